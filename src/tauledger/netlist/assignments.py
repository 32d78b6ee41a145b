"""The assignments of a `.param` card: NAME=VALUE, where a value is a number, a bare formula without blanks outside
parentheses, or a formula in braces or quotes."""

from __future__ import annotations

import re

from tauledger.netlist.diagnostics import Site
from tauledger.netlist.expressions import parse_formula
from tauledger.netlist.items import Item, Setting, Value, Word

_NAME = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")
_CLOSING = {"{": "}", "'": "'", '"': '"'}


def parse_assignments(site: Site) -> tuple[Item, ...]:
    """Give the card's word and its assignments as Settings; raises NetlistError where it is no row of assignments."""
    text = site.card.text
    word = text.split(maxsplit=1)[0]
    items: list[Item] = [Word(word, 0)]
    at = _skip(text, len(word))
    if at == len(text):
        raise site.fault(at, "an assignment is missing", "write .param name=value")
    while at < len(text):
        if text[at] == ",":
            raise site.fault(at, "a comma cannot stand between assignments", "separate them by blanks")
        match = _NAME.match(text, at)
        if match is None:
            formula = text[at] in "+-*/^%<>=!&|?:("
            hint = "a formula with blanks stands in braces: name={a + b}" if formula else "letters, digits and _"
            raise site.fault(at, "the name of a parameter is expected here", hint)
        name = Word(match.group(), at)
        equals = _skip(text, match.end())
        if equals < len(text) and text[equals] == "(":
            raise site.fault(name, "functions of one's own are not supported by this version")
        if equals == len(text) or text[equals] != "=":
            message = "name=value is expected here"
            raise site.fault(name, message, "a formula with blanks stands in braces: name={a + b}")
        start = _skip(text, equals + 1)
        value, at = _value(site, start)
        items.append(Setting(name, value))
        at = _skip(text, at)
    return tuple(items)


def _skip(text: str, at: int) -> int:
    while at < len(text) and text[at] in " \t":
        at += 1
    return at


def _value(site: Site, start: int) -> tuple[Value, int]:
    """Give the value that begins at `start`, and the offset behind it."""
    text = site.card.text
    if start == len(text):
        raise site.fault(start, "the value is missing", "write .param name=value")
    closing = _CLOSING.get(text[start])
    if closing is not None:
        end = text.find(closing, start + 1)
        if end < 0:
            raise site.fault(start, f"this is not closed: {closing} is missing")
        if closing == '"':
            raise site.fault(start, "text as a parameter is not supported by this version", wide=end + 1 - start)
        return parse_formula(site, text[start + 1 : end], start, start + 1), end + 1
    end, depth = start, 0
    while end < len(text) and (depth > 0 or text[end] not in " \t,"):
        depth += {"(": 1, ")": -1}.get(text[end], 0)
        end += 1
    return parse_formula(site, text[start:end], start, start), end
