"""Band edges: where |H| first falls 3 dB below mid-band, going outwards.

The response is scanned outwards from the reference, then each crossing is refined on ln|H| with the exact slope
d ln|H|/d ln f of the adjoint solution, to rounding.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.network.angle import Angle, scanned_angle
from tauledger.network.assemble import Network
from tauledger.network.lines import lumped
from tauledger.network.midband import MidBand, frequency_range
from tauledger.network.solve import Complex, Real, Solution, log_slope, on_axis, response, solve
from tauledger.network.spectrum import frequency_grid, pole_frequencies, zero_frequencies

RIPPLES_TOLD = 5
HALF_POWER = 1.0 / np.sqrt(2.0)
POINTS_PER_DECADE = 60
SHALLOW_SLOPE = 0.2
LEVEL_SLOPE = 1e-3
UNCHANGED = 0.01
# Two peaks of a ripple, seen by the scan's points, are the same within this.
SAME_HEIGHT = 1.0 - 1e-3
# Newton's step squares: one this small leaves rounding alone.
LAST_STEP = 1e-8
MOST_STEPS = 100


class Edge(Struct, frozen=True):
    """One side of the band.

    hz: the first −3 dB crossing, None where there is none. slope: d ln|H|/d ln f there (−1 per pole far above it).
    phase_deg: phase there minus phase at mid-band, unwrapped. peaking_db: the highest gain on this side above
    mid-band, at peaking_at_hz (None and 0 dB where the gain never rises). further_hz: later −3 dB crossings.
    settles_at: |H|/|H_mid| where the response levels off at the end of this side, None where it keeps falling.
    minus_1_db_hz, minus_6_db_hz: given where the slope is shallow (|slope| < 0.2), which makes the edge ill-defined.
    """

    hz: float | None
    slope: float | None
    phase_deg: float | None
    peaking_db: float
    peaking_at_hz: float | None
    further_hz: tuple[float, ...]
    settles_at: float | None
    minus_1_db_hz: float | None = None
    minus_6_db_hz: float | None = None

    @property
    def shallow(self) -> bool:
        """Whether the edge is ill-conditioned: a small change moves it far."""
        return self.slope is not None and abs(self.slope) < SHALLOW_SLOPE


class Edges(Struct, frozen=True):
    """Both band edges; one is None where the response does not leave mid-band on that side.

    frequency_hz: (k,) the scan. response: (k,) complex H there. angle: the phase beyond mid-band, continuous; None for
    a constant response.
    """

    f_low: Edge | None
    f_high: Edge | None
    frequency_hz: Real
    response: Complex
    angle: Angle | None = None


class _Side(Struct, frozen=True):
    """The scan going outwards from the reference: frequency and |H|/|H_mid|, each (k,)."""

    frequency_hz: Real
    gain: Real


def find_edges(network: Network, midband: MidBand) -> Edges:
    """Find the first −3 dB crossing on either side of mid-band, refined to rounding.

    midband: its frequency and gain are the reference; see `midband.in_changed` for a changed network.
    Raises NetworkError where the network has no unique solution.
    """
    scan = _scan(network, midband)
    if scan is None:
        return Edges(None, None, np.zeros(0), np.zeros(0, dtype=complex))
    frequency, h, poles, zeros = scan
    above, below = _sides(midband, frequency, np.abs(h))
    angle = scanned_angle(midband, frequency, h) if network.lines else Angle(poles, zeros, midband)
    return Edges(
        f_low=None if midband.reaches_dc else _edge(network, midband, below, angle),
        f_high=_edge(network, midband, above, angle),
        frequency_hz=frequency,
        response=h,
        angle=angle,
    )


def first_crossings(network: Network, midband: MidBand) -> tuple[float | None, float | None]:
    """Give f_L and f_H in Hz alone, those of `find_edges`, without what lies around them.

    Raises NetworkError where the network has no unique solution.
    """
    scan = _scan(network, midband)
    if scan is None:
        return None, None
    above, below = _sides(midband, scan[0], np.abs(scan[1]))

    def first(side: _Side) -> float | None:
        found = [] if _unchanged(side) else _crossings(network, midband, side, HALF_POWER, only_first=True)
        return found[0] if found else None

    return None if midband.reaches_dc else first(below), first(above)


def _scan(network: Network, midband: MidBand) -> tuple[Real, Complex, Complex, Complex] | None:
    """Give frequency and H (k,), and the poles and zeros that lay the scan out; None for a constant response."""
    rational = lumped(network)
    poles = pole_frequencies(rational)
    zeros = zero_frequencies(rational, poles)
    reach = frequency_range(poles, zeros)
    if reach is None:
        return None
    frequency = frequency_grid(*reach, POINTS_PER_DECADE, np.concatenate([poles, zeros]))
    frequency = frequency[frequency >= midband.floor_hz]
    h = response(network, frequency)
    if network.lines:
        from tauledger.network.ripple import with_ripple

        level = HALF_POWER * abs(midband.gain)
        frequency, h = with_ripple(network, frequency, h, from_hz=midband.frequency_hz, level=level)
    return frequency, h, poles, zeros


def _sides(midband: MidBand, frequency: Real, magnitude: Real) -> tuple[_Side, _Side]:
    gain = magnitude / abs(midband.gain)
    f_mid = midband.frequency_hz
    above, below = frequency > f_mid, frequency < f_mid
    start = f_mid if f_mid > 0.0 else frequency[0] / 10.0
    return (
        _Side(np.concatenate([[start], frequency[above]]), np.concatenate([[1.0], gain[above]])),
        _Side(np.concatenate([[start], frequency[below][::-1]]), np.concatenate([[1.0], gain[below][::-1]])),
    )


def _unchanged(side: _Side) -> bool:
    return len(side.gain) < 2 or bool(np.all(np.abs(side.gain - 1.0) <= UNCHANGED))


def _edge(network: Network, midband: MidBand, side: _Side, angle: Angle) -> Edge | None:
    if _unchanged(side):
        return None
    crossings = _crossings(network, midband, side, HALF_POWER)
    hz = crossings[0] if crossings else None
    slope = phase = None
    if hz is not None:
        at = solve(network, on_axis(hz))
        slope = float(log_slope(network, at)[0].real)
        phase = angle.beyond_midband(hz, complex(at.response[0]))
    peaking_db, peaking_at = _peaking(network, midband, side)
    end = solve(network, on_axis(side.frequency_hz[-1:]))
    # a ripple is level at many places, and settles at none
    levels = not network.lines and abs(float(log_slope(network, end)[0].real)) < LEVEL_SLOPE
    edge = Edge(
        hz=hz,
        slope=slope,
        phase_deg=phase,
        peaking_db=peaking_db,
        peaking_at_hz=peaking_at,
        further_hz=tuple(crossings[1:]),
        settles_at=float(side.gain[-1]) if levels else None,
    )
    if not edge.shallow:
        return edge
    one, six = (_crossings(network, midband, side, 10.0 ** (-db / 20.0), only_first=True) for db in (1.0, 6.0))
    return replace(edge, minus_1_db_hz=one[0] if one else None, minus_6_db_hz=six[0] if six else None)


def _crossings(
    network: Network, midband: MidBand, side: _Side, level: float, *, only_first: bool = False
) -> list[float]:
    """Give where |H| crosses level·|H_mid|, outwards, in Hz; the first is a fall, the next a rise, and so on.

    A line's ripple crosses it without end: the first few are given.
    """
    over = side.gain >= level
    most = 1 if only_first else RIPPLES_TOLD if network.lines else None
    changes = np.flatnonzero(over[:-1] != over[1:])[:most]
    return [
        crossing(network, level * abs(midband.gain), float(side.frequency_hz[k]), float(side.frequency_hz[k + 1]))
        for k in changes
    ]


def crossing(network: Network, magnitude: float, a_hz: float, b_hz: float) -> float:
    """Find the frequency in Hz between a_hz and b_hz where |H| = magnitude, by Newton's method inside the bracket.

    |H| must lie on different sides of it at the two ends. Works on ln|H| over ln f, where a slope is a power law.
    """
    ends = np.abs(response(network, np.array([a_hz, b_hz])))
    start, end = np.log(ends / magnitude)

    def miss_at(solution: Solution) -> Miss:
        size = np.abs(solution.response[0])
        return Miss(float(np.log(size / magnitude)), float(log_slope(network, solution)[0].real))

    start_hz = a_hz * (b_hz / a_hz) ** float(start / (start - end))
    return narrowed(network, miss_at, start_hz, (a_hz, b_hz), rises=bool(ends[1] > ends[0]))


class Miss(Struct, frozen=True):
    """How far something is from what it shall be, and its slope over ln f."""

    value: float
    slope: float


def narrowed(
    network: Network, miss_at: Callable[[Solution], Miss], start_hz: float, ends_hz: tuple[float, float], *, rises: bool
) -> float:
    """Find where a miss is 0 between two frequencies in Hz, by Newton's method over ln f inside the bracket.

    miss_at: of the solution at one frequency. rises: whether it is below 0 at the first end and above it at the second.
    Raises NetworkError where the network has no unique solution.
    """
    a, b = (float(np.log(hz)) for hz in ends_hz)
    u = float(np.log(start_hz))
    for _ in range(MOST_STEPS):
        miss = miss_at(solve(network, on_axis(np.exp(u))))
        if (miss.value > 0.0) == rises:
            b = u
        else:
            a = u
        middle = 0.5 * (a + b)
        step = u - miss.value / miss.slope if miss.slope != 0.0 and np.isfinite(miss.slope) else middle
        following = step if min(a, b) <= step <= max(a, b) else middle
        if abs(following - u) <= LAST_STEP:
            return float(np.exp(following))
        u = following
    return float(np.exp(u))


def _first_highest(gain: Real) -> int:
    """Give the place of the highest gain; of peaks that repeat themselves, as a line's do, the first."""
    high = gain >= SAME_HEIGHT * gain.max()
    first = int(np.argmax(high))
    after = np.flatnonzero(~high[first:])
    last = first + int(after[0]) if len(after) else len(gain)
    return first + int(np.argmax(gain[first:last]))


def _peaking(network: Network, midband: MidBand, side: _Side) -> tuple[float, float | None]:
    """Give the highest gain on this side in dB above mid-band and its frequency, refined by the exact slope."""
    top = _first_highest(side.gain)
    if top == 0 or side.gain[top] <= 1.0 + 1e-9:
        return 0.0, None
    if top == len(side.gain) - 1:
        return float(20.0 * np.log10(side.gain[top])), float(side.frequency_hz[top])
    a, b = float(side.frequency_hz[top - 1]), float(side.frequency_hz[top + 1])
    outwards = 1.0 if b > a else -1.0
    for _ in range(3):
        points = np.geomspace(a, b, 34)
        slope = outwards * log_slope(network, solve(network, on_axis(points))).real
        falls = np.flatnonzero((slope[:-1] > 0.0) & (slope[1:] <= 0.0))
        if not len(falls):
            break
        a, b = float(points[falls[0]]), float(points[falls[0] + 1])
    at = float(np.sqrt(a * b))
    gain = abs(complex(response(network, np.array([at]))[0])) / abs(midband.gain)
    return float(20.0 * np.log10(gain)), at
