"""The behavioural dialect of B, E, G and of R C L given by a formula: its grammar, and the formula of the circuit.

As ngspice evaluates it during the run: x^y is |x|^y and so is pow(x, y), pwr(x, y) keeps the sign (in .param it is the
other way round), log is the natural logarithm. Parameters are put in as numbers; pi and e win over parameters of that
name.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from functools import cache
from typing import TYPE_CHECKING, Any

from msgspec import Struct

from tauledger import circuit
from tauledger.circuit import fold
from tauledger.errors import NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.expressions import advice, check_length
from tauledger.netlist.formulas import Behaviour, Call, Name, Number, Operation, Probe, Tree, formula_parser, offset
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, check_call, find, find_function, known_functions, known_names

if TYPE_CHECKING:
    from lark import Lark, Token

# What makes a formula a behavioural one: it can only be worked out during the run.
OF_THE_RUN = re.compile(r"(?<![\w.])(?:[vi]\s*\(|(?:temper|hertz|time)\b)", re.IGNORECASE)

CONSTANTS = {"pi": math.pi, "e": math.e}
VARIABLES = frozenset({"temper", "hertz", "time"})

_ONE = """abs sgn sqrt exp ln log log10 sin cos tan asin acos atan sinh cosh tanh asinh acosh atanh floor ceil nint
u u2 uramp ddt eq0 ne0 gt0 lt0 ge0 le0"""
# Number of arguments; pwl takes a variable and pairs.
FUNCTIONS: dict[str, int] = dict.fromkeys(_ONE.split(), 1)
FUNCTIONS |= {"min": 2, "max": 2, "pow": 2, "pwr": 2, "ternary_fcn": 3, "pwl": -1}

# What comes after this room walks a formula level by level and part by part.
MOST_DEEP = 100
MOST_PARTS = 5000

Fault = Callable[[Tree, str, str], NetlistError]

_SAME = {"**": "^", "<>": "!=", "negative": "-", "?": "?:"}


def parse_behaviour(site: Site, text: str, at: int, inner: int) -> Behaviour:
    """Parse the text of a behavioural expression.

    at, inner: offsets in the card of its first character, quote included, and of the text.
    Raises NetlistError at the character where it stops making sense.
    """
    from lark import UnexpectedCharacters, UnexpectedToken

    if not text.strip():
        raise site.fault(at, "the formula is empty", "write a number or a formula", wide=len(text) + inner - at + 1)
    check_length(site, text, at)
    # Inside a behavioural expression braces are parentheses: parameters are known by name.
    plain = text.translate({ord("{"): "(", ord("}"): ")"})
    try:
        parsed: Any = _parser().parse(plain)
    except UnexpectedCharacters as error:
        where = error.pos_in_stream or 0
        raise site.fault(inner + where, f"{text[where]!r} cannot stand in a formula") from error
    except UnexpectedToken as error:
        if error.token.type == "$END":
            unclosed = plain.count("(") > plain.count(")")
            ends = "before its last parenthesis is closed" if unclosed else "too early"
            hint = "" if unclosed else "an operator needs a value behind it"
            raise site.fault(inner + len(text), f"the formula ends {ends}", hint) from error
        where, found = error.pos_in_stream or 0, str(error.token)
        message = f"{found!r} cannot stand here in a formula"
        raise site.fault(inner + where, message, advice(plain, where, found)) from error
    return Behaviour(text, at, inner, parsed)


def formula_of(
    site: Site,
    expression: Behaviour,
    *,
    scope: Scope,
    node: Callable[[str], int],
    source: Callable[[str], str],
) -> circuit.Formula:
    """Turn an expression into the formula of an element.

    scope: where its parameters and functions are looked up. node, source: number of a node and flat name of a voltage
    source by the name on the card.
    Raises NetlistError for a name or function that is not known and for a wrong number of arguments.
    """

    def convert(tree: Tree, given: Mapping[str, circuit.Formula], fault: Fault) -> circuit.Formula:
        match tree:
            case Number(value=value):
                return circuit.Number(value)
            case Name(text=text):
                return named(tree, fold(text), given, fault)
            case Probe(kind="i", names=names):
                return circuit.Current(source(names[0]))
            case Probe(names=names):
                return circuit.Voltage(node(names[0]), node(names[1]) if len(names) > 1 else 0)
            case Operation(operator="positive", operands=(inner,)):
                return convert(inner, given, fault)
            case Operation(operator="negative", operands=(Number(value=value),)):
                return circuit.Number(-value)
            case Operation(operator=sign, operands=operands):
                return circuit.Apply(_SAME.get(sign, sign), tuple(convert(part, given, fault) for part in operands))
            case Call():
                return called(tree, tuple(convert(part, given, fault) for part in tree.arguments), fault)
        raise TypeError(tree)

    def named(tree: Name, key: str, given: Mapping[str, circuit.Formula], fault: Fault) -> circuit.Formula:
        if key in given:
            return given[key]
        if key in CONSTANTS:
            return circuit.Number(CONSTANTS[key])
        if key in VARIABLES:
            return circuit.Variable(key)
        value = find(scope, key)
        if value is None:
            hint = nearest(tree.text, known_names(scope), otherwise=f"write v({tree.text}) for the voltage of a node")
            raise fault(tree, f"no parameter is called {tree.text!r}", hint)
        return circuit.Number(value)

    def called(tree: Call, arguments: tuple[circuit.Formula, ...], fault: Fault) -> circuit.Formula:
        known = find_function(scope, fold(tree.function))
        if known is None:
            _check_call(tree, fault, known_functions(scope))
            return circuit.Apply(fold(tree.function), arguments)
        home, function = known
        check_call(scope, tree, function, lambda message, hint: fault(tree, message, hint))
        if function.behaviour is None:
            raise fault(tree, f"{function.name.text} has no meaning in a source", "its body is of the other dialect")
        bound = dict(zip(map(fold, function.parameters), arguments, strict=True))
        found = convert(function.behaviour.tree, bound, _fault_at(home, function.behaviour))
        scope.calls[tree.function] -= 1
        return found

    return convert(expression.tree, {}, _fault_at(site, expression))


class Extent(Struct, frozen=True):
    """How large a formula is when it is written out: operators and functions, and how many stand in one another."""

    size: int
    depth: int


def extent(formula: circuit.Formula) -> Extent:
    """Measure a formula; a part that several others share is measured once."""
    known: dict[int, Extent] = {}

    def measured(part: circuit.Formula) -> Extent:
        if not isinstance(part, circuit.Apply):
            return Extent(1, 0)
        if id(part) not in known:
            inside = [measured(argument) for argument in part.arguments]
            known[id(part)] = Extent(1 + sum(e.size for e in inside), 1 + max((e.depth for e in inside), default=0))
        return known[id(part)]

    return measured(formula)


def applies(formula: circuit.Formula, function: str) -> bool:
    """Say whether a function is called anywhere in a formula."""
    if not isinstance(formula, circuit.Apply):
        return False
    return formula.function == function or any(applies(argument, function) for argument in formula.arguments)


def _fault_at(site: Site, expression: Behaviour) -> Fault:
    def fault(tree: Tree, message: str, hint: str) -> NetlistError:
        wide = len(tree.text) if isinstance(tree, Name) else len(tree.function) if isinstance(tree, Call) else 1
        return site.fault(expression.inner + tree.at, message, hint, wide=wide)

    return fault


def _check_call(tree: Call, fault: Fault, own: Iterable[str]) -> None:
    name, count = fold(tree.function), len(tree.arguments)
    if name in ("v", "i"):
        message = "the voltage between nodes is v(node) or v(node,node)" if name == "v" else "a current is i(source)"
        raise fault(tree, message, "")
    arity = FUNCTIONS.get(name)
    if arity is None:
        raise fault(tree, f"no function of a source is called {tree.function!r}", nearest(name, [*FUNCTIONS, *own]))
    if arity < 0 and (count < 5 or count % 2 == 0):
        raise fault(tree, "pwl takes a value and at least two pairs of numbers", "write pwl(v(in), -1,-5, 1,5)")
    if arity >= 0 and count != arity:
        raise fault(tree, f"{name} takes {arity} argument{'s' if arity > 1 else ''}, not {count}", "")


@cache
def _parser() -> Lark:
    def number(text: str) -> float:
        decimal = read_number(text)
        if decimal is None:
            raise ValueError(text)
        return decimal.value

    def probe(children: Sequence[Token]) -> Probe:
        text = str(children[0])
        inside = text[text.index("(") + 1 : -1]
        return Probe(text[0].lower(), tuple(inside.replace(",", " ").split()), offset(children[0]))

    return formula_parser("behaviour.lark", number, probe)
