"""Cells with two of their terminals on one node: diode-connected, also through r_b, or without control voltage."""

from __future__ import annotations

import math

from tauledger.hand.elements import Cell
from tauledger.hand.rules.rule import Outside, Rule, divider, inverse

BOOK = "Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed., 2009, sec. 4.2"


def diode_siemens(cell: Cell) -> float:
    """Give g = gm + 1/r_o + 1/r_π in S of a cell whose control is its output.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 4.2 (current mirrors).
    """
    return cell.gm + 1.0 / cell.r_o + 1.0 / cell.r_pi


def diode_top_ohm(cell: Cell, outside: Outside) -> float:
    """Give R_S + (1 + g_mb·R_S)/g in ohm, seen from the joined control and output."""
    if math.isinf(outside.common):
        return math.inf
    return outside.common + (1.0 + cell.body_gm * outside.common) * inverse(diode_siemens(cell))


def diode_top_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give R_S + 1/gm in ohm."""
    return outside.common + inverse(cell.gm)


def diode_bottom_ohm(cell: Cell, outside: Outside) -> float:
    """Give (1 + g·R_D)/(g + g_mb) in ohm, seen from the common node."""
    g = diode_siemens(cell)
    if math.isinf(outside.output):
        return math.inf if g else inverse(cell.body_gm)
    return (1.0 + g * outside.output) * inverse(g + cell.body_gm)


def diode_bottom_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give R_D + 1/gm in ohm."""
    return outside.output + inverse(cell.gm)


def diode_through_resistance_ohm(cell: Cell, r_b: float, r_c: float) -> float:
    """Give the two-terminal resistance in ohm of a transistor diode-connected outside its r_b and r_c.

    (r_π + r_b)/(β + 1) ‖ r_o for r_c = 0; r_c adds to the collector branch. Source: Gray, Hurst, Lewis and Meyer,
    5th ed., 2009, sec. 4.2, with the series resistances kept.
    """
    base = 1.0 / (cell.r_pi + r_b)
    collector = (cell.gm * divider(cell, r_b) + 1.0 / cell.r_o) / (1.0 + r_c / cell.r_o)
    return inverse(base + collector)


def control_on_common_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_o plus what lies beyond it in ohm: without control voltage only r_o is left."""
    return cell.r_o + outside.output + outside.common


def output_on_common_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_π plus what lies beyond it in ohm: a current from a node into itself does nothing."""
    return cell.r_pi + outside.control + outside.common


DIODE_TOP = Rule(
    name="through diode-connected",
    formula="R_S + (1 + g_mb·R_S)/g, g = gm + 1/r_o + 1/r_π",
    valid="control and output are one node",
    source=BOOK,
    ohm=diode_top_ohm,
    operands=("gm", "R_S"),
    short="R_S + 1/gm",
    short_ohm=diode_top_short_ohm,
)
DIODE_BOTTOM = Rule(
    name="up through diode-connected",
    formula="(1 + g·R_D)/(g + g_mb), g = gm + 1/r_o + 1/r_π",
    valid="control and output are one node",
    source=BOOK,
    ohm=diode_bottom_ohm,
    operands=("gm", "R_D"),
    short="R_D + 1/gm",
    short_ohm=diode_bottom_short_ohm,
)
CONTROL_ON_COMMON = Rule(
    name="through r_o of",
    formula="r_o + R",
    valid="control and common are one node",
    source="Ohm's law: the controlled current is zero",
    ohm=control_on_common_ohm,
    operands=("r_o", "R"),
)
OUTPUT_ON_COMMON = Rule(
    name="through r_π of",
    formula="r_π + R",
    valid="output and common are one node",
    source="Ohm's law: the controlled current returns to its own node",
    ohm=output_on_common_ohm,
    operands=("r_π", "R"),
)
