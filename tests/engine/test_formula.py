"""Formulas in the deck: all in parentheses, generated names, nothing beyond the whitelist; the engine reads them so."""

from __future__ import annotations

import math

import pytest
from msgspec.structs import replace

from circuits import board
from tauledger.circuit import Apply, Current, Element, Formula, Number, Variable, Voltage
from tauledger.engine.client import Engine
from tauledger.engine.deck import write_deck
from tauledger.engine.formula import written
from tauledger.errors import EngineError

X = Voltage(1, 0)
NODES = ("0", "n1", "n2")


def of(function: str, *arguments: Formula | float) -> Formula:
    return Apply(function, tuple(Number(a) if isinstance(a, float) else a for a in arguments))


@pytest.mark.parametrize(
    ("formula", "text"),
    [
        (Number(-2.5), "(-2.5)"),
        (Voltage(1, 2), "v(n1,n2)"),
        (Voltage(2, 0), "v(n2)"),
        (Voltage(0, 2), "(-v(n2))"),
        (Voltage(0, 0), "(0.0)"),
        (Current("VM"), "i(v7)"),
        (Variable("temper"), "temper"),
        (of("-", X), "(-v(n1))"),
        (of("-", X, 1.0), "(v(n1) - (1.0))"),
        (of("?:", of(">", X, 1.0), 2.0, 3.0), "((v(n1) > (1.0)) ? (2.0) : (3.0))"),
        (of("table", X, 0.0, 0.0, 1.0, 5.0), "pwl(max(min(v(n1),(1.0)),(0.0)),(0.0),(0.0),(1.0),(5.0))"),
    ],
)
def test_every_form_is_written_in_one_way(formula: Formula, text: str) -> None:
    assert written(formula, NODES, {"vm": "v7"}) == text


@pytest.mark.parametrize(
    "formula", [of("shell", X), Variable("x; quit"), Number(math.nan), of("^", X), of("exp; quit", X)]
)
def test_what_is_not_known_is_refused(formula: Formula) -> None:
    with pytest.raises(EngineError, match=r"formula"):
        written(formula, NODES, {})


PLAIN = board("V1 in 0 1.5", "VM in m 0", "RM m 0 1k", "RB out 0 1k")


def solved(engine: Engine, formula: Formula, letter: str = "B", quantity: str = "v") -> float:
    made = Element(letter, f"{letter}9", (3, 0), "", (), 9, 0, formula=formula, quantity=quantity)
    return float(engine.bias(replace(PLAIN, elements=(*PLAIN.elements, made)), ()).voltages[3])


@pytest.mark.parametrize(
    ("formula", "volt"),
    [
        (of("*", of("+", X, 2.0), 3.0), 10.5),
        (of("^", X, 2.0), 2.25),
        (of("-", of("-", 1.0, X), 1.0), -1.5),
        (of("/", 6.0, of("/", X, 2.0)), 8.0),
        (of("-", of("^", X, 2.0)), -2.25),
        (of("?:", of("&&", of(">", X, 1.0), of("!", of(">", X, 2.0))), 2.0, 3.0), 2.0),
        (of("pwl", X, 0.0, 0.0, 1.0, 5.0, 2.0, 6.0), 5.5),
        (of("pwl", X, 0.0, 0.0, 1.0, 5.0), 7.5),
        (of("table", X, 0.0, 0.0, 1.0, 5.0), 5.0),
        (of("table", of("-", X), 0.0, 1.0, 1.0, 5.0), 1.0),
        (of("table", of("/", X, 2.0), 0.0, 0.0, 1.0, 5.0), 3.75),
        (of("max", of("sqrt", X), of("exp", of("-", X))), math.sqrt(1.5)),
        (of("*", Current("vm"), 1000.0), 1.5),
        (Variable("temper"), 27.0),
    ],
)
def test_the_engine_reads_a_formula_as_it_was_meant(formula: Formula, volt: float, engine: Engine) -> None:
    assert solved(engine, formula) == pytest.approx(volt, rel=1e-6)
    assert solved(engine, of("/", formula, -1000.0), quantity="i") == pytest.approx(volt, rel=1e-6)


def test_a_controlled_source_given_by_a_formula_is_a_behavioural_one(engine: Engine) -> None:
    formula = of("*", X, 2.0)
    for letter, quantity, volt in (("E", "v", 3.0), ("G", "i", -3000.0)):
        assert solved(engine, formula, letter, quantity) == pytest.approx(volt, rel=1e-6)
    made = Element("G", "G9", (3, 0), "", (("m", 3.0),), 9, 0, formula=formula, quantity="i")
    deck = write_deck(replace(PLAIN, elements=(*PLAIN.elements, made)))
    assert deck.elements["g9"].startswith("b")
    assert "i = ((3.0) * (v(n1) * (2.0)))" in deck.text


@pytest.mark.parametrize(("letter", "quantity"), [("R", "q"), ("B", "r"), ("C", "l")])
def test_what_an_element_cannot_give_is_refused(letter: str, quantity: str) -> None:
    made = Element(letter, f"{letter}9", (3, 0), "", (), 9, 0, formula=X, quantity=quantity)
    with pytest.raises(EngineError, match=repr(quantity)):
        write_deck(replace(PLAIN, elements=(*PLAIN.elements, made)))
