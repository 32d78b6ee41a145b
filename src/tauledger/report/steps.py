"""From paper to simulation: the estimate after each step with the reason, and the classical methods beside it."""

from __future__ import annotations

import math
from dataclasses import dataclass

from tauledger.record import Review
from tauledger.report.layout import HEADING, Block, Prose, Section
from tauledger.report.wording import EDGE, move, number, retitled

_STEP_SHOWN = 0.005
_REST_SHOWN = 0.0005
_NOT_BY_HAND = ("all poles", "exact")


@dataclass(frozen=True, slots=True)
class _Told:
    """One step as it is printed: frequency, move in per cent, reason."""

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
        blocks.extend(
            Prose(retitled(step.why, review.parts), lead=f"  {step.hertz:>{left}}  {step.change:>{middle}}  ")
            for step in told
        )
    beside = methods(review, edge)
    if beside:
        blocks.append(Prose(beside, lead="  beside it: "))
    return Section(tuple(blocks))


def steps_in_line(review: Review, edge: str) -> list[Block]:
    """Give the same way as running text."""
    told = _steps(review, edge)
    if not told:
        return []
    text = "; ".join(f"{step.hertz}{f' ({step.change})' if step.change else ''} {step.why}" for step in told)
    return [Prose(retitled(text, review.parts), lead="  ")]


def methods(review: Review, edge: str) -> str:
    """Give the error of every classical method whose number no step has shown."""
    shown = {step.hz for step in review.steps if step.edge == edge}
    return ", ".join(
        f"{estimate.method} {move(estimate.difference)}{' (recommended)' if estimate.recommended else ''}"
        for estimate in review.estimates
        if estimate.edge == edge
        and estimate.difference is not None
        and estimate.method not in _NOT_BY_HAND
        and (estimate.recommended or estimate.hz not in shown)
    )


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
            told.append(_Told(number(step.hz, "Hz"), "", step.why))
        elif step.factor is not None and abs(step.factor - 1.0) > _STEP_SHOWN:
            told.append(_Told(number(step.hz, "Hz"), move(step.factor - 1.0), step.why))
        else:
            rest *= step.factor or 1.0
    last = way[-1].hz or math.nan
    end = last if facts.simulated_hz is None else facts.simulated_hz
    what = "exact" if facts.simulated_hz is None else "simulated"
    rest *= end / last
    why = f"{what}; the steps not shown make {move(rest - 1.0)}" if abs(rest - 1.0) > _REST_SHOWN else what
    told.append(_Told(number(end, "Hz"), "", why))
    return told
