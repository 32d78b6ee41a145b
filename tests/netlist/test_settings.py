"""NAME=VALUE: what a name means, and that the circuit is the one of a netlist edited by hand."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Change
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
