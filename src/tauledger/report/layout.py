"""Tables and prose laid out as lines of text: what a section says is data until here.

Symbols are spelled (or written in ASCII) before anything is measured, so that columns line up either way.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Sequence

from msgspec import Struct

HEADING = "heading"
STRONG = "strong"
WARNING = "warning"
CAUTION = "caution"

_ASCII = {
    "µ": "u",
    "μ": "mu",
    "Ω": "ohm",
    "π": "pi",
    "τ": "tau",
    "σ": "sigma",
    "Σ": "sum",
    "β": "beta",
    "λ": "lambda",
    "ω": "w",
    "Δ": "d",
    "∂": "d",
    "‖": "||",
    "∞": "inf",
    "–": "-",
    "−": "-",
    "—": "-",
    "×": "x",
    "·": "*",
    "→": "->",
    "≤": "<=",
    "≥": ">=",
    "≈": "~",
    "≪": "<<",
    "±": "+/-",
    "√": "sqrt",
    "²": "^2",
    "⁰": "0",
    "⁻": "-",
    "¹": "1",
    "³": "^3",
    **dict(zip("⁴⁵⁶⁷⁸⁹", "456789", strict=True)),
    **dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789", strict=True)),
    "Π": "prod",
    "½": "1/2",
    "°": " deg",
    "†": "*",
    "‡": "**",
    "§": "#",
    "¶": "##",
    "“": '"',
    "”": '"',
    "’": "'",
    "…": "...",
}
_ASCII_TABLE = str.maketrans(_ASCII)
SYMBOLS = "".join(_ASCII)

_GLUE = "\N{NO-BREAK SPACE}"
BEFORE_A_UNIT = re.compile(r"(?<=[\d∞]) (?=(?:%|[fpnuµmkMGT]?(?:Hz|F|Ω|ohm|s|V|A|S|H)|dB(?:Ω|ohm|S)?|deg)(?!\w))")


class Row(Struct, frozen=True):
    """One row of a table; `style` holds for the whole line."""

    cells: tuple[str, ...]
    style: str = ""


class Table(Struct, frozen=True):
    """Columns that line up. align: one of l, r per column. indent: blanks before each row, the head not."""

    align: str
    head: tuple[str, ...]
    rows: tuple[Row, ...]
    indent: int = 2


class Prose(Struct, frozen=True):
    """Words that wrap. lead: what stands before the first line. hang: blanks before the others, None: lead's width."""

    text: str
    lead: str = ""
    style: str = ""
    hang: int | None = None


class Line(Struct, frozen=True):
    """One laid-out line."""

    text: str
    style: str = ""


Block = Table | Prose


class Section(Struct, frozen=True):
    """Blocks that belong together; major: keeps the empty line before it longest."""

    blocks: tuple[Block, ...]
    major: bool = False


def spell(text: str, *, unicode: bool) -> str:
    """Write symbols in ASCII where the reader's encoding needs it; what could steer a terminal is shown as `\\x1b`."""
    visible = "".join(c if c.isprintable() else " " if c.isspace() else ascii(c)[1:-1] for c in text)
    return visible if unicode else visible.translate(_ASCII_TABLE)


def cells(text: str) -> int:
    """Count the terminal cells that `text` takes."""
    if text.isascii():
        return len(text)
    return sum(0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text)


def lay_out(sections: Iterable[Section], *, width: int, unicode: bool, page: int) -> list[Line]:
    """Give the lines of all sections; no line is longer than `width` unless a name is.

    page: lines that should do. Empty lines between sections are spent as far as that allows: before each section, else
    before the major ones, else none; a report longer than a page anyway has them all.
    """
    laid = []
    for section in sections:
        lines = [line for block in section.blocks for line in _block(block, width=width, unicode=unicode)]
        if lines:
            laid.append((section.major, lines))
    whole = sum(len(lines) for _, lines in laid)
    every, major = len(laid) - 1, sum(is_major for is_major, _ in laid[1:])
    if page < whole + every and whole <= page:
        spaced = {major_only for major_only in (True,) if whole + major <= page}
    else:
        spaced = {True, False}
    text: list[Line] = []
    for is_major, lines in laid:
        if text and is_major in spaced:
            text.append(Line(""))
        text.extend(lines)
    return text


def _block(block: Block, *, width: int, unicode: bool) -> list[Line]:
    if isinstance(block, Table):
        return _table(block, width=width, unicode=unicode)
    return _prose(block, width=width, unicode=unicode)


def _prose(prose: Prose, *, width: int, unicode: bool) -> list[Line]:
    """Wrap greedily at blanks; a number is never parted from its unit."""
    lead = spell(prose.lead, unicode=unicode)
    words = BEFORE_A_UNIT.sub(_GLUE, spell(prose.text, unicode=unicode)).split(" ")
    texts: list[str] = []
    hang = " " * (cells(lead) if prose.hang is None else prose.hang)
    current, empty = lead, True
    for word in filter(None, words):
        candidate = current + word if empty else f"{current} {word}"
        if not empty and cells(candidate) > width:
            texts.append(current)
            candidate = hang + word
        current, empty = candidate, False
    texts.append(current)
    return [Line(text.replace(_GLUE, " ").rstrip(), prose.style) for text in texts]


def _table(table: Table, *, width: int, unicode: bool) -> list[Line]:
    """Give the first column what the others leave; a longer name gets a line of its own before its numbers."""
    indent = " " * table.indent
    rows = [Row(tuple(spell(cell, unicode=unicode) for cell in row.cells), row.style) for row in table.rows]
    head = tuple(spell(cell, unicode=unicode) for cell in table.head)
    names = [cells(row.cells[0]) for row in rows] + [cells(head[0]) - table.indent]
    others = [max([cells(head[k])] + [cells(row.cells[k]) for row in rows]) for k in range(1, len(table.align))]
    fitting = _that_fit(others, width - table.indent)
    if fitting < len(others):
        parts = (_columns(table, range(1, fitting + 1)), _columns(table, range(fitting + 1, len(others) + 1)))
        return [line for part in parts for line in _table(part, width=width, unicode=unicode)]
    room = {gap: width - table.indent - sum(others) - gap * len(others) for gap in (2, 1)}
    gap = 2 if max(names) <= room[2] else 1
    first = max((size for size in names if size <= room[gap]), default=0)
    lines: list[Line] = []
    if cells(head[0]) > first + table.indent:
        lines += _prose(Prose(head[0], style=HEADING, hang=2 * table.indent), width=width, unicode=unicode)
        head = ("", *head[1:])
    if any(head):
        lines.append(Line(_join(head, table.align, [first + table.indent, *others], gap), HEADING))
    for row in rows:
        numbers = row.cells
        if cells(row.cells[0]) > first:
            name = Prose(row.cells[0], lead=indent, style=row.style, hang=2 * table.indent)
            lines += _prose(name, width=width, unicode=unicode)
            numbers = ("", *row.cells[1:])
        lines.append(Line(indent + _join(numbers, table.align, [first, *others], gap), row.style))
    return lines


def _that_fit(sizes: Sequence[int], room: int) -> int:
    """Count the columns that fit beside each other, at least one."""
    taken = 0
    for k, size in enumerate(sizes):
        taken += size + 1
        if taken > room and k:
            return k
    return len(sizes)


def _columns(table: Table, kept: Iterable[int]) -> Table:
    """Give a table with its first column and the named ones of the others; rows that say nothing there are left out."""
    columns = (0, *kept)
    rows = tuple(Row(tuple(row.cells[k] for k in columns), row.style) for row in table.rows)
    told = tuple(row for row in rows if any(row.cells[1:]))
    align, head = "".join(table.align[k] for k in columns), tuple(table.head[k] for k in columns)
    return Table(align, head, told, table.indent)


def _join(texts: Sequence[str], align: str, widths: Sequence[int], gap: int) -> str:
    padded = []
    for text, side, size in zip(texts, align, widths, strict=True):
        blanks = " " * (size - cells(text))
        padded.append(text + blanks if side == "l" else blanks + text)
    return (" " * gap).join(padded).rstrip()
