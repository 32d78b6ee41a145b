"""A table for reading: caption, columns, rows of text; the first cell of a row names it."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct
from msgspec.structs import replace

from tauledger.report.wording import NO_NUMBER


class Column(Struct, frozen=True):
    """One column; align: "l" or "r"."""

    head: str
    align: Literal["l", "r"] = "r"


class GridRow(Struct, frozen=True):
    """One row. kind: "place" and "part" below the row that they belong to, "sum" for a total.

    part: the part or node that it is about, so that charts can be linked with it."""

    cells: tuple[str, ...]
    kind: Literal["", "place", "part", "sum"] = ""
    part: str = ""


class Grid(Struct, frozen=True):
    """One table; note: what must be said below it."""

    caption: str
    columns: tuple[Column, ...]
    rows: tuple[GridRow, ...]
    note: str = ""


def said(grid: Grid) -> Grid:
    """Give a table without the columns that say nothing in any row; the first stays."""
    kept = [
        k for k in range(len(grid.columns)) if not k or any(row.cells[k] not in ("", NO_NUMBER) for row in grid.rows)
    ]
    if len(kept) == len(grid.columns):
        return grid
    rows = tuple(replace(row, cells=tuple(row.cells[k] for k in kept)) for row in grid.rows)
    return replace(grid, columns=tuple(grid.columns[k] for k in kept), rows=rows)


def columns(first: str, *others: str) -> tuple[Column, ...]:
    """Give the columns of a table of numbers: the first on the left, the others on the right."""
    return (Column(first, "l"), *(Column(head) for head in others))
