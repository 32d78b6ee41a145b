"""A formula as text for ngspice, by whitelist: generated names, finite numbers, known operators and functions.

Everything stands in parentheses, so that no precedence is left to be read differently.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from tauledger.circuit import Apply, Current, Formula, Number, Variable, Voltage, fold
from tauledger.devices.family import names
from tauledger.errors import EngineError

OPERATORS = frozenset({"+", "-", "*", "/", "^", "<", ">", "<=", ">=", "==", "!=", "&&", "||"})
FUNCTIONS = names(
    """abs sgn sqrt exp ln log log10 sin cos tan asin acos atan sinh cosh tanh asinh acosh atanh floor ceil nint
    u u2 uramp ddt min max pow pwr ternary_fcn eq0 ne0 gt0 lt0 ge0 le0 pwl"""
)
VARIABLES = frozenset({"temper", "hertz", "time"})


def written(formula: Formula, nodes: Sequence[str], elements: Mapping[str, str]) -> str:
    """Write a formula.

    nodes: generated name by node number. elements: generated name by folded name of the sources whose current it takes.
    Raises EngineError for what is not on the whitelist and for a number that is not finite.
    """

    def write(part: Formula) -> str:
        match part:
            case Number(value=value):
                if not math.isfinite(value):
                    raise EngineError("a number of a formula is not finite")
                return f"({float(value)!r})"
            case Voltage(plus=plus, minus=minus):
                return _difference(nodes, plus, minus)
            case Current(source=source):
                return f"i({elements[fold(source)]})"
            case Variable(name=name) if name in VARIABLES:
                return name
            case Apply(function="-" | "!" as sign, arguments=(operand,)):
                return f"({sign}{write(operand)})"
            case Apply(function="?:", arguments=(condition, yes, no)):
                return f"({write(condition)} ? {write(yes)} : {write(no)})"
            case Apply(function=sign, arguments=(left, right)) if sign in OPERATORS:
                return f"({write(left)} {sign} {write(right)})"
            case Apply(function="table", arguments=(x, first, *rest)) if len(rest) > 1:
                # beyond its ends a table stays, and pwl goes on
                held = Apply("max", (Apply("min", (x, rest[-2])), first))
                return write(Apply("pwl", (held, first, *rest)))
            case Apply(function=function, arguments=arguments) if function in FUNCTIONS:
                return f"{function}({','.join(map(write, arguments))})"
        raise EngineError(f"a formula holds {_what(part)}, which has no place in the engine's deck")

    return write(formula)


def _difference(nodes: Sequence[str], plus: int, minus: int) -> str:
    match bool(plus), bool(minus):
        case True, True:
            return f"v({nodes[plus]},{nodes[minus]})"
        case True, False:
            return f"v({nodes[plus]})"
        case False, True:
            return f"(-v({nodes[minus]}))"
    return "(0.0)"


def _what(part: Formula) -> str:
    match part:
        case Apply(function=name) | Variable(name=name):
            return repr(name)
    return "something unknown"
