"""The phase budget at unity gain: degrees used by each pole and zero, exact and by hand; f_u and margin by hand."""

from __future__ import annotations

import math

from tauledger.record import PhaseBudget, PhaseRow, Review, UnityStep
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import NOTHING_DEG, coefficients, degrees, move, number, retitled

Cells = tuple[str, ...]


def phase_budget(budget: PhaseBudget) -> Grid:
    """Give the poles and zeros with what they use at f_u, those too small to show together, and what is left."""
    *above, left = budget_cells(budget)
    rows = [*(GridRow(cells) for cells in above), GridRow(left, "sum")]
    heads = columns("Pole or zero", "exact", "used", "by hand", "off", "used, by hand")
    return Grid(f"Phase used up at {number(budget.at_hz, 'Hz', 4)}", heads, tuple(rows))


def by_hand(budget: PhaseBudget) -> Grid:
    """Give f_u and phase margin by hand beside exact."""
    rows = tuple(GridRow(step_cells(step)) for step in budget.by_hand)
    return Grid("Unity gain by hand", columns("Figure", "by hand", "exact", "off"), rows)


def budget_cells(budget: PhaseBudget) -> tuple[Cells, ...]:
    """Give the cells of every row: name, exact Hz, degrees used, Hz by hand, how far off, degrees by hand."""
    rows: list[Cells] = [_cells(row) for row in budget.rows]
    if budget.others:
        others = "1 other" if budget.others == 1 else f"{budget.others} others together"
        rows.append((others, "", degrees(budget.others_deg), "", "", ""))
    if abs(budget.rest_deg) >= NOTHING_DEG:
        rows.append(("delay", "", degrees(budget.rest_deg), "", "", ""))
    if abs(budget.midband_deg) >= NOTHING_DEG:
        rows.append(("at mid-band already", "", degrees(budget.midband_deg), "", "", ""))
    rows.append(("left for the margin", "", degrees(budget.margin_deg), "", "", ""))
    return tuple(rows)


def formulas(budget: PhaseBudget) -> tuple[tuple[str, str], ...]:
    """Give name and formula, with its operands, of every row that has one."""
    return tuple(
        (row.name, ", ".join(filter(None, (coefficients(row.hand_formula), row.hand_values))))
        for row in budget.rows
        if row.hand_formula
    )


def step_cells(step: UnityStep) -> Cells:
    """Give the cells of one figure by hand: what, by hand, exact, how far off."""
    if step.unit == "Hz":
        by_paper, exact = number(step.hand, "Hz", 4), number(step.exact, "Hz", 4)
        how = f"= {step.formula}" if step.values else "with the poles and zeros above"
        return (f"{step.figure} {how}", by_paper, exact, move(step.hand / step.exact - 1.0))
    return (step.figure, degrees(step.hand), degrees(step.exact), f"{step.hand - step.exact:+.1f}°")


def step_reasons(budget: PhaseBudget) -> tuple[tuple[UnityStep, str], ...]:
    """Give the figures by hand with their operands and the reason why they are off, where there is either."""
    told = ((step, "; ".join(filter(None, (step.values, step.why)))) for step in budget.by_hand)
    return tuple((step, text) for step, text in told if text)


def workings(review: Review) -> tuple[tuple[str, str], ...]:
    """Give lead and text of what stands below the poles and zeros: the stage, and every formula with its operands."""
    budget = review.phase_budget
    if budget is None:
        return ()
    stage = (("stage", retitled(budget.stage, review.parts)),) if budget.stage else ()
    return (*stage, *formulas(budget))


def _cells(row: PhaseRow) -> Cells:
    return (
        _name(row),
        number(math.hypot(row.real_hz, row.imag_hz), "Hz", 4),
        degrees(row.used_deg),
        "" if row.hand_hz is None else number(abs(row.hand_hz), "Hz", 4),
        "" if row.difference is None else move(row.difference),
        "" if row.hand_deg is None else degrees(row.hand_deg),
    )


def _name(row: PhaseRow) -> str:
    """Name a row; a zero without a formula says on which side of the axis it lies."""
    if row.kind == "zero" and not row.hand_formula:
        return f"{row.name}, {'right' if row.real_hz > 0.0 else 'left'} half plane"
    return row.name
