"""Miller's factor over frequency for the capacitances between two nodes that take most of the sum of time constants."""

from __future__ import annotations

import math

import numpy as np

from tauledger.answers.answer import Subject
from tauledger.hand.at_edge import factors_over
from tauledger.network.solve import Real
from tauledger.numbers import Numbers
from tauledger.record import MillerCurve, MillerCurves

MOST_CURVES = 12
WORTH_A_CURVE = 0.01
MOST_POINTS = 60
BEYOND_EDGE = 30.0
BELOW_EDGE = 1e3


def miller_curves(subject: Subject) -> MillerCurves | None:
    """Give 1 − K from mid-band to thirty times f_H, at most 60 points of the sweep and 12 capacitances.

    Below mid-band there is none: coupling capacitors are shorts in the network of the budget. None where there is no
    budget, no f_H, or no such capacitance with 1 % of the sum of time constants.
    Raises NetworkError where the upper network has no unique solution.
    """
    numbers, hand = subject.numbers, subject.explanation.hand
    frequency = _grid(numbers)
    if hand is None or len(frequency) < 2:
        return None
    counted = [node for node in hand.nodes if node.in_path and not node.second]
    least = WORTH_A_CURVE * math.fsum(abs(node.time_constant_s) for node in counted)
    factors = factors_over(numbers.bands, hand.nodes, frequency)
    rows = [
        (abs(line.resistance.ohm * term.farad * term.factor), node.name, line, term)
        for node in counted
        for line in node.lines
        for term in line.capacitances
        if (line.at, term.part) in factors
    ]
    rows = sorted((row for row in rows if row[0] >= least), key=lambda row: -row[0])[:MOST_CURVES]
    if not rows:
        return None
    curves = []
    for _, name, line, term in rows:
        factor = factors[line.at, term.part]
        curves.append(
            MillerCurve(
                name, line.node, term.part, term.factor, tuple(factor.real.tolist()), tuple(factor.imag.tolist())
            )
        )
    return MillerCurves(tuple(frequency.tolist()), tuple(curves))


def _grid(numbers: Numbers) -> Real:
    """Give frequencies of the sweep, evenly thinned, from mid-band to thirty times f_H."""
    edge = numbers.edges.f_high
    if edge is None or edge.hz is None:
        return np.zeros(0)
    sweep = numbers.simulated.sweep.frequency_hz if numbers.simulated is not None else numbers.edges.frequency_hz
    first = numbers.midband.frequency_hz or edge.hz / BELOW_EDGE
    kept = sweep[(sweep >= first) & (sweep <= BEYOND_EDGE * edge.hz)]
    at = np.unique(np.linspace(0, max(len(kept) - 1, 0), min(len(kept), MOST_POINTS)).astype(int))
    return np.asarray(kept[at], dtype=np.float64)
