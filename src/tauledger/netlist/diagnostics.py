"""Messages at their place: from a character of a logical card to file:line:column, with the line and a caret.

Text of the netlist is shown with its control characters made visible; none of them reaches a terminal.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable
from difflib import SequenceMatcher, get_close_matches
from operator import itemgetter

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.items import Item, width
from tauledger.netlist.netlist import Card, SourceFile, position

MOST_DIAGNOSTICS = 20
MOST_COLUMNS = 160

_CONTROL_PICTURES = 0x2400  # Unicode block "Control Pictures", one for each of the 32 control codes
_UNSAFE = {"Cc", "Cf", "Cs", "Co", "Zl", "Zp"}


def unsafe(character: str) -> bool:
    """Say whether a character could steer a terminal or turn the direction of its text; tab does neither."""
    return character != "\t" and not " " <= character <= "~" and unicodedata.category(character) in _UNSAFE


def visible(text: str) -> str:
    """Replace each control character by one that shows; the length stays, so that a caret still points right."""
    if text.isascii() and text.isprintable():
        return text
    return "".join(_shown(character) if unsafe(character) else character for character in text)


def _shown(character: str) -> str:
    code = ord(character)
    return chr(_CONTROL_PICTURES + code) if code < 0x20 else "␡" if code == 0x7F else "�"


def nearest(name: str, names: Iterable[str], *, otherwise: str = "") -> str:
    """Word a suggestion: the name that looks most like this one (upper and lower case alike), else `otherwise`."""
    spelt = {fold(candidate): candidate for candidate in sorted(names, reverse=True)}
    key = fold(name)
    close = get_close_matches(key, spelt, n=5, cutoff=0.6) or _neighbours(key, spelt)
    if not close:
        return otherwise
    best = min(close, key=lambda other: (-SequenceMatcher(None, other, key).ratio(), other))
    return f"did you mean {visible(spelt[best])!r}?"


def _neighbours(key: str, names: Iterable[str]) -> list[str]:
    """Give the name nearest in the alphabet to one of two characters, one of which is right.

    No share of common characters tells qm for qn from e1 for e2, so figures count as different on purpose.
    """
    if len(key) != 2:
        return []
    slips: list[tuple[int, str]] = []
    for name in names:
        wrong = [(ord(a), ord(b)) for a, b in zip(key, name, strict=False) if a != b and not (a + b).isdigit()]
        if len(name) == 2 and len(wrong) == 1 and (key[0] == name[0] or key[1] == name[1]):
            slips.append((abs(wrong[0][0] - wrong[0][1]), name))
    return [min(slips)[1]] if slips else []


class Site(Struct, frozen=True):
    """A card in its surroundings: what a message needs to say where it is. context: the instances around it."""

    files: tuple[SourceFile, ...]
    card: Card
    context: tuple[str, ...] = ()

    def fault(self, item: Item | int, message: str, hint: str = "", *, wide: int = 1) -> NetlistError:
        """Make the error for an item of this card, or for the character at an offset of it (then `wide` columns)."""
        at, columns = (item, wide) if isinstance(item, int) else (item.at, width(item))
        where = position(self.files, self.card, at)
        # An item may run over a continuation: the caret stays on the line where it begins.
        columns = max(1, min(columns, len(where.text) - where.column + 1))
        context = self.context + included(self.files, self.card.file)
        return NetlistError(
            diagnostic(where.file, where.line, where.column, where.text, message, hint, columns, context)
        )

    @property
    def where(self) -> str:
        """File and line of the card, e.g. "board.cir:12"."""
        place = position(self.files, self.card, 0)
        return f"{visible(place.file)}:{place.line}"


def diagnostic(
    file: str,
    line: int,
    column: int,
    text: str,
    message: str,
    hint: str = "",
    width: int = 1,
    context: tuple[str, ...] = (),
) -> Diagnostic:
    """Make one message safe for a terminal; a long line is cut behind the caret."""
    limit = max(MOST_COLUMNS, column + width + 20)
    shown = text if len(text) <= limit else text[:limit] + " …"
    return Diagnostic(visible(file), line, column, visible(shown), visible(message), visible(hint), width, context)


def included(files: tuple[SourceFile, ...], file: int) -> tuple[str, ...]:
    """Word how a file came in: one line per `.include`, innermost first; empty for the netlist itself."""
    lines = []
    while files[file].included_by >= 0:
        source = files[file]
        file = source.included_by
        lines.append(f"included from {visible(files[file].path)}:{source.included_at}")
    return tuple(lines)


def gather(faults: Iterable[Diagnostic], files: tuple[SourceFile, ...]) -> NetlistError:
    """Make one error of many diagnostics: in file order, each once, at most MOST_DIAGNOSTICS.

    The same message at the same place in a second instance of a subcircuit is left out.
    """
    order = {visible(source.path): number for number, source in reversed(list(enumerate(files)))}
    first: dict[tuple[tuple[int, int, int], str], Diagnostic] = {}
    for fault in faults:
        first.setdefault(((order[fault.file], fault.line, fault.column), fault.message), fault)
    return NetlistError(*[first[key] for key in sorted(first, key=itemgetter(0))][:MOST_DIAGNOSTICS])
