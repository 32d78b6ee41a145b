"""Large signal: every node that could be judged, with current, capacitance, slew rate and full-power bandwidth."""

from __future__ import annotations

from tauledger.quantity import engineering
from tauledger.record import LargeSignal
from tauledger.report.large_signal import cells
from tauledger.report.tables.grid import Grid, GridRow, columns


def large_signal(facts: LargeSignal) -> Grid:
    """Give the nodes, the one with the lowest full-power bandwidth first."""
    peak = engineering(facts.swing_v, "V", 3, zeros=False)
    heads = columns("Node", "moved by", "can give", "into", "slew rate", "at the output", f"{peak} peak up to")
    note = (
        "SR = I/C: a transistor can fall by its whole standing current and no further; a pair gives its tail current "
        f"to the node where its mirror ends. The bandwidth is SR/(2π·{peak}) with the slew rate as the output shows it."
    )
    if facts.not_judged:
        note += f" Not judged, for no one current is the limit: {', '.join(facts.not_judged)}."
    return Grid("What each stage can deliver at full size", heads, tuple(GridRow(cells(n)) for n in facts.nodes), note)
