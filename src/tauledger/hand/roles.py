"""What a transistor does in its circuit: which terminal the signal enters, and which it leaves by."""

from __future__ import annotations

from tauledger.circuit import GROUND
from tauledger.hand.branches import diode_joint
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit

IDLE = 1e-3
FOLLOWS = 0.05

# Words by the cell's own terminals: common terminal shared, degenerated, signal into the common terminal, follower.
ROLES = {
    "base": ("common emitter", "common emitter, degenerated", "common base", "emitter follower (common collector)"),
    "gate": ("common source", "common source, degenerated", "common gate", "source follower (common drain)"),
    "input": ("transconductor", "transconductor, degenerated", "current follower", "voltage follower"),
}


def role_of(circuit: EquivalentCircuit, cell: Cell) -> str:
    """Name the role of one cell at mid-band from its node voltages x and the adjoint λ of the output.

    Diode-connected where control and output are one node. Without signal where gm·(v_control − v_common) moves the
    output by less than 0.1 %. The signal enters by the control or the common node, whichever moves more, and leaves by
    the output or the common node, whichever the circuit's output follows more. Degenerated: the common node, entered by
    the control, moves by more than 5 % of it, and by more than its own series resistance does it.
    """
    if _diode_node(circuit, cell) is not None:
        return "diode-connected"
    left_at = leaves_at(circuit, cell)
    if left_at is None:
        return "without signal"
    shared, degenerated, into_common, follower = ROLES.get(cell.words[0], ROLES["input"])
    v_control, v_common = _control(circuit, cell), _common(circuit, cell)
    if abs(v_common) > abs(v_control):
        return into_common
    if left_at == cell.common:
        return follower
    driver = _control_node(circuit, cell)
    if driver != GROUND and driver in {_diode_node(circuit, other) for other in circuit.cells if other is not cell}:
        return "current mirror output"
    grounded = any(t.inner == cell.common != t.outer == GROUND for t in circuit.terminals)
    return degenerated if abs(v_common) > FOLLOWS * abs(v_control) and not grounded else shared


def follower_of(cell: Cell) -> str:
    """Give the word for a follower made of this kind of transistor."""
    return ROLES.get(cell.words[0], ROLES["input"])[3]


def leaves_at(circuit: EquivalentCircuit, cell: Cell) -> str | None:
    """Give the node by which the signal leaves a cell, output or common, whichever the circuit's output follows more.

    None where gm·(v_control − v_common) moves the circuit's output by less than 0.1 %.
    """
    v = _control(circuit, cell) - _common(circuit, cell)
    to_output, to_common = _adjoint(circuit, cell.output), _adjoint(circuit, cell.common)
    if abs(cell.gm * v * (to_output - to_common)) < IDLE * abs(circuit.response):
        return None
    return cell.common if abs(to_common) > abs(to_output) else cell.output


def _diode_node(circuit: EquivalentCircuit, cell: Cell) -> str | None:
    """Give the node at which a cell's control is its own output, series resistances aside."""
    if cell.diode_connected:
        # both terminals at AC ground: a common base whose collector is a supply
        return None if cell.control == GROUND else cell.control
    joint = diode_joint(circuit, circuit.cells.index(cell))
    return None if joint is None else joint.node


def _control_node(circuit: EquivalentCircuit, cell: Cell) -> str:
    """Give the node that drives a cell's control: the far end of the one resistor there, else the control itself."""
    resistors = circuit.resistors_at.get(cell.control, ())
    lonely = len(resistors) == 1 and len(circuit.cells_at.get(cell.control, ())) == 1
    return circuit.resistors[resistors[0]].other(cell.control) if lonely else cell.control


def _control(circuit: EquivalentCircuit, cell: Cell) -> complex:
    return _terminal(circuit, cell, cell.control, cell.words[0])


def _common(circuit: EquivalentCircuit, cell: Cell) -> complex:
    return _terminal(circuit, cell, cell.common, cell.words[1])


def _terminal(circuit: EquivalentCircuit, cell: Cell, node: str, word: str) -> complex:
    """Give the voltage of a cell's terminal; one that a source drives directly, ground by hand, has the source's."""
    if node != GROUND:
        return _at(circuit, node)
    at = (t.netlist_node for t in circuit.terminals if (t.owner, t.word, t.inner) == (cell.owner, word, GROUND))
    return next((circuit.driven[node] for node in at if node in circuit.driven), 0j)


def _at(circuit: EquivalentCircuit, node: str) -> complex:
    return 0j if node == GROUND else complex(circuit.voltage[circuit.row[node]])


def _adjoint(circuit: EquivalentCircuit, node: str) -> complex:
    return 0j if node == GROUND else complex(circuit.adjoint[circuit.row[node]])
