"""Sections of a library: `.lib name` .. `.endl` in a file, of which `.lib file name` elsewhere takes one."""

from __future__ import annotations

from collections.abc import Sequence

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.items import Word
from tauledger.netlist.netlist import Card, SourceFile
from tauledger.netlist.runs import Run

_QUOTES = "'\""


class Call(Struct, frozen=True):
    """`.lib file section` as written: both words with their places."""

    file: Word
    section: Word


class Taken(Struct, frozen=True):
    """The cards of a file that count. missing: the names of its sections where the wanted one is not among them."""

    cards: tuple[Card | Run, ...]
    faults: tuple[Diagnostic, ...]
    missing: tuple[str, ...] | None = None


def words_behind(text: str) -> list[Word]:
    """Give the words behind a card's first one; a name in quotes may hold blanks."""
    words: list[Word] = []
    at = len(text.split(maxsplit=1)[0])
    while at < len(text):
        if text[at] in " \t":
            at += 1
            continue
        quote = text[at] if text[at] in _QUOTES else ""
        end = text.find(quote, at + 1) if quote else at + len(text[at:].split(maxsplit=1)[0])
        end = len(text) if end < 0 else end
        words.append(Word(text[at + len(quote) : end], at + len(quote)))
        at = end + len(quote)
    return words


def library_call(card: Card) -> Call | None:
    """Give the call on a `.lib file section` card; None for every other card."""
    if _head(card) != ".lib":
        return None
    words = words_behind(card.text)
    return Call(words[0], words[1]) if len(words) == 2 else None


def take(files: tuple[SourceFile, ...], cards: Sequence[Card | Run], wanted: str | None) -> Taken:
    """Give the cards of one section of a file, or with `wanted` None those outside of all sections.

    Faults: a section that is never closed, or is closed where none is open; a `.lib` with neither section nor `.endl`.
    """
    kept: list[Card | Run] = []
    faults: list[Diagnostic] = []
    names: list[str] = []
    inside: tuple[Card, str] | None = None
    for card in cards:
        if isinstance(card, Run):
            if (inside is None) if wanted is None else (inside is not None and fold(inside[1]) == fold(wanted)):
                kept.append(card)
            continue
        head = _head(card)
        site = Site(files, card)
        if head == ".endl":
            if inside is None:
                faults.extend(
                    site.fault(0, "no section of a library is open here", "delete this line", wide=5).diagnostics
                )
            inside = None
        elif head == ".lib" and library_call(card) is None:
            words = words_behind(card.text)
            if inside is not None or len(words) != 1:
                message = "a library is called by file and section"
                at = words[2] if len(words) > 2 else len(card.text)
                faults.extend(site.fault(at, message, 'write .lib "file" section').diagnostics)
                continue
            inside = (card, words[0].text)
            names.append(words[0].text)
        elif (inside is None) if wanted is None else (inside is not None and fold(inside[1]) == fold(wanted)):
            kept.append(card)
    if inside is not None:
        message = f"section {inside[1]} is never closed"
        hint = 'close it with .endl, or call a library: .lib "file" section'
        faults.extend(Site(files, inside[0]).fault(0, message, hint, wide=4).diagnostics)
    known = {fold(name) for name in names}
    missing = tuple(names) if wanted is not None and fold(wanted) not in known else None
    return Taken(tuple(kept), tuple(faults), missing)


def no_such_section(site: Site, call: Call, names: Sequence[str]) -> NetlistError:
    """Make the error for a section that a library does not have."""
    listed = f"it has {', '.join(names)}" if names else "it has none: take all of it with .include"
    message = f"{call.file.text} has no section {call.section.text}"
    return site.fault(call.section, message, nearest(call.section.text, names, otherwise=listed))


def _head(card: Card) -> str:
    return card.text.split(maxsplit=1)[0].lower()
