"""From the text of a logical card to its items, by the grammar in grammar/card.lark."""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import cache
from types import SimpleNamespace
from typing import TYPE_CHECKING, Any, NamedTuple

from tauledger.netlist.behaviour import OF_THE_RUN, parse_behaviour
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.expressions import parse_formula
from tauledger.netlist.items import Group, Item, Quoted, Setting, Word

if TYPE_CHECKING:
    from lark import Lark, Token

    from tauledger.netlist.formulas import Behaviour, Formula

MOST_NESTED = 50

# What may stand where the grammar stops, in words; the key is what was found there.
_STOPPED = {
    "CLOSE": ("this parenthesis closes nothing", "delete it, or open it before"),
    "_EQUALS": ("an equals sign needs a name before it", "write name=value"),
    "BRACED": ("a formula cannot stand here", "write name=value"),
    "QUOTED": ("a formula cannot stand here", "write name=value"),
    "OPEN": ("a parenthesis cannot stand here", "write name=value, and put a formula in braces: name={..}"),
}
_UNCLOSED = {
    "{": ("this brace is not closed", "close it with }; braces do not stand inside braces"),
    "'": ("this quote is not closed", "close it with '"),
    '"': ("this quote is not closed", 'close it with "'),
}


# The keywords behind which a behavioural expression stands, in braces, quotes or bare, by letter.
_BEHAVIOURAL = {"B": "v|i", "E": "vol|value", "G": "cur|value", "C": "q"}
_PIECE = re.compile(r"""'[^']*'|"[^"]*"|\{[^{}]*\}|[()]|(?<![\w.])([A-Za-z]\w*+)\s*+(?:=(?!=)\s*|(?=[{'"]))""")
_BEHIND = re.compile(r"""'[^']*'|"[^"]*"|\{[^{}]*\}|[()]|\s(?:tc1|tc2|m|temp|dtemp|ic)\s*=(?!=)""", re.IGNORECASE)


_WIDE = re.compile(r"""(?:[^\s(),='"{]++(?:=[^\s(),='"{]++)?+|[\s,()]++)*+""")
_WIDE_ITEM = re.compile(r"([^\s(),=]+)(?:=([^\s(),=]+))?|[()]")


class _Region(NamedTuple):
    """A behavioural expression on a card: its keyword, where that begins, where the expression begins and ends."""

    keyword: str
    key: int
    start: int
    end: int


def parse_element(site: Site) -> tuple[Item, ...]:
    """Give the items of an element card; a behavioural expression becomes the value of its keyword, bare or not.

    `TABLE {x} = ..` of a controlled source comes out as the setting table={x}, its pairs as they stand.
    Raises NetlistError at the character where the card stops making sense.
    """
    text = site.card.text
    region = _region(text, text[0].upper())
    if region is None:
        return parse_card(site)
    keyword, key, start, end = region
    items = parse_card(site, text[:key] + " " * (end - key) + text[end:])
    given = text[start:end].rstrip(" \t=" if keyword.lower() == "table" else None)
    quoted = len(given) >= 2 and given[0] in "'\"" and given[-1] == given[0]
    behaviour = parse_behaviour(site, given[1:-1] if quoted else given, start, start + quoted)
    before = sum(item.at < key for item in items)
    return (*items[:before], Setting(Word(keyword, key), behaviour), *items[before:])


def _region(text: str, letter: str) -> _Region | None:
    if letter not in _BEHAVIOURAL:
        return None
    sure = _BEHAVIOURAL[letter].split("|")
    depth = 0
    for piece in _PIECE.finditer(text):
        keyword = piece.group(1)
        if keyword is None:
            depth += {"(": 1, ")": -1}.get(piece.group(), 0)
            continue
        word = keyword.lower()
        if depth or not piece.start():
            continue
        if word == "table" and letter in "EG":
            start, end = piece.end(), _end(text, piece.end(), alone=True)
            rest = text[end:]
            skip = len(rest) - len(rest.lstrip())
            # The equals sign between the variable and the pairs says nothing.
            return _Region(keyword, piece.start(), start, end + skip + rest[skip : skip + 1].count("="))
        if word in sure and (letter != "B" or "=" in piece.group()):
            return _Region(keyword, piece.start(), piece.end(), _end(text, piece.end()))
    return None


def _end(text: str, start: int, *, alone: bool = False) -> int:
    """Give the end of an expression: of its quotes, else where the next keyword of the card begins.

    alone: what stands in one pair of braces or parentheses.
    """
    if text[start : start + 1] in ("'", '"') or (alone and text[start : start + 1] == "{"):
        closing = text.find({"{": "}"}.get(text[start], text[start]), start + 1)
        return len(text) if closing < 0 else closing + 1
    depth = 0
    for piece in _BEHIND.finditer(text, start):
        found = piece.group()
        depth += {"(": 1, ")": -1}.get(found, 0)
        if alone and found == ")" and depth == 0:
            return piece.end()
        if depth == 0 and found[0].isspace():
            return piece.start()
    return len(text)


def parse_card(site: Site, text: str | None = None) -> tuple[Item, ...]:
    """Give the items of a card, its first word included; formulas are parsed too.

    text: to be read instead of the card's, character for character at the same place.
    Raises NetlistError at the character where the card stops making sense.
    """
    text = site.card.text if text is None else text
    wide = wide_items(text)
    return grammar_items(site, text) if wide is None else wide


def wide_items(text: str) -> tuple[Item, ...] | None:
    """Give the items of a card of plain words, name=word and parentheses, as the grammar would; None for any other.

    Nearly all cards are such: this is some twenty times faster, and most netlists never need the grammar.
    """
    if _WIDE.fullmatch(text) is None or text.count("(") > MOST_NESTED:
        return None
    open_groups: list[tuple[int, list[Item]]] = [(0, [])]
    for piece in _WIDE_ITEM.finditer(text):
        name, value = piece.group(1, 2)
        if name is None and piece.group() == "(":
            open_groups.append((piece.start(), []))
        elif name is None:
            if len(open_groups) == 1:
                return None
            at, inside = open_groups.pop()
            open_groups[-1][1].append(Group(tuple(inside), at, piece.end()))
        else:
            word = Word(name, piece.start())
            open_groups[-1][1].append(word if value is None else Setting(word, Word(value, piece.start(2))))
    if len(open_groups) > 1 or not open_groups[0][1]:
        return None
    return tuple(open_groups[0][1])


def grammar_items(site: Site, text: str) -> tuple[Item, ...]:
    """Give the items of any card by the grammar; raises NetlistError where it stops making sense."""
    from lark import Token, UnexpectedCharacters, UnexpectedToken

    deep = _depth(text)
    if deep is not None:
        raise site.fault(deep, f"parentheses are nested more than {MOST_NESTED} deep")
    try:
        found: Any = _parser().parse(text)
    except UnexpectedCharacters as error:
        at = error.pos_in_stream or 0
        message, hint = _UNCLOSED.get(text[at], (f"{text[at]!r} cannot stand here", ""))
        raise site.fault(at, message, hint) from error
    except UnexpectedToken as error:
        if error.token.type == "$END":
            raise _ended(site, text) from error
        message, hint = _STOPPED.get(error.token.type, ("this cannot stand here", "write name=value"))
        raise site.fault(error.pos_in_stream or 0, message, hint, wide=len(error.token)) from error

    def item(raw: Any) -> Item:
        if isinstance(raw, Token):
            return value(raw)
        if isinstance(raw, Group):
            return Group(tuple(item(inner) for inner in raw.items), raw.at, raw.end)
        name, given = raw
        return Setting(Word(str(name), name.start_pos), value(given))

    def value(token: Token) -> Word | Quoted | Formula | Behaviour:
        at = token.start_pos or 0
        if token.type == "WORD":
            return Word(str(token), at)
        if token.type == "TEXT":
            return Quoted(str(token)[1:-1], at)
        given = str(token)[1:-1]
        if OF_THE_RUN.search(given) and not text.startswith("."):
            return parse_behaviour(site, given, at, at + 1)
        return parse_formula(site, given, at, at + 1)

    return tuple(item(raw) for raw in found)


def _depth(text: str) -> int | None:
    """Give the offset of the parenthesis that is one too deep, or None."""
    if text.count("(") <= MOST_NESTED:
        return None
    depth = 0
    for at, character in enumerate(text):
        depth += {"(": 1, ")": -1}.get(character, 0)
        if depth > MOST_NESTED:
            return at
    return None


def _ended(site: Site, text: str) -> Exception:
    depth: list[int] = []
    for at, character in enumerate(text):
        if character == "(":
            depth.append(at)
        elif character == ")" and depth:
            depth.pop()
    if depth:
        return site.fault(depth[-1], "this parenthesis is not closed", "close it with )")
    return site.fault(len(text), "the card ends where a value is expected", "write name=value")


@cache
def _parser() -> Lark:
    from lark import Lark

    def group(children: Sequence[Any]) -> Group:
        return Group(tuple(children[1:-1]), children[0].start_pos, children[-1].end_pos)

    build = SimpleNamespace(start=list, setting=tuple, group=group)
    return Lark.open_from_package(
        "tauledger.grammar",
        "card.lark",
        ("",),
        parser="lalr",
        lexer="contextual",
        transformer=build,
        maybe_placeholders=False,
    )
