"""Differential and common mode of two sources, and the further outputs of the same run."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.modes import BALANCED, balanced, mode_rows, output_rows
from tauledger.report.tables.grid import Column, Grid, GridRow


def modes(review: Review) -> Grid:
    """Give both gains and their ratio at mid-band and at f_H."""
    facts = review.modes
    assert facts is not None
    note = (
        "Differential: from the first less the second. Common: from both moved together. CMRR: the one less the other."
    )
    if balanced(review):
        note += f" Here {BALANCED}."
    heads = (Column("At", "l"), Column("", "l"), Column("differential"), Column("common mode"), Column("CMRR"))
    rows = tuple(GridRow(cells) for cells in mode_rows(review))
    return Grid(f"Gain from {facts.plus} less {facts.minus}, and from both", heads, rows, note)


def further_outputs(review: Review) -> Grid:
    """Give mid-band gain and band edges of every further output, each against its own plateau."""
    heads = (Column("Output", "l"), Column("", "l"), *map(Column, ("gain", "at", "f_L", "f_H")))
    rows = tuple(GridRow(cells) for one in review.outputs for cells in output_rows(one))
    return Grid("Further outputs of the same run", heads, rows, "Each against its own plateau.")
