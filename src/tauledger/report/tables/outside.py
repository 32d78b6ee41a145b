"""What the reader brought along: figures of a page of their own, and values set from outside of the netlist."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.changed import added_text, by, same, set_text, shown, so
from tauledger.report.paper import AGREES, figure_title
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import move, number, retitled


def own_figures(review: Review) -> Grid:
    """Set each figure of the page beside hand and exact."""
    rows = tuple(
        GridRow(
            (
                retitled(figure_title(figure), review.parts),
                number(figure.yours, figure.unit),
                number(figure.hand, figure.unit),
                number(figure.exact, figure.unit),
                move(figure.off),
            )
        )
        for figure in review.paper
    )
    return Grid("Your figures beside hand and exact", columns("Figure", "yours", "by hand", "exact", "off by"), rows)


def verdicts(review: Review) -> tuple[tuple[str, str], ...]:
    """Give name and verdict of each figure that is off by more than 2 %."""
    return tuple(
        (retitled(figure_title(figure), review.parts), figure.says)
        for figure in review.paper
        if figure.off is None or abs(figure.off) > AGREES
    )


def set_values(review: Review) -> Grid:
    """Give the figures that move with what was set, before and after."""
    told = []
    if review.settings:
        told.append(f"Set from outside: {set_text(review)}")
    if review.added:
        told.append(f"Added: {added_text(review)}")
    rows = tuple(
        GridRow((figure.figure, shown(figure, figure.before), shown(figure, figure.after), by(figure)))
        for figure in review.moved
        if not same(figure)
    )
    still = ", ".join(figure.figure for figure in review.moved if same(figure))
    heads = columns("Figure", "as in the netlist", so(review), "change")
    return Grid(". ".join(told), heads, rows, f"Unchanged: {still}." if still else "")
