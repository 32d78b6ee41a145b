"""The proof of a stray capacitance: ngspice run again with it in place."""

from __future__ import annotations

import numpy as np
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.answers.stray import Target, decibels, rms_db
from tauledger.circuit import ADDED, GROUND, Circuit, fold
from tauledger.engine.client import Engine
from tauledger.network.added import places, response_with
from tauledger.network.ripple import ripple_grids
from tauledger.network.solve import Real
from tauledger.numbers import Numbers
from tauledger.record import StrayFacts
from tauledger.simulated import simulate


def proven(stray: StrayFacts, target: Target, numbers: Numbers, engine: Engine | None) -> tuple[StrayFacts, Real]:
    """Run ngspice with the capacitance in place, and leave it with the deck that it had; gives the curve in dB (k,)."""
    circuit = numbers.circuit
    if engine is None or circuit is None or numbers.simulated is None:
        place = places(numbers.network, [(stray.plus, stray.minus)], target.frequency_hz)
        curve = decibels(response_with(place, np.array([stray.capacitance_f]))[:, 0])
        return replace(stray, rms_db=rms_db(target, curve)), curve
    engine.bias(with_capacitor(circuit, stray.plus, stray.minus, stray.capacitance_f), ())
    curve = decibels(engine.sweep(target.frequency_hz).response)
    grid = numbers.simulated.sweep.frequency_hz
    ripple_hz = ripple_grids(numbers.network, numbers.simulated.f_high_hz, float(grid[-1]))
    again = simulate(engine.sweep, grid, midband=numbers.midband, ripple_hz=ripple_hz)
    engine.bias(circuit, ())
    return replace(stray, rms_db=rms_db(target, curve), f_high_rerun_hz=again.f_high_hz, rerun=True), curve


def with_capacitor(circuit: Circuit, plus: str, minus: str, farad: float) -> Circuit:
    """Give the circuit with one capacitor more; drive and output stay as they were chosen."""
    taken = {fold(name) for name in (*circuit.passives.name, *(element.name for element in circuit.elements))}
    name = next(name for name in (f"Cstray{k or ''}" for k in range(len(taken) + 1)) if fold(name) not in taken)
    number = {node: k for k, node in enumerate(circuit.nodes)}
    passives = circuit.passives

    def one(column: NDArray[np.int32], value: int) -> NDArray[np.int32]:
        return np.append(column, np.int32(value)).astype(np.int32)

    more = replace(
        passives,
        kind=passives.kind + "C",
        name=(*passives.name, name),
        a=one(passives.a, number[plus]),
        b=one(passives.b, 0 if minus == GROUND else number[minus]),
        value=np.append(passives.value, farad),
        card=one(passives.card, ADDED),
        path=one(passives.path, 0),
    )
    return replace(circuit, passives=more)
