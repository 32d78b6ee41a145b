"""What the sweep alone says: mid-band and band edges of ngspice, refined by further runs.

Where the rebuilt network agrees with the engine, the sweep takes the network's mid-band frequency as its reference,
so that exact and simulated edges mean the same thing; where it does not, the sweep finds its own.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.network.edges import HALF_POWER
from tauledger.network.midband import FLAT_SLOPE, PLATEAU_DECADES, MidBand
from tauledger.solution import Sweep

REFINING_POINTS = 33
REFINING_ROUNDS = 2

RunSweep = Callable[[NDArray[np.float64]], Sweep]


class Simulated(Struct, frozen=True):
    """ngspice's answer: the sweep, its mid-band, and the first −3 dB crossings going outwards in Hz (None: none).

    ripple: evenly spaced frequencies beside the sweep where lines make |H| ripple; None without lines.
    """

    sweep: Sweep
    midband: MidBand
    f_low_hz: float | None
    f_high_hz: float | None
    ripple: Sweep | None = None

    @property
    def all_of_it(self) -> Sweep:
        """Sweep and ripple as one, in ascending order."""
        if self.ripple is None:
            return self.sweep
        frequency = np.concatenate([self.sweep.frequency_hz, self.ripple.frequency_hz])
        order = np.argsort(frequency, kind="stable")
        return Sweep(frequency[order], np.concatenate([self.sweep.response, self.ripple.response])[order])


def simulate(
    run: RunSweep,
    frequency_hz: NDArray[np.float64],
    *,
    midband: MidBand | None,
    ripple_hz: tuple[NDArray[np.float64], ...] = (),
) -> Simulated:
    """Sweep over these frequencies (n,) in Hz and refine both band edges.

    run: asks the engine for the response at any frequencies. midband: reference frequency and extent of the network,
    None to find the plateau in the sweep itself. A crossing is bracketed in the sweep and narrowed by two finer runs,
    then interpolated on ln|H| over ln f: to better than 1e-7.
    ripple_hz: evenly spaced frequencies (k,) in Hz, each lot a run of its own, that follow what the sweep would miss.
    """
    sweep = run(frequency_hz)
    ripple = _together([run(more) for more in ripple_hz])
    if midband is None:
        midband = sweep_midband(sweep)
    else:
        # ngspice has no AC at 0 Hz; far below the lowest edge the plateau has been reached.
        at_hz = midband.frequency_hz or float(frequency_hz[0])
        midband = replace(midband, gain=complex(run(np.array([at_hz])).response[0]))
    level = abs(midband.gain) * HALF_POWER
    found = Simulated(sweep, midband, None, None, ripple)
    followed = found.all_of_it
    above = followed.frequency_hz > midband.frequency_hz
    below = (followed.frequency_hz < midband.frequency_hz) & (followed.frequency_hz >= midband.floor_hz)
    start = midband.frequency_hz or float(frequency_hz[0])
    return replace(
        found,
        f_low_hz=_edge(run, start, followed.frequency_hz[below][::-1], np.abs(followed.response[below][::-1]), level),
        f_high_hz=_edge(run, start, followed.frequency_hz[above], np.abs(followed.response[above]), level),
    )


def _together(sweeps: list[Sweep]) -> Sweep | None:
    if not sweeps:
        return None
    return Sweep(
        np.concatenate([sweep.frequency_hz for sweep in sweeps]), np.concatenate([sweep.response for sweep in sweeps])
    )


def sweep_midband(sweep: Sweep) -> MidBand:
    """Find the plateau of highest gain in a sweep: |slope| ≤ 2 dB/decade over at least half a decade.

    The reference is the point of smallest slope on it; without a plateau the maximum of |H|. A plateau that begins with
    the sweep is taken to reach DC.
    """
    magnitude = np.abs(sweep.response)
    slope = np.gradient(np.log(magnitude), np.log(sweep.frequency_hz))
    flat = np.abs(slope) <= FLAT_SLOPE
    ends = np.flatnonzero(np.diff(np.concatenate([[0], flat.astype(np.int8), [0]])))
    runs = [
        (first, last - 1)
        for first, last in zip(ends[::2].tolist(), ends[1::2].tolist(), strict=True)
        if np.log10(sweep.frequency_hz[last - 1] / sweep.frequency_hz[first]) >= PLATEAU_DECADES
    ]
    if not runs:
        peak = int(np.argmax(magnitude))
        return MidBand(float(sweep.frequency_hz[peak]), None, None, complex(sweep.response[peak]))
    first, last = max(runs, key=lambda ends: float(magnitude[ends[0] : ends[1] + 1].max()))
    at = first + int(np.argmin(np.abs(slope[first : last + 1])))
    return MidBand(
        float(sweep.frequency_hz[at]),
        0.0 if first == 0 else float(sweep.frequency_hz[first]),
        np.inf if last == len(magnitude) - 1 else float(sweep.frequency_hz[last]),
        complex(sweep.response[at]),
    )


def _edge(
    run: RunSweep, start_hz: float, outward_hz: NDArray[np.float64], magnitude: NDArray[np.float64], level: float
) -> float | None:
    falls = np.flatnonzero(magnitude < level)
    if not len(falls):
        return None
    k = int(falls[0])
    inside, outside = (float(outward_hz[k - 1]) if k else start_hz), float(outward_hz[k])
    for _ in range(REFINING_ROUNDS):
        grid = np.geomspace(inside, outside, REFINING_POINTS)
        gain = np.abs(run(np.sort(grid)).response)
        gain = gain if outside > inside else gain[::-1]
        first = max(1, int(np.argmax(gain < level)) if np.any(gain < level) else REFINING_POINTS - 1)
        inside, outside = float(grid[first - 1]), float(grid[first])
        edge = (np.log(level / gain[first - 1])) / np.log(gain[first] / gain[first - 1])
    return float(inside * (outside / inside) ** edge)
