"""Each capacitance loads the others: poles split or pull each other, and no node keeps the pole it has alone."""

from __future__ import annotations

from tauledger.causes.advice import advice, nearer
from tauledger.causes.cause import Cause
from tauledger.causes.complex_poles import complex_poles_above, complex_poles_below
from tauledger.causes.evidence import EdgeEvidence, Evidence, hertz, in_hertz, move, outward
from tauledger.causes.gain_falls_first import gain_falls_first
from tauledger.hand.combine import Combined
from tauledger.hand.poles import SEPARATED
from tauledger.record import NamedNumber

SPLITTING = 0.5


def interaction_above(evidence: Evidence) -> Cause | None:
    """The capacitances of the upper network act on each other, the poles staying real.

    Effect: two coefficients ÷ exact time constants as separate poles. Not beside complex poles or a gain that falls
    first: those say the same move in sharper words.
    """
    if complex_poles_above(evidence) is not None or gain_falls_first(evidence) is not None:
        return None
    return _interaction(evidence.upper)


def interaction_below(evidence: Evidence) -> Cause | None:
    """The coupling and bypass capacitors act on each other, the poles staying real. Effect as above."""
    if complex_poles_below(evidence) is not None:
        return None
    return _interaction(evidence.lower)


def _interaction(edge: EdgeEvidence) -> Cause | None:
    effect = move(edge, "two-coefficients", "exact-constants")
    poles, combined = outward(edge), edge.combined
    if effect is None or combined is None or combined.sigma is None or combined.hidden or len(poles) < 2:
        return None
    first, second = (f"{'a pair at ' if pole.imag else ''}{in_hertz(hertz(pole))}" for pole in poles[:2])
    splits = combined.sigma < SPLITTING
    how = "load each other and push their poles apart" if splits else "act on each other"
    thing = "capacitances" if edge.edge == "f_high" else "coupling and bypass capacitors"
    becomes = ""
    if combined.exact_constants is not None and combined.two_coefficients is not None:
        becomes = f", {in_hertz(combined.exact_constants)} becomes {in_hertz(combined.two_coefficients)}"
    return Cause(
        cause="interaction",
        quantity=edge.quantity,
        effect=effect,
        where=f"poles at {first} and {second}",
        says=f"the {thing} {how} (σ = {combined.sigma:.2g}): the poles are at {first} and {second}{becomes}",
        instead=_instead(edge, combined),
        numbers=(
            NamedNumber("σ", combined.sigma, ""),
            NamedNumber("first pole", hertz(poles[0]), "Hz"),
            NamedNumber("second pole", hertz(poles[1]), "Hz"),
        ),
    )


def _instead(edge: EdgeEvidence, combined: Combined) -> str:
    before, both = combined.exact_constants, combined.two_coefficients
    if before is None or both is None or not nearer(edge, both, before):
        return advice(edge, before) if before is not None else "take the poles of the whole network"
    poles = outward(edge)
    real = not poles[0].imag and not poles[1].imag
    if real and combined.coefficients.separation > SEPARATED and nearer(edge, combined.sum_of_constants, before):
        both_poles = ("1/b1", "b1/b2") if edge.edge == "f_high" else ("a1", "a2/a1")
        return f"give no capacitor a pole of its own: {both_poles[0]} is the first, {both_poles[1]} the second"
    named = "b1 and b2" if edge.edge == "f_high" else "a1 and a2"
    return f"give no capacitor a pole of its own: {named} together give {in_hertz(both)}"
