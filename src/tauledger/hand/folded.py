"""A resistor across base and emitter, counted in r_π: the loop that it makes is gone, and the rules apply.

Source: common practice; exact without r_b and r_e, which stand between the resistor and r_π.
"""

from __future__ import annotations

import math

from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.hand.arrangements import outer
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit, adjacency
from tauledger.hand.figures import plain


def folded_in_r_pi(circuit: EquivalentCircuit) -> tuple[EquivalentCircuit, tuple[str, ...]]:
    """Give the circuit with every resistor across a base and its emitter in that r_π, and say which, or no words.

    Inner and outer ends count alike. The matrices stay those of the circuit as it is.
    """
    cells, kept = list(circuit.cells), list(circuit.resistors)
    told: list[str] = []
    for k, cell in enumerate(circuit.cells):
        if math.isinf(cell.r_pi) or cell.diode_connected or GROUND in (cell.control, cell.common):
            continue
        base = {cell.control, outer(circuit, cell.control)}
        emitter = {cell.common, outer(circuit, cell.common)}
        for resistor in [one for one in kept if _across(one.a, one.b, base, emitter)]:
            kept.remove(resistor)
            told.append(_fold(cells, k, resistor.name, resistor.ohm))
    if not told:
        return circuit, ()
    smaller = replace(
        circuit,
        resistors=tuple(kept),
        cells=tuple(cells),
        resistors_at=adjacency([(one.a, one.b) for one in kept]),
        cells_at=adjacency([(cell.control, cell.common, cell.output) for cell in cells]),
    )
    return smaller, tuple(told)


def _fold(cells: list[Cell], k: int, name: str, ohm: float) -> str:
    cell = cells[k]
    together = 1.0 / (1.0 / cell.r_pi + 1.0 / ohm)
    cells[k] = replace(cell, r_pi=together)
    return f"r_π of {cell.owner} with {name} across it: {plain(cell.r_pi)} ‖ {plain(ohm)} = {plain(together)}"


def _across(a: str, b: str, base: set[str], emitter: set[str]) -> bool:
    live = GROUND not in (a, b)
    return live and ((a in base and b in emitter) or (b in base and a in emitter))
