"""What a report is made of: paragraphs, pictures, lists and tables, gathered into sections."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

from tauledger.report.tables.grid import Grid
from tauledger.report.tables.working import Lines

FigureName = Literal["time", "shares", "way", "bode", "stages", "plane", "loop", "impedance"]


class Prose(Struct, frozen=True):
    """A paragraph."""

    text: str


class Picture(Struct, frozen=True):
    """A figure: which one, and its caption."""

    name: FigureName
    caption: str


class Item(Struct, frozen=True):
    """One cause, note or caution: what leads it ("f_H −25 %"), the sentences."""

    lead: str
    text: str


class Items(Struct, frozen=True):
    """A list of causes, notes or cautions."""

    items: tuple[Item, ...]


class Folded(Struct, frozen=True):
    """Something a reader opens: its title, and what is in it."""

    title: str
    blocks: tuple[Prose | Lines | Grid, ...]


Block = Prose | Picture | Items | Folded | Grid


class Section(Struct, frozen=True):
    """One section; terms: those that first come up here, by name."""

    key: str
    title: str
    blocks: tuple[Block, ...]
    terms: tuple[str, ...] = ()
