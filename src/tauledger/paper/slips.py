"""The known slips of a hand analysis: each changes the circuit, a Miller factor, or the figure itself.

A slip on the circuit is a table of factors on the values of its parts; applied, it gives what a designer who made it
would have written.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.devices.parts import Part
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.nodes import crossing
from tauledger.network.bands import Bands
from tauledger.paper.bench import Edit, Factor, Split, miller_factor

BOLTZMANN_OVER_CHARGE = 8.617333262e-5
ZERO_CELSIUS = 273.15
SHORTED = 1e7
RESTS = 0.05
OVERALL_GAIN = "overall-gain"
GM_FOR_G_M = "gm-for-G_m"
INPUT_LEFT_OUT = "input-resistance-left-out"
CONTROL_WORDS = ("base", "gate", "input")
SERIES_AT_CONTROL = ("g_b", "r_b", "g_g")
SUBSTRATE = ("c_sub",)
DRAIN_BULK = ("c_db",)


class Slip(Struct, frozen=True):
    """One slip. id: fixed. says: what was done, as an engineer would say it.

    edit: factor on the value of each part that it changes. factor: Miller's factor as the slip has it.
    at_nodes: it is looked for in the figures of nodes alone.
    """

    id: str
    says: str
    edit: Edit
    factor: Factor = miller_factor
    at_nodes: bool = False


def slips(bands: Bands, circuit: EquivalentCircuit, *, temperature_c: float) -> tuple[Slip, ...]:
    """List the slips that this circuit gives occasion for.

    circuit: the whole mid-band circuit. temperature_c: at which gm = I_C/V_T was taken.
    """
    parts = bands.network.parts
    r_o, load = _output_conductances(parts, circuit), _load(bands)
    found = [
        Slip("r_o-forgotten", "r_o forgotten", _each(r_o, 0.0)),
        Slip("load-forgotten", "the load forgotten", _each(load, 0.0)),
        Slip("r_o-and-load-forgotten", "r_o and the load forgotten", _each((*r_o, *load), 0.0) if r_o and load else {}),
        Slip("bias-twice", "the bias network counted twice", _each(bias_network(bands, circuit), 2.0)),
        Slip("r_b-forgotten", "r_b forgotten", _each(_labelled(parts, SERIES_AT_CONTROL), SHORTED)),
        *_thermal_voltage(parts, temperature_c),
        *_input_resistances(parts, circuit),
        *_undegenerated(bands, circuit),
        Slip(OVERALL_GAIN, "the overall gain taken for the gain of the bridged nodes", {}, _overall),
        Slip("A-for-1-plus-A", "|A| taken for 1 + |A|", {}, _without_one),
        Slip("c_mu-not-multiplied", "C_μ not multiplied", {}, _not_multiplied),
        Slip("c_pi-not-bootstrapped", "C_π not bootstrapped", {}, _not_bootstrapped),
        Slip("substrate-left-out", "C_cs left out", _each(_labelled(parts, SUBSTRATE), 0.0)),
        Slip("substrate-left-out", "C_db left out", _each(_labelled(parts, DRAIN_BULK), 0.0)),
        Slip("load-capacitance-left-out", "C_L left out", _each(_load_capacitance(bands), 0.0)),
    ]
    return tuple(slip for slip in found if slip.edit or slip.factor is not miller_factor)


def thermal_voltage(temperature_c: float) -> float:
    """Give V_T = kT/q in V. Source: CODATA 2018, k/q = 8.617333262e-5 V/K."""
    return BOLTZMANN_OVER_CHARGE * (temperature_c + ZERO_CELSIUS)


def _overall(split: Split) -> float:
    if split.grounded or split.mirrored or split.far_end or split.gain >= -1.0:
        return miller_factor(split)
    return 1.0 + abs(split.overall)


def _without_one(split: Split) -> float:
    plain = split.grounded or split.mirrored or split.far_end or split.gain >= 0.0
    return miller_factor(split) if plain else -split.gain


def _not_multiplied(split: Split) -> float:
    return miller_factor(split) if split.mirrored or split.gain >= 0.0 else 1.0


def _not_bootstrapped(split: Split) -> float:
    return 1.0 if 0.0 < split.gain < 1.0 and not split.far_end else miller_factor(split)


def _each(names: Iterable[str], factor: float) -> dict[str, float]:
    return dict.fromkeys(names, factor)


def _labelled(parts: Sequence[Part], labels: Sequence[str]) -> list[str]:
    return [part.name for part in parts if part.label in labels]


def _output_conductances(parts: Sequence[Part], circuit: EquivalentCircuit) -> list[str]:
    """Name every g_o, and the resistors that stand between output and common node of a cell as its r_o."""
    named = _labelled(parts, ("g_o", "g_ds", "gds"))
    finite = {cell.owner for cell in circuit.cells if math.isfinite(cell.r_o)}
    loose = [
        part.name
        for part in parts
        if part.kind == "conductance" and not part.label
        for cell in circuit.cells
        if cell.owner in finite and GROUND not in (cell.common, cell.output)
        if {circuit.at[node] for node in part.nodes} == {cell.common, cell.output}
    ]
    return [*named, *loose]


def _load(bands: Bands) -> list[str]:
    """Name the resistors from the output straight to ground."""
    port = bands.network.port
    ends = ({port.plus, GROUND}, {port.minus, GROUND}, {port.plus, port.minus})
    return [
        part.name
        for part in bands.network.parts
        if part.kind == "conductance" and not part.label and port.kind == "voltage" and set(part.nodes) in ends
    ]


def _load_capacitance(bands: Bands) -> list[str]:
    port = bands.network.port
    ends = ({port.plus, GROUND}, {port.minus, GROUND}, {port.plus, port.minus})
    return [
        part.name
        for part in bands.network.parts
        if part.kind == "capacitance" and not part.label and port.kind == "voltage" and set(part.nodes) in ends
    ]


def bias_network(bands: Bands, circuit: EquivalentCircuit) -> list[str]:
    """Name the resistors from a base or gate to AC ground or to a node at rest; the driven source's is none of them."""
    inputs = {t.outer for t in circuit.terminals if t.word in CONTROL_WORDS and t.outer != GROUND}
    found = []
    for part in bands.network.parts:
        if part.kind != "conductance" or part.label or circuit.driven.keys() & set(part.nodes):
            continue
        a, b = (circuit.at[node] for node in part.nodes)
        for here, far in ((a, b), (b, a)):
            if here in inputs and far != here and _rests(circuit, far):
                found.append(part.name)
                break
    return found


def _input_resistances(parts: Sequence[Part], circuit: EquivalentCircuit) -> list[Slip]:
    """Leave out what a base draws, one transistor at a time; seen from outside, its r_b goes with it."""
    loading = [cell.owner for cell in circuit.cells if cell.control != GROUND and not cell.diode_connected]
    return [
        Slip(INPUT_LEFT_OUT, f"the input resistance of {owner} left out", _each(names, 0.0) | series)
        for owner in dict.fromkeys(loading)
        if (names := [part.name for part in parts if part.owner == owner and part.label == "g_pi"])
        for series in (
            {},
            _each((part.name for part in parts if part.owner == owner and part.label in SERIES_AT_CONTROL), SHORTED),
        )
    ]


def _undegenerated(bands: Bands, circuit: EquivalentCircuit) -> list[Slip]:
    """Take gm for G_m: in all of the circuit, or in Miller's factors alone, with C_π bootstrapped there or not."""
    degeneration = {cell.owner: _degeneration(bands, circuit, cell) for cell in circuit.cells}
    ratio = {
        cell.owner: 1.0 + cell.gm * _common_ohm(bands, cell, degeneration[cell.owner])
        for cell in circuit.cells
        if cell.output != GROUND and degeneration[cell.owner]
    }
    owner = {part.name: part.owner for part in bands.network.parts}
    says = "gm taken for G_m = gm/(1 + gm·R_E)"
    shorted = dict.fromkeys((name for names in degeneration.values() for name in names), SHORTED)
    if not shorted:
        return []

    def bootstrapped(split: Split) -> float:
        plain = split.grounded or split.mirrored or split.far_end or split.gain >= 0.0
        return miller_factor(split) if plain else 1.0 - split.gain * ratio.get(owner[split.part], 1.0)

    def not_bootstrapped(split: Split) -> float:
        shunted = owner[split.part] in ratio and 0.0 < split.gain < 1.0 and not split.far_end
        return 1.0 if shunted else bootstrapped(split)

    return [
        Slip(GM_FOR_G_M, says, shorted),
        *(Slip(GM_FOR_G_M, says, {}, factor, at_nodes=True) for factor in (bootstrapped, not_bootstrapped) if ratio),
    ]


def _degeneration(bands: Bands, circuit: EquivalentCircuit, cell: Cell) -> list[str]:
    """Name the resistances between the common node of an inverting cell and AC ground, its own series one included."""
    if cell.common == GROUND or cell.diode_connected:
        return []
    outer = next((t.outer for t in circuit.terminals if t.inner == cell.common), cell.common)
    found = []
    for part in bands.network.parts:
        if part.kind != "conductance" or part.label in ("g_pi", "g_o"):
            continue
        ends = {circuit.at[node] for node in part.nodes}
        own = part.owner == cell.owner and ends == {cell.common, outer}
        far = next(iter(ends - {outer}), outer)
        if own or (outer in ends and not part.label and far != outer and _rests(circuit, far)):
            found.append(part.name)
    return found


def _common_ohm(bands: Bands, cell: Cell, names: Sequence[str]) -> float:
    """Add what is between a cell's common node and AC ground: its own series resistance and the others in parallel."""
    parts = [part for part in bands.network.parts if part.name in names]
    own = math.fsum(1.0 / part.value for part in parts if part.owner == cell.owner)
    outside = math.fsum(part.value for part in parts if part.owner != cell.owner)
    return own + (1.0 / outside if outside else 0.0)


def _rests(circuit: EquivalentCircuit, node: str) -> bool:
    return node == GROUND or abs(crossing(circuit, node)) < RESTS


def _thermal_voltage(parts: Sequence[Part], temperature_c: float) -> list[Slip]:
    """gm = I_C/V_T with a round V_T, and r_π = β/gm with it."""
    bipolar = {part.owner for part in parts if part.label == "g_pi"}
    names = [part.name for part in parts if part.owner in bipolar and part.label in ("gm", "g_pi")]
    return [
        Slip(
            f"thermal-voltage-{millivolt}",
            f"V_T taken as {millivolt} mV",
            _each(names, thermal_voltage(temperature_c) / (1e-3 * millivolt)),
        )
        for millivolt in (25, 26)
    ]
