"""The netlist as read: its files, its logical cards with their positions, and the tree of subcircuits.

Nothing here is evaluated yet: parameters, models and instances get their values in elaborate, once per condition.
"""

from __future__ import annotations

from bisect import bisect_right

from msgspec import Struct, field

from tauledger.circuit import Place, ReadingNote
from tauledger.netlist.items import Item, Setting, Word

TOP = -1


class SourceFile(Struct, frozen=True):
    """One file that was read: its path as the user would type it and its physical lines without their ends.

    included_by: number of the including file, or -1; included_at: the line of the `.include` there, from 1.
    """

    path: str
    lines: tuple[str, ...]
    included_by: int = -1
    included_at: int = 0


class Piece(Struct, frozen=True):
    """Where a part of a logical card came from: its offset in the card, its line and column in the file, from 1."""

    offset: int
    line: int
    column: int


class Card(Struct, frozen=True):
    """One logical card: physical lines joined, comments out. file: number of its file in `Netlist.files`."""

    text: str
    file: int
    pieces: tuple[Piece, ...]


class Script(Struct, frozen=True):
    """A `.control` block: number of its file, its line from 1, and its lines, the fences left out."""

    file: int
    line: int
    lines: tuple[str, ...]


class Definition(Struct, frozen=True):
    """A subcircuit, or the netlist itself (`card` is TOP, name and ports empty); cards are numbers in `Netlist.cards`.

    defaults: the parameters on the `.subckt` card. elements, parameters, models, nodesets: card numbers in file order.
    """

    name: str
    card: int
    ports: tuple[Word, ...]
    defaults: tuple[Setting, ...]
    elements: tuple[int, ...]
    parameters: tuple[int, ...]
    models: tuple[int, ...]
    definitions: tuple[Definition, ...]
    nodesets: tuple[int, ...] = ()


class Netlist(Struct, frozen=True):
    """All that was read.

    path: as typed. items: per card what its text holds, empty where the card is not read by place and keyword.
    globals: nodes named by `.global`, folded. options, temperatures: card numbers. requests: texts of analyses and
    outputs, which are hints only. past: what was read past, by word and count. sha256: over the bytes of all files in
    the order in which they were read. blocks: the cards of `.if`, `.elseif`, `.else` of each block; within: for a card
    in such blocks their numbers and those of the branches, outermost first. passed: number of a card and what on it
    was read past. scripts: the `.control` blocks.
    """

    path: str
    title: str
    files: tuple[SourceFile, ...]
    cards: tuple[Card, ...]
    items: tuple[tuple[Item, ...], ...]
    top: Definition
    globals: tuple[str, ...]
    options: tuple[int, ...]
    temperatures: tuple[int, ...]
    requests: tuple[str, ...]
    past: tuple[tuple[str, int], ...]
    sha256: str
    notes: tuple[ReadingNote, ...] = ()
    blocks: tuple[tuple[int, ...], ...] = ()
    passed: tuple[tuple[int, str], ...] = ()
    scripts: tuple[Script, ...] = ()
    within: dict[int, tuple[tuple[int, int], ...]] = field(default_factory=dict)


def position(files: tuple[SourceFile, ...], card: Card, offset: int) -> Place:
    """Give the place in the file of a character of a logical card; an offset beyond its end is the last piece's."""
    index = bisect_right(card.pieces, offset, key=lambda piece: piece.offset) - 1
    piece = card.pieces[max(index, 0)]
    source = files[card.file]
    return Place(source.path, piece.line, piece.column + offset - piece.offset, source.lines[piece.line - 1])


def place(netlist: Netlist, card: int, path: int = 0) -> Place:  # noqa: ARG001 - all instances share their cards
    """Give the place of a card's first character, by the two integers that every item of a Circuit carries.

    The instance (`path`) does not move the place; `instance_context` words it. Raises IndexError for ADDED: a load
    that a Change added has no line.
    """
    if card < 0:
        raise IndexError(card)
    return position(netlist.files, netlist.cards[card], 0)
