"""Frequencies: the grids that ngspice lays out itself, by decades or evenly, and the way to ask it for any list."""

from __future__ import annotations

import math

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

GRID_TOLERANCE = 1e-9
# ngspice reads a number to within its last bit and rounds the number of steps down: at a whole number of decades that
# bit decides. A stop this much higher keeps the count, and moves the frequencies by less than rounding of the sweep.
STOP_MARGIN = 1e-13
# A short list is asked point by point, exact where it was asked.
LONG = 16


class Grid(Struct, frozen=True):
    """One AC run of `count` frequencies from start to stop, `points` per decade; points = 0 spaces them evenly."""

    points: int
    start_hz: float
    stop_hz: float
    count: int


def decades(start_hz: float, stop_hz: float, points: int) -> NDArray[np.float64]:
    """Give the frequencies (n,) in Hz from start to stop, both included, with `points` in each decade.

    The number of steps over the whole range is rounded down, as ngspice's `ac dec` does, so that the engine answers all
    of them in one run; a range that holds no whole number of steps has slightly wider ones.
    """
    steps = max(1, _steps(start_hz, stop_hz * (1.0 + STOP_MARGIN), points))
    return np.geomspace(start_hz, stop_hz, steps + 1)


def plan(frequency_hz: NDArray[np.float64]) -> tuple[Grid, ...]:
    """Give the AC runs that answer these frequencies (n,) in their order.

    A geometric list is one run, where a whole number of points per decade lays it out; so is a long list that is evenly
    spaced. Any other is one run each.
    """
    n = len(frequency_hz)
    start, stop = float(frequency_hz[0]), float(frequency_hz[-1])
    if n >= 3 and 0.0 < start < stop:
        higher = stop * (1.0 + STOP_MARGIN)
        points = math.ceil((n - 1) / math.log10(higher / start))
        same_count = all(_steps(start, end, points) == n - 1 for end in (higher, stop * (1.0 + 2.0 * STOP_MARGIN)))
        if same_count and np.max(np.abs(frequency_hz / np.geomspace(start, stop, n) - 1.0)) < GRID_TOLERANCE:
            return (Grid(points, start, higher, n),)
        even = np.linspace(start, stop, n)
        if n >= LONG and np.max(np.abs(frequency_hz / even - 1.0)) < GRID_TOLERANCE:
            return (Grid(0, start, stop, n),)
    return singly(frequency_hz)


def singly(frequency_hz: NDArray[np.float64]) -> tuple[Grid, ...]:
    """Give one run for each frequency (n,)."""
    return tuple(Grid(0, f, f, 1) for f in frequency_hz.tolist())


def _steps(start_hz: float, stop_hz: float, points: int) -> int:
    return math.floor(abs(math.log10(stop_hz / start_hz)) * points)
