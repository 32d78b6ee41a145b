"""The poles nearest mid-band are a complex pair: no node has a pole of its own."""

from __future__ import annotations

from tauledger.causes.advice import advice, nearer
from tauledger.causes.cause import Cause
from tauledger.causes.evidence import EdgeEvidence, Evidence, in_hertz, interaction_step, move, outward
from tauledger.hand.poles import pair_frequency_and_q
from tauledger.record import NamedNumber

NEAR = 10.0


def complex_poles_above(evidence: Evidence) -> Cause | None:
    """The lowest poles of the upper network are complex, within ten to one of f_H.

    Effect: two coefficients (or all poles, where those tell nothing) ÷ exact time constants as separate poles.
    """
    return _complex_poles(evidence.upper)


def complex_poles_below(evidence: Evidence) -> Cause | None:
    """The highest poles of the lower network are complex, within ten to one of f_L. Effect as above."""
    return _complex_poles(evidence.lower)


def _complex_poles(edge: EdgeEvidence) -> Cause | None:
    poles, combined = outward(edge), edge.combined
    effect = move(edge, interaction_step(edge), "exact-constants")
    if combined is None or effect is None or edge.hz is None or not poles or not poles[0].imag:
        return None
    f0, q = pair_frequency_and_q(poles[0])
    if max(f0 / edge.hz, edge.hz / f0) > NEAR:
        return None
    before = combined.exact_constants
    instead = "take the poles themselves: more than two of them count"
    if combined.all_poles is not None and nearer(edge, combined.all_poles, before):
        instead += f", and all give {in_hertz(combined.all_poles)}"
    elif before is not None:
        instead = advice(edge, before)
    both = None if combined.two_coefficients_overshoot else combined.two_coefficients
    if both is not None and nearer(edge, both, before):
        coefficients = ("1/(2π·√b2)", "√b2/b1") if edge.edge == "f_high" else ("√a2/2π", "√a2/a1")
        instead = (
            f"take f0 = {coefficients[0]} and Q = {coefficients[1]} instead of one pole per node: {in_hertz(both)}"
        )
    separate = ""
    if combined.exact_constants is not None:
        separate = f", and the time constants taken as separate poles give {in_hertz(combined.exact_constants)}"
    return Cause(
        cause="complex-poles",
        quantity=edge.quantity,
        effect=effect,
        where=f"pair at {in_hertz(f0)}",
        says=f"the poles next to the band are a complex pair, f0 = {in_hertz(f0)}, Q = {q:.2f}: "
        f"no node has a pole of its own{separate}",
        instead=instead,
        numbers=(NamedNumber("f0", f0, "Hz"), NamedNumber("Q", q, "")),
    )
