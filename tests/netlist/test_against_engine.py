"""Each construct: ngspice gives the same voltages and currents on the original file and on a flat deck of ours."""

from __future__ import annotations

from pathlib import Path

import pytest

from netlist_boards import BOARDS, MODEL, STAGE
from netlist_elements import ELEMENTS
from netlist_judge import answers, judged
from netlist_language import LANGUAGE
from tauledger.netlist import elaborate, read
from tauledger.netlist.writer import flat_netlist

# Both runs are tight (reltol 1e-6); the same numbers in another order of cards come out within this.
SAME = 1e-6


@pytest.mark.parametrize("name", BOARDS)
def test_our_circuit_has_the_same_operating_point_and_ac_as_the_original_file(name: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(BOARDS[name], encoding="utf-8")
    assert judged(path, elaborate(read(path), output="in")) <= SAME


@pytest.mark.parametrize("name", [*ELEMENTS, *LANGUAGE])
def test_every_letter_and_every_rule_gives_what_the_original_file_gives(name: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text({**ELEMENTS, **LANGUAGE}[name], encoding="utf-8")
    assert judged(path, elaborate(read(path), purpose="reading")) <= SAME


@pytest.mark.parametrize("name", [*BOARDS, *ELEMENTS, *LANGUAGE])
def test_the_flat_deck_is_read_back_to_itself(name: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text({**BOARDS, **ELEMENTS, **LANGUAGE}[name], encoding="utf-8")
    flat = flat_netlist(elaborate(read(path), purpose="reading"))
    path.write_text(flat, encoding="utf-8")
    assert flat_netlist(elaborate(read(path), purpose="reading")) == flat


def test_line_ends_byte_order_mark_tabs_and_latin_1_do_not_matter(tmp_path: Path) -> None:
    text = "Pegelmesser für den Fluß\n" + STAGE.replace(" ", "\t") + MODEL
    plain, other = tmp_path / "plain.cir", tmp_path / "other.cir"
    plain.write_text(text, encoding="utf-8")
    circuit = elaborate(read(plain))
    for data in (
        text.encode("latin-1"),
        b"\xef\xbb\xbf" + text.encode("utf-8"),
        text.replace("\n", "\r\n").encode("utf-8"),
        text.rstrip("\n").encode("utf-8"),
    ):
        other.write_bytes(data)
        again = elaborate(read(other))
        assert (again.title, again.nodes, again.elements, again.models) == (
            circuit.title,
            circuit.nodes,
            circuit.elements,
            circuit.models,
        )
        assert judged(other, again) <= SAME


def test_included_files_are_read_in_place_and_relative_to_the_including_file(tmp_path: Path) -> None:
    (tmp_path / "parts").mkdir()
    (tmp_path / "parts" / "models.lib").write_text("* first line of an include is a card\n.include 'nsmall.lib'\n")
    (tmp_path / "parts" / "nsmall.lib").write_text(MODEL)
    (tmp_path / "load.inc").write_text("R8 out 0 10k\nC8 out 0 100p\n.end\n")
    path = tmp_path / "board.cir"
    path.write_text("includes\n" + STAGE + '.include "parts/models.lib"\n.inc load.inc ; the cable\nR9 out 0 22k\n')
    assert judged(path, elaborate(read(path))) <= SAME


def test_a_script_is_never_run(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    script = ".control\nshell touch ran\nac dec 10 5 5meg\nplot vdb(out)\n.endc\n*# shell touch ran\n"
    path.write_text("script\n" + STAGE + script + MODEL)
    netlist = read(path)
    circuit = elaborate(netlist)
    assert str(circuit.output) == "v(out)"
    assert not (tmp_path / "ran").exists()
    # Without the script ngspice reads the same circuit.
    path.write_text("script\n" + STAGE + MODEL)
    assert judged(path, circuit) <= SAME


def test_nested_m_is_the_product_where_ngspice_takes_the_outermost_alone(tmp_path: Path) -> None:
    """ngspice 39: the m of the inner instance is lost; the product is what m copies mean, and a note says so."""
    cell = ".subckt cell a y\nR1 a y 1k m=2\n.ends\n"
    board = "copies\nV1 in 0 1 AC 1\nX1 in out pair m=3\nR2 out 0 1k\n.subckt pair a y\nX1 a y cell m=5\n.ends\n" + cell
    board += ".print ac v(out)\n"
    path = tmp_path / "board.cir"
    path.write_text(board)
    circuit = elaborate(read(path))
    assert circuit.passives.value[circuit.passives.name.index("X1.X1.R1")] == pytest.approx(1e3 / 30)
    assert [note.where.rpartition(":")[2] for note in circuit.notes] == ["6", "9"]
    theirs = answers(tmp_path, path)[0]
    assert theirs["out"][0].real == pytest.approx(1e3 / (1e3 + 1e3 / 3))


def test_a_note_says_where_a_given_value_was_read_in_the_called_subcircuit(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(BOARDS["scopes are dynamic and a given value is read in the called subcircuit"])
    says = [note.says for note in elaborate(read(path), output="in").notes]
    assert says[0].startswith("p={a*40} is 280: ngspice takes a from the subcircuit")
    assert says[0].endswith("with the caller's it would be 40")


def test_each_surprise_of_the_engine_has_its_note(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(LANGUAGE["where ngspice surprises"])
    notes = {(int(note.where.rpartition(":")[2]), note.says) for note in elaborate(read(path), purpose="reading").notes}
    expected = {
        4: "1k5 is 1k, as ngspice reads it: digits behind a suffix are dropped; if 1.5k is meant, write the point",
        5: "2n2F is 2n, as ngspice reads it: digits behind a suffix are dropped; if 2.2nF is meant, write the point",
        6: "pow(x,y) keeps the sign of x here, as ngspice does; in a behavioural source it takes |x|",
        7: "(-2)^3 is taken as |x|^y, as ngspice does",
        8: "pwr(x,y) takes |x| here, as ngspice does; in a behavioural source it keeps the sign of x",
        13: "(-2)**2 is taken as |x|^y, as ngspice does",
        19: "model dup is defined twice; the first definition counts, as in ngspice",
        2: "parameter p is set again; the last value counts, as in ngspice",
        25: "subcircuit pair is defined twice; the first definition counts, as in ngspice",
        27: f"cards behind .end ({path}:26) are read, as ngspice does",
    }
    assert notes >= set(expected.items())
    assert (8, "mil inside a formula is m (1e-3), as ngspice reads it; outside it is 25.4e-6") in notes
