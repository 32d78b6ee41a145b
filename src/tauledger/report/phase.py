"""The phase budget at unity gain as text: what each pole and zero uses, paper beside it, and f_u and margin by hand."""

from __future__ import annotations

from tauledger.record import PhaseBudget, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.tables.phase import budget_cells, step_cells, step_reasons, workings
from tauledger.report.wording import number


def phase_used(review: Review) -> Section:
    """Give the degrees that poles and zeros use at f_u, exact and by hand, and how far f_u by hand is off."""
    budget = review.phase_budget
    if budget is None:
        return Section(())
    head = (f"PHASE USED UP at {number(budget.at_hz, 'Hz', 4)}", "exact", "used", "by hand", "off", "by hand")
    rows = tuple(Row(cells) for cells in budget_cells(budget))
    blocks: list[Block] = [Table("lrrrrr", head, rows)]
    blocks += [Prose(f"{name}: {text}", lead="  ", hang=4) for name, text in workings(review)]
    blocks += _by_hand(budget)
    return Section(tuple(blocks), major=True)


def _by_hand(budget: PhaseBudget) -> list[Block]:
    if not budget.by_hand:
        return []
    head = ("UNITY GAIN BY HAND", "by hand", "exact", "off")
    rows = tuple(Row(step_cells(step)) for step in budget.by_hand)
    said = [Prose(f"{step.figure}: {why}", lead="  ", hang=4) for step, why in step_reasons(budget)]
    return [Table("lrrr", head, rows), *said]
