"""No pole dominates: the sum of time constants is then no band edge."""

from __future__ import annotations

from tauledger.causes.advice import advice
from tauledger.causes.cause import Cause
from tauledger.causes.evidence import EdgeEvidence, Evidence, hertz, in_hertz, nearest_zero, outward
from tauledger.record import NamedNumber

# b1²/b2 = r + 2 + 1/r of two real poles of ratio r; 10 apart the sum of time constants is 8 % off (closed form).
DOMINANT = 10.0 + 2.0 + 0.1
ZERO_FAR = 5.0
THIRD_COUNTS = 30.0
DOMINATES = 8.0


def no_dominant_pole_above(evidence: Evidence) -> Cause | None:
    """Real poles closer than ten to one make the open-circuit sum too low. Effect: sum of them ÷ all poles."""
    return _no_dominant_pole(evidence.upper)


def no_dominant_pole_below(evidence: Evidence) -> Cause | None:
    """Real poles closer than ten to one make the short-circuit sum too high. Effect: sum of them ÷ all poles."""
    return _no_dominant_pole(evidence.lower)


def _no_dominant_pole(edge: EdgeEvidence) -> Cause | None:
    poles, zero, combined = outward(edge), nearest_zero(edge), edge.combined
    if combined is None or edge.hz is None or combined.sum_of_constants is None or combined.all_poles is None:
        return None
    if len(poles) < 2:
        return None
    if poles[0].imag or poles[1].imag or combined.coefficients.separation >= DOMINANT:
        return None
    if zero is not None and _ratio(hertz(zero), edge.hz) < ZERO_FAR:
        return None
    effect = combined.sum_of_constants / combined.all_poles - 1.0
    first, second = hertz(poles[0]), hertz(poles[1])
    kind = "open-circuit" if edge.edge == "f_high" else "short-circuit"
    third = 1.0 if len(poles) < 3 else _ratio(first, hertz(poles[2]))
    if len(poles) > 2 and third < THIRD_COUNTS:
        apart = f"{in_hertz(first)}, {in_hertz(second)} and {in_hertz(hertz(poles[2]))} add up"
    else:
        apart = f"{in_hertz(first)} and {in_hertz(second)} are {_ratio(first, second):.2g} to 1"
    lead = "no pole dominates" if _ratio(first, second) < DOMINATES else "the poles beyond the first count too"
    off = f"{abs(100 * effect):.2g} % {'low' if effect < 0 else 'high'}"
    return Cause(
        cause="no-dominant-pole",
        quantity=edge.quantity,
        effect=effect,
        where=f"poles at {in_hertz(first)} and {in_hertz(second)}",
        says=f"{lead}: {apart}, so the {kind} sum, {in_hertz(combined.sum_of_constants)}, comes out {off} against "
        f"all poles together, {in_hertz(combined.all_poles)}",
        instead=advice(edge, combined.sum_of_constants),
        numbers=(
            NamedNumber("first pole", first, "Hz"),
            NamedNumber("second pole", second, "Hz"),
            NamedNumber("sum of time constants", combined.sum_of_constants, "Hz"),
        ),
    )


def _ratio(a: float, b: float) -> float:
    return max(a, b) / min(a, b)
