"""Analyses and outputs are hints; what is read past is counted in one line."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.netlist import Hints, Netlist, ac_range, hints, read, read_past

PAD = "River-level gauge, pad\nVIN in 0 PULSE(0 1) AC 1\nR1 in out 600 noisy=0\nC1 out 0 100p ic=1\n"


def board(folder: Path, cards: str) -> Netlist:
    path = folder / "board.cir"
    path.write_text(PAD + cards)
    return read(path)


@pytest.mark.parametrize(
    ("cards", "expected"),
    [
        (".ac dec 10 100 10meg\n", (100.0, 1e7)),
        (".AC LIN 100 1k 2k\n", (1e3, 2e3)),
        (".control\nac oct 3 20 20k\n.endc\n", (20.0, 20e3)),
        (".control\nac oct 3 20 20k\n.endc\n.ac dec 10 1 1g\n", (1.0, 1e9)),
        (".ac dec 10 {f1} {f2}\n", None),
        (".ac dec 10 1meg 1k\n", None),
        (".ac lin 10 0 1k\n", None),
        (".ac dec\n", None),
        (".tran 1u 1m\n", None),
    ],
)
def test_the_range_is_that_of_the_first_ac_analysis(
    tmp_path: Path, cards: str, expected: tuple[float, float] | None
) -> None:
    assert ac_range(board(tmp_path, cards)) == expected


def test_outputs_of_an_ac_analysis_come_before_all_others(tmp_path: Path) -> None:
    cards = ".print tran v(in)\n.save v(a)\n.print ac v(out) i(VIN)\n.plot ac vdb(out) vp(a,b)\n"
    assert hints(board(tmp_path, cards)) == Hints(("v(out)", "i(VIN)", "v(a,b)"))


def test_what_was_read_past_is_one_line(tmp_path: Path) -> None:
    cards = """.ac dec 10 1 1g
.tran 1u 1m
.print ac v(out)
.measure ac top max v(out)
.meas ac low min v(out)
.options reltol=1e-4 gmin=1e-13 nopage method=gear temp=30
.control
ac dec 10 1 1g
plot vdb(out)
.endc
"""
    assert read_past(board(tmp_path, cards)) == (
        "2 analyses, 2 .meas, 1 .print, .control block of 2 lines, 3 options, "
        "1 initial condition, 1 noise switch, 1 time function"
    )


def test_nothing_read_past_is_nothing_said(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text("River-level gauge, pad\nVIN in 0 AC 1\nR1 in out 600\nC1 out 0 100p\n.end\n")
    assert read_past(read(path)) == ""
