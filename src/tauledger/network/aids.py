"""Measuring aids: inductors and capacitors so large that they only set the operating point.

A loop is opened for a measurement by an inductor of 1 GH, which carries direct current alone, and a capacitor of 1 GF,
which holds the other end at AC ground. No board has such parts. Their poles lie decades below everything else, and the
amplifier's own response begins above them: there they are an open and a short, and its plateau may reach down to them.

They stay in the network and in all that is exact; only mid-band, band edges and tables look past them.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.circuit import fold
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.merge import joined_nodes, passes, renamed
from tauledger.network.solve import log_slope, on_axis, response, solve
from tauledger.network.spectrum import pole_frequencies, zero_frequencies

# A filter choke has 100 H at most, a capacitor on a board less than a farad (common practice).
HUGE_HENRY = 1e3
HUGE_FARAD = 1.0
# An aid whose pole lies four decades below the lowest other one turns the phase by 1e-3 a decade below that.
UNSEEN = 1e-3
# Where |H| is below this part of its largest, a difference counts against that part: what leaks past is no signal.
SEEN_FROM = 1e-6
# Both networks are compared from this far below the lowest root to this far above the highest.
CHECKED_BEYOND = 10.0
POINTS_PER_DECADE = 4
SCANNED_PER_DECADE = 40
# Roots this far below the amplifier's lowest are those of the aids.
FAR = 1e3
# The frequency that stands for the lowest root of a network that has none.
NO_ROOTS_HZ = 1.0


class MeasuringAids(Struct, frozen=True):
    """The aids by part name, and the network with their inductors open and their capacitors short.

    lowest_hz: the lowest pole or zero of that network, 1 Hz where it has none.
    """

    names: tuple[str, ...]
    ideal: Network
    lowest_hz: float


def measuring_aids(network: Network) -> MeasuringAids | None:
    """Find inductors from 1 kH and capacitors from 1 F on that act at AC as an open and a short entirely; None if none.

    With all of them ideal, H is the same within 1e-3 from a tenth of the lowest pole or zero on; where that fails
    for all together, each is asked alone.
    """
    large = _large(network)
    if not large:
        return None
    together = _unseen(network, large)
    if together is not None:
        return together
    alone = [name for name in large if _unseen(network, [name]) is not None]
    return _unseen(network, alone) if alone else None


def flattest_hz(network: Network, aids: MeasuringAids) -> float:
    """Give the frequency in Hz between the aids' poles and all others where |H| changes least."""
    poles = np.abs(pole_frequencies(network)) / (2.0 * np.pi)
    below = poles[(poles > 0.0) & (poles < aids.lowest_hz / FAR)]
    low = float(below.max()) if len(below) else aids.lowest_hz / FAR**2
    count = 2 + int(SCANNED_PER_DECADE * np.log10(aids.lowest_hz / low))
    frequency = np.geomspace(low, aids.lowest_hz, count)
    return float(frequency[np.argmin(np.abs(log_slope(network, solve(network, on_axis(frequency))).real))])


def _large(network: Network) -> list[str]:
    coupled = {fold(owner) for part in network.parts if part.kind == "mutual inductance" for owner in part.references}
    return [
        part.name
        for part in network.parts
        if (passes(network, part) and part.value >= HUGE_HENRY and fold(part.owner) not in coupled)
        or (part.kind == "capacitance" and part.value >= HUGE_FARAD)
    ]


def _unseen(network: Network, names: list[str]) -> MeasuringAids | None:
    """Give the aids with the ideal network, None where that is another amplifier, or none at all."""
    try:
        ideal = _idealised(network, frozenset(names))
        poles = pole_frequencies(ideal)
        roots = np.abs(np.concatenate([poles, zero_frequencies(ideal, poles)])) / (2.0 * np.pi)
        roots = roots[roots > 0.0]
        low, high = (float(roots.min()), float(roots.max())) if len(roots) else (NO_ROOTS_HZ, NO_ROOTS_HZ)
        decades = np.log10(high / low) + 2.0 * np.log10(CHECKED_BEYOND)
        frequency = np.geomspace(low / CHECKED_BEYOND, high * CHECKED_BEYOND, 2 + int(decades * POINTS_PER_DECADE))
        with_aids, without = response(network, frequency), response(ideal, frequency)
    except NetworkError:
        return None
    size = np.abs(without)
    same = np.abs(with_aids - without) <= UNSEEN * np.maximum(size, SEEN_FROM * size.max())
    return MeasuringAids(tuple(names), ideal, low) if np.all(same) and size.max() > 0.0 else None


def _idealised(network: Network, names: frozenset[str]) -> Network:
    aids = [part for part in network.parts if part.name in names]
    kept = [part for part in network.parts if part.name not in names or part.kind == "capacitance"]
    return renamed(network, kept, joined_nodes(network, [part for part in aids if part.kind == "capacitance"]))
