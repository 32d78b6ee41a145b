"""What would help: what 10 % less of one element does to both edges and the gain, resistors and gm among them."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.marks import at_length, mark
from tauledger.report.tables.grid import Grid, GridRow, columns, said
from tauledger.report.wording import change, move, part_title, value_of


def what_would_help(review: Review) -> Grid:
    """Give first-order effects of 10 % less per element, and below it the exact ones where recomputed."""
    rows = []
    for one in review.helps:
        title = part_title(one.name, one.owner) + f" {mark(one)}".rstrip()
        value = value_of(one.name, one.owner, one.value, one.unit)
        first = (title, value, move(one.f_high), move(one.f_low), move(one.gain))
        rows.append(GridRow(first, part=one.name))
        if one.gain_rerun is not None:
            high = change(one.f_high_rerun_hz, review.f_high.exact_hz if review.f_high else None)
            low = change(one.f_low_rerun_hz, review.f_low.exact_hz if review.f_low else None)
            rows.append(GridRow(("recomputed", "", move(high), move(low), move(one.gain_rerun)), "part"))
    notes = ["To first order; the operating point is held.", *at_length(review.helps)]
    heads = columns("10 % less of", "value", "f_H", "f_L", "gain")
    return said(Grid("What 10 % less of one element does", heads, tuple(rows), " ".join(notes)))
