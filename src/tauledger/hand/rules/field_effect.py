"""Looking into the gate, the source and the drain of a transistor whose terminals see R_S and R_D.

A lone voltage-controlled current source without resistance at its control is one of these.
"""

from __future__ import annotations

import math

from tauledger.hand.elements import Cell
from tauledger.hand.rules.rule import Outside, Rule, inverse

BOOK = "Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed., 2009"
SOURCE_BOOK = f"{BOOK}, sec. 3.3.4, 3.3.7 and 3.3.9"


def gate_ohm(_cell: Cell, _outside: Outside) -> float:
    """Give infinity: no signal current flows into a gate at mid-band.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.2.
    """
    return math.inf


def source_ohm(cell: Cell, outside: Outside) -> float:
    """Give (r_o + R_D)/[1 + (gm + g_mb)·r_o] in ohm; 1/(gm + g_mb) where r_o is infinite.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.4.
    """
    gm = cell.gm + cell.body_gm
    if math.isinf(cell.r_o):
        return inverse(gm)
    return (cell.r_o + outside.output) * inverse(1.0 + gm * cell.r_o)


def source_short_ohm(cell: Cell, _outside: Outside) -> float:
    """Give 1/(gm + g_mb) in ohm."""
    return inverse(cell.gm + cell.body_gm)


def drain_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_o + R_S + (gm + g_mb)·r_o·R_S in ohm.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.9.
    """
    if math.isinf(cell.r_o) or math.isinf(outside.common):
        return math.inf
    return cell.r_o + outside.common + (cell.gm + cell.body_gm) * cell.r_o * outside.common


def drain_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_o·(1 + gm·R_S) in ohm."""
    return math.inf if math.isinf(outside.common) else cell.r_o * (1.0 + cell.gm * outside.common)


GATE = Rule(
    name="into gate",
    formula="∞",
    valid="a control without resistance to the common node",
    source=f"{BOOK}, sec. 3.3.2",
    ohm=gate_ohm,
    operands=(),
)
SOURCE = Rule(
    name="into source",
    formula="(r_o + R_D)/[1 + (gm + g_mb)·r_o]",
    valid="the drain sees a resistance R_D to AC ground; the body is at AC ground",
    source=SOURCE_BOOK,
    ohm=source_ohm,
    operands=("gm", "g_mb", "R_D", "r_o"),
    short="1/(gm + g_mb)",
    short_ohm=source_short_ohm,
)
DRAIN = Rule(
    name="into drain",
    formula="r_o + R_S + (gm + g_mb)·r_o·R_S",
    valid="the source sees a resistance R_S to AC ground; the body is at AC ground",
    source=SOURCE_BOOK,
    ohm=drain_ohm,
    operands=("r_o", "gm", "g_mb", "R_S"),
    short="r_o·(1 + gm·R_S)",
    short_ohm=drain_short_ohm,
)
