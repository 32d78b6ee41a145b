"""The gain falls before Miller's multiplied capacitance can act: at that node's pole it is no longer multiplied."""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.causes.advice import advice, nearer
from tauledger.causes.cause import Cause
from tauledger.causes.evidence import (
    EdgeEvidence,
    Evidence,
    hertz,
    in_hertz,
    in_words,
    interaction_step,
    move,
    outward,
    rows_that_count,
)
from tauledger.circuit import GROUND
from tauledger.hand.combine import Combined
from tauledger.hand.estimate import InnerLine, MillerTerm, SignalNode
from tauledger.network.assemble import Network
from tauledger.network.solve import admittance
from tauledger.record import NamedNumber

# a part of a row's time constant below this is not what makes its pole
FAIR_PART = 0.2


class _Fallen(Struct, frozen=True):
    """A Miller term whose factor |1 − K| at the pole that it makes by hand is less than half of that at mid-band.

    part_of_row: R·C·factor of the term over the row's time constant.
    """

    row: SignalNode
    term: MillerTerm
    hand_hz: float
    factor: float
    part_of_row: float


def gain_falls_first(evidence: Evidence) -> Cause | None:
    """At a node's pole by hand its Miller factor has already halved, and the second pole is twice as high or more.

    Effect: two coefficients (or all poles, where those tell nothing) ÷ lowest node alone.
    """
    poles = outward(evidence.upper)
    effect = move(evidence.upper, interaction_step(evidence.upper), "lowest")
    if effect is None or len(poles) < 2:
        return None
    fallen = [found for row in rows_that_count(evidence.nodes) for found in _fallen(evidence, row)]
    fallen = [found for found in fallen if found.hand_hz < 0.5 * hertz(poles[1])]
    fallen = [found for found in fallen if found.part_of_row >= FAIR_PART]
    worst = max(fallen, key=lambda found: found.part_of_row * found.row.time_constant_s, default=None)
    combined = evidence.upper.combined
    if worst is None or combined is None:
        return None
    part = in_words(evidence.bands.network.part(worst.term.part))
    return Cause(
        cause="gain-falls-first",
        quantity="f_H",
        effect=effect,
        where=worst.row.title,
        says=f"{part} counts {_times(worst.term.factor)} times at {worst.row.title}, a pole at "
        f"{in_hertz(worst.hand_hz)} by hand; there the gain has fallen and it counts only "
        f"{_times(worst.factor, 2)} times: the second pole is at {in_hertz(hertz(poles[1]))}",
        instead=_instead(evidence.upper, combined),
        numbers=(
            NamedNumber("Miller factor at mid-band", worst.term.factor, ""),
            NamedNumber("Miller factor at the pole by hand", worst.factor, ""),
            NamedNumber("pole by hand", worst.hand_hz, "Hz"),
            NamedNumber("second pole", hertz(poles[1]), "Hz"),
        ),
    )


def _times(factor: float, digits: int = 3) -> str:
    return f"{factor:.{digits}g}" if factor < 10**digits else f"{factor:,.0f}"


def _instead(edge: EdgeEvidence, combined: Combined) -> str:
    """Advise both poles from b1 and b2, where they are real and lead nearer to f_H than the lowest node alone."""
    hz = combined.all_poles if combined.two_coefficients_overshoot else combined.two_coefficients
    if hz is None or combined.lowest is None or not nearer(edge, hz, combined.lowest):
        return "take no node by a pole of its own" if combined.lowest is None else advice(edge, combined.lowest)
    first, second = outward(edge)[:2]
    both = "both poles from b1 and b2 (1/b1 and b1/b2)"
    if first.imag or second.imag:
        both = "the poles together" if combined.two_coefficients_overshoot else "b1 and b2 together"
    return f"take {both}, not one pole per node: {in_hertz(hz)} instead of {in_hertz(combined.lowest)}"


def _fallen(evidence: Evidence, row: SignalNode) -> list[_Fallen]:
    found = []
    omega = 1.0 / row.time_constant_s
    for line in row.lines:
        for term in line.capacitances:
            if term.factor < 2.0:
                continue
            gain = _gain(evidence, line, term, omega)
            if gain is not None and abs(1.0 - gain) < 0.5 * term.factor:
                part = line.resistance.ohm * term.farad * term.factor / row.time_constant_s
                found.append(_Fallen(row, term, hertz(omega), abs(1.0 - gain), part))
    return found


def _gain(evidence: Evidence, line: InnerLine, term: MillerTerm, omega: float) -> complex | None:
    """Give K = Z_ji/Z_ii at jω, driven from the line's node to the capacitance's other end; None where grounded."""
    upper, merged = evidence.bands.upper, evidence.bands.merged
    here = line.at
    ends = {merged.get(node, node) for node in evidence.bands.network.part(term.part).nodes}
    other = ends - {here, GROUND}
    if here not in ends or len(other) != 1:
        return None
    return driven_gain(upper, here, other.pop(), omega, evidence.images.get(here))


def driven_gain(network: Network, here: str, other: str, omega: float, opposite: str | None = None) -> complex:
    """Give K = v(other)/v(here) at jω with a current into `here`, and out of its image in the other half if any."""
    i, j = network.index(here), network.index(other)
    injected = np.zeros(network.size)
    injected[i] = 1.0
    if opposite is not None:
        injected[network.index(opposite)] = -1.0
    v = np.linalg.solve(admittance(network, np.array([1j * omega]))[0], injected)
    return complex(v[j] / v[i])
