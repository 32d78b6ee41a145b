"""POLY(n): the polynomial of a controlled source, its gradient, and the same as a formula.

The coefficients come constant first, then degree by degree, within one degree in the order x1, x2, …, x1², x1·x2, …,
x2², …; those left out are 0. Measured: a single coefficient is the constant.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from itertools import combinations_with_replacement, count

from tauledger.circuit import Apply, Current, Element, Formula, Number, Voltage


def controls(element: Element) -> tuple[Formula, ...]:
    """Give the quantities that control a source, as formulas: voltages of node pairs, or currents."""
    if element.references:
        return tuple(Current(name) for name in element.references)
    pairs = element.nodes[2:]
    return tuple(Voltage(plus, minus) for plus, minus in zip(pairs[::2], pairs[1::2], strict=True))


def gradient(coefficients: Sequence[float], at: Sequence[float]) -> tuple[float, ...]:
    """Give the derivative of the polynomial by each control (n,) at their values (n,)."""
    slopes = [0.0] * len(at)
    for coefficient, factors in _terms(coefficients, len(at)):
        for k in set(factors):
            others = list(factors)
            others.remove(k)
            slopes[k] += coefficient * factors.count(k) * math.prod(at[j] for j in others)
    return tuple(slopes)


def as_formula(element: Element) -> Formula:
    """Give the polynomial of an element as a formula of its controls."""
    x = controls(element)
    terms: list[Formula] = []
    for coefficient, factors in _terms(element.polynomial, len(x)):
        term: Formula = Number(coefficient)
        for k in factors:
            term = Apply("*", (term, x[k]))
        terms.append(term)
    total: Formula = terms[0] if terms else Number(0.0)
    for term in terms[1:]:
        total = Apply("+", (total, term))
    return total


def _terms(coefficients: Sequence[float], n: int) -> Iterator[tuple[float, tuple[int, ...]]]:
    """Run through the coefficients that are not 0 with the controls that they multiply, as numbers from 0."""
    monomials = (factors for degree in count() for factors in combinations_with_replacement(range(n), degree))
    for coefficient, factors in zip(coefficients, monomials, strict=False):
        if coefficient != 0.0:
            yield coefficient, factors
