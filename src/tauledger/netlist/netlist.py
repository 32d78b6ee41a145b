"""The netlist as read: its files, its logical cards with their positions, and the tree of subcircuits.

Nothing here is evaluated yet: parameters, models and instances get their values in elaborate, once per condition.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterable
from functools import lru_cache

from msgspec import Struct, field

from tauledger.circuit import Place, ReadingNote
from tauledger.netlist.items import Item, Setting, Word
from tauledger.netlist.runs import Run, row, row_items

TOP = -1


class SourceFile(Struct, frozen=True):
    """One file that was read: its path as the user would type it and its text, lines ended by line feeds only.

    included_by: number of the including file, or -1; included_at: the line of the `.include` there, from 1.
    """

    path: str
    text: str
    included_by: int = -1
    included_at: int = 0

    @property
    def lines(self) -> list[str]:
        """The physical lines without their ends."""
        return _lines(self.text)


@lru_cache(maxsize=16)
def _lines(text: str) -> list[str]:
    return text.split("\n")


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


class Cards(Struct, frozen=True):
    """The logical cards in the order of reading, by number; the lines of a run count one by one.

    entries: cards and runs. starts: the number of each entry's first card. count: of all cards.
    """

    entries: tuple[Card | Run, ...]
    starts: tuple[int, ...]
    count: int

    def __len__(self) -> int:
        return self.count

    def __getitem__(self, number: int) -> Card:
        entry, inside = self.entry(number)
        if isinstance(entry, Card):
            return entry
        text, column = row(entry, inside)
        return Card(text, entry.file, (Piece(0, entry.line + inside, column),))

    def entry(self, number: int) -> tuple[Card | Run, int]:
        """Give the card or run to which a number belongs, and its place in the run."""
        if not 0 <= number < self.count:
            raise IndexError(number)
        at = bisect_right(self.starts, number) - 1
        return self.entries[at], number - self.starts[at]


def numbered(entries: Iterable[Card | Run]) -> Cards:
    """Number cards and the lines of runs."""
    kept, starts, count = tuple(entries), [], 0
    for entry in kept:
        starts.append(count)
        count += entry.count if isinstance(entry, Run) else 1
    return Cards(kept, tuple(starts), count)


class ItemsOfCards(Struct, frozen=True):
    """What each card holds, by number; of a run's lines worked out when asked for. held: per entry of `cards`."""

    cards: Cards
    held: tuple[tuple[Item, ...], ...]

    def __getitem__(self, number: int) -> tuple[Item, ...]:
        entry, inside = self.cards.entry(number)
        if isinstance(entry, Run):
            return row_items(entry, inside)
        return self.held[bisect_right(self.cards.starts, number) - 1]


class Script(Struct, frozen=True):
    """A `.control` block: number of its file, its line from 1, and its lines, the fences left out."""

    file: int
    line: int
    lines: tuple[str, ...]


class Definition(Struct, frozen=True):
    """A subcircuit, or the netlist itself (`card` is TOP, name and ports empty); cards are numbers in `Netlist.cards`.

    defaults: the parameters on the `.subckt` card. elements, parameters, models, nodesets: card numbers in file order,
    of a run the first one's.
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
    globals: nodes named by `.global`, folded. options, temperatures: card numbers. requests: the cards of analyses and
    outputs and the lines of `.control` blocks, which are hints only. past: what was read past, by word and count.
    sha256: over the bytes of all files in the order in which they were read. blocks: the cards of `.if`, `.elseif`,
    `.else` of each block; within: for a card in such blocks their numbers and those of the branches, outermost first.
    passed: number of a card and what on it was read past. scripts: the `.control` blocks.
    """

    path: str
    title: str
    files: tuple[SourceFile, ...]
    cards: Cards
    items: ItemsOfCards
    top: Definition
    globals: tuple[str, ...]
    options: tuple[int, ...]
    temperatures: tuple[int, ...]
    requests: tuple[Card, ...]
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
