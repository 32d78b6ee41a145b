"""Margins of loops whose T is a formula: crossover, phase margin, gain margin, edge."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.network.loop_shape import (
    edge_above,
    loop_grid,
    loop_shape,
    margins_near,
    opposes,
    single_frequency,
    turn_near,
)
from tauledger.network.solve import Complex, Real

GRID = np.geomspace(1.0, 1e8, 161)


@settings(max_examples=25, derandomize=True, deadline=None)
@given(t0=st.floats(1.5, 1e4), poles=st.integers(1, 4))
def test_equal_poles_cross_over_where_the_formula_says(t0: float, poles: int) -> None:
    """|T0/(1 + jx)ⁿ| = 1 at x = √(T0^(2/n) − 1), where the phase is −n·arctan x; −180° at x = tan(180°/n)."""
    f_pole = 1e4

    def ratio_at(hz: Real) -> Complex:
        return np.asarray(t0 / (1.0 + 1j * hz / f_pole) ** poles, dtype=complex)

    shape = loop_shape(ratio_at, GRID, 0.0)
    x = math.sqrt(t0 ** (2.0 / poles) - 1.0)
    assert shape.crossover is not None
    assert shape.crossover.hz == pytest.approx(f_pole * x, rel=1e-7)
    margin = 180.0 - poles * math.degrees(math.atan(x))
    assert shape.crossover.phase_margin_deg == pytest.approx(margin, abs=1e-4)
    assert shape.f_high_hz == pytest.approx(f_pole * math.sqrt(2.0 ** (1.0 / poles) - 1.0), rel=1e-7)
    if poles < 3:
        assert shape.gain_margin is None
    else:
        at = math.tan(math.pi / poles)
        assert shape.gain_margin is not None
        assert shape.gain_margin.hz == pytest.approx(f_pole * at, rel=1e-6)
        size = t0 / (1.0 + at * at) ** (poles / 2.0)
        assert shape.gain_margin.gain_db == pytest.approx(20.0 * math.log10(size), abs=1e-4)


def test_a_loop_that_works_in_a_band_crosses_over_twice() -> None:
    def ratio_at(hz: Real) -> Complex:
        return np.asarray(100.0 / ((1.0 + 1e3 / (1j * hz)) * (1.0 + 1j * hz / 1e5)), dtype=complex)

    shape = loop_shape(ratio_at, GRID, 1e4)
    assert shape.lower_crossover is not None
    assert shape.crossover is not None
    assert shape.lower_crossover.hz == pytest.approx(1e3 / math.sqrt(100.0**2 - 1.0), rel=1e-3)
    assert shape.crossover.hz == pytest.approx(1e5 * math.sqrt(100.0**2 - 1.0), rel=1e-3)
    assert shape.lower_crossover.phase_margin_deg == pytest.approx(90.0, abs=1.0)


def test_a_loop_below_one_has_no_crossover() -> None:
    shape = loop_shape(lambda hz: np.asarray(0.5 / (1.0 + 1j * hz / 1e4), dtype=complex), GRID, 0.0)
    assert shape.crossings == ()
    assert shape.crossover is None


def test_a_few_samples_around_the_place_give_the_same_margins() -> None:
    def ratio_at(hz: Real) -> Complex:
        return np.asarray(50.0 / (1.0 + 1j * hz / 1e4) ** 3, dtype=complex)

    shape = loop_shape(ratio_at, GRID, 0.0)
    around = np.array([0.97, 0.985, 1.0, 1.015, 1.03])
    assert shape.crossover is not None
    assert shape.gain_margin is not None
    hz = 1.004 * shape.crossover.hz * around
    near = margins_near(ratio_at(hz), hz, shape.crossover)
    assert near is not None
    assert near.hz == pytest.approx(shape.crossover.hz, rel=1e-8)
    assert near.phase_margin_deg == pytest.approx(shape.crossover.phase_margin_deg, abs=1e-5)
    hz = 0.996 * shape.gain_margin.hz * around
    turn = turn_near(ratio_at(hz), hz)
    assert turn is not None
    assert turn.hz == pytest.approx(shape.gain_margin.hz, rel=1e-6)
    assert turn.gain_db == pytest.approx(shape.gain_margin.gain_db, abs=1e-4)
    assert margins_near(ratio_at(1e3 * hz), 1e3 * hz, shape.crossover) is None
    assert turn_near(ratio_at(1e-3 * hz), 1e-3 * hz) is None


def test_the_grid_holds_all_that_the_poles_do() -> None:
    grid = loop_grid(np.array([-1e3 + 0j]), np.array([-1e9 + 0j]))
    assert grid[0] < 1e3 / (2.0 * math.pi) / 100.0
    assert grid[-1] > 1e9 / (2.0 * math.pi) * 100.0


def test_an_edge_that_is_not_there_is_none() -> None:
    assert edge_above(lambda hz: np.ones_like(hz), GRID, 0.0, 1.0) is None


def test_a_loop_that_comes_back_above_one_is_as_far_from_minus_one_as_its_phase_says() -> None:
    """Low-pass plus a resonance beyond it: |T| = 1 three times, and arg T runs through −180° where |T| is small."""

    def ratio_at(hz: Real) -> Complex:
        low = 20.0 / (1.0 + 1j * hz / 1e3)
        ring = (-2e-3 * (hz / 1e5) ** 2) / (1.0 - (hz / 1e6) ** 2 + 0.05j * hz / 1e6)
        return np.asarray(low + ring, dtype=complex)

    shape = loop_shape(ratio_at, np.geomspace(1.0, 1e8, 641), 0.0)
    first, rises, last = shape.above
    assert [first.falling, rises.falling, last.falling] == [True, False, True]
    for one in shape.above:
        t = complex(ratio_at(np.array([one.hz]))[0])
        assert abs(one.phase_margin_deg) == pytest.approx(180.0 - abs(math.degrees(np.angle(t))), abs=1e-3)
        assert -180.0 < one.phase_margin_deg <= 180.0
    assert first.phase_margin_deg == pytest.approx(90.0 + math.degrees(math.asin(1.0 / 20.0)), abs=2.0)
    assert shape.crossover == min((first, last), key=lambda one: one.phase_margin_deg)


@pytest.mark.parametrize(
    ("ratio", "negative"),
    [(10.0, True), (-0.28 - 74.0j, True), (-1.78 - 953.7j, True), (-0.49, False), (-5.0, False), (0.5j - 0.4, False)],
)
def test_the_sign_of_feedback_is_that_of_its_phase_not_of_its_real_part(ratio: complex, negative: bool) -> None:
    assert opposes(ratio) is negative


def test_an_edge_times_one_plus_t_needs_a_t_that_is_flat_below() -> None:
    def falling(hz: Real) -> Complex:
        return np.asarray(1e4 / (1.0 + 1j * hz / 10.0), dtype=complex)

    def rising(hz: Real) -> Complex:
        return np.asarray(10.0 * (1.0 + 1j * hz / 1e2) / ((1.0 + 1j * hz / 1e4) * (1.0 + 1j * hz / 1e5)), dtype=complex)

    assert loop_shape(falling, GRID, 0.0).flat
    assert not loop_shape(falling, GRID, 1e3).flat
    assert not loop_shape(rising, GRID, 0.0).flat


def test_what_stands_for_dc_lies_below_all_that_moves_t() -> None:
    def integrator_like(hz: Real) -> Complex:
        return np.asarray(10.0 * (1.0 + 1j * hz / 1e-3) / (1.0 + 1j * hz / 1e5), dtype=complex)

    hz = single_frequency(integrator_like, 10.0, 1.0)
    assert hz is not None
    assert abs(integrator_like(np.array([hz]))[0] / 10.0 - 1.0) < 1e-4
    assert single_frequency(lambda hz: np.asarray(1.0 / (1j * hz), dtype=np.complex128), 10.0, 1.0) is None
