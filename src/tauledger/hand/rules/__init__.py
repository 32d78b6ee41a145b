"""Looking-in rules: the resistance into one terminal of a transistor whose other terminals see known resistances.

Each rule is one function with its formula, where it holds, and its source; `RULES` lists them all. Applied to a tree of
cells (no path leads back to where one looks from) they give the driving-point resistance exactly, r_o included. To add
one: a function and a `Rule` here, its choice in hand/looking_in.py, and a published case in tests/hand.
"""

from __future__ import annotations

from tauledger.hand.rules.bipolar import BASE, COLLECTOR, EMITTER
from tauledger.hand.rules.field_effect import DRAIN, GATE, SOURCE
from tauledger.hand.rules.rule import Outside, Rule, parallel
from tauledger.hand.rules.two_terminal import CONTROL_ON_COMMON, DIODE_BOTTOM, DIODE_TOP, OUTPUT_ON_COMMON

RULES: tuple[Rule, ...] = (
    BASE,
    EMITTER,
    COLLECTOR,
    GATE,
    SOURCE,
    DRAIN,
    DIODE_TOP,
    DIODE_BOTTOM,
    CONTROL_ON_COMMON,
    OUTPUT_ON_COMMON,
)

__all__ = ["RULES", "Outside", "Rule", "parallel"]
