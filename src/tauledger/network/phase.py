"""How much of the phase every pole and zero uses between mid-band and a frequency: exact, and adding up.

With H = H_0·Π(1 − s/z)/Π(1 − s/p) the phase beyond mid-band is the sum of what the axis point turns through as seen
from every zero, less that from every pole. Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct

from tauledger.network.angle import turned_deg
from tauledger.network.identities import Identity
from tauledger.network.poles import Pole, PoleZeroMap, Zero

# The roots are found to some 1e-9; a hundred of them, at 57° per radian, stay far below this.
ADDS_UP_DEG = 1e-3
# A delay turns next to nothing at mid-band.
AT_MIDBAND_DEG = 0.5


class PhaseUse(Struct, frozen=True):
    """One pole or zero (of a complex pair the one above the axis, standing for both) and what it uses, in degrees.

    A pole of the left half plane uses phase, a zero there gives it back: negative. start_hz: from where it is counted.
    """

    root: Pole | Zero
    degrees: float
    start_hz: float = 0.0

    @property
    def paired(self) -> bool:
        """Whether it stands for a complex pair."""
        return self.root.paired


class PhaseUsed(Struct, frozen=True):
    """What poles and zeros use of the phase at a frequency, in degrees; rest: what delays do beside them.

    before: what is used at mid-band already, where poles and zeros are counted from there.
    """

    poles: tuple[PhaseUse, ...]
    zeros: tuple[PhaseUse, ...]
    rest: float
    before: float = 0.0


def phase_used(
    found: PoleZeroMap, *, midband_hz: float, hz: float, used_deg: float, offset_deg: float | None = None
) -> PhaseUsed:
    """Give what every pole and zero uses of the phase at hz; used_deg is all of it, from nominal polarity.

    Above mid-band a root is counted from DC, below it from where it has turned to its end: as nominal polarity has
    them. offset_deg: phase at mid-band less nominal polarity, None where used_deg is from mid-band. Where the roots do
    not add up to that (one below mid-band has no counterpart of the other kind) they are counted from mid-band.
    """
    starts = _nominal_starts(found, midband_hz)
    at_midband = sum(_turn(zero, starts[zero.s], midband_hz) for zero in found.zeros) - sum(
        _turn(pole, starts[pole.s], midband_hz) for pole in found.poles
    )
    before = 0.0
    if offset_deg is None or abs(at_midband - offset_deg) > AT_MIDBAND_DEG:
        starts, before = dict.fromkeys(starts, midband_hz), -(offset_deg or 0.0)
    poles = tuple(PhaseUse(pole, _turn(pole, starts[pole.s], hz), starts[pole.s]) for pole in found.poles)
    zeros = tuple(PhaseUse(zero, -_turn(zero, starts[zero.s], hz), starts[zero.s]) for zero in found.zeros)
    return PhaseUsed(poles, zeros, used_deg - before - sum(one.degrees for one in (*poles, *zeros)), before)


def phase_identities(used: PhaseUsed, used_deg: float, *, rational: bool) -> tuple[Identity, ...]:
    """The degrees of all poles and zeros add to the phase used; rational: they are all there is, and no delay."""
    if not rational:
        return ()
    total = used.before + sum(one.degrees for one in (*used.poles, *used.zeros))
    scale = max(1.0, *(abs(one.degrees) for one in (*used.poles, *used.zeros)))
    return (Identity("degrees of poles and zeros add to the phase used", total, used_deg, ADDS_UP_DEG / scale, scale),)


def _nominal_starts(found: PoleZeroMap, midband_hz: float) -> dict[complex, float]:
    """Give for every root, by its place, the frequency from which it is counted: ∞ where it lies below mid-band.

    Of poles and zeros below mid-band the highest that are left over count from DC.
    """
    mid = 2.0 * np.pi * midband_hz
    places = [pole.s for pole in found.poles] + [zero.s for zero in found.zeros]
    starts: dict[complex, float] = dict.fromkeys(places, 0.0)
    below: list[list[Pole | Zero]] = [
        [pole for pole in found.poles if abs(pole.s) < mid],
        [zero for zero in found.zeros if abs(zero.s) < mid],
    ]
    many, few = below if _count(below[0]) >= _count(below[1]) else below[::-1]
    left = _count(many) - _count(few)
    for root in sorted(many, key=lambda one: -abs(one.s)):
        if _count([root]) <= left:
            left -= _count([root])
            many.remove(root)
    for root in (*many, *few):
        starts[root.s] = np.inf
    return starts


def _count(roots: Sequence[Pole | Zero]) -> int:
    return sum(2 if root.paired else 1 for root in roots)


def _turn(root: Pole | Zero, start_hz: float, stop_hz: float) -> float:
    """Give the degrees through which the axis point turns between two frequencies, as seen from a root or its pair."""
    roots = np.array([root.s, root.s.conjugate()] if root.paired else [root.s])
    return float(np.sum(turned_deg(roots, start_hz, np.array([stop_hz]))))
