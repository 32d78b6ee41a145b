"""Looking into the base, the emitter and the collector of a transistor whose terminals see R_B, R_E and R_C."""

from __future__ import annotations

import math

from tauledger.hand.elements import Cell
from tauledger.hand.rules.rule import Outside, Rule, divider, inverse, parallel

SOURCE = "Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed., 2009, ch. 3"


def base_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_π + R_E·[r_o·(β + 1) + R_C]/(r_o + R_C + R_E) in ohm; r_π + (β + 1)·r_o + R_C where R_E is infinite.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.8 (emitter degeneration), with R_C kept.
    """
    r_pi, r_o, beta = cell.r_pi, cell.r_o, cell.beta
    r_e, r_c = outside.common, outside.output
    if r_e == 0.0:
        return r_pi
    if math.isinf(r_o):
        return r_pi + (beta + 1.0) * r_e
    if math.isinf(r_c):
        return r_pi + r_e
    if math.isinf(r_e):
        return r_pi + (beta + 1.0) * r_o + r_c
    return r_pi + r_e * (r_o * (beta + 1.0) + r_c) / (r_o + r_c + r_e)


def base_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_π + (β + 1)·R_E in ohm."""
    return cell.r_pi + (cell.beta + 1.0) * outside.common


def emitter_ohm(cell: Cell, outside: Outside) -> float:
    """Give R from 1/R = 1/(r_π + R_B) + [1 + β·r_o/(r_π + R_B)]/(r_o + R_C) in ohm.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.3 and 3.3.6, with r_o and R_C kept.
    """
    return inverse(1.0 / (cell.r_pi + outside.control) + _into_common_siemens(cell, outside))


def emitter_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give (r_π + R_B)/(β + 1) in ohm."""
    return (cell.r_pi + outside.control) * inverse(cell.beta + 1.0)


def collector_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_o + R' + gm·r_o·R'·r_π/(r_π + R_B) in ohm, R' = R_E ‖ (r_π + R_B).

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 3.3.8, with R_B kept.
    """
    r = parallel(outside.common, cell.r_pi + outside.control)
    if math.isinf(cell.r_o) or math.isinf(r):
        return math.inf
    return cell.r_o + r + cell.gm * divider(cell, outside.control) * cell.r_o * r


def collector_short_ohm(cell: Cell, outside: Outside) -> float:
    """Give r_o·[1 + gm·(R_E ‖ r_π)] in ohm."""
    return cell.r_o * (1.0 + cell.gm * parallel(outside.common, cell.r_pi))


def _into_common_siemens(cell: Cell, outside: Outside) -> float:
    gm = cell.gm * divider(cell, outside.control)
    if math.isinf(cell.r_o):
        return gm
    return 0.0 if math.isinf(outside.output) else (1.0 + gm * cell.r_o) / (cell.r_o + outside.output)


BASE = Rule(
    name="into base",
    formula="r_π + R_E·[r_o·(β + 1) + R_C]/(r_o + R_C + R_E)",
    valid="collector and emitter see separate resistances R_C and R_E to AC ground",
    source=f"{SOURCE}, sec. 3.3.8",
    ohm=base_ohm,
    operands=("r_π", "β", "R_E", "R_C", "r_o"),
    short="r_π + (β + 1)·R_E",
    short_ohm=base_short_ohm,
)
EMITTER = Rule(
    name="into emitter",
    formula="1/{1/(r_π + R_B) + [1 + β·r_o/(r_π + R_B)]/(r_o + R_C)}",
    valid="base and collector see separate resistances R_B and R_C to AC ground",
    source=f"{SOURCE}, sec. 3.3.3 and 3.3.6",
    ohm=emitter_ohm,
    operands=("r_π", "β", "R_B", "R_C", "r_o"),
    short="(r_π + R_B)/(β + 1)",
    short_ohm=emitter_short_ohm,
)
COLLECTOR = Rule(
    name="into collector",
    formula="r_o + R' + β·r_o·R'/(r_π + R_B), R' = R_E ‖ (r_π + R_B)",
    valid="base and emitter see separate resistances R_B and R_E to AC ground",
    source=f"{SOURCE}, sec. 3.3.8",
    ohm=collector_ohm,
    operands=("r_o", "gm", "R_E", "r_π", "R_B"),
    short="r_o·[1 + gm·(R_E ‖ r_π)]",
    short_ohm=collector_short_ohm,
)
