"""What transistors do together: pairs, mirrors, active loads, push-pull followers, feedback around a stage."""

from __future__ import annotations

import re
from collections.abc import Sequence

from tauledger.circuit import GROUND
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.roles import leaves_at, role_of

COUPLED = {"base": "emitter-coupled pair", "gate": "source-coupled pair", "input": "pair with one common terminal"}
SERIES = re.compile(r"r_[a-z]+\((\w+)\)")
FOLLOWER = "follower"
FOLLOWS = 0.5


def arrangement(
    circuit: EquivalentCircuit, cell: Cell, node: str, before: str | None, earlier: Sequence[Cell]
) -> tuple[str, ...]:
    """Say in words what stands around the cell that brings the signal from node `before` to `node`.

    earlier: the cells of the stages before. Darlington: the first transistor's emitter drives the second, and both
    collectors are one node. Complementary pair: the first one's collector drives the second, whose collector is the
    first one's emitter.
    """
    told: list[str] = []
    for other in circuit.cells:
        if other is cell:
            continue
        into, out, common = (outer(circuit, end) for end in (cell.control, cell.output, cell.common))
        o_out, o_common = outer(circuit, other.output), outer(circuit, other.common)
        if o_common == into != GROUND and o_out == out:
            told.append(f"Darlington with {other.owner}")
        elif o_out == into != GROUND and o_common == out != GROUND:
            told.append(f"complementary pair with {other.owner}")
        elif _shares_tail(circuit, cell, other) and common != node:
            told.append(f"{COUPLED.get(cell.words[0], COUPLED['input'])} with {other.owner}")
        elif o_out == node and outer(circuit, cell.output) == node:
            role = role_of(circuit, other)
            if role in ("diode-connected", "current mirror output"):
                told.append(f"{'diode' if role == 'diode-connected' else 'mirror'} load {other.owner}")
            elif role == "without signal":
                told.append(f"active load {other.owner}")
        elif _pushes_and_pulls(circuit, cell, other) and node in _reached(circuit, common):
            told.append(f"push-pull with {other.owner}")
    return (*dict.fromkeys(told), *_feedback(circuit, cell, node, before, earlier))


def beyond(circuit: EquivalentCircuit, node: str) -> tuple[str, ...]:
    """Give the nodes that one resistor separates from a node: a follower's output behind its emitter resistor."""
    if node == GROUND:
        return ()
    far = (circuit.resistors[k].other(node) for k in circuit.resistors_at.get(node, ()))
    return tuple(end for end in far if end != GROUND)


def bootstrapped(circuit: EquivalentCircuit, node: str, far: str) -> bool:
    """Say whether a transistor makes the far end of a resistor follow the node by more than half: it carries less."""
    if far == GROUND or not FOLLOWS < circuit.gain(node, far) < 1.0:
        return False
    following = [cell for cell in circuit.cells if outer(circuit, leaves_at(circuit, cell) or GROUND) == far]
    return any(outer(circuit, cell.control) == node for cell in following)


def follows_as_one(around: Sequence[str]) -> bool:
    """Whether the stage is a complementary pair, which works as one follower."""
    return any(told.startswith("complementary pair") for told in around)


def _feedback(
    circuit: EquivalentCircuit, cell: Cell, node: str, before: str | None, earlier: Sequence[Cell]
) -> list[str]:
    """Name the resistors that lead from this stage back to an input or an emitter (source) before it."""
    targets: dict[str, str] = {}
    if before is not None:
        targets[before] = f"to {before}"
    for one in (*earlier, cell):
        targets.setdefault(outer(circuit, one.control), f"to the {one.words[0]} of {one.owner}")
    for one in earlier:
        targets.setdefault(outer(circuit, one.common), f"to the {one.words[1]} of {one.owner}")
    ends = dict.fromkeys((node, outer(circuit, cell.common)))
    told = []
    for end in ends:
        for k in circuit.resistors_at.get(end, ()) if end != GROUND else ():
            resistor = circuit.resistors[k]
            far = resistor.other(end)
            forward = far == before and outer(circuit, leaves_at(circuit, cell) or GROUND) != end and end == node
            if far in targets and far not in (GROUND, end) and not forward and resistor.name[:2] not in ("r_", "(r"):
                told.append(f"feedback {targets[far]} through {resistor.name}")
    return list(dict.fromkeys(told))


def _pushes_and_pulls(circuit: EquivalentCircuit, cell: Cell, other: Cell) -> bool:
    """Two followers of opposite polarity (npn and pnp, n- and p-channel) that lead to one live node."""
    if {cell.kind[:1], other.kind[:1]} != {"n", "p"}:
        return False
    joint = _reached(circuit, outer(circuit, cell.common)) & _reached(circuit, outer(circuit, other.common))
    return bool(joint - {GROUND}) and all(FOLLOWER in role_of(circuit, one) for one in (cell, other))


def _reached(circuit: EquivalentCircuit, node: str) -> set[str]:
    return {node, *beyond(circuit, node)}


def _shares_tail(circuit: EquivalentCircuit, cell: Cell, other: Cell) -> bool:
    """Two cells of one kind on one live common node, directly or each through one resistor, driven at two nodes."""
    if (cell.words, cell.kind) != (other.words, other.kind) or outer(circuit, cell.control) == outer(
        circuit, other.control
    ) != GROUND:
        return False
    tails = [_tail(circuit, one) for one in (cell, other)]
    return tails[0] == tails[1] != GROUND


def _tail(circuit: EquivalentCircuit, cell: Cell) -> str:
    """Give the node in which the common terminal ends, through its own series resistance and one resistor alone."""
    node = cell.common
    for _ in range(2):
        resistors = circuit.resistors_at.get(node, ())
        if node == GROUND or len(resistors) != 1 or len(circuit.cells_at.get(node, ())) != 1:
            return node
        node = circuit.resistors[resistors[0]].other(node)
    return node


def device_of(name: str) -> str:
    """Give the device that a series resistance belongs to: "r_c(Q1)" → "Q1"; other names as they are."""
    inner = SERIES.fullmatch(name)
    return inner.group(1) if inner else name


def outer(circuit: EquivalentCircuit, node: str) -> str:
    """Give the netlist's node of a device's terminal for its inner node; any other node as it is."""
    return next((t.outer for t in circuit.terminals if t.inner == node and t.outer != node), node)
