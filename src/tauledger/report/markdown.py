"""The review as Markdown for a pull request: the same document as the page, without its pictures."""

from __future__ import annotations

import re
from collections.abc import Iterator

from tauledger.record import Review
from tauledger.report.blocks import Folded, Items, Prose, Section
from tauledger.report.document import document
from tauledger.report.tables.grid import Grid
from tauledger.report.tables.working import Lines
from tauledger.report.terms import TERMS

_BREAK = re.compile(r"\s*[\r\n]+\s*")
# What Markdown or the place that shows it would take for markup, a mention or a reference; an underscore only where it
# could open emphasis.
_MARKUP = re.compile(r"[\\`*\[\]<>|~$]|(?<!\w)_|_(?!\w)|(?<!&)#(?=\w)|@(?=\w)|&(?=#?\w+;)")
_AS_NUMBER = "<>&@#$|"
INDENT = {"place": "&emsp;", "part": "&emsp;&emsp;"}
FOLDED = ("devices", "roots", "lines", "proof", "trust")


def to_markdown(review: Review) -> bytes:
    """Give the review as Markdown in UTF-8; equal reviews give equal bytes."""
    page = document(review)
    lines = [f"## {escape(page.title)}", "", escape(page.subtitle), ""]
    if page.warning:
        lines += [f"> **{escape(page.warning)}**", ""]
    lines += [f"**{escape(page.headline)}**", ""]
    lines += [
        "| " + " | ".join(escape(figure.label) for figure in page.figures) + " |",
        "|---" * len(page.figures) + "|",
    ]
    lines.append("| " + " | ".join(f"**{escape(f.value)}**<br>{escape(f.beside)}" for f in page.figures) + " |")
    lines.append("")
    for answer in page.answers:
        lines += [f"- **{escape(answer.question)}** {escape(answer.answer)}"]
    lines.append("")
    for section in page.sections:
        lines += _section(section)
    lines += ["<details><summary>Terms</summary>", ""]
    lines += [f"- **{escape(term)}**: {escape(says)}" for term, says in TERMS.items()]
    lines += ["", "</details>"]
    return ("\n".join(lines) + "\n").encode(errors="backslashreplace")


def escape(text: str) -> str:
    """Write text so that it stays text, on one line."""
    one_line = _BREAK.sub(" ", text)
    return _MARKUP.sub(
        lambda found: f"&#{ord(found.group())};" if found.group() in _AS_NUMBER else f"\\{found.group()}", one_line
    )


def _section(section: Section) -> list[str]:
    lines = [line for block in section.blocks for line in _block(block)]
    if not lines:
        return []
    if section.key in FOLDED:
        return [f"<details><summary><b>{escape(section.title)}</b></summary>", "", *lines, "</details>", ""]
    return [f"### {escape(section.title)}", "", *lines]


def _block(block: object) -> Iterator[str]:
    if isinstance(block, Grid):
        yield from _table(block)
    elif isinstance(block, Prose):
        yield from (escape(block.text), "")
    elif isinstance(block, Items):
        yield from (f"- **{escape(item.lead)}** {escape(item.text)}" for item in block.items)
        yield ""
    elif isinstance(block, Lines):
        yield from (f"- {escape(line)}" for line in block.lines)
        yield ""
    elif isinstance(block, Folded):
        yield from (f"<details><summary>{escape(block.title)}</summary>", "")
        for inner in block.blocks:
            yield from _block(inner)
        yield from ("</details>", "")


def _table(grid: Grid) -> Iterator[str]:
    if grid.columns[0].head:
        yield from (f"*{escape(grid.caption)}*", "")
    yield "| " + " | ".join(escape(column.head) for column in grid.columns) + " |"
    yield "|" + "|".join("---:" if column.align == "r" else "---" for column in grid.columns) + "|"
    for row in grid.rows:
        cells = [escape(cell) for cell in row.cells]
        if row.kind in INDENT:
            cells[0] = f"{INDENT[row.kind]}{cells[0]}"
        elif row.kind == "sum":
            cells = [f"**{cell}**" if cell else "" for cell in cells]
        yield "| " + " | ".join(cells) + " |"
    yield ""
    if grid.note:
        yield from (escape(grid.note), "")
