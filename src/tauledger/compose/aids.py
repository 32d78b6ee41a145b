"""Measuring aids in one line: what a netlist holds for the sake of a measurement, and no table counts.

Huge inductors and capacitors (network/aids.py), ammeters of 0 V, resistors that move nothing, a controlled source that
only reads the output, a drive between two nodes. All of them stay in the network.
"""

from __future__ import annotations

import math

import numpy as np

from tauledger.circuit import GROUND, Element, fold
from tauledger.devices.parts import Part
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.recompute import without
from tauledger.network.solve import on_axis, response, solve
from tauledger.numbers import DISAGREES, Numbers
from tauledger.quantity import engineering
from tauledger.record import NoteFacts

PROBE_OHM = 100e6
MOVES_NOTHING = 1e-4
# ngspice and numpy reckon with 53 binary digits
ROUNDING = 2.0**-53


def aid_notes(numbers: Numbers) -> tuple[NoteFacts, ...]:
    """Name the measuring aids, if there are any, and one that is too large for the simulator's arithmetic."""
    network = numbers.network
    huge = [part for part in network.parts if part.name in numbers.midband.aids]
    told = [f"{part.name} {_size(part)}" for part in huge]
    told += [f"{part.name} {engineering(1.0 / part.value, 'Ω', 3, zeros=False)}" for part in _probes(numbers)]
    told += [f"{part.name} that reads the output" for part in network.parts if _reads_the_output(network, part)]
    told += [f"{element.name} 0 V as ammeter" for element in _ammeters(numbers)]
    told += [
        f"the drive {part.name} floating between {part.nodes[0]} and {part.nodes[1]}"
        for part in network.driving
        if part.kind == "voltage source" and GROUND not in part.nodes
    ]
    notes = [NoteFacts("measuring-aids", "", f"measuring aids left out: {', '.join(told)}")] if told else []
    return (*notes, *(_too_large(numbers, part) for part in huge if _loses_all_digits(numbers, part)))


def _size(part: Part) -> str:
    return engineering(part.value, "H" if part.kind == "inductance" else "F", 3, zeros=False)


def _probes(numbers: Numbers) -> list[Part]:
    """Give the resistors from 100 MΩ on without which gain and both edges are the same within 1e-4."""
    network, edges = numbers.network, numbers.edges
    large = [p for p in network.parts if p.kind == "conductance" and not p.label and 0.0 < p.value <= 1.0 / PROBE_OHM]
    at = [numbers.midband.frequency_hz, *(e.hz for e in (edges.f_high, edges.f_low) if e is not None and e.hz)]
    return [part for part in large if _moves_nothing(network, part, np.array(at))]


def _moves_nothing(network: Network, part: Part, at_hz: np.ndarray[tuple[int], np.dtype[np.float64]]) -> bool:
    try:
        ratio = response(without(network, frozenset({part.name})), at_hz) / response(network, at_hz)
    except NetworkError:
        return False
    return bool(np.all(np.abs(ratio - 1.0) <= MOVES_NOTHING))


def _reads_the_output(network: Network, part: Part) -> bool:
    """Whether this is a controlled voltage source on whose output nothing else stands."""
    port = network.port
    if (
        part.kind != "voltage gain"
        or part.label
        or port.kind != "voltage"
        or set(part.nodes[:2]) != {port.plus, port.minus}
    ):
        return False
    ends = {port.plus, port.minus} - {GROUND}
    return not any(ends & set(other.nodes) for other in network.parts if other is not part)


def _ammeters(numbers: Numbers) -> list[Element]:
    """Give the sources of 0 V between two live nodes that neither drive nor are sensed nor carry the output."""
    circuit, port = numbers.circuit, numbers.network.port
    if circuit is None:
        return []
    busy = {fold(name) for part in numbers.network.parts for name in part.references}
    busy |= {fold(name) for name, amplitude in numbers.network.amplitudes.items() if amplitude != 0.0}
    busy |= {fold(port.through)} if port.kind == "current" else set()
    return [
        element
        for element in circuit.elements
        if element.letter == "V"
        and element.parameter("dc", 0.0) == 0.0
        and GROUND not in [circuit.nodes[node] for node in element.nodes]
        and fold(element.name) not in busy
    ]


def _loses_all_digits(numbers: Numbers, part: Part) -> bool:
    """Whether ngspice differs, and s·C of a capacitor between two live nodes is why."""
    if numbers.trusted or part.kind != "capacitance":
        return False
    return bool(np.isfinite(_digits_end_hz(numbers, part)))


def _digits_end_hz(numbers: Numbers, part: Part) -> float:
    """Give where rounding of ω·C reaches a thousandth of what stands beside it, infinite where one end is fixed."""
    network = numbers.network
    at = solve(network, on_axis(np.array([numbers.midband.frequency_hz or 1.0])))
    rows = [network.index(node) for node in part.nodes]
    if any(row is None or abs(at.x[0, row]) == 0.0 for row in rows):
        return math.inf
    fixed = {node for other in network.parts if other.kind == "voltage source" for node in other.nodes}
    if fixed & set(part.nodes):
        return math.inf
    beside = [p.value for p in network.parts if p.kind == "conductance" and set(p.nodes) & set(part.nodes)]
    return DISAGREES * max(beside, default=math.inf) / (ROUNDING * 2.0 * math.pi * part.value)


def _too_large(numbers: Numbers, part: Part) -> NoteFacts:
    from_hz = engineering(_digits_end_hz(numbers, part), "Hz", 2)
    return NoteFacts(
        "too-large-to-simulate",
        part.name,
        f"{_size(part)} between two live nodes leaves ngspice no digits above about {from_hz}: its sweep is rounding "
        "there; a smaller value couples as well",
    )
