"""The scan of a network with lines: evenly spaced in frequency, because what is reflected ripples evenly.

Reflections make |H| ripple with the period 1/(2·Σ√(LC)) or a longer one. An even logarithmic grid loses it above a few
periods; so between its points others are set, a given number per period, outwards until |H| has fallen for good. Where
a ripple comes near the level, its bottom is looked at more closely.
"""

from __future__ import annotations

import numpy as np

from tauledger.network.angle import Angle, scanned_angle
from tauledger.network.assemble import Network
from tauledger.network.lines import delay_of_waves
from tauledger.network.solve import Complex, Real, response

# Between two of them a sine has moved by a quarter of its amplitude at most, so that no dip is stepped over.
PER_PERIOD = 24
# Between two of so many frequencies a period, the phase turns by an eighth of a turn or so.
PER_TURN = 8
# What an even logarithmic sweep has beside it.
SWEPT_PER_DECADE = 40
# Frequencies of the even list around f_H, and of the closer look at one bottom of a ripple, ends counted.
AROUND = 33
CLOSER = 17
# Beyond the frequency where |H| has fallen, so many times as far.
BEYOND = 2.0
# Some 800 periods; beyond, a note says that the ripple is followed no further.
MOST_POINTS = 20_000


def spacing_hz(network: Network) -> float | None:
    """Give the spacing in Hz that follows every ripple; None where no line reflects."""
    delay = delay_of_waves(network)
    return 1.0 / (2.0 * delay * PER_PERIOD) if delay else None


def followed_to_hz(network: Network) -> float | None:
    """Give how far in Hz a ripple is followed at least; None where no line reflects."""
    spacing = spacing_hz(network)
    return None if spacing is None else MOST_POINTS * spacing


def with_ripple(
    network: Network, frequency_hz: Real, h: Complex, *, from_hz: float, level: float
) -> tuple[Real, Complex]:
    """Give the scan (k,) of frequency and H with the evenly spaced frequencies among it.

    frequency_hz: an even logarithmic scan (k,), h: H there. from_hz: where the way outwards begins, to twice the
    frequency at which |H| first falls below `level`, V or A.
    """
    spacing = spacing_hz(network)
    if spacing is None:
        return frequency_hz, h
    steps = np.diff(frequency_hz)
    wide = np.flatnonzero(steps > spacing)
    if not len(wide):
        return frequency_hz, h
    low, top = float(frequency_hz[wide[0]]), float(frequency_hz[-1])
    pieces: list[tuple[Real, Complex]] = []
    done, stop = 0, top
    at, size = low, max(low, PER_PERIOD * spacing)
    while at < stop and done < MOST_POINTS:
        count = min(int(np.ceil(min(size, stop - at) / spacing)), MOST_POINTS - done)
        more: Real = at + spacing * np.arange(1.0, count + 1.0)
        there = response(network, more)
        pieces.append((more, there))
        fallen = more[(np.abs(there) < level) & (more > from_hz)]
        if len(fallen):
            stop = min(stop, BEYOND * float(fallen[0]))
        done, at, size = done + count, float(more[-1]), 2.0 * size
    followed = [np.concatenate(both) for both in zip(*pieces, strict=True)]
    closer = _closer(network, followed[0], followed[1], level)
    return _merged((frequency_hz, h), (followed[0], followed[1]), closer)


def ripple_grids(network: Network, f_high_hz: float | None, stop_hz: float) -> tuple[Real, ...]:
    """Lay out what a sweep of 40 frequencies a decade misses of a ripple: evenly up to f_H, and closely around it.

    f_high_hz: the exact one, None where there is none; then the ripple is followed up to stop_hz. Each lot is evenly
    spaced, in Hz; none without lines that reflect.
    """
    spacing = spacing_hz(network)
    if spacing is None:
        return ()
    low = spacing * SWEPT_PER_DECADE / np.log(10.0)
    around: tuple[Real, ...] = ()
    if f_high_hz is not None:
        stop_hz = min(stop_hz, f_high_hz + 2.0 * spacing)
        if f_high_hz > low:
            around = (np.linspace(f_high_hz - spacing, f_high_hz + spacing, AROUND),)
    count = min(int((stop_hz - low) / spacing) + 1, MOST_POINTS)
    return around if count < AROUND else (np.linspace(low, low + (count - 1) * spacing, count), *around)


def followed(network: Network, angle: Angle, to_hz: float, most: int) -> tuple[Angle, float]:
    """Give the phase followed to to_hz, and how far in Hz it is followed with `most` frequencies.

    angle: of the edges' scan, which follows it as far as |H| does.
    """
    spacing = spacing_hz(network)
    if spacing is None:
        return angle, to_hz
    spacing *= PER_PERIOD / PER_TURN
    to_hz = max(to_hz, angle.midband.frequency_hz)
    low = spacing * SWEPT_PER_DECADE / np.log(10.0)
    count = int((to_hz - low) / spacing) + 2
    if count < 2:
        return angle, to_hz
    frequency: Real = low + spacing * np.arange(min(count, most))
    nearer = angle.scan_hz < low
    below = (angle.scan_hz[nearer], response(network, angle.scan_hz[nearer]))
    scan = _merged(below, (frequency, response(network, frequency)))
    return scanned_angle(angle.midband, *scan), to_hz if count <= most else float(frequency[-1])


def _closer(network: Network, frequency_hz: Real, h: Complex, level: float) -> tuple[Real, Complex]:
    """Give more points around every lowest point of the ripple that lies above the level, up to twice it."""
    size = np.abs(h)
    lowest = np.flatnonzero((size[1:-1] < size[:-2]) & (size[1:-1] <= size[2:])) + 1
    near = lowest[(size[lowest] >= level) & (size[lowest] < 2.0 * level)]
    inner = np.linspace(frequency_hz[near - 1], frequency_hz[near + 1], CLOSER)[1:-1].ravel()
    return inner, response(network, inner)


def _merged(*scans: tuple[Real, Complex]) -> tuple[Real, Complex]:
    """Give scans as one, in ascending order and each frequency once."""
    frequency = np.concatenate([scan[0] for scan in scans])
    h = np.concatenate([scan[1] for scan in scans])
    order = np.argsort(frequency, kind="stable")
    frequency, h = frequency[order], h[order]
    new = np.concatenate([[True], frequency[1:] > frequency[:-1]])
    return frequency[new], h[new]
