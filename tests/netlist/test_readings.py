"""Where ngspice reads something in a way that cannot be meant, a note holds both readings; ngspice confirms its own."""

from __future__ import annotations

import cmath
from pathlib import Path

import pytest

from netlist_judge import answers
from tauledger.circuit import Circuit
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, read
from tauledger.netlist.draft import MOST_INSTANCES
from tauledger.netlist.writer import flat_netlist

PAIR = "Rs a p 10\nL1 p 0 1m{m}\nL2 b 0 4m\nK1 L1 L2 {k}\n"
COUPLED = "pair\nV1 a 0 AC 1\n" + PAIR + "RL b 0 1k\n.print ac v(b)\n"
IN_INSTANCE = "pair\nV1 a 0 AC 1\nX1 a b tr m=2\n.subckt tr a b\n" + PAIR + ".ends\nRL b 0 1k\n.print ac v(b)\n"
CHOICE = "choice\n.param a={a} k={{{formula}}}\nV1 in 0 1 AC 1\nR1 in out 1k\nR2 out 0 {{k*1k}}\n"
RESISTIVE = ".model mm nmos level=1 vto=.8 kp=60u rd=100\n"


def _says(circuit: Circuit) -> list[str]:
    return [note.says for note in circuit.notes]


@pytest.mark.parametrize(
    ("board", "m", "coupling"),
    [(COUPLED, " m=2", 2**0.5), (IN_INSTANCE, "", 2.0)],
)
def test_inductors_with_m_are_coupled_as_written_and_a_note_gives_the_coupling_that_ngspice_has(
    board: str, m: str, coupling: float, tmp_path: Path
) -> None:
    path = tmp_path / "board.cir"
    path.write_text(board.format(m=m, k=0.4))
    circuit = elaborate(read(path))
    theirs = answers(tmp_path, path)[1]["b"]
    (note,) = _says(circuit)
    assert "with 0.4; ngspice" in note
    assert note.endswith(f"a coupling of {0.4 * coupling:.4g}")
    path.write_text(flat_netlist(circuit))
    ours = answers(tmp_path, path)[1]["b"]
    assert not any(cmath.isclose(a, b, rel_tol=1e-2) for a, b in zip(ours[:5], theirs, strict=False))
    path.write_text(flat_netlist(circuit).replace(" 0.4\n", f" {0.4 * coupling!r}\n"))
    assert answers(tmp_path, path)[1]["b"] == pytest.approx(theirs, rel=1e-6)


def test_m_on_an_instance_that_defines_a_subcircuit_counts_on_all_of_it_and_a_note_says_so(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    inner = ".subckt cell p r=1k\nR2 p 0 1k\n.ends\n"
    board = "copies\nV1 in 0 1 AC 1\nR0 in a 1k\nX1 a stage m=2\n{}.subckt stage a\n{}R1 a 0 4k\nXb a cell\n.ends\n"
    path.write_text(board.format(inner, ""))
    outside = elaborate(read(path), purpose="reading")
    assert _says(outside) == []
    path.write_text(board.format("", inner))
    circuit = elaborate(read(path), purpose="reading")
    assert circuit.passives.value.tolist() == outside.passives.value.tolist() == [1e3, 2e3, 500.0]
    (note,) = _says(circuit)
    assert note.startswith("X1 counts m = 2 on everything in it; ngspice loses it")
    # ngspice: 4 kΩ as written beside 1 kΩ / 2.
    load = 1.0 / (1 / 4e3 + 2 / 1e3)
    assert answers(tmp_path, path)[0]["a"][0].real == pytest.approx(load / (1e3 + load))


@pytest.mark.parametrize(
    ("formula", "ours", "theirs"),
    [
        ("a>1?a<1?1:2:3", 2.0, 1.0),
        ("a>1?(a)<1?1:2:3", 2.0, 1.0),
        ("1+(a>1?a<1?1:2:3)", 3.0, 2.0),
        ("a>1?(a<1?1:2):3", 2.0, 2.0),
        ("a>3?a<1?1:2:3", 3.0, 3.0),
        ("a>3?1:a<1?2:3", 3.0, 3.0),
    ],
)
def test_a_choice_in_the_middle_of_another_has_a_note_where_ngspice_gives_another_value(
    formula: str, ours: float, theirs: float, tmp_path: Path
) -> None:
    path = tmp_path / "board.cir"
    path.write_text(CHOICE.format(a=2, formula=formula))
    circuit = elaborate(read(path), purpose="reading")
    assert circuit.passives.value[1] == pytest.approx(ours * 1e3)
    engine = answers(tmp_path, path)[0]["out"][0].real
    assert engine / (1.0 - engine) == pytest.approx(theirs)
    assert bool(_says(circuit)) == (ours != theirs)
    assert all("a?c?x:y:z" in says for says in _says(circuit))


def test_rshunt_is_left_to_ngspice_where_it_loads_nodes_inside_devices(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    board = "shunt\n.options rshunt=1meg\nVdd vdd 0 5\nV1 in 0 1.2 AC 1\nRd vdd out 200k\nM1 out in 0 0 mm l=1u w=10u\n"
    path.write_text(f"{board}{RESISTIVE}.print ac v(out)\n")
    circuit = elaborate(read(path))
    (note,) = _says(circuit)
    assert "ngspice puts one to every node inside a device as well (M1), as here" in note
    assert circuit.options == (("rshunt", 1e6),)
    assert circuit.passives.name == ("Rd",)
    path.write_text(f"{board}{RESISTIVE.replace(' rd=100', '')}.print ac v(out)\n")
    circuit = elaborate(read(path))
    (note,) = _says(circuit)
    assert note.endswith("from every node to ground: Rshunt.<node>")
    assert circuit.options == ()
    assert len(circuit.passives.name) == 4


def test_rshunt_is_refused_where_the_nodes_inside_are_unknown(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(
        "shunt\n.options rshunt=1meg\nV1 in 0 AC 1\nT1 in 0 out 0 z0=50 td=1n\nR1 out 0 50\n.print ac v(out)\n"
    )
    with pytest.raises(NetlistError, match=r"board\.cir:2:10: .*rshunt loads the nodes inside T1") as raised:
        elaborate(read(path))
    assert "write resistors" in str(raised.value)


def test_default_geometry_reaches_the_transistors_whose_cards_leave_it_out(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(
        "geometry\n.options defl=2u defw=10u defad=20p defas=30p scale=3\nVdd vdd 0 5\nV1 in 0 1.2 AC 1\n"
        "Rd vdd out 200k\n"
        "M1 out in 0 0 m1\nM2 out in 0 0 m1 l=1u\nM3 out in 0 0 m8\n.model m1 nmos(level=3 vto=1)\n"
        ".model m8 nmos(level=8)\n.print ac v(out)\n"
    )
    circuit = elaborate(read(path))
    first, second, third = (dict(element.parameters) for element in circuit.elements if element.letter == "M")
    assert first == pytest.approx({"l": 2e-6, "w": 10e-6, "ad": 20e-12}, rel=1e-12, abs=0)
    assert second == pytest.approx({"l": 3e-6, "w": 10e-6, "ad": 20e-12}, rel=1e-12, abs=0)
    assert third == {}
    assert any("option defas: ngspice takes it for nothing" in says for says in _says(circuit))


def test_an_ac_resistance_of_nothing_is_refused_at_its_value(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text("ac\nV1 in 0 AC 1\nR1 in out 1k ac=0\nR2 out 0 1k\n.print ac v(out)\n")
    with pytest.raises(NetlistError, match=r"board\.cir:3:17: an AC resistance of 0 Ω"):
        elaborate(read(path))


def test_a_limit_is_told_once(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    levels = 6
    cells = "".join(
        f".subckt s{k} a b\n" + "".join(f"X{n} a b s{k + 1}\n" for n in range(10)) + ".ends\n" for k in range(levels)
    )
    path.write_text(f"bomb\nV1 a 0 AC 1\nX1 a 0 s0\n{cells}.subckt s{levels} a b\nR1 a b 1\n.ends\n")
    with pytest.raises(InputError) as raised:
        elaborate(read(path))
    assert str(raised.value).count(f"more than {MOST_INSTANCES} instances") == 1


def test_a_byte_order_mark_before_latin_1_is_no_part_of_the_title(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_bytes(b"\xef\xbb\xbfFlap\nV1 in 0 AC 1\nR1 in knot\xe4 1k\nR2 knot\xe4 0 1k\n")
    circuit = elaborate(read(path), purpose="reading")
    assert circuit.title == "Flap"
    assert "knotä" in circuit.nodes


@pytest.mark.parametrize("words", ["jn off area=2", "jn area=2 off", "jn 2 off"])
def test_a_flag_and_an_area_are_read_alike_in_every_order(words: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(f"flag\nV1 in 0 AC 1\nR1 in d 1k\nJ1 d 0 0 {words}\n.model jn njf vto=-2\n")
    flat = flat_netlist(elaborate(read(path), purpose="reading"))
    assert "jn off area=2.0" in flat
    path.write_text(flat)
    assert flat_netlist(elaborate(read(path), purpose="reading")) == flat


def test_a_line_does_not_count_the_m_of_the_instances_around_it_nor_does_it_in_ngspice(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    board = (
        "lead\nV1 a 0 AC 1\nX1 a b lead{}\n.subckt lead p q\nT1 p 0 q 0 z0=75 td=5n\n.ends\nR1 b 0 50\n.print ac v(b)\n"
    )
    path.write_text(board.format(" m=2"))
    circuit = elaborate(read(path))
    assert _says(circuit) == ["X1.T1 does not count the m = 2 of the instances around it: ngspice has none for T"]
    theirs = answers(tmp_path, path)[1]["b"]
    path.write_text(flat_netlist(circuit))
    assert answers(tmp_path, path)[1]["b"] == pytest.approx(theirs, rel=1e-6)
