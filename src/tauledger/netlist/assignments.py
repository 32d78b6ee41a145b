"""The assignments of `.param`, `.func` and `.nodeset` cards: NAME=VALUE, NAME(X,Y)=BODY, V(NODE)=VALUE.

A value is a number, a bare formula without blanks outside parentheses, or a formula in braces or quotes.
"""

from __future__ import annotations

import re

from tauledger.errors import NetlistError
from tauledger.netlist.behaviour import OF_THE_RUN, parse_behaviour
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.expressions import parse_formula
from tauledger.netlist.items import Function, Item, Setting, Value, Word

_NAME = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")
_NODE = re.compile(r"(?:v\s*\(\s*([^(),\s]+)\s*\)|all)\s*=", re.IGNORECASE)
# No node can have this name.
ALL = "v(*)"
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
            function, at = _function(site, name, equals)
            items.append(function)
            at = _skip(text, at)
            continue
        if equals == len(text) or text[equals] != "=":
            message = "name=value is expected here"
            raise site.fault(name, message, "a formula with blanks stands in braces: name={a + b}")
        start = _skip(text, equals + 1)
        value, at = _value(site, start)
        items.append(Setting(name, value))
        at = _skip(text, at)
    return tuple(items)


def parse_functions(site: Site) -> tuple[Item, ...]:
    """Give the items of a `.func` card: its word and one function, NAME(X,Y) {BODY}, with or without equals sign."""
    text = site.card.text
    word = text.split(maxsplit=1)[0]
    at = _skip(text, len(word))
    match = _NAME.match(text, at)
    opening = _skip(text, match.end()) if match else at
    if match is None or text[opening : opening + 1] != "(":
        raise site.fault(at, "the name of a function and its arguments are expected here", "write .func f(x) {2*x}")
    function, end = _function(site, Word(match.group(), at), opening)
    if text[end:].strip():
        raise site.fault(_skip(text, end), "the function has ended before this", "put its body in braces: {..}")
    return (Word(word, 0), function)


def parse_nodesets(site: Site) -> tuple[Item, ...]:
    """Give the items of a `.nodeset` card: its word and a setting for each v(node)=value; ALL names them all."""
    text = site.card.text
    word = text.split(maxsplit=1)[0]
    items: list[Item] = [Word(word, 0)]
    at = _skip(text, len(word))
    while at < len(text):
        match = _NODE.match(text, at)
        if match is None:
            raise site.fault(at, "v(node)=value is expected here", "write .nodeset v(out)=2.5")
        name = Word(match.group(1), match.start(1)) if match.group(1) else Word(ALL, at)
        value, at = _value(site, _skip(text, match.end()))
        items.append(Setting(name, value))
        at = _skip(text, at)
    return tuple(items)


def _function(site: Site, name: Word, opening: int) -> tuple[Function, int]:
    """Read the arguments that begin at `opening` and the body; give the offset behind it."""
    text = site.card.text
    closing = text.find(")", opening)
    if closing < 0:
        raise site.fault(opening, "this parenthesis is not closed", "close it with )")
    parameters = tuple(text[opening + 1 : closing].replace(",", " ").split())
    for parameter in parameters:
        if _NAME.fullmatch(parameter) is None:
            raise site.fault(text.find(parameter, opening), "the name of an argument is expected here")
    start = _skip(text, closing + 1)
    if text[start : start + 1] == "=":
        start = _skip(text, start + 1)
    if start == len(text):
        raise site.fault(start, "the body of the function is missing", "write .func f(x) {2*x}")
    quote = _CLOSING.get(text[start], "")
    end = text.find(quote, start + 1) if quote else start + len(text[start:].split(maxsplit=1)[0])
    if end < 0:
        raise site.fault(start, f"this is not closed: {quote} is missing")
    inner = start + len(quote)
    body = text[inner:end]
    if OF_THE_RUN.search(body):
        return Function(name, parameters, None, parse_behaviour(site, body, start, inner)), end + len(quote)
    formula = parse_formula(site, body, start, inner)
    try:
        behaviour = parse_behaviour(site, body, start, inner)
    except NetlistError:
        # The numeric dialect has operators that a source does not have.
        return Function(name, parameters, formula, None), end + len(quote)
    return Function(name, parameters, formula, behaviour), end + len(quote)


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
