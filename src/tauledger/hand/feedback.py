"""Feedback around several stages: where the loop is, and T₀, ideal gain and closed loop as a designer works them out.

A loop is looked for at the wires into the control and common terminals of the transistors that the signal passes: cut
there, return ratio T above 1 at mid-band. It is feedback around the amplifier where it dies when a later node that all
signal passes is held at ground, and it is *one* loop where no other such wire has T above 1 once the first transistor
is dead. So an emitter resistor alone is none: its signal does not come back through the wire into the emitter.

By hand the loop is opened at its last inverting transistor: gm·(resistance at its collector) times the gains from node
to node round to its base is T₀, f_H is that of T times 1 + T₀, and the gain is A∞·T₀/(1 + T₀).

Sources: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed., 2009, chapter 8
(return ratio, section 8.8; from memory); Rosenstark, IEEE Trans. Education E-17(4), 1974.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator, Mapping

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND, Port
from tauledger.devices.family import Device
from tauledger.devices.parts import current_source, voltage_source
from tauledger.errors import InputError, NetworkError
from tauledger.hand.arrangements import outer
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.estimate import SignalNode, StageRow
from tauledger.hand.looking_in import looking_in
from tauledger.hand.stages import stage_rows
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import GAIN_TOLERANCE, Bands, merged_nodes, upper_network
from tauledger.network.loop_shape import signed_size
from tauledger.network.midband import MidBand
from tauledger.network.reactances import REACTIVE
from tauledger.network.return_ratio import CONTROLLED, VOLTAGE_KINDS, at_source, at_wire, return_ratio
from tauledger.network.solve import on_axis, response

LOOP_ABOVE = 1.0
# What is left of T where only another way round leads, past the part that was taken out of the loop.
DIES = 0.1
SOURCE = "loop'i"


class FoundLoop(Struct, frozen=True):
    """A loop around the amplifier.

    owner, node, word: the wire at which it is cut, into this terminal of this transistor; empty node: `owner` is a
    controlled source, and it is opened there. device: the last inverting transistor (or the source itself). path: the
    signal nodes that it passes.
    """

    owner: str
    node: str
    word: str
    device: str
    path: tuple[str, ...]


class LoopStage(Struct, frozen=True):
    """One factor of T₀: the node that is reached, its gain by hand and exact; the first is a resistance in Ω."""

    node: str
    title: str
    hand: float
    exact: float


class HandLoop(Struct, frozen=True):
    """T₀ by hand: gm in S of `device` times every stage's gain; exact_t0 is the product of the exact ones."""

    device: str
    siemens: float
    stages: tuple[LoopStage, ...]
    t0: float
    exact_t0: float


def find_loop(
    network: Network,
    devices: tuple[Device, ...],
    nodes: tuple[SignalNode, ...],
    stages: tuple[StageRow, ...],
    at_hz: float,
) -> FoundLoop | None:
    """Find the one feedback loop around the amplifier; None where there is none or several.

    at_hz: mid-band. Balanced circuits, analysed as halves, are left out.
    """
    if any(stage.image for stage in stages):
        return None
    place = _places(nodes, stages)
    wires = sorted(_wires(devices, place), key=lambda wire: wire[0])
    loops = [wire for wire in wires if signed_size(_wire_ratio(network, wire[1], wire[2], at_hz)) > LOOP_ABOVE]
    for where, owner, node, word in loops:
        path = tuple(
            stage.node
            for k, stage in enumerate(stages)
            if k > where and _wire_ratio(network, owner, node, at_hz, held=stage.node).real < DIES
        )
        if not path:
            continue
        rest = _without_gm(network, {owner})
        others = (_wire_ratio(rest, wire[1], wire[2], at_hz) for wire in loops if wire[1] != owner)
        if any(signed_size(t) > LOOP_ABOVE for t in others):
            return None
        device = _last_inverting(network, devices, stages, (owner, node), at_hz)
        return None if not device else FoundLoop(owner, node, word, device, path)
    return _at_lone_source(network, devices, at_hz)


def hand_loop(closed: Bands, devices: tuple[Device, ...], owner: str) -> HandLoop | None:
    """Work T₀ out at one transistor, or lone transconductance: from its output round to its control.

    closed: the whole network, its capacitors classed at mid-band. None where no hand rule gives all of it.
    """
    network, at_hz = closed.network, closed.midband.frequency_hz
    parts = [part for part in network.parts if part.owner == owner and part.kind in CONTROLLED]
    if not parts or parts[0].kind != "transconductance":
        return None
    first = parts[0]
    dead = _without_gm(network, {owner})
    source = current_source(SOURCE, first.nodes[0], first.nodes[1], 1.0)
    port = Port(first.nodes[2], first.nodes[3])
    others = tuple(replace(one, cell=None) if one.name == owner else one for one in devices)
    try:
        opened = assemble((*dead.parts, source), port, {**dict.fromkeys(network.amplitudes, 0j), SOURCE: 1.0})
        bands = classed_as(closed, opened)
        if bands is None:
            return None
        circuit = upper_circuit(bands, others)
        rows = stage_rows(bands, others)
    except (NetworkError, InputError):
        return None
    control = outer(circuit, circuit.at[first.nodes[2]])
    ends = [k for k, row in enumerate(rows) if circuit.at.get(row.node) == control]
    if not ends:
        return None
    stages = []
    for k, row in enumerate(rows[: ends[0] + 1]):
        hand = row.gain_hand
        if k == 0 and hand is None:
            # the source leads to an inner node: behind a series resistance it drives the same current
            hand = math.copysign(looking_in(circuit, circuit.at[row.node], row.node).ohm, row.gain_exact or -1.0)
        if hand is None or not row.gain_exact:
            return None
        stages.append(LoopStage(row.node, row.title, hand, row.gain_exact))
    total = complex(response(opened, np.array([at_hz]))[0]).real
    inside = total / math.prod(stage.exact for stage in stages)
    r_pi = _inner_divider(devices, network, owner)
    if r_pi is not None:
        stages.append(LoopStage(first.nodes[2], f"inside {owner}, behind r_b", r_pi, inside))
    t0 = -first.value * math.prod(stage.hand for stage in stages)
    return HandLoop(owner, first.value, tuple(stages), t0, -first.value * total)


def classed_as(closed: Bands, opened: Network) -> Bands | None:
    """Take every capacitor and inductor of an opened loop for what it is at mid-band of the closed one; others as open.

    None where the gain of what is left is more than 2 % off, and where capacitors set the gain.
    Raises NetworkError where the opened network has no unique solution at mid-band.
    """
    if closed.gain_setting:
        return None
    reactive = [part for part in opened.parts if part.kind in REACTIVE]
    class_of = {part.name: closed.class_of.get(part.name, "open") for part in reactive}
    merged = merged_nodes(opened, class_of)
    upper = upper_network(opened, class_of, merged)
    at_hz = closed.midband.frequency_hz
    gain = complex(response(opened, np.array([at_hz]))[0])
    merged_gain = complex(response(upper, np.zeros(1))[0])
    if not abs(merged_gain.real - gain.real) <= GAIN_TOLERANCE * abs(gain):
        return None
    midband = MidBand(at_hz, at_hz, at_hz, gain)
    return Bands(opened, midband, class_of, {}, merged, upper, opened, sound=True)


def _inner_divider(devices: tuple[Device, ...], network: Network, owner: str) -> float | None:
    """Give r_π/(r_b + r_π) where the transistor has a base resistance, else None."""
    device = next((one for one in devices if one.name == owner), None)
    cell = device.cell if device is not None else None
    series = next((part for part in network.parts if part.name == f"{owner}.g_b"), None)
    if cell is None or cell.r_pi is None or series is None:
        return None
    return cell.r_pi / (cell.r_pi + 1.0 / series.value)


def _places(nodes: tuple[SignalNode, ...], stages: tuple[StageRow, ...]) -> Mapping[str, int]:
    """Give for every network node on a stage its place in the signal order."""
    members = {row.name: row.members for row in nodes}
    return {node: k for k, stage in enumerate(stages) for node in (stage.node, *members.get(stage.node, ()))}


def _wires(devices: tuple[Device, ...], place: Mapping[str, int]) -> Iterator[tuple[int, str, str, str]]:
    """Give the wires into control and common terminals that the signal passes: place, owner, node, word.

    Feedback may arrive at the common terminal, which not all signal passes: its place is then that of the control.
    """
    for device in devices:
        cell = device.cell
        if cell is None:
            continue
        ends = [next((t for t in device.terminals if t.inner == node), None) for node in (cell.control, cell.common)]
        places = [place.get(end.outer) for end in ends if end is not None]
        for end in ends:
            where = None if end is None else place.get(end.outer, places[0])
            if end is not None and where is not None and end.outer != GROUND:
                yield where, device.name, end.outer, end.word


def _wire_ratio(network: Network, owner: str, node: str, at_hz: float, held: str = "") -> complex:
    """Give T of a wire at mid-band, with a node held at ground where one is named; 0 where there is no such wire."""
    try:
        if held:
            grounded = (*network.parts, voltage_source("loop'held", held, GROUND))
            network = assemble(grounded, network.port, network.amplitudes)
        return complex(return_ratio(at_wire(network, owner, node), on_axis(at_hz))[0])
    except (NetworkError, InputError):
        return 0j


def _without_gm(network: Network, owners: Collection[str]) -> Network:
    parts = tuple(
        replace(part, value=0.0) if part.owner in owners and part.kind in CONTROLLED else part for part in network.parts
    )
    return assemble(parts, network.port, network.amplitudes)


def _last_inverting(
    network: Network,
    devices: tuple[Device, ...],
    stages: tuple[StageRow, ...],
    wire: tuple[str, str],
    at_hz: float,
) -> str:
    """Name the last transistor in signal order that inverts and without whose gm the loop is dead."""
    there = {device.name for device in devices if device.cell is not None}
    whole = _wire_ratio(network, *wire, at_hz)
    for stage in reversed(stages):
        if stage.owner in there and (stage.gain_exact or 0.0) < 0.0:
            dead = _without_gm(network, {stage.owner})
            if abs(_wire_ratio(dead, *wire, at_hz)) < DIES * abs(whole):
                return stage.owner
    return ""


def _at_lone_source(network: Network, devices: tuple[Device, ...], at_hz: float) -> FoundLoop | None:
    """Find the controlled voltage source that is an amplifier by itself and has T above 1; None where not just one."""
    transistors = {device.name for device in devices if device.cell is not None and device.terminals}
    owners = dict.fromkeys(
        part.owner for part in network.parts if part.kind in VOLTAGE_KINDS and part.owner not in transistors
    )
    found = []
    for owner in owners:
        parts = [part for part in network.parts if part.owner == owner and part.kind in CONTROLLED]
        try:
            t = signed_size(complex(return_ratio(at_source(network, parts), on_axis(at_hz))[0]))
        except (NetworkError, InputError):
            continue
        if np.isfinite(t) and t > LOOP_ABOVE:
            found.append(owner)
    return FoundLoop(found[0], "", "", found[0], ()) if len(found) == 1 else None
