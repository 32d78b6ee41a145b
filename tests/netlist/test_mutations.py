"""Netlists cut, doubled and stirred: a circuit or a message, never a traceback and never a hang."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from netlist_boards import BOARDS
from tauledger.errors import InputError
from tauledger.netlist import elaborate, hints, read, read_past
from tauledger.netlist.diagnostics import unsafe

FIXTURES = Path(__file__).parents[2] / "fixtures"
ORIGINALS = [path.read_text(encoding="latin-1") for path in sorted(FIXTURES.rglob("*.cir"))] + list(BOARDS.values())

# What cards are made of, and what has broken readers before.
FRAGMENTS = [
    *("(", ")", "{", "}", "'", '"', "=", ",", "+", "\n+", "\n", "$", ";", "//", "*", "\\\\", "&", "#", " ", "\t", "\r"),
    *(".", "..", ".subckt", ".ends", ".model", ".param", ".include", ".control", ".endc", ".temp", ".options"),
    *("0", "-1", "1e999", "1k5", "nan", "m=0", "m=", "{a}", "{a", "a=a", "x", "X1 in out stage", "Q1", "AC", "DC"),
    *("\x1b", "\x00", "\xff", "µ", "\u202e", "params:", "r=", "ic=", "off", "R", "V", "G1 a b c d", "poly(1)"),
    *("PULSE(", ".global", "X1 in out cell m=2"),
]


@st.composite
def mutated(draw: st.DrawFn) -> str:
    """A netlist with up to eight places cut, doubled or replaced."""
    text = draw(st.sampled_from(ORIGINALS))
    for _ in range(draw(st.integers(1, 8))):
        at = draw(st.integers(0, len(text)))
        length = draw(st.integers(0, 12))
        fragment = draw(st.sampled_from(FRAGMENTS))
        kind = draw(st.integers(0, 2))
        if kind == 0:
            text = text[:at] + text[at + length :]
        elif kind == 1:
            text = text[:at] + fragment + text[at:]
        else:
            text = text[:at] + fragment + text[at + length :]
    return text


@settings(
    derandomize=True, max_examples=400, deadline=5000, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(mutated())
def test_a_mutated_netlist_gives_a_circuit_or_a_message(tmp_path: Path, text: str) -> None:
    path = tmp_path / "board.cir"
    path.write_bytes(text.encode("utf-8", "surrogatepass"))
    message = ""
    try:
        netlist = read(path)
        hints(netlist)
        assert not any(map(unsafe, netlist.title + read_past(netlist)))
        circuit = elaborate(netlist, output="in")
    except InputError as error:
        message = str(error)
    if message:
        assert not any(unsafe(character) for character in message if character != "\n")
        return
    assert all(math.isfinite(value) and value >= 0.0 for value in circuit.passives.value.tolist())
    assert all(math.isfinite(value) for element in circuit.elements for _, value in element.parameters)
    assert all(math.isfinite(value) for model in circuit.models for _, value in model.parameters)
    names = [*circuit.nodes, *circuit.passives.name, *(element.name for element in circuit.elements)]
    assert not any(map(unsafe, "".join(names)))


@settings(
    derandomize=True, max_examples=150, deadline=5000, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(st.binary(max_size=300))
def test_any_bytes_give_a_circuit_or_a_message(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "board.cir"
    path.write_bytes(b"pad\nVIN in 0 AC 1\nR1 in out 1k\n" + data)
    message = ""
    try:
        elaborate(read(path))
    except InputError as error:
        message = str(error)
    assert not any(unsafe(character) for character in message if character != "\n")


@pytest.mark.parametrize("deep", ["(" * 5000, "{" * 5000, "R1 a 0 {" + "(" * 5000, "R1 a 0 {" + "!" * 3000 + "1}"])
def test_deep_nesting_is_a_message(tmp_path: Path, deep: str) -> None:
    path = tmp_path / "board.cir"
    path.write_text("pad\nVIN in 0 AC 1\nR1 in out 1k\nR2 out 0 " + deep + "\n")
    with pytest.raises(InputError):
        elaborate(read(path))


def test_balanced_deep_parentheses_are_a_message(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text("pad\nVIN in 0 AC 1\nR1 in out " + "(" * 3000 + "1k" + ")" * 3000 + "\n")
    with pytest.raises(InputError, match="nested"):
        elaborate(read(path))
