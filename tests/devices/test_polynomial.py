"""POLY: order of the coefficients, and a gradient that is the derivative of the value."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cells import near
from tauledger.circuit import Apply, Current, Element, Formula, Number, Voltage
from tauledger.devices.polynomial import as_formula, controls, gradient

few = st.floats(-3.0, 3.0).map(lambda value: round(value, 3))


def source(coefficients: tuple[float, ...], n: int) -> Element:
    nodes = (1, 0, *(node for k in range(n) for node in (k + 2, 0)))
    return Element("E", "E1", nodes, "", (), 0, 0, polynomial=coefficients)


def value(formula: Formula, x: list[float]) -> float:
    match formula:
        case Number(value=number):
            return number
        case Voltage(plus=plus):
            return x[plus - 2]
        case Apply(function="+", arguments=(left, right)):
            return value(left, x) + value(right, x)
        case Apply(function="*", arguments=(left, right)):
            return value(left, x) * value(right, x)
    raise TypeError(formula)


def test_coefficients_come_degree_by_degree() -> None:
    """The engine's own polynomial source gives 964321 and 2660064 for these (ngspice 39, measured)."""
    assert value(as_formula(source((1, 10, 100, 1e3, 1e4, 1e5), 2)), [2.0, 3.0]) == 964321.0
    three = source((0, 0, 0, 0, 1, 10, 100, 1e3, 1e4, 1e5), 3)
    assert value(as_formula(three), [2.0, 3.0, 5.0]) == 2660064.0


def test_one_coefficient_is_the_constant() -> None:
    """The engine's own polynomial source with the one coefficient 7 gives 7 at 2 V, not 14 (measured)."""
    assert value(as_formula(source((7.0,), 1)), [2.0]) == 7.0
    assert gradient((7.0,), [2.0]) == (0.0,)


def test_nothing_is_zero() -> None:
    assert as_formula(source((), 1)) == Number(0.0)


def test_currents_control_where_sources_are_named() -> None:
    element = Element("F", "F1", (1, 0), "", (), 0, 0, references=("V1", "V2"), polynomial=(0.0, 1.0, 2.0))
    assert controls(element) == (Current("V1"), Current("V2"))


@settings(derandomize=True, max_examples=40, deadline=None)
@given(
    st.integers(1, 3).flatmap(lambda n: st.tuples(st.lists(few, max_size=20), st.lists(few, min_size=n, max_size=n)))
)
def test_gradient_is_the_derivative(drawn: tuple[list[float], list[float]]) -> None:
    coefficients, x = drawn
    formula = as_formula(source(tuple(coefficients), len(x)))
    slopes = gradient(coefficients, x)
    step = 1e-5
    size = 1.0 + sum(abs(c) for c in coefficients) * max(1.0, *map(abs, x)) ** 6
    for k, slope in enumerate(slopes):
        ahead, behind = ([*x[:k], x[k] + sign * step, *x[k + 1 :]] for sign in (1.0, -1.0))
        numeric = (value(formula, ahead) - value(formula, behind)) / (2.0 * step)
        assert math.isclose(slope, numeric, rel_tol=1e-6, abs_tol=1e-7 * size)


def test_gradient_of_a_square_and_of_a_product() -> None:
    assert gradient((0.0, 0.0, 3.0), [5.0]) == (30.0,)
    assert gradient((0.0, 0.0, 0.0, 0.0, 7.0), [2.0, 3.0]) == (21.0, 14.0)
    assert gradient((0.0, 1.0, 2.0), [9.0, 9.0]) == pytest.approx((1.0, 2.0))
    assert gradient((0.0, 0.0, 0.0, 1.0), [2.0])[0] == near(12.0)
