"""A formula at the operating point: its value and its derivative by every voltage and current in it, exactly.

Both are carried through the formula together, as ngspice understands its functions: x^y and pow(x, y) are |x|^y,
pwr(x, y) keeps the sign of x, log is natural, a comparison is 1 or 0 and flat, pwl goes on beyond its ends as at them
and a table stays. A derivative by time, ddt, is nothing: at rest, and in ngspice's AC analysis (measured) as well.

Source: Griewank and Walther, "Evaluating Derivatives", 2nd ed., 2008, chapter 3 (forward mode).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from itertools import pairwise

from msgspec import Struct

from tauledger.circuit import Apply, Circuit, Current, Formula, Number, Variable, Voltage
from tauledger.errors import ElementError
from tauledger.solution import Bias

Control = Voltage | Current


class Slope(Struct, frozen=True):
    """A value and its derivative by each control that moves it."""

    value: float
    by: Mapping[Control, float]


class NoDerivative(Exception):
    """The formula has no finite value or derivative there; says why."""


def at_bias(formula: Formula, circuit: Circuit, bias: Bias, owner: str) -> Slope:
    """Give value and derivatives of a formula at the operating point.

    Raises ElementError where it has no finite derivative there.
    """
    try:
        found = _slope(formula, circuit, bias)
        if not all(map(math.isfinite, (found.value, *found.by.values()))):
            raise NoDerivative("a value is not finite")
    except (NoDerivative, OverflowError, ZeroDivisionError, ValueError) as reason:
        raise ElementError(
            owner,
            f"the formula of {owner} has no derivative at its operating point ({reason})",
            "keep it away from such a point, or write the formula otherwise",
        ) from reason
    return Slope(found.value, {control: slope for control, slope in found.by.items() if slope})


def _slope(formula: Formula, circuit: Circuit, bias: Bias) -> Slope:
    match formula:
        case Number(value=value):
            return Slope(value, {})
        case Voltage(plus=plus, minus=minus):
            by: dict[Control, float] = {} if plus == minus else {formula: 1.0}
            return Slope(float(bias.voltages[plus] - bias.voltages[minus]), by)
        case Current(source=source):
            return Slope(bias.currents[source], {formula: 1.0})
        case Variable(name="temper"):
            return Slope(circuit.temperature_c, {})
        case Variable(name="time"):
            return Slope(0.0, {})
        case Apply(function=function, arguments=arguments):
            return _apply(function, [_slope(argument, circuit, bias) for argument in arguments])
    raise TypeError(formula)


def _apply(function: str, x: Sequence[Slope]) -> Slope:
    match function, len(x):
        case "-", 1:
            return _chain(-x[0].value, (-1.0, x[0]))
        case "ddt", 1:
            return Slope(0.0, {})
        case "!", 1:
            return Slope(float(not x[0].value), {})
        case (("?:" | "ternary_fcn"), 3):
            return x[1] if x[0].value else x[2]
        case (("pwl" | "table"), _):
            return _piecewise(x[0], [point.value for point in x[1:]], held=function == "table")
        case _, 1:
            rule = ONE[function]
            value, slope = rule(x[0].value)
            return _chain(value, (slope, x[0])) if x[0].by else Slope(value, {})
        case _, 2:
            return _two(function, x[0], x[1])
    raise TypeError(function)


def _two(function: str, x: Slope, y: Slope) -> Slope:
    a, b = x.value, y.value
    match function:
        case "+":
            return _chain(a + b, (1.0, x), (1.0, y))
        case "-":
            return _chain(a - b, (1.0, x), (-1.0, y))
        case "*":
            return _chain(a * b, (b, x), (a, y))
        case "/":
            return _chain(a / b, (1.0 / b, x), (-a / b**2, y))
        case "^" | "pow" | "pwr":
            return _power(x, y, signed=function == "pwr")
        case "min":
            return x if a < b else y
        case "max":
            return x if a > b else y
    return Slope(float(COMPARE[function](a, b)), {})


def _power(x: Slope, y: Slope, *, signed: bool) -> Slope:
    """|x|^y, or with the sign of x; by y as well where that moves."""
    a, b = abs(x.value), y.value
    sign = math.copysign(1.0, x.value)
    if a == 0.0 and b < 1.0 and x.by:
        raise NoDerivative("a power of 0")
    value = a**b
    by_a = b * a ** (b - 1.0) if b else 0.0
    terms = [(by_a if signed else by_a * sign, x)]
    if y.by:
        if a == 0.0:
            raise NoDerivative("a power of 0")
        terms.append((value * math.log(a) * (sign if signed else 1.0), y))
    return _chain(sign * value if signed else value, *terms)


def _piecewise(x: Slope, numbers: Sequence[float], *, held: bool) -> Slope:
    points = list(zip(numbers[::2], numbers[1::2], strict=True))
    for (_, level), beyond in ((points[0], x.value < points[0][0]), (points[-1], x.value > points[-1][0])):
        if held and beyond:
            return Slope(level, {})
    for (x0, y0), (x1, y1) in pairwise(points):
        if x.value < x1 or (x1, y1) == points[-1]:
            slope = (y1 - y0) / (x1 - x0)
            return _chain(y0 + slope * (x.value - x0), (slope, x))
    raise NoDerivative("a table needs two points")


def _chain(value: float, *terms: tuple[float, Slope]) -> Slope:
    by: dict[Control, float] = {}
    for factor, inner in terms:
        for control, slope in inner.by.items():
            by[control] = by.get(control, 0.0) + factor * slope
    return Slope(value, by)


def _step(x: float) -> float:
    return 0.5 if x == 0.0 else float(x > 0.0)


def _flat(f: Callable[[float], float]) -> Callable[[float], tuple[float, float]]:
    return lambda x: (float(f(x)), 0.0)


def _with(f: Callable[[float], float], slope: Callable[[float], float]) -> Callable[[float], tuple[float, float]]:
    return lambda x: (f(x), slope(x))


def _sign(x: float) -> float:
    return math.copysign(1.0, x) if x else 0.0


ONE: Mapping[str, Callable[[float], tuple[float, float]]] = {
    "abs": _with(abs, _sign),
    "sgn": _flat(_sign),
    "sqrt": _with(math.sqrt, lambda x: 0.5 / math.sqrt(x)),
    "exp": _with(math.exp, math.exp),
    "ln": _with(math.log, lambda x: 1.0 / x),
    "log": _with(math.log, lambda x: 1.0 / x),
    "log10": _with(math.log10, lambda x: 1.0 / (x * math.log(10.0))),
    "sin": _with(math.sin, math.cos),
    "cos": _with(math.cos, lambda x: -math.sin(x)),
    "tan": _with(math.tan, lambda x: 1.0 / math.cos(x) ** 2),
    "asin": _with(math.asin, lambda x: 1.0 / math.sqrt(1.0 - x**2)),
    "acos": _with(math.acos, lambda x: -1.0 / math.sqrt(1.0 - x**2)),
    "atan": _with(math.atan, lambda x: 1.0 / (1.0 + x**2)),
    "sinh": _with(math.sinh, math.cosh),
    "cosh": _with(math.cosh, math.sinh),
    "tanh": _with(math.tanh, lambda x: 1.0 / math.cosh(x) ** 2),
    "asinh": _with(math.asinh, lambda x: 1.0 / math.sqrt(x**2 + 1.0)),
    "acosh": _with(math.acosh, lambda x: 1.0 / math.sqrt(x**2 - 1.0)),
    "atanh": _with(math.atanh, lambda x: 1.0 / (1.0 - x**2)),
    "floor": _flat(math.floor),
    "ceil": _flat(math.ceil),
    "nint": _flat(round),
    "u": _flat(_step),
    "u2": _with(lambda x: min(max(x, 0.0), 1.0), lambda x: _step(x) - _step(x - 1.0)),
    "uramp": _with(lambda x: max(x, 0.0), _step),
    "eq0": _flat(lambda x: x == 0.0),
    "ne0": _flat(lambda x: x != 0.0),
    "gt0": _flat(lambda x: x > 0.0),
    "lt0": _flat(lambda x: x < 0.0),
    "ge0": _flat(lambda x: x >= 0.0),
    "le0": _flat(lambda x: x <= 0.0),
}

COMPARE: Mapping[str, Callable[[float, float], bool]] = {
    "<": lambda a, b: a < b,
    ">": lambda a, b: a > b,
    "<=": lambda a, b: a <= b,
    ">=": lambda a, b: a >= b,
    "==": lambda a, b: a == b,
    "!=": lambda a, b: a != b,
    "&&": lambda a, b: bool(a) and bool(b),
    "||": lambda a, b: bool(a) or bool(b),
}
