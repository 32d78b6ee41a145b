"""The circuit with cards of other value and a resistor put in series with a capacitor, as ngspice is given it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec.structs import replace

from tauledger.circuit import ADDED, Circuit, Passives, fold
from tauledger.network.altered import SeriesResistor


def is_card(circuit: Circuit, name: str) -> bool:
    """Whether an element is a plain resistor, capacitor or inductor of the circuit."""
    return fold(name) in {fold(one) for one in circuit.passives.name}


def changed_circuit(circuit: Circuit, values: Mapping[str, float], series: SeriesResistor | None) -> Circuit:
    """Give the circuit with these values of plain cards, ohm, farad or henry, and with the resistor put in.

    Raises KeyError where a name is no plain card.
    """
    passives = circuit.passives
    row = {fold(name): k for k, name in enumerate(passives.name)}
    value = passives.value.copy()
    for name, new in values.items():
        value[row[fold(name)]] = new
    passives = replace(passives, value=value)
    if series is None:
        return replace(circuit, passives=passives)
    k = row[fold(series.capacitor)]
    between = len(circuit.nodes)
    a = passives.a.copy()
    start, a[k] = int(a[k]), between
    return replace(
        circuit,
        nodes=(*circuit.nodes, f"{series.name}'c"),
        passives=_with_row(replace(passives, a=a), series, start, between),
    )


def _with_row(passives: Passives, series: SeriesResistor, start: int, stop: int) -> Passives:
    def longer(column: np.ndarray, value: float) -> np.ndarray:
        return np.append(column, np.array([value], dtype=column.dtype))

    return Passives(
        kind=passives.kind + "R",
        name=(*passives.name, series.name),
        a=longer(passives.a, start),
        b=longer(passives.b, stop),
        value=longer(passives.value, series.ohm),
        card=longer(passives.card, ADDED),
        path=longer(passives.path, 0),
    )
