"""How much of the phase every pole and zero uses between mid-band and a frequency: exact, and adding up.

With H = H_0·Π(1 − s/z)/Π(1 − s/p) the phase beyond mid-band is the sum of what the axis point turns through as seen
from every zero, less that from every pole. Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.network.angle import turned_deg
from tauledger.network.identities import Identity
from tauledger.network.poles import Pole, PoleZeroMap, Zero

# The roots are found to some 1e-9; a hundred of them, at 57° per radian, stay far below this.
ADDS_UP_DEG = 1e-3


class PhaseUse(Struct, frozen=True):
    """One pole or zero (of a complex pair the one above the axis, standing for both) and what it uses, in degrees.

    A pole of the left half plane uses phase, a zero there gives it back: negative.
    """

    root: Pole | Zero
    degrees: float

    @property
    def paired(self) -> bool:
        """Whether it stands for a complex pair."""
        return self.root.paired


class PhaseUsed(Struct, frozen=True):
    """What poles and zeros use between mid-band and a frequency, in degrees; rest: what delays do beside them."""

    poles: tuple[PhaseUse, ...]
    zeros: tuple[PhaseUse, ...]
    rest: float


def phase_used(found: PoleZeroMap, *, midband_hz: float, hz: float, used_deg: float) -> PhaseUsed:
    """Give what every pole and zero uses of the phase at hz; used_deg is all of it, minus the phase beyond mid-band."""
    poles = tuple(PhaseUse(pole, _turn(pole, midband_hz, hz)) for pole in found.poles)
    zeros = tuple(PhaseUse(zero, -_turn(zero, midband_hz, hz)) for zero in found.zeros)
    return PhaseUsed(poles, zeros, used_deg - sum(one.degrees for one in (*poles, *zeros)))


def phase_identities(used: PhaseUsed, used_deg: float, *, rational: bool) -> tuple[Identity, ...]:
    """The degrees of all poles and zeros add to the phase used; rational: they are all there is, and no delay."""
    if not rational:
        return ()
    total = sum(one.degrees for one in (*used.poles, *used.zeros))
    scale = max(1.0, *(abs(one.degrees) for one in (*used.poles, *used.zeros)))
    return (Identity("degrees of poles and zeros add to the phase used", total, used_deg, ADDS_UP_DEG / scale, scale),)


def _turn(root: Pole | Zero, start_hz: float, stop_hz: float) -> float:
    """Give the degrees through which the axis point turns between two frequencies, as seen from a root or its pair."""
    roots = np.array([root.s, root.s.conjugate()] if root.paired else [root.s])
    return float(np.sum(turned_deg(roots, start_hz, np.array([stop_hz]))))
