"""What a card holds before anybody knows what it means: words, formulas, quoted texts, settings and groups.

`at` is the offset of the first character in the logical card.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from msgspec import Struct

from tauledger.netlist.formulas import Behaviour, Formula


class Word(Struct, frozen=True):
    """A run of characters without blank, comma, parenthesis, equals sign or quote: a name, a number or a keyword."""

    text: str
    at: int


class Quoted(Struct, frozen=True):
    """Text between double quotes, which are left out."""

    text: str
    at: int


class Function(Struct, frozen=True):
    """A function of the user's own, f(x) = body: the body in each dialect in which it makes sense."""

    name: Word
    parameters: tuple[str, ...]
    formula: Formula | None
    behaviour: Behaviour | None

    @property
    def at(self) -> int:
        """Offset of the name."""
        return self.name.at


Value = Word | Formula | Quoted | Behaviour


class Setting(Struct, frozen=True):
    """`name=value`."""

    name: Word
    value: Value

    @property
    def at(self) -> int:
        """Offset of the name."""
        return self.name.at


class Group(Struct, frozen=True):
    """Items between parentheses. end: offset behind the closing one."""

    items: tuple[Item, ...]
    at: int
    end: int


Item = Value | Setting | Group | Function


def width(item: Item) -> int:
    """Say how many characters of the card an item takes."""
    match item:
        case Word(text=text):
            return len(text)
        case Quoted(text=text):
            return len(text) + 2
        case Formula(text=text, at=at, inner=inner) | Behaviour(text=text, at=at, inner=inner):
            return len(text) + 2 * (inner - at)
        case Setting(name=name, value=value):
            return value.at + width(value) - name.at
        case Group(at=at, end=end):
            return end - at
        case Function(name=name):
            return len(name.text)


def flattened(items: Iterable[Item]) -> Iterator[Value | Setting]:
    """Run through items as if parentheses were blanks."""
    for item in items:
        if isinstance(item, Group):
            yield from flattened(item.items)
        elif not isinstance(item, Function):
            yield item
