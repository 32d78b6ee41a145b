"""Gain and phase at a frequency, and the peaking, in tables."""

from __future__ import annotations

from tauledger.record import AtFacts, PeakFacts, Review
from tauledger.report.at import at_cells, peak_cells, peak_rows, source_rows
from tauledger.report.tables.grid import Column, Grid, GridRow, columns
from tauledger.report.unity import signed
from tauledger.report.wording import EDGE, number

_FIRST_ORDER = "To first order; the operating point is held."


def gain_and_phase(review: Review) -> Grid:
    """Give gain and phase at every frequency that was asked for, simulated and exact."""
    rows = tuple(GridRow(cells) for one in review.at for cells in source_rows(one, review))
    heads = (*columns("Frequency", "gain", "phase", "beyond mid-band"),)
    return Grid("Gain and phase", (heads[0], Column("", "l"), *heads[1:]), rows)


def at_elements(one: AtFacts) -> Grid:
    """Give what 10 % less of every element does to gain and phase at one frequency."""
    rows = tuple(GridRow(at_cells(element), part=element.name) for element in one.elements)
    heads = columns("10 % less of", "value", "gain", "phase")
    return Grid(f"What 10 % less of one element does at {number(one.hz, 'Hz')}", heads, rows, _FIRST_ORDER)


def peak(one: PeakFacts) -> Grid:
    """Give how high the peak of one side is and where, simulated and exact."""
    rows = tuple(GridRow(cells) for cells in peak_rows(one))
    return Grid(f"Peaking towards {EDGE[one.edge]}", columns("", "simulated", "exact"), rows)


def peak_elements(one: PeakFacts) -> Grid:
    """Give what 10 % less of every element does to the peaking, the first two recomputed."""
    rows = []
    for element in one.elements:
        rows.append(GridRow(peak_cells(element), part=element.name))
        if element.rerun_db is not None:
            rows.append(GridRow(("recomputed", "", signed(element.rerun_db - one.exact_db, " dB")), "part"))
    return Grid("Who makes it", columns("10 % less of", "value", "peaking"), tuple(rows), _FIRST_ORDER)
