"""What a looking-in rule is: a formula, where it holds, who published it, and its two forms."""

from __future__ import annotations

import math
from collections.abc import Callable

from msgspec import Struct

from tauledger.hand.elements import Cell


class Outside(Struct, frozen=True):
    """The resistances in ohm from the control, the common and the output node to AC ground, the cell taken out."""

    control: float = 0.0
    common: float = 0.0
    output: float = 0.0


class Rule(Struct, frozen=True):
    """One looking-in rule.

    name: where one looks, in the words of a bipolar or field-effect transistor. formula: exact closed form.
    short: what paper has instead, or empty. valid: where the formula holds. source: author, title, year, section.
    ohm: the closed form. short_ohm: the short form, printed where it is within 0.5 % of the closed form.
    operands: symbols whose values are printed beside it.
    """

    name: str
    formula: str
    valid: str
    source: str
    ohm: Callable[[Cell, Outside], float]
    operands: tuple[str, ...]
    short: str = ""
    short_ohm: Callable[[Cell, Outside], float] | None = None


def parallel(a: float, b: float) -> float:
    """Give a ‖ b in ohm; 0 or infinite where one of them is."""
    if a == 0.0 or b == 0.0:
        return 0.0
    if math.isinf(a):
        return b
    return a if math.isinf(b) else a * b / (a + b)


def divider(cell: Cell, control: float) -> float:
    """Give r_pi/(r_pi + R), what a resistance R in the control leaves of its voltage: 1 for a gate."""
    if math.isinf(cell.r_pi):
        return 1.0
    return 0.0 if math.isinf(control) else cell.r_pi / (cell.r_pi + control)


def inverse(siemens: float) -> float:
    """Give 1/g in ohm; infinite for no conductance."""
    return 1.0 / siemens if siemens else math.inf
