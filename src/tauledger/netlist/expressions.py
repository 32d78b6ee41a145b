"""The numeric dialect of {..}, '..' and .param: parsing by grammar/expression.lark, and evaluation.

As ngspice evaluates it before the run: x^y is |x|^y, pow(x, y) keeps the sign, log is the natural logarithm, truth is 1
or 0, `\\` is the integer division, nint rounds half to even. Random functions are refused: a review must come out
the same each time.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Sequence
from functools import cache
from typing import TYPE_CHECKING, Any

from msgspec import Struct

from tauledger.errors import NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.formulas import Call, Formula, Name, Number, Operation, Probe, Tree, formula_parser, offset
from tauledger.netlist.numbers import read_formula_number

if TYPE_CHECKING:
    from lark import Lark, Token

MOST_CHARACTERS = 4000
MOST_OPERATORS = 300


def _sign(x: float) -> float:
    return math.copysign(1.0, x) if x else 0.0


def _choose(condition: float, yes: float, no: float) -> float:
    return yes if condition else no


def _power(x: float, y: float) -> float:
    return math.pow(abs(x), y)


FUNCTIONS: dict[str, tuple[int, Callable[..., float]]] = {
    "abs": (1, abs),
    "sgn": (1, _sign),
    "sqrt": (1, math.sqrt),
    "sqr": (1, lambda x: x * x),
    "exp": (1, math.exp),
    "ln": (1, math.log),
    "log": (1, math.log),
    "log10": (1, math.log10),
    "sin": (1, math.sin),
    "cos": (1, math.cos),
    "tan": (1, math.tan),
    "asin": (1, math.asin),
    "acos": (1, math.acos),
    "atan": (1, math.atan),
    "arctan": (1, math.atan),
    "sinh": (1, math.sinh),
    "cosh": (1, math.cosh),
    "tanh": (1, math.tanh),
    "asinh": (1, math.asinh),
    "acosh": (1, math.acosh),
    "atanh": (1, math.atanh),
    "int": (1, lambda x: float(math.trunc(x))),
    "nint": (1, lambda x: float(round(x))),
    "floor": (1, lambda x: float(math.floor(x))),
    "ceil": (1, lambda x: float(math.ceil(x))),
    "min": (2, min),
    "max": (2, max),
    "pow": (2, math.pow),
    "pwr": (2, _power),
    "ternary_fcn": (3, _choose),
}
POWERS = {
    "pow": "pow(x,y) keeps the sign of x here, as ngspice does; in a behavioural source it takes |x|",
    "pwr": "pwr(x,y) takes |x| here, as ngspice does; in a behavioural source it keeps the sign of x",
}
RANDOM = ("gauss", "agauss", "unif", "aunif", "limit")

_OPERATORS: dict[str, Callable[[float, float], float]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": operator.truediv,
    "%": math.fmod,
    "\\": lambda x, y: float(math.trunc(x / y)),
    "^": _power,
    "**": _power,
    "==": lambda x, y: float(x == y),
    "=": lambda x, y: float(x == y),
    "!=": lambda x, y: float(x != y),
    "<>": lambda x, y: float(x != y),
    "<": lambda x, y: float(x < y),
    ">": lambda x, y: float(x > y),
    "<=": lambda x, y: float(x <= y),
    ">=": lambda x, y: float(x >= y),
    "&&": lambda x, y: float(bool(x) and bool(y)),
    "||": lambda x, y: float(bool(x) or bool(y)),
}


def parse_formula(site: Site, text: str, at: int, inner: int) -> Formula:
    """Parse the text of a formula. at, inner: offsets in the card of its first character and of the text.

    Raises NetlistError at the character where the formula stops making sense.
    """
    from lark import UnexpectedCharacters, UnexpectedToken

    if not text.strip():
        raise site.fault(at, "the formula is empty", "write a number or a formula", wide=len(text) + inner - at + 1)
    check_length(site, text, at)
    try:
        parsed: Any = _parser().parse(text)
    except UnexpectedCharacters as error:
        where = error.pos_in_stream or 0
        raise site.fault(inner + where, f"{text[where]!r} cannot stand in a formula") from error
    except UnexpectedToken as error:
        if error.token.type == "$END":
            unclosed = text.count("(") > text.count(")")
            message = (
                "the formula ends before its last parenthesis is closed" if unclosed else "the formula ends too early"
            )
            raise site.fault(
                inner + len(text), message, "" if unclosed else "an operator needs a value behind it"
            ) from error
        where = error.pos_in_stream or 0
        found = str(error.token)
        raise site.fault(
            inner + where, f"{found!r} cannot stand here in a formula", advice(text, where, found)
        ) from error
    tree: Tree = parsed
    _check_signs(site, tree, text, inner)
    return Formula(text, at, inner, _marked(tree, text) if text.count("?") > 1 else tree)


def check_length(site: Site, text: str, at: int) -> None:
    """Raise NetlistError for a formula beyond the limits, which hold for both dialects."""
    if len(text) > MOST_CHARACTERS or sum(map(text.count, "+-*/%\\^<>=&|!?(,")) > MOST_OPERATORS:
        limits = f"at most {MOST_CHARACTERS} characters and {MOST_OPERATORS} operators and parentheses"
        raise site.fault(at, "the formula is too long", f"split it into parameters: {limits}")


def advice(text: str, where: int, found: str) -> str:
    """Say what would help where a formula stops making sense at `found`; empty where that is not clear."""
    if found[0] in "+-" or text[:where].rstrip()[-1:] in ("+", "-"):
        return "behind an operator only a minus before a number stands: use parentheses"
    if found[0].isdigit() and where and text[where - 1].isalpha():
        return "digits cannot follow a suffix: write 4.7k, not 4k7"
    return "an operator is missing before it" if found[0].isalnum() or found[0] in "_(" else ""


def _check_signs(site: Site, tree: Tree, text: str, inner: int) -> None:
    """Refuse a sign behind a comparison, `?`, `:`, && or || before anything but a number, as ngspice does."""
    if isinstance(tree, Number | Name | Probe):
        return
    if isinstance(tree, Call):
        for part in tree.arguments:
            _check_signs(site, part, text, inner)
        return
    if tree.operator == "negative" or tree.operator == "positive":
        before = text[: tree.at].rstrip()
        if before and before[-1] not in "(," and not isinstance(tree.operands[0], Number):
            raise site.fault(
                inner + tree.at, "behind an operator only a minus before a number stands", "use parentheses"
            )
    for part in tree.operands:
        _check_signs(site, part, text, inner)


def _marked(tree: Tree, text: str) -> Tree:
    """Give "??" to each choice whose middle branch is another one without parentheses: ngspice reads it otherwise."""
    if isinstance(tree, Call):
        return Call(tree.function, tuple(_marked(part, text) for part in tree.arguments), tree.at)
    if not isinstance(tree, Operation):
        return tree
    operator = tree.operator
    if operator == "?" and _bare(tree.operands[1], text):
        operator = "??"
    return Operation(operator, tuple(_marked(part, text) for part in tree.operands), tree.at)


def _bare(branch: Tree, text: str) -> bool:
    """Say whether the middle branch of a choice is a choice that no parentheses enclose."""
    if not (isinstance(branch, Operation) and branch.operator == "?"):
        return False
    depth = 0
    for character in text[text.rfind("?", 0, _first(branch)) + 1 :]:
        depth += (character == "(") - (character == ")")
        if character in "?:" and depth == 0:
            return character == "?"
    return False


def _first(tree: Tree) -> int:
    """Give the offset at which a part of a formula begins, parentheses left out."""
    if isinstance(tree, Operation):
        return min(tree.at, *map(_first, tree.operands))
    return tree.at


class Surrounding(Struct, frozen=True):
    """What a formula needs of the place where it stands.

    parameter: value of a name. call: value of a function of the user's own, None where there is none of that name.
    functions: names of those. fault: makes the error for a part of the tree. remark: takes what the reader must know.
    """

    parameter: Callable[[Name], float]
    call: Callable[[Call, Sequence[float]], float | None]
    functions: Callable[[], Sequence[str]]
    fault: Callable[[Tree, str, str], NetlistError]
    remark: Callable[[str], None]


def evaluate(tree: Tree, here: Surrounding) -> float:
    """Evaluate a formula at its place.

    Raises NetlistError for an unknown function, a wrong number of arguments, and a result that is not finite.
    """
    match tree:
        case Number(value=value):
            return value
        case Name():
            return here.parameter(tree)
        case Operation(operator="?", operands=(condition, yes, no)):
            return evaluate(yes if evaluate(condition, here) else no, here)
        case Operation(operator="??", operands=(condition, Operation(operands=(_, first, _)) as yes, no)):
            return _inner_choice(yes, first, here) if evaluate(condition, here) else evaluate(no, here)
        case Operation(operator="negative", operands=(inner,)):
            return -evaluate(inner, here)
        case Operation(operator="positive", operands=(inner,)):
            return evaluate(inner, here)
        case Operation(operator="!", operands=(inner,)):
            return float(not evaluate(inner, here))
        case Operation(operator=sign, operands=(left, right)):
            values = [evaluate(left, here), evaluate(right, here)]
            if sign in ("^", "**") and values[0] < 0.0:
                here.remark(f"({values[0]:.6g}){sign}{values[1]:.6g} is taken as |x|^y, as ngspice does")
            return _finite(tree, _OPERATORS[sign], values, here.fault)
        case Call(function=name, arguments=arguments):
            values = [evaluate(part, here) for part in arguments]
            own = here.call(tree, values)
            if own is not None:
                return own
            if name.lower() in ("pow", "pwr") and len(values) == 2 and values[0] < 0.0:
                here.remark(POWERS[name.lower()])
            function = _function(tree, name, len(arguments), here)
            return _finite(tree, function, values, here.fault)
    raise TypeError(tree)


def _inner_choice(choice: Operation, first: Tree, here: Surrounding) -> float:
    """Evaluate c ? x : y in a ? c ? x : y : z, for which ngspice takes x whatever c is."""
    value = evaluate(choice, here)
    if (theirs := evaluate(first, here)) != value:
        here.remark(
            f"a choice inside a choice without parentheses, a?c?x:y:z, is a?(c?x:y):z here and gives {value:.6g}; "
            f"ngspice gives {theirs:.6g}, x whatever c is: write the parentheses"
        )
    return value


def _function(tree: Call, name: str, count: int, here: Surrounding) -> Callable[..., float]:
    known, fault = FUNCTIONS.get(name.lower()), here.fault
    if known is None:
        if name.lower() in RANDOM:
            raise fault(
                tree, f"{name} draws a random number", "a review must come out the same each time: write a value"
            )
        raise fault(tree, f"no function is called {name!r}", nearest(name, [*FUNCTIONS, *here.functions()]))
    arity, function = known
    if count != arity:
        wanted = "1 argument" if arity == 1 else f"{arity} arguments"
        raise fault(tree, f"{name} takes {wanted}, not {count}", "")
    return function


def _finite(
    tree: Operation | Call,
    function: Callable[..., float],
    arguments: list[float],
    fault: Callable[[Tree, str, str], NetlistError],
) -> float:
    try:
        result = function(*arguments)
    except (ValueError, ArithmeticError) as error:
        raise _impossible(tree, arguments, fault) from error
    if not math.isfinite(result):
        raise _impossible(tree, arguments, fault)
    return result


def _impossible(
    tree: Operation | Call, arguments: list[float], fault: Callable[[Tree, str, str], NetlistError]
) -> NetlistError:
    values = [f"{value:.6g}" for value in arguments]
    if isinstance(tree, Call):
        said = f"{tree.function}({', '.join(values)})"
    else:
        said = f"{values[0]} {tree.operator} {values[1]}"
    return fault(tree, f"{said} has no finite value", "")


@cache
def _parser() -> Lark:
    def signed(children: Sequence[Token]) -> Number:
        return Number(-read_formula_number(str(children[1])), offset(children[0]))

    return formula_parser("expression.lark", read_formula_number, signed)
