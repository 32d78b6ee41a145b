"""Input and output impedance: R ‖ C at mid-band and at f_H, exact and simulated, and at mid-band by hand."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.impedances import exact, heads, in_series, simulated, title
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import number


def impedances(review: Review) -> Grid:
    """Give every impedance that was asked for; simulated below exact."""
    rows: list[GridRow] = []
    for one in review.impedances:
        rows.append(GridRow((title(one), *exact(one), number(one.hand_ohm, "Ω"))))
        if any(simulated(one)):
            rows.append(GridRow(("simulated", *simulated(one), ""), "part"))
    note = "A resistance in parallel with a capacitance, or with an inductance where the current lags."
    for text in in_series(review):
        note += f" {text[:1].upper()}{text[1:]}."
    return Grid(
        "Input and output impedance, exact and simulated", columns("Impedance", *heads(review)), tuple(rows), note
    )


def workings(review: Review) -> tuple[str, ...]:
    """Give the lines by hand, one per impedance that looking in gives."""
    return tuple(one.hand_text for one in review.impedances if one.hand_text)
