"""The reference of all band edges: the plateau of highest gain, or the maximum of |H| where there is no plateau."""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.errors import InputError, NetworkError
from tauledger.network.aids import MeasuringAids, flattest_hz, measuring_aids
from tauledger.network.assemble import Network
from tauledger.network.lines import lumped
from tauledger.network.solve import Complex, Real, log_slope, on_axis, response, solve
from tauledger.network.spectrum import frequency_grid, pole_frequencies, zero_frequencies

FLAT_SLOPE = 0.10  # d ln|H| / d ln f, 2 dB per decade
LEVEL_SLOPE = 1e-3
PLATEAU_DECADES = 0.5
SAME_GAIN = 10.0 ** (-3.0 / 20.0)
PEAK = 1.01
POINTS_PER_DECADE = 40
UPHILL_POINTS = 200
# A sweep seldom begins and ends where the band does.
AROUND = 10.0
# Maxima of a line repeat themselves; the scan's points are that far off their tops, and so many are looked at.
SAME_TOP = 0.9
SAME_HEIGHT = 1.0 - 1e-3
MOST_TOPS = 10
MARGIN = 1e3
CONSTANT_RANGE_HZ = (1.0, 10.0)
NO_SIGNAL = 1e-14
FAR_BELOW = 0.1
FAR_BELOW_A_RESONANCE = 0.01
# Beyond this only the rounding of ngspice is left to see; f_H itself may lie higher.
HIGHEST_HZ = 1e12


class MidBand(Struct, frozen=True):
    """The reference of all band edges.

    frequency_hz: 0 where the plateau reaches DC. from_hz, to_hz: the plateau's extent, 0 at DC, inf without upper
    limit, both None where there is no plateau. gain: complex H there.
    aids: names of measuring aids (aids.py), which act below floor_hz alone; nothing below that belongs to the
    amplifier. A plateau that reaches down to them reaches DC: from_hz is 0 and frequency_hz is floor_hz.
    maximum: |H| has its maximum there, and no plateau; in a changed network the reference is where that has moved.
    within_hz: the range in which it was looked for first.
    """

    frequency_hz: float
    from_hz: float | None
    to_hz: float | None
    gain: complex
    aids: tuple[str, ...] = ()
    floor_hz: float = 0.0
    maximum: bool = False
    within_hz: tuple[float, float] | None = None

    @property
    def reaches_dc(self) -> bool:
        """Whether the reference is where direct current is, or where it would be without measuring aids."""
        return self.frequency_hz <= self.floor_hz

    @property
    def plateau(self) -> bool:
        """Whether the reference lies on a plateau; else it is the maximum of |H|."""
        return self.from_hz is not None


class _Scan(Struct, frozen=True):
    """|H| and its exact logarithmic slope over frequency: each (k,).

    resonant: a sharp pair makes the highest gain, or a line may make it.
    """

    frequency_hz: Real
    magnitude: Real
    slope: Real
    resonant: bool


class _Plateau(Struct, frozen=True):
    """A run of the scan from point `first` to `last`; frequency_hz is its own reference, gain |H| there."""

    first: int
    last: int
    from_hz: float
    to_hz: float
    frequency_hz: float
    gain: float

    @property
    def decades(self) -> float:
        if self.from_hz == 0.0 or np.isinf(self.to_hz):
            return float("inf")
        return float(np.log10(self.to_hz / self.from_hz))

    def decades_in(self, low_hz: float, high_hz: float) -> float:
        """Give how many decades of it lie in this range, in Hz; 0 where none does."""
        low, high = max(self.from_hz, low_hz), min(self.to_hz, high_hz)
        return float(np.log10(high / low)) if high > low > 0.0 else 0.0


def find_midband(
    network: Network, *, at_hz: float | None = None, within_hz: tuple[float, float] | None = None
) -> MidBand:
    """Find the plateau of highest gain (|slope| ≤ 2 dB/decade over at least half a decade) and its reference.

    at_hz: take this frequency instead; its plateau's extent is given where it lies on one.
    within_hz: what is wanted of the netlist. A plateau of which half a decade lies there goes before all others, then a
    maximum there, then a plateau up to a decade beside it.
    Among plateaus within 3 dB of the highest gain the widest is taken. The reference is 0 where that plateau reaches
    DC, else the stationary point of |H| nearest its middle, so that it does not move to first order (where |H| has none
    but a peak at the plateau's end, the flattest point); without a plateau it is the maximum of |H|, of equal ones the
    lowest.
    A plateau more than 20 dB below the highest gain (40 dB where a resonance makes that) is what leaks past the
    amplifier, no mid-band. Measuring aids are looked past.
    Raises InputError where at_hz is negative or beyond 1 THz, and where no signal passes there or anywhere;
    NetworkError where the network has no unique solution.
    """
    aids = measuring_aids(network)
    if aids is None or (at_hz is not None and 0.0 < at_hz < aids.lowest_hz / MARGIN):
        return _find(network, at_hz, within_hz)
    found = _find(aids.ideal, at_hz, within_hz)
    return _beside(network, aids, found)


def _beside(network: Network, aids: MeasuringAids, found: MidBand) -> MidBand:
    """Give the reference in the network with its aids, found in the one where they are ideal."""
    floor_hz = flattest_hz(network, aids) if found.frequency_hz == 0.0 else aids.lowest_hz / MARGIN
    at_hz = max(found.frequency_hz, floor_hz)
    gain = complex(response(network, np.array([at_hz]))[0])
    return replace(found, frequency_hz=at_hz, gain=gain, aids=aids.names, floor_hz=floor_hz)


def _find(network: Network, at_hz: float | None, within_hz: tuple[float, float] | None) -> MidBand:
    scan = _scan(network)
    plateaus = _plateaus(network, scan)
    if at_hz is not None:
        return replace(_at(network, at_hz, plateaus), within_hz=within_hz)
    inside = None if within_hz is None else _find_within(network, scan, plateaus, *within_hz)
    return replace(inside or _find_anywhere(network, scan, plateaus), within_hz=within_hz)


def _find_within(
    network: Network, scan: _Scan, plateaus: list[_Plateau], low_hz: float, high_hz: float
) -> MidBand | None:
    """Find a plateau in this range, a maximum in it, or a plateau a decade beside it; None where there is neither."""
    around = (low_hz / AROUND, high_hz * AROUND)
    near = _no_leaks(scan, plateaus, *around)
    tops = _tops(network, scan, low_hz, high_hz)
    under = [plateau for plateau in near if any(plateau.from_hz <= top <= plateau.to_hz for top in tops)]
    inside = [plateau for plateau in near if plateau.decades_in(low_hz, high_hz) >= PLATEAU_DECADES] or under
    if inside:
        return _on_plateau(network, scan, inside, around)
    if tops:
        return _at_maximum(network, tops[0])
    beside = [plateau for plateau in near if plateau.decades_in(*around) >= PLATEAU_DECADES]
    return _on_plateau(network, scan, beside, around) if beside else None


def _find_anywhere(network: Network, scan: _Scan, plateaus: list[_Plateau]) -> MidBand:
    everywhere = (0.0, float("inf"))
    near = _no_leaks(scan, plateaus, *everywhere)
    if near:
        return _on_plateau(network, scan, near, everywhere)
    tops = _tops(network, scan, *everywhere)
    if tops:
        return _at_maximum(network, tops[0])
    frequency = float(scan.frequency_hz[int(np.argmax(scan.magnitude))])
    return MidBand(frequency, None, None, complex(response(network, np.array([frequency]))[0]))


def _on_plateau(network: Network, scan: _Scan, plateaus: list[_Plateau], around: tuple[float, float]) -> MidBand:
    """Take the widest of those within 3 dB of the highest; the reference lies in this range where the plateau does."""
    highest = max(plateau.gain for plateau in plateaus)
    near = [plateau for plateau in plateaus if plateau.gain >= highest * SAME_GAIN]
    # two plateaus without end whose gains differ by rounding alone: the lower one is what a reader expects
    best = max(near, key=lambda plateau: (plateau.decades, float(f"{plateau.gain:.6g}"), -plateau.from_hz))
    frequency = 0.0 if best.from_hz == 0.0 and _direct(network) else _reference(network, scan, best.first, best.last)
    if frequency and not around[0] <= frequency <= around[1]:
        points = np.arange(best.first, best.last + 1)
        inside = points[(scan.frequency_hz[points] >= around[0]) & (scan.frequency_hz[points] <= around[1])]
        if len(inside):
            frequency = _reference(network, scan, int(inside[0]), int(inside[-1]))
    return MidBand(frequency, best.from_hz, best.to_hz, complex(response(network, np.array([frequency]))[0]))


def _at_maximum(network: Network, hz: float) -> MidBand:
    return MidBand(hz, None, None, complex(response(network, np.array([hz]))[0]), maximum=True)


def _tops(network: Network, scan: _Scan, low_hz: float, high_hz: float) -> list[float]:
    """Give where |H| is highest in this range, in Hz, of equal maxima the lowest; nothing where that is at its end."""
    inside = np.flatnonzero((scan.frequency_hz >= low_hz) & (scan.frequency_hz <= high_hz))
    if len(inside) < 3:
        return []
    gain = scan.magnitude[inside]
    if gain.argmax() in (0, len(gain) - 1):
        return []
    peaks = 1 + np.flatnonzero(
        (gain[1:-1] >= gain[:-2]) & (gain[1:-1] > gain[2:]) & (gain[1:-1] >= SAME_TOP * gain.max())
    )
    hz = scan.frequency_hz[inside]
    exact = [_bisect(network, float(hz[k - 1]), float(hz[k + 1])) for k in peaks[:MOST_TOPS]]
    heights = np.abs(response(network, np.array(exact)))
    return [exact[int(np.argmax(heights >= SAME_HEIGHT * heights.max()))]]


def in_changed(network: Network, midband: MidBand) -> MidBand:
    """Give the reference in a changed network: at the same frequency, or where the maximum has moved to.

    The plateau's extent is carried over. A maximum is followed uphill to at most twice or half its frequency; one that
    is not found there stays where it was.
    Raises NetworkError where the network has no unique solution.
    """
    hz = midband.frequency_hz
    if midband.maximum:
        uphill = float(log_slope(network, solve(network, on_axis(hz)))[0].real) > 0.0
        away = np.geomspace(hz, 2.0 * hz if uphill else 0.5 * hz, UPHILL_POINTS)
        rises = log_slope(network, solve(network, on_axis(away))).real > 0.0
        turns = np.flatnonzero(rises != uphill)
        if len(turns) and turns[0] > 0:
            beside = sorted((float(away[turns[0] - 1]), float(away[turns[0]])))
            hz = _bisect(network, beside[0], beside[1])
    return replace(midband, frequency_hz=hz, gain=complex(response(network, np.array([hz]))[0]))


def frequency_range(poles: Complex, zeros: Complex) -> tuple[float, float] | None:
    """Give the range in Hz that holds all that the response does, a thousand times wider; None for a constant one.

    poles, zeros: in rad/s.
    """
    p, z = np.abs(poles[np.abs(poles) > 0.0]), np.abs(zeros[np.abs(zeros) > 0.0])
    if not len(p):
        return None
    # a zero may lie far below all poles, and a plateau below it
    lowest, highest = float(min(p.min(), z.min(initial=np.inf))), float(max(p.max(), z.max(initial=0.0)))
    return lowest / (2.0 * np.pi) / MARGIN, highest / (2.0 * np.pi) * MARGIN


def _scan(network: Network) -> _Scan:
    rational = lumped(network)
    poles = pole_frequencies(rational)
    _require_signal(network, poles)
    zeros = zero_frequencies(rational, poles)
    low, high = frequency_range(poles, zeros) or CONSTANT_RANGE_HZ
    frequency = frequency_grid(low, high, POINTS_PER_DECADE, np.concatenate([poles, zeros]))
    solution = solve(network, on_axis(frequency))
    magnitude = np.abs(solution.response)
    resonant = bool(network.lines) or _resonant(poles, frequency[magnitude.argmax()])
    return _Scan(frequency, magnitude, log_slope(network, solution).real, resonant)


def _resonant(poles: Complex, peak_hz: float) -> bool:
    """Whether a pair of poles of Q above 3 makes the highest gain."""
    omega = np.abs(poles)
    sharp = omega > 6.0 * np.abs(poles.real)
    return bool(np.any(sharp & (np.abs(omega / (2.0 * np.pi * peak_hz) - 1.0) < 0.2)))


def _require_signal(network: Network, poles: Complex) -> None:
    """Raise InputError where the output is nothing but rounding at all frequencies."""
    low, high = frequency_range(poles, poles) or CONSTANT_RANGE_HZ
    at = solve(network, on_axis(np.geomspace(low, high, 9)))
    nodes = np.abs(at.x[:, : network.n_nodes]) if network.port.kind == "voltage" else np.abs(at.x * network.output)
    if not np.any(np.abs(at.response) > NO_SIGNAL * np.max(nodes, axis=1, initial=0.0)):
        raise InputError(
            f"no signal reaches {network.port}",
            "drive a source with an AC value, or take the output where its signal arrives",
        )


def _plateaus(network: Network, scan: _Scan) -> list[_Plateau]:
    flat = np.concatenate([[False], np.abs(scan.slope) <= FLAT_SLOPE, [False]])
    starts, stops = np.flatnonzero(~flat[:-1] & flat[1:]), np.flatnonzero(flat[:-1] & ~flat[1:]) - 1
    found = [_plateau(network, scan, int(first), int(last)) for first, last in zip(starts, stops, strict=True)]
    return [plateau for plateau in found if plateau.decades >= PLATEAU_DECADES]


def _no_leaks(scan: _Scan, plateaus: list[_Plateau], low_hz: float, high_hz: float) -> list[_Plateau]:
    """Leave out the plateaus far below the highest gain in this range: what leaks past the amplifier, no mid-band."""
    inside = (scan.frequency_hz >= low_hz) & (scan.frequency_hz <= high_hz)
    highest = float(scan.magnitude.max(where=inside, initial=0.0))
    floor = highest * (FAR_BELOW_A_RESONANCE if scan.resonant else FAR_BELOW)
    return [plateau for plateau in plateaus if plateau.gain >= floor]


def _plateau(network: Network, scan: _Scan, first: int, last: int) -> _Plateau:
    top = len(scan.frequency_hz) - 1
    from_hz = _boundary(scan, first - 1, first) if first > 0 else float(scan.frequency_hz[0])
    to_hz = _boundary(scan, last, last + 1) if last < top else float(scan.frequency_hz[top])
    if first == 0 and abs(scan.slope[0]) < LEVEL_SLOPE:
        from_hz = 0.0
    if last == top and abs(scan.slope[top]) < LEVEL_SLOPE:
        to_hz = float("inf")
    if from_hz == 0.0 and _direct(network):
        return _Plateau(first, last, from_hz, to_hz, 0.0, float(scan.magnitude[first]))
    at = _reference_point(scan, first, last)
    return _Plateau(first, last, from_hz, to_hz, float(scan.frequency_hz[at]), float(scan.magnitude[at]))


def _boundary(scan: _Scan, a: int, b: int) -> float:
    """Interpolate where |slope| = 2 dB/decade between two neighbours, one flat and one not."""
    sa, sb = abs(float(scan.slope[a])), abs(float(scan.slope[b]))
    share = (FLAT_SLOPE - sa) / (sb - sa)
    return float(scan.frequency_hz[a] * (scan.frequency_hz[b] / scan.frequency_hz[a]) ** share)


def _reference_point(scan: _Scan, first: int, last: int) -> int:
    """Give the point before the slope's fall through zero nearest the run's middle, else the flattest one there.

    A fall through zero that lies on a rise of more than 1 % above the flattest point is a peak at the plateau's end,
    and no reference.
    """
    slope, place = scan.slope[first : last + 1], np.log(scan.frequency_hz[first : last + 1])
    middle = 0.5 * (place[0] + place[-1])
    steep = np.concatenate([[np.inf], np.abs(slope), [np.inf]])
    flattest = np.flatnonzero((steep[1:-1] <= steep[:-2]) & (steep[1:-1] <= steep[2:]))
    flat = int(flattest[np.argmin(np.abs(place[flattest] - middle))])
    falls = np.flatnonzero((slope[:-1] > 0.0) & (slope[1:] <= 0.0))
    if len(falls):
        fall = int(falls[np.argmin(np.abs(0.5 * (place[falls] + place[falls + 1]) - middle))])
        if scan.magnitude[first + fall] <= PEAK * scan.magnitude[first + flat]:
            return first + fall
    return first + flat


def _reference(network: Network, scan: _Scan, first: int, last: int) -> float:
    at = _reference_point(scan, first, last)
    if at < last and scan.slope[at] > 0.0 >= scan.slope[at + 1]:
        return _bisect(network, float(scan.frequency_hz[at]), float(scan.frequency_hz[at + 1]))
    return float(scan.frequency_hz[at])


def _bisect(network: Network, low: float, high: float) -> float:
    """Find where the exact slope of |H| falls through zero between two frequencies, a batch of points at a time."""
    while high / low - 1.0 > 1e-14:
        frequency = np.geomspace(low, high, 34)
        falling = log_slope(network, solve(network, on_axis(frequency))).real <= 0.0
        after = max(1, int(np.argmax(falling))) if np.any(falling) else len(frequency) - 1
        if frequency[after - 1] <= low and frequency[after] >= high:
            break
        low, high = float(frequency[after - 1]), float(frequency[after])
    return float(np.sqrt(low * high))


def _direct(network: Network) -> bool:
    """Whether the network can be solved at DC and passes it."""
    try:
        gain = response(network, np.zeros(1))[0]
    except NetworkError:
        return False
    return bool(np.isfinite(gain)) and abs(gain) > 0.0


def _at(network: Network, at_hz: float, plateaus: list[_Plateau]) -> MidBand:
    if not 0.0 <= at_hz <= HIGHEST_HZ:
        raise InputError(f"mid-band cannot be at {at_hz:g} Hz", "give a frequency from 0 Hz to 1 THz, e.g. 10k")
    if at_hz == 0.0 and not _direct(network):
        raise InputError("mid-band cannot be at 0 Hz: nothing passes there", "give a frequency in the band, e.g. 10k")
    gain = complex(response(network, np.array([at_hz]))[0])
    for plateau in plateaus:
        if plateau.from_hz <= at_hz <= plateau.to_hz:
            return MidBand(at_hz, plateau.from_hz, plateau.to_hz, gain)
    return MidBand(at_hz, None, None, gain)
