"""The two band edges are so close that neither sees a flat mid-band."""

from __future__ import annotations

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import EdgeEvidence, Evidence, in_hertz, move
from tauledger.record import NamedNumber


def upper_edge_near_lower(evidence: Evidence) -> Cause | None:
    """The coupling capacitors still act at f_H. Effect: full network ÷ upper network with its zeros."""
    return _near(evidence.upper, evidence.lower, "coupling and bypass capacitors are no shorts yet")


def lower_edge_near_upper(evidence: Evidence) -> Cause | None:
    """The open capacitances already act at f_L. Effect: full network ÷ lower network with its zeros."""
    return _near(evidence.lower, evidence.upper, "load and device capacitances are no opens any more")


def _near(edge: EdgeEvidence, other: EdgeEvidence, why: str) -> Cause | None:
    effect = move(edge, "full", "zeros")
    if effect is None or edge.hz is None or other.hz is None or not other.hz:
        return None
    ratio = max(edge.hz, other.hz) / min(edge.hz, other.hz)
    low, high = sorted((edge.hz, other.hz))
    return Cause(
        cause="edges-interact",
        quantity=edge.quantity,
        effect=effect,
        where=f"f_L {in_hertz(low)}, f_H {in_hertz(high)}",
        says=f"f_L and f_H are only {ratio:.3g} to 1: at {edge.quantity} = {in_hertz(edge.hz)} the {why}, and "
        " the reference lies below the ideal mid-band gain",
        instead="take both edges from the whole network, and the gain at its highest point",
        numbers=(NamedNumber("f_H/f_L", ratio, ""),),
    )
