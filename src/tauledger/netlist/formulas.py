"""Formulas of both dialects as trees: what the text says, before any value is known.

Numeric: {..}, '..', .param. Behavioural: B, E, G, and R C L given by a formula.
"""

from __future__ import annotations

from collections.abc import Iterator

from msgspec import Struct


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
