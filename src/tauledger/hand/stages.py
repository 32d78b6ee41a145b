"""The chain of stages: the nodes that all signal crosses, in signal order, with hand and exact gain between them."""

from __future__ import annotations

import math
from functools import cmp_to_key

import numpy as np

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.hand.arrangements import arrangement, beyond, bootstrapped, device_of, follows_as_one, outer
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import StageRow
from tauledger.hand.looking_in import looking_in
from tauledger.hand.miller import hand_gain, signal_gain
from tauledger.hand.mirror import drive_of_halves, find_mirror, half_circuit
from tauledger.hand.nodes import Group, crossing, groups, node_name
from tauledger.hand.roles import follower_of, leaves_at, role_of
from tauledger.network.bands import Bands

CROSSED_BY_ALL = (0.9, 1.1)
PART_OF_A_STAGE = 0.001
WORTH_A_REASON = 0.02
OPPOSITE = 1e-6


def stage_rows(bands: Bands, devices: tuple[Device, ...]) -> tuple[StageRow, ...]:
    """List the signal nodes with 0.9 < ρ < 1.1 in signal order.

    gain_exact is the voltage ratio to the node before, gain_hand the hand gain driven from that node; for the first
    node both count from the source: V/V where one voltage source drives, ohm where one current source does, None where
    several do; two in opposite phase count as their difference. Of a balanced circuit the half circuit is listed, its
    first gain counted from its own source. gain_hand is None at a first node that no source reaches without a stage.
    Raises NetworkError where the mid-band circuit has no unique solution.
    """
    whole = upper_circuit(bands, devices)
    mirror = find_mirror(whole)
    circuit = whole if mirror is None else half_circuit(whole, mirror)
    crossed = [
        group for group in groups(circuit) if CROSSED_BY_ALL[0] < crossing(circuit, group.nodes[0]) < CROSSED_BY_ALL[1]
    ]

    def order(a: Group, b: Group) -> int:
        return _order(circuit, a.nodes[0], b.nodes[0])

    ordered = sorted(crossed, key=cmp_to_key(order))
    rows: list[StageRow] = []
    earlier: list[Cell] = []
    before: str | None = None
    for group in ordered:
        node = group.nodes[0]
        if before is None:
            by_hand, exact = _from_source(bands, circuit, node, halves=mirror is not None)
        else:
            exact = _ratio(circuit, before, node)
            solved = signal_gain if circuit.s_mid else _hand_value
            by_hand = solved(circuit, before, node)
        if by_hand == 0.0:
            # no element leads from the node before to this one: paper has no gain for it
            by_hand = None
        cell = _source_cell(circuit, group, before)
        around = () if cell is None else arrangement(circuit, cell, node, before, earlier)
        role = "passive" if cell is None else role_of(circuit, cell)
        if cell is not None and follows_as_one(around):
            role = follower_of(cell)
        rows.append(
            StageRow(
                node=group.name,
                title=group.title,
                role=role,
                owner=cell.owner if cell is not None else "",
                gain_hand=by_hand,
                gain_exact=exact,
                elements=_elements(circuit, node),
                around=around,
                why=_why(circuit, before, node, by_hand, exact),
                image="" if mirror is None else node_name(whole, mirror.image[node]),
            )
        )
        earlier += [cell] if cell is not None else []
        before = node
    return tuple(rows)


def _order(circuit: EquivalentCircuit, a: str, b: str) -> int:
    """Order two nodes that all signal crosses: driven from the earlier one alone, the later one moves as it does."""
    forward = abs(_driven(circuit, a, b) - 1.0)
    backward = abs(_driven(circuit, b, a) - 1.0)
    return -1 if forward < backward else 1


def _hand_value(circuit: EquivalentCircuit, before: str, node: str) -> float | None:
    return hand_gain(circuit, before, node).value


def _driven(circuit: EquivalentCircuit, start: str, end: str) -> complex:
    """Give the gain driven from `start` over the ratio of the signal there, complex where capacitors set the gain."""
    if not circuit.s_mid:
        return complex(circuit.gain(start, end) / _ratio(circuit, start, end))
    i, j = circuit.row[start], circuit.row[end]
    gain = complex(circuit.whole[j, i] / circuit.whole[i, i])
    return gain * complex(circuit.voltage[i]) / complex(circuit.voltage[j])


def _ratio(circuit: EquivalentCircuit, before: str, node: str) -> float:
    return float((circuit.voltage[circuit.row[node]] / circuit.voltage[circuit.row[before]]).real)


def _from_source(
    bands: Bands, circuit: EquivalentCircuit, node: str, *, halves: bool
) -> tuple[float | None, float | None]:
    """Give hand and exact gain from the source, by the Norton current that it forces into the first node."""
    driven = [amplitude for amplitude in bands.network.amplitudes.values() if amplitude]
    k = circuit.row[node]
    amplitude: complex
    if len(driven) == 1 and not halves:
        amplitude = driven[0]
    elif not halves and len(driven) == 2 and abs(driven[0] + driven[1]) <= OPPOSITE * abs(driven[0]):
        amplitude = driven[0] - driven[1]
    else:
        size = drive_of_halves(bands.network) if halves else None
        if size is None or not circuit.injected[k]:
            return None, None
        amplitude = math.copysign(size, circuit.injected[k].real)
    exact = float((circuit.voltage[k] / amplitude).real)
    if not circuit.injected[k]:
        return None, exact
    seen = looking_in(circuit, node, node_name(circuit, node)).ohm
    return float((circuit.injected[k] * seen / amplitude).real), exact


def _why(circuit: EquivalentCircuit, before: str | None, node: str, hand: float | None, exact: float | None) -> str:
    """Name what brings signal to a node beside the node before, where hand and exact gain differ by more than 2 %.

    Hand drives the node before alone: every other node then moves by v' = K·v(before). The element that carries the
    largest current more than that, with the true voltages, is the reason.
    """
    if hand is None or exact is None or abs(hand - exact) <= WORTH_A_REASON * abs(exact):
        return ""
    if before is None:
        return "looking in by hand is not exact there"
    k = circuit.row[before]
    missed = circuit.voltage - circuit.voltage[k] * np.array([circuit.gain(before, other) for other in circuit.nodes])
    missed[circuit.row[node]] = 0.0

    def at(end: str | None) -> complex:
        return 0j if end is None or end == GROUND else complex(missed[circuit.row[end]])

    carried: dict[str, float] = {}
    for r in circuit.resistors_at.get(node, ()):
        resistor = circuit.resistors[r]
        carried[resistor.name] = abs(at(resistor.other(node))) / resistor.ohm
    for c in circuit.cells_at.get(node, ()):
        cell = circuit.cells[c]
        drawn = cell.gm * (at(cell.control) - at(cell.common)) + cell.g_mb * (at(cell.body) - at(cell.common))
        drawn += (at(cell.output) - at(cell.common)) / cell.r_o
        entering = (at(cell.control) - at(cell.common)) / cell.r_pi
        total = sum(
            sign * current
            for end, sign, current in (
                (cell.output, 1.0, drawn),
                (cell.common, -1.0, drawn + entering),
                (cell.control, 1.0, entering),
            )
            if end == node
        )
        carried[cell.owner] = abs(total)
    name = max(carried, key=lambda one: carried[one], default="")
    if not name or not carried[name]:
        return "the gain was solved: no chain of hand gains fits"
    return f"{device_of(name)} brings signal to {node_name(circuit, node)} as well, past {node_name(circuit, before)}"


def _source_cell(circuit: EquivalentCircuit, group: Group, before: str | None) -> Cell | None:
    """Find the cell that brings the signal to a row: it leaves there, and enters at the row before if one does."""
    at = dict.fromkeys(k for node in group.nodes for k in circuit.cells_at.get(node, ()))
    leaving = [
        cell
        for cell in (circuit.cells[k] for k in at)
        if leaves_at(circuit, cell) in group.nodes and role_of(circuit, cell) != "diode-connected"
    ]
    if not leaving and before is not None:
        leaving = [cell for cell in circuit.cells if _follows_into(circuit, cell, group, before)]
    near = [cell for cell in leaving if before in (cell.control, cell.common)]
    return next(iter(near or leaving), None)


def _follows_into(circuit: EquivalentCircuit, cell: Cell, group: Group, before: str) -> bool:
    """Whether a follower driven at `before` leads to the row through its emitter (source) resistor."""
    left_at = leaves_at(circuit, cell)
    if left_at is None or left_at != cell.common or outer(circuit, cell.control) != before:
        return False
    return bool({*beyond(circuit, outer(circuit, left_at))} & {*group.nodes})


def _elements(circuit: EquivalentCircuit, node: str) -> tuple[str, ...]:
    """Name the resistors and cells at a node that carry more than 0.1 % of its conductance."""
    least = PART_OF_A_STAGE / circuit.z(node, node)
    resistors = [circuit.resistors[k] for k in circuit.resistors_at.get(node, ())]
    named = [
        f"{r.name} (bootstrapped)" if bootstrapped(circuit, node, r.other(node)) else device_of(r.name)
        for r in resistors
        if 1.0 / r.ohm >= least
    ]
    named += [circuit.transformers[k].name for k in circuit.transformers_at.get(node, ())]
    cells = [circuit.cells[k].owner for k in circuit.cells_at.get(node, ())]
    return (*dict.fromkeys(named + cells),)
