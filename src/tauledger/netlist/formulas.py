"""Formulas of both dialects as trees: what the text says, before any value is known.

Numeric: {..}, '..', .param. Behavioural: B, E, G, and R C L given by a formula. One builder makes both parsers; what is
particular to a dialect comes from its own file.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from types import SimpleNamespace
from typing import TYPE_CHECKING, Any

from msgspec import Struct

if TYPE_CHECKING:
    from lark import Lark, Token


class Number(Struct, frozen=True):
    """A number; `at` is its offset in the formula, as everywhere in a tree."""

    value: float
    at: int


class Name(Struct, frozen=True):
    """A parameter."""

    text: str
    at: int


class Operation(Struct, frozen=True):
    """A sign or denial with one operand, an operator with two, or "?" with three."""

    operator: str
    operands: tuple[Tree, ...]
    at: int


class Call(Struct, frozen=True):
    """A function with its arguments."""

    function: str
    arguments: tuple[Tree, ...]
    at: int


class Probe(Struct, frozen=True):
    """v(plus, minus), v(plus) or i(element) in a behavioural expression; the names are not expressions."""

    kind: str
    names: tuple[str, ...]
    at: int


Tree = Number | Name | Operation | Call | Probe


class Formula(Struct, frozen=True):
    """A formula on a card: the text between its braces or quotes, the tree, and where it stands.

    at: offset of its first character in the card, brace included. inner: offset of the text.
    """

    text: str
    at: int
    inner: int
    tree: Tree


class Behaviour(Struct, frozen=True):
    """A behavioural expression: its text, where it and its text begin in the card, and the tree."""

    text: str
    at: int
    inner: int
    tree: Tree


def names(tree: Tree) -> Iterator[str]:
    """Run through the parameter names that a tree mentions, as written."""
    match tree:
        case Name(text=text):
            yield text
        case Operation(operands=inner) | Call(arguments=inner):
            for part in inner:
                yield from names(part)
        case Number() | Probe():
            return


def formula_parser(grammar: str, number: Callable[[str], float], *rules: Callable[[Sequence[Token]], Any]) -> Lark:
    """Build the parser of one dialect, which gives trees of the records above.

    grammar: its file. number: how this dialect reads a number. rules: what it has beyond the other, each named as in
    the grammar.
    """
    from lark import Lark

    def read(children: Sequence[Token]) -> Number:
        return Number(number(str(children[0])), offset(children[0]))

    def name(children: Sequence[Token]) -> Name:
        return Name(str(children[0]), offset(children[0]))

    def leading(children: Sequence[Any]) -> Operation:
        return Operation("negative" if children[0] == "-" else "positive", (children[1],), offset(children[0]))

    def denial(children: Sequence[Any]) -> Operation:
        return Operation("!", (children[1],), offset(children[0]))

    def binary(children: Sequence[Any]) -> Operation:
        return Operation(str(children[1]), (children[0], children[2]), offset(children[1]))

    def choose(children: Sequence[Any]) -> Operation:
        return Operation("?", tuple(children), children[0].at)

    def call(children: Sequence[Any]) -> Call:
        return Call(str(children[0]), tuple(children[1:]), offset(children[0]))

    named = {rule.__name__: rule for rule in (name, leading, denial, binary, choose, call, *rules)}
    build = SimpleNamespace(number=read, **named)
    return Lark.open_from_package(
        "tauledger.grammar", grammar, ("",), parser="lalr", lexer="contextual", transformer=build
    )


def offset(token: Token) -> int:
    """Give where a token starts in its text."""
    return token.start_pos or 0
