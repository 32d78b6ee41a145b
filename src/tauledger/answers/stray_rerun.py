"""The proof of a stray capacitance: ngspice run again with it in place."""

from __future__ import annotations

import numpy as np
from msgspec.structs import replace

from tauledger.answers.changed_circuit import changed_circuit, free_name
from tauledger.answers.stray import Target, decibels, rms_db
from tauledger.engine.client import Engine
from tauledger.network.added import places, response_with
from tauledger.network.altered import AddedCapacitor
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
    name = free_name([*circuit.passives.name, *(element.name for element in circuit.elements)], "Cstray")
    added = AddedCapacitor(name, stray.plus, stray.minus, stray.capacitance_f)
    engine.bias(changed_circuit(circuit, {}, None, added), ())
    curve = decibels(engine.sweep(target.frequency_hz).response)
    grid = numbers.simulated.sweep.frequency_hz
    ripple_hz = ripple_grids(numbers.network, numbers.simulated.f_high_hz, float(grid[-1]))
    again = simulate(engine.sweep, grid, midband=numbers.midband, ripple_hz=ripple_hz)
    engine.bias(circuit, ())
    return replace(stray, rms_db=rms_db(target, curve), f_high_rerun_hz=again.f_high_hz, rerun=True), curve
