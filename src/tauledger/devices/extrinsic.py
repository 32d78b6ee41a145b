"""Series resistances of an instance that was measured alone: what stands between its terminals and its first inner
nodes.

The engine tells the voltage of the node behind each of them. Where the current into the terminal is g·(v − v_behind)
at every frequency, whatever is driven, there is a resistance and nothing beside it; the instance is then what lies
behind, with that node as its terminal: I = Y·V, and so Y = I·V⁻¹ with V the voltages behind. Area, m and temperature
are in g, self-heating too. A capacitance that hangs at the terminal itself, or a resistance that depends on the
voltages, fails the test, and all stays inside.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.solution import Samples

# An inner node that never leaves its terminal by more than this, V/V, is the terminal.
TOGETHER = 1e-12
# Current that is not g·(v − v_behind), relative to the largest into this terminal; and what rounding of v makes of it.
ALIKE = 1e-9
ROUNDING = 1e-14


class Extrinsic(Struct, frozen=True):
    """What was brought out: conductance in S by place of the terminal, and the samples of what lies behind."""

    siemens: Mapping[int, float]
    behind: Samples


def series_outside(samples: Samples, suffixes: Mapping[int, Sequence[str]]) -> Extrinsic:
    """Bring out the series resistances of an instance.

    suffixes: by place of the terminal the engine's names of the node behind its resistance; the first that exists
    counts.
    """
    siemens: dict[int, float] = {}
    taken: dict[int, int] = {}
    for place, names in suffixes.items():
        row = next((samples.inner.index(name) for name in names if name in samples.inner), None)
        g = None if row is None else _conductance(samples, place, row)
        if row is not None and g is not None:
            siemens[place], taken[place] = g, row
    if not siemens:
        return Extrinsic({}, samples)
    n = len(samples.terminals)
    voltages = np.broadcast_to(np.eye(n, dtype=complex), samples.admittance.shape).copy()
    for place, row in taken.items():
        voltages[:, place, :] = samples.inner_gain[:, row, :]
    back = np.linalg.inv(voltages)
    left = [row for row in range(len(samples.inner)) if row not in taken.values()]
    behind = replace(
        samples,
        admittance=samples.admittance @ back,
        inner=tuple(samples.inner[row] for row in left),
        inner_gain=samples.inner_gain[:, left, :] @ back,
    )
    return Extrinsic(siemens, behind)


def _conductance(samples: Samples, place: int, row: int) -> float | None:
    """Give g in S where the terminal's current is g·(v − v_behind) and nothing else, or None."""
    current: NDArray[np.complex128] = samples.admittance[:, place, :]
    across = np.eye(len(samples.terminals))[place] - samples.inner_gain[:, row, :]
    if np.abs(across).max() < TOGETHER:
        return None
    g = float(np.vdot(across, current).real / np.vdot(across, across).real)
    beside = np.abs(current - g * across).max(axis=1)
    alike = beside <= ALIKE * np.abs(current).max(axis=1) + ROUNDING * abs(g)
    return g if g > 0.0 and bool(alike.all()) else None
