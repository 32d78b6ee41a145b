"""Lower band edge: worked examples with coupling and bypass capacitors, walked without netlist and engine."""

from __future__ import annotations

import math

import pytest

import boards
from tauledger.pipeline import review_network
from tauledger.record import PartRow, Review


def part(review: Review, name: str) -> PartRow:
    return next(row for row in review.parts if row.name == name)


def exact_hz(review: Review) -> float:
    assert review.f_low is not None
    assert review.f_low.exact_hz is not None
    return review.f_low.exact_hz


def test_bypass_zero_makes_the_short_circuit_sum_too_high_kumar_and_jain_10_20() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.20(a): three time constants, f_L 504.72 Hz by their sum.

    With the zero of the source bypass, 1/(2 pi R_S2 C_3) = 200 Hz, the -3 dB edge is sqrt(p^2 - 2 z^2) = 413 Hz
    (root of squares, Sedra and Smith 8e, sec. 10.3.2).
    """
    review = review_network(boards.follower_then_common_source_low_edge())
    for name, seconds in {"C1": 0.0502, "C2": 0.150, "C3": 0.000318}.items():
        assert part(review, name).time_constant_s == pytest.approx(seconds, rel=1e-6, abs=0), name
    assert review.budget.lower is not None
    assert review.budget.lower.sum_hz == pytest.approx(504.72, rel=1e-5, abs=0)
    assert review.budget.lower.pole_sum_hz == pytest.approx(504.72, rel=1e-5, abs=0)
    assert part(review, "C3").zero_hz == pytest.approx(1 / (2 * math.pi * 150 * 5.3e-6), rel=1e-6, abs=0)
    assert exact_hz(review) == pytest.approx(413, rel=2e-3, abs=0)
    assert any(cause.quantity == "f_L" and cause.effect < -0.1 for cause in review.causes)


def test_two_equal_constants_interact_kumar_and_jain_10_15() -> None:
    """Kumar and Jain, Ex. 10.15: C_B and C_E designed for 25 Hz each, f_L 50 Hz, zero of C_E 0.26 Hz."""
    review = review_network(boards.two_equal_low_edges())
    assert part(review, "CB").edge_hz == pytest.approx(25, rel=1e-3, abs=0)
    assert part(review, "CE").edge_hz == pytest.approx(25, rel=1e-3, abs=0)
    assert part(review, "CE").zero_hz == pytest.approx(0.26, rel=1e-2, abs=0)
    assert exact_hz(review) == pytest.approx(50, rel=5e-3, abs=0)


def test_three_comparable_edges_need_more_than_the_highest() -> None:
    """Scilab textbook companion, book 2882, Ex. 9.6 and 9.8: 1376, 419.6 and 230.7 Hz for input, bypass and output.

    The printed bypass edge neglects R_E in parallel, 0.7 %.
    """
    review = review_network(boards.three_low_edges())
    for name, hz, precision in (("C1", 1376.0, 1e-3), ("C2", 419.6, 1e-2), ("C3", 230.7, 1e-3)):
        assert part(review, name).edge_hz == pytest.approx(hz, rel=precision, abs=0), name
    assert review.budget.lower is not None
    assert review.budget.lower.sum_hz is not None
    assert 1376.0 < exact_hz(review) < review.budget.lower.sum_hz
