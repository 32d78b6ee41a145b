"""From the text of a logical card to its items, by the grammar in grammar/card.lark."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from types import SimpleNamespace
from typing import TYPE_CHECKING, Any

from tauledger.netlist.diagnostics import Site
from tauledger.netlist.expressions import parse_formula
from tauledger.netlist.items import Group, Item, Quoted, Setting, Word

if TYPE_CHECKING:
    from lark import Lark, Token

    from tauledger.netlist.formulas import Formula

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


def parse_card(site: Site) -> tuple[Item, ...]:
    """Give the items of a card, its first word included; formulas are parsed too.

    Raises NetlistError at the character where the card stops making sense.
    """
    from lark import Token, UnexpectedCharacters, UnexpectedToken

    text = site.card.text
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

    def value(token: Token) -> Word | Quoted | Formula:
        at = token.start_pos or 0
        if token.type == "WORD":
            return Word(str(token), at)
        if token.type == "TEXT":
            return Quoted(str(token)[1:-1], at)
        return parse_formula(site, str(token)[1:-1], at, at + 1)

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
