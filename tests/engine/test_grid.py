"""A decade grid is one run of the engine; any other list is asked point by point, and answered exactly there."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from circuits import board
from tauledger.devices.catalogue import observations
from tauledger.engine import grid as grid_module
from tauledger.engine.client import Engine
from tauledger.engine.grid import Grid, decades, plan


@settings(derandomize=True, max_examples=60, deadline=None)
@given(st.floats(1e-3, 1e6), st.floats(0.5, 14.0), st.integers(3, 60))
def test_a_decade_grid_holds_both_ends_and_is_one_run(start: float, span: float, points: int) -> None:
    grid = decades(start, start * 10.0**span, points)
    assert np.isclose(grid[0], start, rtol=1e-12)
    assert np.isclose(grid[-1], start * 10.0**span, rtol=1e-9)
    if len(grid) >= 3:
        assert [run.count for run in plan(grid)] == [len(grid)]


def test_whole_decades_hold_the_points_asked_for() -> None:
    assert len(decades(10.0, 1e8, 20)) == 141
    assert np.allclose(decades(10.0, 1e8, 20)[::20], 10.0 ** np.arange(1, 9), rtol=1e-12)


def test_a_list_that_is_no_grid_is_one_run_each() -> None:
    assert [(run.points, run.start_hz) for run in plan(np.array([10.0, 20.0, 30.0]))] == [
        (0, 10.0),
        (0, 20.0),
        (0, 30.0),
    ]


@settings(derandomize=True, max_examples=12, deadline=None)
@given(st.floats(1e-2, 1e4), st.floats(0.5, 9.0), st.integers(3, 40))
def test_the_engine_lays_out_the_grid_that_was_planned(engine: Engine, start: float, span: float, points: int) -> None:
    circuit = board("V1 in 0 0", "R1 in out 1k", "C1 out 0 1n", drive={"V1": 1.0})
    engine.bias(circuit, observations(circuit))
    grid = decades(start, start * 10.0**span, points)
    assert np.allclose(engine.sweep(grid).frequency_hz, grid, rtol=1e-11)


@settings(derandomize=True, max_examples=60, deadline=None)
@given(st.floats(1e-2, 1e5), st.integers(1, 8), st.integers(3, 40))
def test_whole_decades_from_an_odd_start_keep_their_count(engine: Engine, start: float, span: int, points: int) -> None:
    """ngspice rounds the number of steps down; one bit of the start decides at a whole number of decades."""
    circuit = board("V1 in 0 0", "R1 in out 1k", "C1 out 0 1n", drive={"V1": 1.0})
    engine.bias(circuit, observations(circuit))
    grid = decades(start, start * 10.0**span, points)
    assert len(grid) == span * points + 1
    assert np.allclose(engine._run(plan(grid)).frequency_hz, grid, rtol=1e-11)


def test_a_grid_that_the_engine_lays_out_otherwise_is_asked_point_by_point(
    engine: Engine, monkeypatch: pytest.MonkeyPatch
) -> None:
    circuit = board("V1 in 0 0", "R1 in out 1k", "C1 out 0 1n", drive={"V1": 1.0})
    engine.bias(circuit, observations(circuit))
    monkeypatch.setattr(grid_module, "plan", lambda f: (Grid(7, float(f[0]), float(f[-1]), len(f)),))
    asked = decades(1.0, 1e3, 20)
    assert np.allclose(engine.sweep(asked).frequency_hz, asked, rtol=1e-15)


def test_single_frequencies_are_exact_and_keep_their_order(engine: Engine) -> None:
    """The answer is the single pole 1/(1 + j2πfRC), at the frequency asked and no other."""
    circuit = board("V1 in 0 0", "R1 in out 1k", "C1 out 0 1n", drive={"V1": 1.0})
    engine.bias(circuit, observations(circuit))
    asked = np.array([159154.943091895, 3.0, 1e9, 159154.943091896, np.pi])
    sweep = engine.sweep(asked)
    assert np.allclose(sweep.frequency_hz, asked, rtol=2e-16, atol=0.0)
    assert np.allclose(sweep.response, 1.0 / (1.0 + 2j * np.pi * asked * 1e-6), rtol=1e-14)


@settings(derandomize=True, max_examples=12, deadline=None)
@given(st.floats(1.0, 1e6), st.floats(1.5, 1e4), st.integers(16, 3000))
def test_a_long_list_that_is_evenly_spaced_is_one_run(engine: Engine, start: float, ratio: float, count: int) -> None:
    circuit = board("V1 in 0 0", "R1 in out 1k", "C1 out 0 1n", drive={"V1": 1.0})
    engine.bias(circuit, observations(circuit))
    even = np.linspace(start, ratio * start, count)
    assert len(plan(even)) == 1
    assert np.allclose(engine.sweep(even).frequency_hz, even, rtol=1e-12)
