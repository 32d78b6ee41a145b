"""NODE=VALUES: a resistance and a capacitance to ground, and one clear message for everything else."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Load
from tauledger.errors import InputError
from tauledger.netlist import Netlist, elaborate, read
from tauledger.netlist.added import added
from tauledger.netlist.writer import flat_netlist

BOARD = """a board
VIN in 0 DC 0 AC 1
X1 in out stage
.subckt stage a b
R1 a m 1k
R2 m b 1k
C1 m 0 1n
.ends
RL out 0 10k
.end
"""


@pytest.fixture
def netlist(tmp_path: Path) -> Netlist:
    path = tmp_path / "board.cir"
    path.write_text(BOARD, encoding="utf-8")
    return read(path)


@pytest.mark.parametrize(
    ("text", "loads"),
    [
        ("out=12p", [("C", "out", 12e-12)]),
        ("OUT=12pF", [("C", "out", 12e-12)]),
        ("out=10meg", [("R", "out", 10e6)]),
        ("out=10meg,12p", [("R", "out", 10e6), ("C", "out", 12e-12)]),
        ("out= 12p , 10meg", [("C", "out", 12e-12), ("R", "out", 10e6)]),
        ("x1.M=1p", [("C", "X1.m", 1e-12)]),
        ("out=50", [("R", "out", 50.0)]),
        ("out=100u", [("C", "out", 100e-6)]),
    ],
)
def test_values_say_by_their_size_what_they_are(
    netlist: Netlist, text: str, loads: list[tuple[str, str, float]]
) -> None:
    found = added(netlist, [text]).loads
    assert [(load.kind, load.plus) for load in found] == [(kind, node) for kind, node, _ in loads]
    assert [load.value for load in found] == pytest.approx([value for *_, value in loads], abs=0)
    assert {load.minus for load in found} == {"0"}


def test_several_are_added_one_after_the_other(netlist: Netlist) -> None:
    change = added(netlist, ["out=12p", "X1.m=1p", "out=3p"])
    assert change.loads == (
        Load("C", "out", "0", 12e-12),
        Load("C", "X1.m", "0", 1e-12),
        Load("C", "out", "0", 3e-12),
    )
    circuit = elaborate(netlist, change)
    names = [name for name in circuit.passives.name if "added" in name]
    assert names == ["C added at out", "C added at X1.m", "C added at out, 2"]


def test_the_flat_deck_has_no_blank_in_a_name(netlist: Netlist) -> None:
    text = flat_netlist(elaborate(netlist, added(netlist, ["out=12p", "out=3p"])))
    assert "\nC_added_at_out out 0 1.2e-11\n" in text
    assert "\nC_added_at_out_2 out 0 3e-12\n" in text


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("uot=12p", "--add uot=12p: no node is called 'uot'\n  did you mean 'out'?"),
        ("X1.n=12p", "no node is called 'X1.n'\n  did you mean 'X1.m'?"),
        ("zzzzzz=12p", "there are in, out, X1.m"),
        ("out=1,2,3p", "--add out=1,2,3p: 3 values\n  write a capacitance, a resistance, or both"),
        ("out=twelve", "--add out=twelve: 'twelve' is no number"),
        ("out=", "'' is no number"),
        ("out=10meg,", "'' is no number"),
        ("out", "--add out: not NODE=VALUES"),
        ("=12p", "--add =12p: not NODE=VALUES"),
        ("out=1p,2p", "two capacitances"),
        ("out=1k,2k", "two resistances"),
        ("out=-1p", "-1p is not above 0"),
        ("out=0", "0 is not above 0"),
        ("out=1e999", "1e999 is not above 0"),
        ("out=10M", "10M is no resistance from 1 ohm on and no capacitance up to 1 mF\n  in SPICE M is milli"),
        ("0=12p", "both ends would be ground"),
        ("gnd=12p", "both ends would be ground"),
    ],
)
def test_anything_else_gets_one_clear_message(netlist: Netlist, text: str, says: str) -> None:
    with pytest.raises(InputError) as raised:
        added(netlist, [text])
    assert says in str(raised.value)
