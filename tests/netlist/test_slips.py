"""Slips that are read all the same: each has a note at its place, and what is written right has none."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Circuit
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, read
from tauledger.pipeline import review

PAD = "River-level gauge, pad\nVIN in 0 AC 1\n.print ac v(out)\nR1 in out 1k\nC1 out 0 100p\n"


def circuit_of(folder: Path, text: str) -> Circuit:
    path = folder / "board.cir"
    path.write_text(text)
    return elaborate(read(path))


def notes_of(folder: Path, text: str) -> list[str]:
    return [f"{note.where.rpartition(':')[2]} {note.says}" for note in circuit_of(folder, text).notes]


@pytest.mark.parametrize("filler", ["", "".join(f"RF{k} in out 1meg\n" for k in range(12))])
@pytest.mark.parametrize("value", ["3.3kk", "3.3KK", "3.3kmeg", "3.3ku"])
def test_a_second_suffix_is_no_factor_and_a_note_says_so(tmp_path: Path, value: str, filler: str) -> None:
    line = f"R2 out 0 {value}\n"
    text = PAD + filler + line
    where = text.count("\n")
    assert notes_of(tmp_path, text) == [
        f"{where} {value} is {value[:4]}, as ngspice reads it: what follows a suffix is a unit"
    ]


@pytest.mark.parametrize("filler", ["", "".join(f"RF{k} in out 1meg\n" for k in range(12))])
@pytest.mark.parametrize(("written", "ohm"), [("1M", "0.001"), ("6.8M", "0.0068"), ("2.2MOhm", "0.0022")])
def test_a_capital_m_on_a_resistor_is_said_to_be_milli(tmp_path: Path, filler: str, written: str, ohm: str) -> None:
    text = PAD + filler + f"R2 out 0 {written}\n"
    number = written.rstrip("MOhm")
    assert notes_of(tmp_path, text) == [
        f"{text.count(chr(10))} R2 has {written}: M is milli in SPICE, as m is; {ohm} Ω is taken, write {number}meg "
        "for megohms"
    ]


@pytest.mark.parametrize("written", ["10m", "1meg", "2.2MEG", "1Meg"])
def test_a_small_m_and_meg_need_no_note(tmp_path: Path, written: str) -> None:
    assert notes_of(tmp_path, PAD + f"R2 out 0 {written}\n") == []


@pytest.mark.parametrize("value", ["3.3k", "3.3kohm", "3.3meg", "3.3megohm", "100mm", "1um", "1nF", "1pf"])
def test_a_unit_behind_a_suffix_needs_no_note(tmp_path: Path, value: str) -> None:
    assert notes_of(tmp_path, PAD + f"R2 out 0 {value}\n") == []


def test_a_negative_resistance_is_reviewed_as_written_with_a_note(tmp_path: Path) -> None:
    board = tmp_path / "board.cir"
    board.write_text(PAD + "R2 out 0 -5k\n")
    found = review(board)
    # 1k against -5k: the gain is 5/4, and the output sees 1.25 kΩ.
    assert found.midband.gain_db == pytest.approx(1.9382, abs=1e-3)
    assert found.f_high is not None
    assert found.f_high.simulated_hz == pytest.approx(1.0 / (2 * 3.141592653589793 * 1.25e3 * 100e-12), rel=1e-4)
    assert found.f_high.exact_hz == pytest.approx(found.f_high.simulated_hz, rel=1e-6)
    assert "R2 has -5000 Ω, less than 0: taken as written, as ngspice does" in [note.says for note in found.notes]


@pytest.mark.parametrize(
    ("card", "note"),
    [
        (".print ac v(ot)", "5 .print v(ot): no node is called 'ot'; did you mean 'out'?"),
        (".print ac v(out) v(im)", "5 .print v(im): no node is called 'im'; did you mean 'in'?"),
        (".print tran v(a,in)", "5 .print v(a,in): no node is called 'a'"),
        (".plot ac i(VIM)", "5 .plot i(VIM): no element is called 'VIM'; did you mean 'VIN'?"),
        (".control\n  plot vdb(outt)\n.endc", "6 plot v(outt): no node is called 'outt'; did you mean 'out'?"),
        (".ac dce 20 1 1meg", "5 .ac dce: did you mean 'dec'?"),
    ],
)
def test_a_request_for_what_does_not_exist_has_a_note_at_its_place(tmp_path: Path, card: str, note: str) -> None:
    assert note in notes_of(tmp_path, PAD.replace(".print ac v(out)\n", "") + card + "\n")


@pytest.mark.parametrize(
    "request_", ["v(x1.mid)", "i(r1)", "i(v.x1.vsense)", "v(q1#base)", "v($node)", "v(gnd,out)", "v(all)"]
)
def test_what_exists_or_what_only_ngspice_knows_has_none(tmp_path: Path, request_: str) -> None:
    cell = "X1 in out cell\n.subckt cell a y\nRA a mid 1k\nVSENSE mid y 0\n.ends\n"
    assert notes_of(tmp_path, PAD + cell + f".save {request_}\n") == []


def test_where_only_a_strange_request_is_there_it_is_the_error(tmp_path: Path) -> None:
    with pytest.raises(
        NetlistError, match=r"board.cir:3:11: no node is called 'zy'\n.*\n +\^{5}\n  did you mean 'zz'\?"
    ):
        circuit_of(tmp_path, PAD.replace("out", "zz").replace("v(zz)", "v(zy)"))


@pytest.mark.parametrize(
    ("card", "notes"),
    [
        (".print ac v(out)", []),
        (".print ac vdb(out) vp(out)", []),
        (".print ac v(in) v(out)", []),
        ("", ["4 output v(out): the only node called out, vout or output"]),
        (".print ac v(mid) v(out)", ["3 output v(out): of v(mid), v(out) asked for in .print, the one called so"]),
    ],
)
def test_the_choice_of_the_output_is_told_unless_one_request_names_it(
    tmp_path: Path, card: str, notes: list[str]
) -> None:
    text = "River-level gauge, pad\nVIN in 0 AC 1\n" + (f"{card}\n" if card else "RB mid 0 1k\n")
    text += "R1 mid out 1k\nR2 in mid 1k\nC1 out 0 100p\n"
    assert notes_of(tmp_path, text) == notes


@pytest.mark.parametrize(
    ("cards", "notes"),
    [
        ("R2 ouu 0 1k", ["6 node ouu has one connection only, R2; did you mean 'out'?"]),
        ("R2 out O 1k", ["6 node O has one connection only, R2; is ground, 0, meant?"]),
        ("R2 out tap 1k\n.save v(tap)", []),
        ("R2 out tap 1k\nG1 0 out tap 0 1m", []),
        ("R2 out tap 1k\nB1 0 out i=1m*v(tap)", []),
        ("R2 tap tap 1k", []),
        ("R2 out far 1k\nX1 far cell\n.subckt cell a\nR1 a 0 1k\n.ends", []),
        ("X1 out far cell\n.subckt cell a b\nR1 a 0 1k\nR2 b 0 1k\n.ends", ["6 node far has one connection only, X1"]),
        (
            "X1 out cell\nX2 out cell\n.subckt cell a\nR1 a open 1k\n.ends",
            ["9 node open of subcircuit cell has one connection only, R1"],
        ),
        (".global vdd\nX1 out cell\nX2 out cell\n.subckt cell a\nR1 a vdd 1k\n.ends", []),
        (".options rshunt=1e12\nR2 far 0 1k", ["7 node far has one connection only, R2"]),
    ],
)
def test_a_node_with_one_connection_is_told_where_it_stands(tmp_path: Path, cards: str, notes: list[str]) -> None:
    found = notes_of(tmp_path, PAD + cards + "\n")
    assert [note for note in found if "one connection" in note] == notes


def test_many_nodes_with_one_connection_are_not_all_listed(tmp_path: Path) -> None:
    found = notes_of(tmp_path, PAD + "".join(f"RP{k} out {k}stub 1k\n" for k in range(1, 41)))
    assert len(found) == 13
    assert found[-1].endswith("28 more nodes have one connection only")


@pytest.mark.parametrize(
    ("line", "what"),
    [
        ("VCC in 0 12", "a voltage source"),
        ("V2 out 0 DC 5", "a voltage source"),
        ("R9 in out 1k", "a resistor"),
        ("Q9 out in 0 nsmall", "a bipolar transistor"),
        ("E9 out 0 in 0 10", "a voltage-controlled voltage source"),
        ("X9 in out cell", "a subcircuit"),
        (".model other npn (bf=90)", "a .model card"),
    ],
)
def test_a_title_that_would_make_a_card_is_told(tmp_path: Path, line: str, what: str) -> None:
    rest = PAD.partition("\n")[2] + ".model nsmall npn (bf=220)\n.subckt cell a y\nR1 a y 1k\n.ends\n"
    assert notes_of(tmp_path, f"{line}\n{rest}") == [
        f"1 the first line is the title: it looks like {what}; if it is one, put a title above it"
    ]


@pytest.mark.parametrize(
    "line",
    ["River-level gauge, pad", "Receiver board rev 2", "Q1 bias test", "Line driver out 2", "* V1 in 0 5", "Two in 0"],
)
def test_a_title_is_a_title(tmp_path: Path, line: str) -> None:
    assert notes_of(tmp_path, f"{line}\n{PAD.partition(chr(10))[2]}") == []


def test_a_source_in_the_place_of_the_title_is_told_where_no_source_is_left(tmp_path: Path) -> None:
    with pytest.raises(
        InputError, match=r"no source has an AC value\n.*\n  .*board.cir:1: the first line is the title"
    ):
        circuit_of(tmp_path, "VIN in 0 AC 1\nVCC vcc 0 12\nR1 in out 1k\nR2 vcc out 1k\n")


@pytest.mark.parametrize(
    ("sources", "suggested"),
    [
        ("VCC vcc 0 12\nVIN in 0 0", "VIN"),
        ("VCC vcc 0 12\nVIN in 0", "VIN"),
        ("VCC vcc 0 12\nVIN in 0 0.7", "VIN"),
        ("VCC vcc 0 12\nIIN 0 in 0", "IIN"),
        ("VCC vcc 0 12\nR9 vcc in 1meg", "SOURCE"),
    ],
)
def test_a_supply_is_not_suggested_as_input(tmp_path: Path, sources: str, suggested: str) -> None:
    stage = "RC vcc out 1k\nQ1 out in 0 nsmall\nRB in 0 10k\n.model nsmall npn (bf=220)\n"
    with pytest.raises(InputError, match=rf"--input {suggested} \(there are: VCC"):
        circuit_of(tmp_path, f"River-level gauge, stage\n{sources}\n{stage}")
