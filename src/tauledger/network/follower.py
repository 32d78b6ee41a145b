"""The amplifier closed around itself as a follower: all of its output fed back at the sign that opposes.

With H = eᵀY⁻¹b and the sign σ of its nominal polarity, the follower H/(1 + σ·k·H) has the poles of Y + σ·k·b·eᵀ, so
that its stability is decided exactly, whatever the margins say.

Source: Sherman and Morrison, "Adjustment of an inverse matrix corresponding to a change in one element of a given
matrix", Ann. Math. Stat. 21(1), 1950; Bode, "Network Analysis and Feedback Amplifier Design", 1945.
"""

from __future__ import annotations

import cmath
import math

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.network.admittance import all_pass
from tauledger.network.assemble import Network, Triplets
from tauledger.network.midband import MidBand
from tauledger.network.spectrum import pole_frequencies

# Farther than this from a multiple of 180° nobody can say which sign the amplifier has.
CLEAR_DEG = 60.0
ROUNDING = 1e-9
JUST_BEYOND_DB = 0.01


class HalfTurn(Struct, frozen=True):
    """A frequency in Hz where the phase from nominal polarity is −180° or a whole turn beyond, and −|H| in dB there."""

    hz: float
    below_db: float


def polarity_offset_deg(gain: complex) -> float | None:
    """Give the phase of a mid-band gain less the nearest multiple of 180°, its nominal polarity; None if not clear."""
    phase = math.degrees(cmath.phase(gain))
    offset = phase - 180.0 * round(phase / 180.0)
    return offset if abs(offset) <= CLEAR_DEG else None


def polarity(gain: complex) -> float:
    """Give the sign of nominal polarity, +1 or −1."""
    return math.copysign(1.0, gain.real)


def is_follower_stable(network: Network, midband: MidBand, *, gain: float = 1.0) -> bool | None:
    """Tell whether no pole of H/(1 + σ·gain·H) lies to the right; None where polarity is not clear, and for lines.

    Delays are all-passes, as for the poles of a review; what lies below the floor is of measuring aids.
    Raises NetworkError where the network is singular at every s.
    """
    if polarity_offset_deg(midband.gain) is None or network.lines:
        return None
    rational = all_pass(network)
    row, column = np.flatnonzero(rational.drive), np.flatnonzero(rational.output)
    back = polarity(midband.gain) * gain * np.outer(rational.drive[row].real, rational.output[column])
    g = rational.conductance
    closed = Triplets(
        np.concatenate([g.row, np.repeat(row, len(column))]),
        np.concatenate([g.column, np.tile(column, len(row))]),
        np.concatenate([g.value, back.ravel()]),
    )
    poles = pole_frequencies(replace(rational, conductance=closed))
    poles = poles[np.abs(poles) > 2.0 * np.pi * midband.floor_hz]
    return bool(np.all(poles.real <= ROUNDING * np.abs(poles)))


def gain_margin(network: Network, midband: MidBand, turns: tuple[HalfTurn, ...]) -> HalfTurn | None:
    """Give the half turn nearest to |H| = 1 beyond which the follower changes between stable and not.

    below_db of what is given is the margin: above 0 where the follower is stable, also where the gain may fall by it
    (conditionally stable), below 0 where it is not.
    Raises NetworkError where the network is singular at every s.
    """
    if len(turns) < 2:
        return turns[0] if turns else None
    stable = is_follower_stable(network, midband)
    if stable is None:
        return turns[0]
    nearest = sorted(turns, key=lambda one: abs(one.below_db))
    if stable:
        return HalfTurn(nearest[0].hz, abs(nearest[0].below_db))
    for one in nearest:
        beyond_db = one.below_db + math.copysign(JUST_BEYOND_DB, one.below_db)
        if is_follower_stable(network, midband, gain=10.0 ** (beyond_db / 20.0)):
            return HalfTurn(one.hz, -abs(one.below_db))
    return HalfTurn(turns[0].hz, -abs(turns[0].below_db))
