"""The table of a measured curve: its band edges beside the simulated ones."""

from __future__ import annotations

from tauledger.record import CurveFacts
from tauledger.report.curve import FIGURES, off
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import number


def measured_edges(curve: CurveFacts) -> Grid:
    """Set the measured band edges and unity-gain frequency beside the simulated ones."""
    rows = tuple(
        GridRow(
            (FIGURES[figure.figure], number(figure.measured_hz, "Hz"), number(figure.simulated_hz, "Hz"), off(figure))
        )
        for figure in curve.figures
    )
    return Grid("Measured beside " + curve.against, columns("Figure", "measured", curve.against, "off by"), rows)
