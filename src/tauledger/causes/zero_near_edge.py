"""A zero near the band edge: no sum of time constants and no product of poles knows of it."""

from __future__ import annotations

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import EdgeEvidence, Evidence, hertz, in_hertz, move, nearest_zero
from tauledger.hand.lower import nearest_zero_owner
from tauledger.record import NamedNumber

SQUARES_GOOD_WITHIN = 0.05


def zero_near_upper_edge(evidence: Evidence) -> Cause | None:
    """A zero of the upper network moves f_H. Effect: poles and zeros ÷ all poles."""
    effect, zero = move(evidence.upper, "zeros", "all-poles"), nearest_zero(evidence.upper)
    if effect is None or zero is None:
        return None
    at = in_hertz(hertz(zero))
    side = "right" if zero.real > 0 else "left"
    turns = ", and adds lag instead of taking it back" if zero.real > 0 else ""
    return Cause(
        cause="zero-near-edge",
        quantity="f_H",
        effect=effect,
        where=f"zero at {at}",
        says=f"a zero at {at} in the {side} half plane keeps |H| from falling{turns}; "
        f"no time constant shows it{_moved(evidence.upper)}",
        instead=_squares(evidence.upper, "1/√(Σ1/p² − 2·Σ1/z²)"),
        numbers=(NamedNumber("zero", hertz(zero), "Hz"),),
    )


def zero_near_lower_edge(evidence: Evidence) -> Cause | None:
    """A zero above DC, as a bypass capacitor beside a resistor has it, moves f_L. Effect: zeros ÷ all zeros at DC."""
    edge = evidence.lower
    effect, zero = move(edge, "zeros", "all-poles"), nearest_zero(edge)
    if effect is None or zero is None or edge.combined is None:
        return None
    at = in_hertz(hertz(zero))
    owner = nearest_zero_owner(evidence.bands, evidence.capacitors, edge.combined)
    total = edge.combined.sum_of_constants
    high = ""
    if total is not None and edge.hz is not None and total > edge.hz:
        high = f": it makes the short-circuit sum, {in_hertz(total)}, too high"
    return Cause(
        cause="zero-near-edge",
        quantity="f_L",
        effect=effect,
        where=f"zero at {at}" if owner is None else f"{owner.title}, zero at {at}",
        says=f"{'a capacitor' if owner is None else owner.title} has its zero at {at}, not at DC{high}{_moved(edge)}",
        instead=_squares(edge, "√(Σp² − 2·Σz²)"),
        numbers=(NamedNumber("zero", hertz(zero), "Hz"),),
    )


def _moved(edge: EdgeEvidence) -> str:
    """Say both ends of the move that the effect is: the edge of the poles alone, and that with the zeros."""
    combined = edge.combined
    if combined is None or combined.all_poles is None or combined.with_zeros is None:
        return ""
    return f"; the poles alone give {in_hertz(combined.all_poles)}, with the zeros {in_hertz(combined.with_zeros)}"


def _squares(edge: EdgeEvidence, formula: str) -> str:
    squares = None if edge.combined is None else edge.combined.root_sum_of_squares
    if squares is not None and edge.hz is not None and abs(squares / edge.hz - 1.0) <= SQUARES_GOOD_WITHIN:
        return f"keep the zero: {formula} gives {in_hertz(squares)}"
    return "keep the zero and find the -3 dB frequency from poles and zeros together"
