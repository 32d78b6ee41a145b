"""Estimates: the way from the lowest node to the simulation, the methods beside it, and what was recomputed."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.record import PartRow, Review, known_hz
from tauledger.report.tables.grid import Column, Grid, GridRow, columns
from tauledger.report.wording import EDGE, NO_NUMBER, coefficients, move, number, part_titles

SHOWN = 0.005
PROVED = 2
STEP_TITLES = {
    "lowest": "slowest node alone",
    "all-nodes": "a pole for each node",
    "exact-constants": "exact time constants",
    "two-coefficients": "two coefficients b₁, b₂",
    "all-poles": "all poles",
    "zeros": "zeros too",
    "full": "whole network",
    "lines": "lines as they are",
    "simulated": "simulated",
    "exact": "exact",
}
LOWER_TITLES = {
    "lowest": "highest edge alone",
    "all-nodes": "a pole for each capacitor",
    "two-coefficients": "two coefficients a₁, a₂",
}
METHODS = {
    "lowest node alone": "slowest node alone",
    "all nodes together": "a pole of its own for each node",
    "highest capacitor alone": "capacitor with the highest edge alone",
    "all capacitors together": "a pole of its own for each capacitor",
    "sum of time constants": "sum of the exact time constants",
}


class Told(Struct, frozen=True):
    """One step worth telling: its title, the estimate after it in Hz, its move as a fraction (None for the first)."""

    title: str
    hz: float
    change: float | None
    why: str


def method_title(method: str, edge: str) -> str:
    """Name a method for an edge ("f_high", "f_low") so that it says what is done with what."""
    if method == "two coefficients":
        return f"{method} {'b₁, b₂' if edge == 'f_high' else 'a₁, a₂'}"
    return METHODS.get(method, method)


def way(review: Review, edge: str) -> tuple[Told, ...]:
    """Give the first estimate, every step that moves it by more than 0.5 %, and the simulation at its end."""
    facts = review.f_high if edge == "f_high" else review.f_low
    steps = [step for step in review.steps if step.edge == edge and step.hz is not None]
    if facts is None or not steps:
        return ()
    titles = {**STEP_TITLES, **(LOWER_TITLES if edge == "f_low" else {})}
    told: list[Told] = []
    last = 0.0
    for step in steps:
        hz = step.hz or 0.0
        if not told:
            told.append(Told(titles.get(step.step, step.step), hz, None, step.why))
        elif step.factor is not None and abs(step.factor - 1.0) > SHOWN and step.step != "simulated":
            told.append(Told(titles.get(step.step, step.step), hz, hz / last - 1.0, step.why))
        else:
            continue
        last = hz
    end = known_hz(facts)
    if end is not None:
        name = "simulated" if facts.simulated_hz is not None else "exact"
        told.append(Told(name, end, end / last - 1.0, "what is left of the smaller steps"))
    return tuple(told)


def way_table(review: Review, edge: str) -> Grid:
    """List the steps with their reasons."""
    rows = [
        GridRow(
            (
                told.title,
                number(told.hz, "Hz"),
                "" if told.change is None else move(told.change),
                coefficients(told.why),
            )
        )
        for told in way(review, edge)
    ]
    heads = (Column("Estimate", "l"), Column(EDGE[edge]), Column("move"), Column("why", "l"))
    return Grid(f"From the simplest estimate of {EDGE[edge]} to the simulation", heads, tuple(rows))


def methods_table(review: Review, edge: str) -> Grid:
    """List the classical methods with their error against the simulation."""
    rows = [
        GridRow(
            (
                method_title(estimate.method, edge) + (" (recommended)" if estimate.recommended else ""),
                number(estimate.hz, "Hz"),
                NO_NUMBER if estimate.difference is None else move(estimate.difference),
            )
        )
        for estimate in review.estimates
        if estimate.edge == edge and estimate.method not in ("simulated", "exact")
    ]
    against = "simulation" if review.engine is not None else "exact value"
    heads = columns("Method", EDGE[edge], f"against the {against}")
    why = " ".join(f"None is recommended: {one.why}." for one in review.no_method if one.edge == edge)
    return Grid(f"Methods for {EDGE[edge]} side by side", heads, tuple(rows), why)


def reruns(review: Review) -> Grid:
    """Set what the shares predict for 10 % less beside what the network recomputed with it gives, for the largest."""
    titles = part_titles(review.parts)
    rows = []
    for edge in ("f_high", "f_low"):
        facts = review.f_high if edge == "f_high" else review.f_low
        exact = facts.exact_hz if facts is not None else None
        if not exact:
            continue
        for part in _largest(review, edge)[:PROVED]:
            less = part.ten_percent_less.f_high_hz if edge == "f_high" else part.ten_percent_less.f_low_hz
            if less is None:
                continue
            predicted = 0.9 ** -(_share(part, edge) or 0.0) - 1.0
            rows.append(
                GridRow(
                    (
                        f"{titles[part.name]}, 10 % less",
                        EDGE[edge],
                        move(predicted, 3),
                        move(less / exact - 1.0, 3),
                        number(less, "Hz"),
                    ),
                    part=part.name,
                )
            )
    heads = (
        Column("Change", "l"),
        Column("edge", "l"),
        Column("predicted, 0.9 to the power of −share"),
        Column("recomputed"),
        Column("edge then"),
    )
    note = (
        "A share s means that the edge goes as C to the power of −s, so that 10 % less gives 0.9 to the power of −s; "
        "for small shares that is +0.1·s. What is recomputed differs by what the share itself changes on the way."
    )
    return Grid("The largest shares, put to the test by computing the whole network again", heads, tuple(rows), note)


def _largest(review: Review, edge: str) -> list[PartRow]:
    parts = [part for part in review.parts if math.isfinite(_share(part, edge) or math.nan)]
    return sorted(parts, key=lambda part: -abs(_share(part, edge) or 0.0))


def _share(part: PartRow, edge: str) -> float | None:
    return part.share.f_high if edge == "f_high" else part.share.f_low
