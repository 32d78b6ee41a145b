"""The circuit with cards of other value, a resistor or a capacitor put in, as ngspice is given it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
from msgspec.structs import replace

from tauledger.circuit import ADDED, Circuit, Passives, fold
from tauledger.network.altered import AddedCapacitor, SeriesResistor


def free_name(taken: Iterable[str], name: str) -> str:
    """Give a name that none of those taken is, in any spelling: this one, or it with an X or more behind it."""
    known = {fold(one) for one in taken}
    while fold(name) in known:
        name += "X"
    return name


def is_plain_card(circuit: Circuit, name: str) -> bool:
    """Whether an element is a plain resistor, capacitor or inductor of the circuit."""
    return fold(name) in {fold(one) for one in circuit.passives.name}


def changed_circuit(
    circuit: Circuit, values: Mapping[str, float], series: SeriesResistor | None, added: AddedCapacitor | None = None
) -> Circuit:
    """Give the circuit with resistor and capacitor put in, and with these values of plain cards: ohm, farad, henry.

    Raises KeyError where a name is no plain card, ValueError where a node is none of the circuit.
    """
    passives, nodes = circuit.passives, circuit.nodes
    if added is not None:
        ends = nodes.index(added.plus), nodes.index(added.minus)
        passives = _with_row(passives, "C", added.name, ends, added.farad)
    row = {fold(name): k for k, name in enumerate(passives.name)}
    value = passives.value.copy()
    for name, new in values.items():
        value[row[fold(name)]] = new
    passives = replace(passives, value=value)
    if series is not None:
        k, between = row[fold(series.capacitor)], len(nodes)
        a = passives.a.copy()
        start, a[k] = int(a[k]), between
        nodes = (*nodes, f"{series.name}'c")
        passives = _with_row(replace(passives, a=a), "R", series.name, (start, between), series.ohm)
    return replace(circuit, nodes=nodes, passives=passives)


def _with_row(passives: Passives, kind: str, name: str, ends: tuple[int, int], value: float) -> Passives:
    def longer(column: np.ndarray, entry: float) -> np.ndarray:
        return np.append(column, np.array([entry], dtype=column.dtype))

    return Passives(
        kind=passives.kind + kind,
        name=(*passives.name, name),
        a=longer(passives.a, ends[0]),
        b=longer(passives.b, ends[1]),
        value=longer(passives.value, value),
        card=longer(passives.card, ADDED),
        path=longer(passives.path, 0),
    )
