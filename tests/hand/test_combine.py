"""Ways to combine time constants, coefficients and roots into one band edge."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from by_algebra import plain_capacitor, plain_node
from tauledger.hand.combine import (
    coefficients,
    combine_lower,
    combine_upper,
    first_fall,
    root_sum_of_squares_edge,
    two_pole_edge,
    visible_roots,
)

NONE = np.empty(0, dtype=complex)

decades = st.floats(-3.0, 3.0).map(lambda exponent: 10.0**exponent)


def poles_at(*values: complex) -> np.ndarray:
    return np.array(values, dtype=complex)


# Closed form, two real poles without zeros, ratio → error in per cent of 1/b1 and of the root of the sum of squares:
# ω² = [2·b2 − b1² + √((b1² − 2·b2)² + 4·b2²)] / (2·b2²), evaluated by hand.
@pytest.mark.parametrize(
    ("ratio", "sum_error", "squares_error"),
    [
        (1, -22.31, 9.87),
        (1.5, -21.65, 8.65),
        (2, -20.41, 6.79),
        (3, -17.72, 4.07),
        (4, -15.40, 2.60),
        (6, -12.00, 1.27),
        (10, -8.20, 0.48),
        (20, -4.52, 0.12),
        (100, -0.98, 0.00),
    ],
)
def test_sum_of_time_constants_is_low_by_what_the_ratio_of_two_poles_says(
    ratio: float, sum_error: float, squares_error: float
) -> None:
    poles = poles_at(-1, -ratio)
    pair = coefficients(poles)
    edge = two_pole_edge(pair.b1, pair.b2)
    assert edge is not None
    squares = root_sum_of_squares_edge(poles, NONE)
    assert squares is not None
    assert 100 * (1 / pair.b1 / edge - 1) == pytest.approx(sum_error, abs=0.006)
    assert 100 * (squares / edge - 1) == pytest.approx(squares_error, abs=0.006)


# 1/b1 = Q·ω0 and ω_3dB = ω0·√(a + √(a² + 1)) with a = 1 − 1/(2Q²): Carusone, Johns and Martin, 2nd ed. (2012), sec. 4.
@pytest.mark.parametrize(
    ("q", "error"),
    [(0.3, -8.91), (0.42, -16.8), (0.5, -22.31), (0.7071, -29.29), (1, -21.38), (1.4142136, 0.0), (2, 34.72)],
)
def test_sum_of_time_constants_turns_optimistic_above_q_of_root_two(q: float, error: float) -> None:
    edge = two_pole_edge(1 / q, 1.0)
    assert edge is not None
    assert 100 * (q / edge - 1) == pytest.approx(error, abs=0.01)


# n identical poles: f_n = f_1·√(2^(1/n) − 1), 0.64 for two (Gray, Hurst, Lewis and Meyer, 5th ed., eq. 7.128).
@pytest.mark.parametrize(("n", "factor"), [(1, 1.0), (2, 0.643594), (3, 0.509825), (4, 0.434979), (6, 0.349946)])
def test_identical_poles_shrink_the_bandwidth(n: int, factor: float) -> None:
    assert first_fall(poles_at(*[-1.0] * n), NONE) == pytest.approx(factor, rel=2e-6)


@pytest.mark.parametrize(("n", "factor"), [(2, 0.643594), (4, 0.434979)])
def test_identical_low_poles_raise_the_lower_edge_by_the_same_factor(n: int, factor: float) -> None:
    rows = [plain_capacitor(f"C{k}", 20.0) for k in range(n)]
    combined = combine_lower(rows, poles_at(*[-2 * math.pi * 20.0] * n), poles_at(*[0.0] * n))
    assert combined.all_nodes == pytest.approx(20.0 / factor, rel=2e-6)
    assert combined.all_poles == pytest.approx(20.0 / factor, rel=2e-6)
    assert combined.with_zeros == pytest.approx(20.0 / factor, rel=2e-6)
    assert combined.sum_of_constants == pytest.approx(20.0 * n)


@settings(max_examples=60, derandomize=True)
@given(b1=decades, b2=decades)
def test_two_pole_edge_lies_where_the_quadratic_is_root_two(b1: float, b2: float) -> None:
    omega = two_pole_edge(b1, b2)
    assert omega is not None
    assert abs(1 + 1j * omega * b1 - omega**2 * b2) == pytest.approx(math.sqrt(2), rel=1e-9)


def test_two_pole_edge_without_a_second_pole_is_the_inverse_time_constant() -> None:
    assert two_pole_edge(2.0, 0.0) == pytest.approx(0.5)
    assert two_pole_edge(2.0, 1e-30) == pytest.approx(0.5)
    assert two_pole_edge(0.0, 0.0) is None


@settings(max_examples=40, derandomize=True)
@given(p1=decades, p2=decades)
def test_search_and_closed_form_agree_for_two_real_poles(p1: float, p2: float) -> None:
    pair = coefficients(poles_at(-p1, -p2))
    assert first_fall(poles_at(-p1, -p2), NONE) == pytest.approx(two_pole_edge(pair.b1, pair.b2), rel=1e-9)


@settings(max_examples=40, derandomize=True)
@given(q=st.floats(0.51, 30.0))
def test_search_and_closed_form_agree_for_a_peaking_pair(q: float) -> None:
    pair = np.roots([1.0, 1.0 / q, 1.0]).astype(complex)
    assert first_fall(pair, NONE) == pytest.approx(two_pole_edge(1 / q, 1.0), rel=1e-9)


@settings(max_examples=40, derandomize=True)
@given(p=decades, z=decades)
def test_one_pole_and_one_zero_fall_3_db_only_where_the_zero_is_far_enough(p: float, z: float) -> None:
    """|H|² = (1 + ω²/z²)/(1 + ω²/p²) = ½ at ω² = 1/(1/p² − 2/z²); the sign of z does not matter."""
    inverse = 1 / p**2 - 2 / z**2
    if abs(inverse) * p**2 < 1e-3:
        return
    for sign in (-1, 1):
        found = first_fall(poles_at(-p), poles_at(sign * z))
        assert found == (pytest.approx(1 / math.sqrt(inverse), rel=1e-8) if inverse > 0 else None)


def test_a_notch_counts_as_the_first_fall() -> None:
    notch = poles_at(0.1j, -0.1j)
    found = first_fall(poles_at(-1, -1), notch)
    assert found is not None
    assert 0.03 < found < 0.1


def test_a_zero_far_below_the_poles_delays_the_fall_beyond_any_fixed_range() -> None:
    """H = (1 + s)/(1 + s/1e4)² rises to 5e3 and falls below 0.7 only near 1e8·√2: from the asymptote 1e8/ω."""
    assert first_fall(poles_at(-1e4, -1e4), poles_at(-1.0)) == pytest.approx(1e8 * math.sqrt(2), rel=1e-4)


def test_coefficients_are_those_of_the_polynomial() -> None:
    poles = poles_at(-1 + 2j, -1 - 2j, -7, -30)
    polynomial = np.poly(poles).real
    pair = coefficients(poles)
    assert pair.b1 == pytest.approx(polynomial[-2] / polynomial[-1])
    assert pair.b2 == pytest.approx(polynomial[-3] / polynomial[-1])


def test_a_pole_with_a_zero_within_two_per_cent_is_not_seen() -> None:
    roots = visible_roots(poles_at(-1, -10, -100), poles_at(-9.81, -96))
    assert roots.poles.tolist() == [-1, -100]
    assert roots.cancelled.tolist() == [-10]
    assert roots.zeros.tolist() == [-96]


def test_both_members_of_a_cancelled_pair_go() -> None:
    roots = visible_roots(poles_at(-1, -3 + 4j, -3 - 4j), poles_at(-3.01 + 4j, -3.01 - 4j))
    assert roots.poles.tolist() == [-1]
    assert len(roots.cancelled) == 2
    assert len(roots.zeros) == 0


def test_one_zero_cancels_one_pole_only() -> None:
    roots = visible_roots(poles_at(-10, -10.1), poles_at(-10.05))
    assert len(roots.poles) == 1


def test_decoupling_does_not_enter_the_coefficients() -> None:
    """A pole at 3.3 kHz under its zero adds 48 µs to −Σ1/p and nothing to the edge."""
    node = plain_node("out", 1e-7)
    alone = combine_upper([node], poles_at(-1e7), NONE)
    decoupled = combine_upper([node], poles_at(-1e7, -2.08e4), poles_at(-2.0801e4))
    assert decoupled.coefficients == alone.coefficients
    assert decoupled.with_zeros == pytest.approx(alone.with_zeros)


@settings(max_examples=25, derandomize=True)
@given(k=decades, taus=st.lists(decades, min_size=2, max_size=4))
def test_slower_by_a_factor_means_every_estimate_lower_by_it(k: float, taus: list[float]) -> None:
    poles, zeros = poles_at(*[-1 / tau for tau in taus]), poles_at(-30 / min(taus))
    one = combine_upper([plain_node(str(i), tau) for i, tau in enumerate(taus)], poles, zeros)
    nodes = [plain_node(str(i), k * tau) for i, tau in enumerate(taus)]
    slow = combine_upper(nodes, poles_at(*(poles / k)), poles_at(*(zeros / k)))
    for name in ("lowest", "all_nodes", "exact_constants", "two_coefficients", "all_poles", "with_zeros"):
        assert getattr(slow, name) == pytest.approx(getattr(one, name) / k, rel=1e-8), name


@settings(max_examples=25, derandomize=True)
@given(hz=st.lists(decades, min_size=1, max_size=4, unique=True), z=st.floats(0.01, 0.9))
def test_a_lower_edge_is_an_upper_edge_with_frequency_turned_round(hz: list[float], z: float) -> None:
    rows = [plain_capacitor(f"C{i}", f) for i, f in enumerate(hz)]
    omega = [2 * math.pi * f for f in hz]
    zero = z * min(omega)
    low = combine_lower(rows, poles_at(*[-w for w in omega]), poles_at(-zero, *[0.0] * (len(hz) - 1)))
    nodes = [plain_node(str(i), w) for i, w in enumerate(omega)]
    high = combine_upper(nodes, poles_at(*[-1 / w for w in omega]), poles_at(-1 / zero))
    for name in ("lowest", "all_nodes", "two_coefficients", "all_poles", "with_zeros", "sum_of_constants"):
        above, below = getattr(high, name), getattr(low, name)
        if above is None:
            assert below is None
        else:
            assert below == pytest.approx(1 / (above * (2 * math.pi) ** 2), rel=1e-8), name


def test_nodes_that_do_not_see_each_other_have_a_sigma_of_one() -> None:
    taus = (3.0, 2.0, 0.5)
    combined = combine_upper([plain_node(str(t), t) for t in taus], poles_at(*[-1 / t for t in taus]), NONE)
    assert combined.sigma == pytest.approx(1.0)
    assert combined.all_nodes == pytest.approx(combined.all_poles)


def test_a_negative_time_constant_stays_in_the_sum_and_out_of_the_product() -> None:
    """A capacitor across a gain of +2 sees −9 kΩ; its −3.6 ns counts in b1 (derived from R = R_s·(1 − K))."""
    nodes = [plain_node("a", 10e-9), plain_node("b", -3.6e-9)]
    combined = combine_upper(nodes, poles_at(-1 / 10e-9), NONE)
    assert combined.lowest == pytest.approx(1 / (2 * math.pi * 10e-9))
    assert combined.all_nodes == pytest.approx(combined.lowest)
    assert combined.sum_of_constants == pytest.approx(1 / (2 * math.pi * 6.4e-9))


def test_two_coefficients_of_four_equal_poles_explain_nothing() -> None:
    """They put the edge at 0.347, all four poles at 0.435, which is where four separate nodes put it already."""
    nodes = [plain_node(str(k), 1.0) for k in range(4)]
    combined = combine_upper(nodes, poles_at(-1, -1, -1, -1), NONE)
    assert combined.two_coefficients_overshoot
    pair = combine_upper(nodes[:2], poles_at(-1, -1), NONE)
    assert not pair.two_coefficients_overshoot


def test_right_half_plane_pole_is_unstable_even_under_a_zero() -> None:
    assert not combine_upper([plain_node("a", 1.0)], poles_at(-1, 5), NONE).stable
    assert not combine_upper([plain_node("a", 1.0)], poles_at(-1, 5), poles_at(5.01)).stable
    assert combine_upper([plain_node("a", 1.0)], poles_at(-1, -5), poles_at(5.0)).stable


def test_far_gain_is_where_the_response_levels_off() -> None:
    combined = combine_upper([plain_node("a", 1.0)], poles_at(-1), poles_at(-1.1))
    assert combined.with_zeros is None
    assert combined.far_gain == pytest.approx(1 / 1.1)
