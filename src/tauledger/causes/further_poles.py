"""More than two poles count: what b1 and b2 make of the network is not its band edge."""

from __future__ import annotations

from tauledger.causes.advice import nearer
from tauledger.causes.cause import Cause
from tauledger.causes.complex_poles import complex_poles_above, complex_poles_below
from tauledger.causes.evidence import EdgeEvidence, Evidence, hertz, in_hertz, interaction_step, move, outward
from tauledger.causes.gain_falls_first import gain_falls_first
from tauledger.record import NamedNumber

TOLD = 4
NEAR = 30.0


def further_poles_above(evidence: Evidence) -> Cause | None:
    """A third pole of the upper network is near. Effect: all poles ÷ two coefficients.

    Where the two coefficients lead away from the edge and no sharper cause says the move: all poles ÷ exact time
    constants as separate poles.
    """
    said = complex_poles_above(evidence) is not None or gain_falls_first(evidence) is not None
    return _further_poles(evidence.upper, said=said)


def further_poles_below(evidence: Evidence) -> Cause | None:
    """A third pole of the lower network is near. Effect as above."""
    return _further_poles(evidence.lower, said=complex_poles_below(evidence) is not None)


def _further_poles(edge: EdgeEvidence, *, said: bool) -> Cause | None:
    poles, combined = outward(edge), edge.combined
    from_two = interaction_step(edge) == "two-coefficients"
    effect = move(edge, "all-poles", "two-coefficients" if from_two else "exact-constants")
    if effect is None or combined is None or combined.all_poles is None or (said and not from_two):
        return None
    before = combined.two_coefficients if from_two else combined.exact_constants
    count = sum(2 if pole.imag else 1 for pole in poles)
    if before is None or count < 3:
        return None
    where = [_placed(pole) for pole in poles if 1.0 / NEAR < hertz(pole) / combined.all_poles < NEAR][:TOLD]
    if len(where) < 2:
        where = [_placed(pole) for pole in poles[:2]]
    both = "b1 and b2" if edge.edge == "f_high" else "a1 and a2"
    paper = both if from_two else "the time constants as separate poles"
    return Cause(
        cause="further-poles",
        quantity=edge.quantity,
        effect=effect,
        where=f"poles at {', '.join(where)}",
        says=f"more than two poles count: {', '.join(where[:-1])} and {where[-1]}; {paper} give {in_hertz(before)}, "
        f"all poles {in_hertz(combined.all_poles)}",
        instead=_instead(edge, combined.all_poles, before),
        numbers=(NamedNumber("before", before, "Hz"), NamedNumber("all poles", combined.all_poles, "Hz")),
    )


def _instead(edge: EdgeEvidence, all_hz: float, before: float) -> str:
    if nearer(edge, all_hz, before):
        return "take the poles of the whole network: no formula of two coefficients holds a third one"
    return "take poles and zeros of the whole network: with the poles alone it leads further off"


def _placed(pole: complex) -> str:
    return f"{'the pair at ' if pole.imag else ''}{in_hertz(hertz(pole))}"
