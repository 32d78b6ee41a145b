"""From paper to simulation: the estimate after each step with the reason, and the classical methods beside it."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.record import Review
from tauledger.report.layout import HEADING, Block, Prose, Row, Section, Table
from tauledger.report.wording import EDGE, move, number, retitled

_STEP_SHOWN = 0.005
_IN_SHORT = {
    "lowest": "the highest alone",
    "all-nodes": "the others",
    "exact-constants": "exact resistances",
    "two-coefficients": "each loads the others",
    "all-poles": "further poles",
    "zeros": "zeros",
    "full": "the whole network",
    "lines": "the lines",
}
_CLASSICAL = "sum of time constants"


class _Told(Struct, frozen=True):
    """One step as it is printed: its id, frequency, move in per cent, reason."""

    step: str
    hertz: str
    change: str
    why: str


def steps(review: Review, edge: str) -> Section:
    """Give the way from paper to simulation for one edge ("f_high", "f_low"), and the methods beside it."""
    told = _steps(review, edge)
    blocks: list[Block] = []
    if told:
        blocks.append(Prose(f"FROM PAPER TO SIMULATION, {EDGE[edge]}", style=HEADING))
        left, middle = max(len(step.hertz) for step in told), max(len(step.change) for step in told)
        for step in told:
            change = f"{step.change:>{middle}}  " if step.change else ""
            why = f"{step.why}; {methods(review, edge)}" if step is told[-1] else step.why
            blocks.append(Prose(retitled(why, review.parts), lead=f"  {step.hertz:>{left}}  {change}"))
    return Section(tuple(blocks))


def steps_in_line(review: Review, edge: str) -> str:
    """Give the same way as running text, each reason in a few words."""
    told = _steps(review, edge)
    if not told:
        return ""
    between = "".join(f", {step.change} {_IN_SHORT.get(step.step, step.step)}" for step in told[1:-1])
    return f"{told[0].hertz} {_IN_SHORT['lowest']}{between}"


def methods(review: Review, edge: str) -> str:
    """Give the sum of time constants and the recommended method with their error; JSON has all methods."""
    told = sorted(
        (
            estimate
            for estimate in review.estimates
            if estimate.edge == edge
            and estimate.difference is not None
            and (estimate.recommended or estimate.method == _CLASSICAL)
        ),
        key=lambda estimate: estimate.recommended,
    )
    said = [
        f"{'recommended: ' if estimate.recommended else ''}{estimate.method} {move(estimate.difference)}"
        for estimate in told
    ]
    said += [f"no method recommended: {one.why}" for one in review.no_method if one.edge == edge]
    return "; ".join(said)


def methods_table(review: Review, edge: str) -> Section:
    """Give every method's answer for one edge with its error against the simulation, the recommended one marked."""
    told = [estimate for estimate in review.estimates if estimate.edge == edge]
    if not told:
        return Section(())
    rows = tuple(
        Row((one.method, number(one.hz, "Hz"), move(one.difference), "recommended" if one.recommended else ""))
        for one in told
    )
    why = tuple(Prose(f"none recommended: {one.why}", lead="  ") for one in review.no_method if one.edge == edge)
    return Section((Table("lrrl", (f"METHODS, {EDGE[edge]}", "f", "off by", ""), rows), *why))


def _steps(review: Review, edge: str) -> list[_Told]:
    """Tell the first step, then what moves by more than 0.5 %; what the smaller ones add up to, with the last line."""
    facts = review.f_high if edge == "f_high" else review.f_low
    way = [step for step in review.steps if step.edge == edge and step.hz is not None]
    if not way or facts is None:
        return []
    told: list[_Told] = []
    rest = 1.0
    for step in way:
        if not told:
            told.append(_Told(step.step, number(step.hz, "Hz"), "", step.why))
        elif step.factor is not None and abs(step.factor - 1.0) > _STEP_SHOWN:
            told.append(_Told(step.step, number(step.hz, "Hz"), move(step.factor - 1.0), step.why))
        else:
            rest *= step.factor or 1.0
    last = way[-1].hz or math.nan
    end = last if facts.simulated_hz is None else facts.simulated_hz
    what = "exact" if facts.simulated_hz is None else "simulated"
    rest *= end / last
    why = f"{move(rest - 1.0)} smaller steps, {what}" if abs(rest - 1.0) > _STEP_SHOWN else what
    told.append(_Told(what, number(end, "Hz"), "", why))
    return told
