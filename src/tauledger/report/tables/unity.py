"""Unity gain in tables: figures from three sources, what sets them, what a picofarad at each node costs."""

from __future__ import annotations

from tauledger.record import UnityFacts
from tauledger.report.marks import at_length, mark
from tauledger.report.tables.grid import Grid, GridRow, columns, said
from tauledger.report.unity import again_cells, element_cells, figures, node_cells, remarks
from tauledger.report.wording import part_title


def unity_gain(facts: UnityFacts) -> Grid:
    """Give f_u, margins and gain-bandwidth product, simulated, exact and by hand."""
    rows = tuple(GridRow((cells[0].strip(), *cells[1:])) for cells in figures(facts))
    return Grid(
        "Unity gain and its margins", columns("", "simulated", "exact", "by hand"), rows, " ".join(remarks(facts))
    )


def who_sets(facts: UnityFacts) -> Grid:
    """Give what 10 % less of every element does to f_u and both margins, the first two recomputed."""
    rows = []
    for one in facts.elements:
        _, *cells = element_cells(one)
        # in a table for reading a mark stands apart from the name
        title = f"{part_title(one.name, one.owner)} {mark(one)}".rstrip()
        rows.append(GridRow((title, *cells), part=one.name))
        if one.f_unity_rerun_hz is not None:
            rows.append(GridRow(("recomputed", *again_cells(one, facts)), "part"))
    note = " ".join(("To first order; the operating point is held.", *at_length(facts.elements)))
    heads = columns("10 % less of", "value", "f_u", "phase margin", "gain margin")
    return said(Grid("Who sets f_u and margin", heads, tuple(rows), note))


def at_nodes(facts: UnityFacts) -> Grid:
    """Give what 1 pF from a node to ground does to f_u and margin, each recomputed."""
    rows = tuple(GridRow(node_cells(node, facts), part=node.node) for node in facts.nodes)
    return Grid("1 pF to ground, recomputed", columns("Node", "f_u", "phase margin", "gain margin"), rows)
