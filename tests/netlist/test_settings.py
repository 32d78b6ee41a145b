"""NAME=VALUE: what a name means, and that the circuit is the one of a netlist edited by hand."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Change, joined
from tauledger.errors import InputError
from tauledger.netlist import elaborate, read
from tauledger.netlist.settings import change_of
from tauledger.netlist.writer import flat_netlist

BOARD = """settings
.param load=1k gain=2
VIN in 0 DC 1 AC 1
R1 in b {load}
R2 b c 2k tc1=1m
E1 d 0 b 0 10
X1 d out cell
X2 d out pair m=3
X4 d out stage level=2
R3 out 0 1k m=2
Q1 out b 0 nsmall
.subckt cell a y
R1 a y {gain*100}
D1 y 0 local
.model local d is=1e-14
.ends
.subckt pair a y
G1 a 0 y 0 2m m=2
I1 a 0 5u AC 7u m=2
.ends
.subckt stage a y level=5
.param half={level/2}
R1 a y {1k*half}
Q1 y a 0 nsmall area=7
.ends
.model nsmall npn (bf=220)
.temp 60
"""


@pytest.fixture
def board(tmp_path: Path) -> Path:
    path = tmp_path / "board.cir"
    path.write_text(BOARD)
    return path


@pytest.mark.parametrize(
    ("setting", "change"),
    [
        ("LOAD=2k", Change(parameters=(("load", 2e3),))),
        ("r3 = 4.7kohm", Change(elements=(("R3", 4.7e3),))),
        ("X1.R1=10", Change(elements=(("X1.R1", 10.0),))),
        ("R.X1.R1=10", Change(elements=(("X1.R1", 10.0),))),
        ("nsmall.BF=100", Change(models=(("nsmall", "bf", 100.0),))),
        ("X1:local.is=1f", Change(models=(("X1:local", "is", 1e-15),))),
        ("q1.AREA=2", Change(given=(("Q1", "area", 2.0),))),
        ("X4.LEVEL=3", Change(given=(("X4", "level", 3.0),))),
        ("Temp=-40", Change(temperature_c=-40.0)),
    ],
)
def test_a_name_is_a_parameter_an_element_or_a_parameter_of_a_model(board: Path, setting: str, change: Change) -> None:
    assert change_of(read(board), [setting]) == change


@pytest.mark.parametrize(
    ("setting", "old", "new"),
    [
        ("load=2k", "load=1k", "load=2k"),
        ("R2=3k", "c 2k", "c 3k"),
        ("R3=5k", "0 1k m", "0 5k m"),
        ("E1=20", "0 10", "0 20"),
        ("VIN=2", "DC 1", "DC 2"),
        ("X2.G1=3m", "y 0 2m", "y 0 3m"),
        ("X2.I1=6u", "0 5u", "0 6u"),
        ("nsmall.bf=100", "bf=220", "bf=100"),
        ("nsmall.vaf=80", "bf=220", "bf=220 vaf=80"),
        ("X1:local.is=1f", "is=1e-14", "is=1e-15"),
        ("X4.level=3", "stage level=2", "stage level=3"),
        ("X4.half=9", "half={level/2}", "half=9"),
        ("X2.m=4", "pair m=3", "pair m=4"),
        ("X1.m=4", "out cell", "out cell m=4"),
        ("Q1.area=2", "0 nsmall\n.subckt cell", "0 nsmall area=2\n.subckt cell"),
        ("Q1.m=2", "0 nsmall\n.subckt cell", "0 nsmall m=2\n.subckt cell"),
        ("X4.Q1.area=3", "area=7", "area=3"),
        ("Q.X4.Q1.m=3", "area=7", "area=7 m=3"),
        ("R3.m=5", "0 1k m=2", "0 1k m=5"),
    ],
)
def test_the_circuit_is_that_of_the_netlist_edited_by_hand(board: Path, setting: str, old: str, new: str) -> None:
    netlist = read(board)
    changed = elaborate(netlist, change_of(netlist, [setting]), purpose="reading")
    board.write_text(BOARD.replace(old, new))
    assert flat_netlist(changed) == flat_netlist(elaborate(read(board), purpose="reading"))
    assert BOARD.count(old) == 1


@pytest.mark.parametrize(
    ("settings", "message"),
    [
        (["R9=1k"], "nothing is called 'R9'"),
        (["load"], "not NAME=VALUE"),
        (["load=much"], "not NAME=VALUE"),
        (["load=1k5"], "not NAME=VALUE"),
        (["load=1e999"], "not NAME=VALUE"),
        (["load=1", "LOAD=2"], "is set twice"),
        (["\x1b[31m=1"], "nothing is called"),
        (["X4.levl=1"], "nothing is called 'X4.levl'\n  did you mean 'X4.level'"),
        (["Q1.bf=1"], "nothing is called 'Q1.bf'"),
        (["VIN.m=2"], "nothing is called 'VIN.m'"),
        (["Q1.off=1"], "nothing is called 'Q1.off'"),
    ],
)
def test_what_cannot_be_set_is_one_message(board: Path, settings: list[str], message: str) -> None:
    with pytest.raises(InputError, match=message) as raised:
        change_of(read(board), settings)
    assert "\x1b" not in str(raised.value)


def test_a_name_of_two_things_is_refused(board: Path) -> None:
    board.write_text(BOARD.replace("gain=2", "gain=2 r3=1"))
    with pytest.raises(InputError, match="is a parameter and an element"):
        change_of(read(board), ["r3=1"])


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (("Q1", "area", 0.0), "Q1: area must be greater than 0, not 0"),
        (("X1", "m", -1.0), "X1: m must be greater than 0, not -1"),
        (("Q1", "area", float("nan")), "area: nan is not a finite number"),
        (("Q9", "area", 1.0), "nothing is called 'Q9'"),
        (("X4", "gain", 1.0), "X4 has no parameter 'gain' that could be set"),
    ],
)
def test_a_card_cannot_give_what_it_does_not_have(board: Path, given: tuple[str, str, float], message: str) -> None:
    with pytest.raises(InputError, match=message):
        elaborate(read(board), Change(given=(given,)), purpose="reading")


def test_of_two_changes_of_a_card_the_second_counts() -> None:
    first, second = Change(given=(("Q1", "area", 2.0), ("X1", "m", 2.0))), Change(given=(("q1", "AREA", 3.0),))
    assert joined(first, second).given == (("q1", "AREA", 3.0), ("X1", "m", 2.0))
