"""A folder of reports: what each file is called, and the page that lists them."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import PurePath
from urllib.parse import quote

from msgspec import Struct

from tauledger.record import Review
from tauledger.report.headline import headline, key_figures
from tauledger.report.html import style, template

INDEX = "index.html"


class Entry(Struct, frozen=True):
    """One netlist of the folder: its path as typed, the file of its report, and its review or why there is none."""

    path: str
    file: str
    review: Review | None
    failure: str = ""


class Listed(Struct, frozen=True):
    """One row of the page."""

    path: str
    link: str
    title: str
    headline: str
    figures: tuple[tuple[str, str, str], ...]
    failure: str


def file_names(paths: Sequence[str]) -> tuple[str, ...]:
    """Name each report after its netlist; a second one of the same name is counted: preamp.html, preamp-2.html."""
    taken = {INDEX}
    names = []
    for path in paths:
        stem = PurePath(path).stem or "netlist"
        name, count = f"{stem}.html", 1
        while name.casefold() in taken:
            count += 1
            name = f"{stem}-{count}.html"
        taken.add(name.casefold())
        names.append(name)
    return tuple(names)


def to_index(entries: Sequence[Entry]) -> bytes:
    """Give the page that lists the reports, in UTF-8."""
    return (
        template("index.html.j2")
        .render(entries=tuple(map(_listed, entries)), style=style())
        .encode(errors="backslashreplace")
    )


def _link(file: str) -> str:
    """Write a file name for a link, whatever bytes it holds."""
    return quote(os.fsencode(file))


def _listed(entry: Entry) -> Listed:
    if entry.review is None:
        return Listed(entry.path, _link(entry.file), "", "", (), entry.failure)
    figures = tuple((figure.label, figure.value, figure.beside) for figure in key_figures(entry.review))
    title = entry.review.netlist.title or "(no title)"
    return Listed(entry.path, _link(entry.file), title, headline(entry.review), figures, "")
