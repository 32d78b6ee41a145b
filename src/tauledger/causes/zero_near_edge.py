"""A zero near the band edge: no sum of time constants and no product of poles knows of it."""

from __future__ import annotations

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import EdgeEvidence, Evidence, hertz, in_hertz, move, nearest_zero
from tauledger.hand.estimate import LowerRow
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
        says=f"a zero at {at} in the {side} half plane keeps |H| from falling{turns}; no time constant shows it",
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
    owner = _owner(evidence.capacitors, hertz(zero))
    total = edge.combined.sum_of_constants
    high = "" if total is None else f": the bypass zero makes the short-circuit sum, {in_hertz(total)}, too high"
    return Cause(
        cause="zero-near-edge",
        quantity="f_L",
        effect=effect,
        where=f"zero at {at}" if owner is None else f"{owner.title}, zero at {at}",
        says=f"{'a bypass capacitor' if owner is None else owner.title} has its zero at {at}, not at DC{high}",
        instead=_squares(edge, "√(Σp² − 2·Σz²)"),
        numbers=(NamedNumber("zero", hertz(zero), "Hz"),),
    )


def _squares(edge: EdgeEvidence, formula: str) -> str:
    squares = None if edge.combined is None else edge.combined.root_sum_of_squares
    if squares is not None and edge.hz is not None and abs(squares / edge.hz - 1.0) <= SQUARES_GOOD_WITHIN:
        return f"keep the zero: {formula} gives {in_hertz(squares)}"
    return "keep the zero and find the -3 dB frequency from poles and zeros together"


def _owner(capacitors: tuple[LowerRow, ...], zero_hz: float) -> LowerRow | None:
    near = [row for row in capacitors if row.in_path and row.zero_hz > 0 and abs(row.zero_hz / zero_hz - 1.0) < 0.2]
    return min(near, key=lambda row: abs(row.zero_hz - zero_hz), default=None)
