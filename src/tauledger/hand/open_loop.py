"""T₀ and the band edge of T by hand: the loop cut at its wire, loaded there with what the wire led to, node by node.

The far end of the cut is driven, the near end has the input resistance and capacitance of what was behind it: then the
loop is an amplifier without feedback, and its time constants are those of any other.

Source: common practice (the loop broken and loaded with its own input impedance).
"""

from __future__ import annotations

import math

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND, Port
from tauledger.devices.family import Device, Terminal
from tauledger.devices.parts import Part, capacitance, conductance, voltage_source
from tauledger.errors import InputError, NetworkError
from tauledger.hand.budget import signal_nodes
from tauledger.hand.estimate import StageRow
from tauledger.hand.feedback import FoundLoop, LoopStage, classed_as
from tauledger.hand.stages import stage_rows
from tauledger.network.assemble import assemble
from tauledger.network.bands import Bands
from tauledger.network.return_ratio import SERIES, at_wire
from tauledger.network.solve import on_axis, response

DRIVE, SHORT = "loop'v", "loop'0"
# A node that takes less of the sum is not shown.
COUNTS = 0.01
# The gain that multiplies the input capacitance has not fallen yet, and coupling capacitors are shorts.
BELOW_THE_EDGE = 0.1


class OpenNode(Struct, frozen=True):
    """One node of the opened loop by hand: R in Ω, C in F, R·C in s."""

    node: str
    ohm: float
    farad: float
    seconds: float


class OpenLoop(Struct, frozen=True):
    """The edge of T by hand in Hz, 1/(2π·Σ R·C), and the nodes that take at least 1 % of the sum, largest first.

    stages: the gains from the driven end of the cut round to the loaded one, whose product is −t0; none where a rule is
    missing, and t0 None.
    """

    edge_hz: float
    nodes: tuple[OpenNode, ...]
    stages: tuple[LoopStage, ...] = ()
    t0: float | None = None


def open_loop(closed: Bands, devices: tuple[Device, ...], loop: FoundLoop, edge_hz: float) -> OpenLoop | None:
    """Work the time constants of the opened loop out.

    closed: the whole network, its capacitors classed at mid-band. edge_hz: about where the edge of T is; the input
    capacitance is taken somewhat below. None for a loop that is not cut at a wire, and where hand rules do not reach.
    Raises NetworkError where the network has no unique solution.
    """
    if not loop.node:
        return None
    network, at_hz = closed.network, closed.midband.frequency_hz
    cut = at_wire(network, loop.owner, loop.node)
    parts = tuple(part for part in cut.network.parts if part.owner != SERIES)
    silent = dict.fromkeys(network.amplitudes, 0j)
    siemens, farad = _load(parts, silent, cut.far, loop.node, at_hz, BELOW_THE_EDGE * edge_hz)
    load = [conductance("R_in", loop.node, GROUND, siemens)] if siemens > 0.0 else []
    load += [capacitance("C_in", loop.node, GROUND, farad)] if farad > 0.0 else []
    driven = voltage_source(DRIVE, cut.far, GROUND, 1.0)
    moved = tuple(_moved(one, loop.node, cut.far) if one.name == loop.owner else one for one in devices)
    try:
        opened = assemble((*parts, *load, driven), Port(loop.node), {**silent, DRIVE: 1.0})
        bands = classed_as(closed, opened)
        if bands is None:
            return None
        rows = [row for row in signal_nodes(bands, moved) if row.in_path and not row.second]
        stages = _stages(stage_rows(bands, moved), loop.node)
    except (NetworkError, InputError):
        return None
    total = math.fsum(row.time_constant_s for row in rows)
    if not total > 0.0:
        return None
    ordered = sorted(rows, key=lambda row: -abs(row.time_constant_s))
    shown = tuple(
        OpenNode(_called(row.name), row.resistance_hand_ohm, row.capacitance_f, row.time_constant_s)
        for row in ordered
        if abs(row.time_constant_s) >= COUNTS * total
    )
    t0 = -math.prod(stage.hand for stage in stages) if stages else None
    return OpenLoop(1.0 / (2.0 * math.pi * total), shown, stages, t0)


def _stages(rows: tuple[StageRow, ...], node: str) -> tuple[LoopStage, ...]:
    """Give the gains round to a node; none where one has no rule, or the way does not end there."""
    if not rows or rows[-1].node != node:
        return ()
    stages = []
    for row in rows:
        if row.gain_hand is None or row.gain_exact is None:
            return ()
        stages.append(LoopStage(_called(row.node), row.title, row.gain_hand, row.gain_exact))
    return tuple(stages)


def _called(name: str) -> str:
    """Name what lies behind the cut by its transistor."""
    owner, cut, _ = name.partition("'loop")
    return f"inside {owner}" if cut else name


def _load(
    parts: tuple[Part, ...], silent: dict[str, complex], far: str, near: str, at_hz: float, below_hz: float
) -> tuple[float, float]:
    """Give conductance at mid-band and capacitance at below_hz of what the wire leads to, the near end at ground."""
    held = (*parts, voltage_source(DRIVE, far, GROUND, 1.0), voltage_source(SHORT, near, GROUND))
    measured = assemble(held, Port("", kind="current", through=DRIVE), {**silent, DRIVE: 1.0, SHORT: 0j})
    y = -response(measured, np.array([at_hz, below_hz]))
    return float(y[0].real), float(y[1].imag / on_axis(below_hz)[0].imag)


def _moved(device: Device, node: str, far: str) -> Device:
    """Put what a transistor has at a node at the far end of the cut."""

    def at(one: str) -> str:
        return far if one == node else one

    cell = device.cell
    if cell is not None:
        body = None if cell.body is None else at(cell.body)
        cell = replace(cell, control=at(cell.control), common=at(cell.common), output=at(cell.output), body=body)
    terminals = tuple(Terminal(t.word, at(t.outer), at(t.inner)) for t in device.terminals)
    parts = tuple(replace(part, nodes=tuple(at(one) for one in part.nodes)) for part in device.parts)
    return replace(device, cell=cell, terminals=terminals, parts=parts)
