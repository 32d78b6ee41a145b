"""The return ratio as ngspice gives it: two runs with the loop closed, a voltage in a wire and a current at it.

The wire from a node into one element is cut and bridged by a source of 0 V, so that the operating point stays what it
is. Run 1 drives that source with 1 V and tells v₁, the voltage behind it; run 2 drives a current of 1 A at its near end
and tells i₁, what goes on behind it; 1/(1 + T) = v₁ + i₁.

Source: Middlebrook, "Measurement of loop gain in feedback systems", Int. J. Electronics 38(4), 1975.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import ADDED, Circuit, Drive, Element, Port, fold
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.network.solve import Complex, Real

VOLTAGE, CURRENT, FAR = "V'loop", "I'loop", "loop'far"


class Cut(Struct, frozen=True):
    """A wire into one element: its name, the number of the node there, and which of its terminals are on the far side.

    source: the element is a controlled source, whose signal comes out of the wire; else it goes into the element.
    """

    element: str
    node: int
    terminals: tuple[int, ...]
    source: bool = False


def cut_into(circuit: Circuit, owner: str, node: str) -> Cut:
    """Give the wire from a node into all that an element has there.

    Raises InputError where there is no such wire.
    """
    element, number = _element(circuit, owner), circuit.nodes.index(node)
    terminals = tuple(k for k, at in enumerate(element.nodes) if at == number)
    if not terminals or number == 0:
        raise InputError(f"no wire leads from {node} into {owner}", "name a terminal that carries signal")
    return Cut(owner, number, terminals)


def cut_out_of(circuit: Circuit, owner: str) -> Cut:
    """Give the wire out of a controlled source: that of its first terminal, of its second where the first is ground.

    Raises InputError where both are ground.
    """
    element = _element(circuit, owner)
    for terminal in (0, 1):
        if element.nodes[terminal] != 0:
            return Cut(owner, element.nodes[terminal], (terminal,), source=True)
    raise InputError(f"{owner} drives no node", "name another source")


def injected_ratio(circuit: Circuit, cut: Cut, engine: Engine, frequency_hz: Real) -> Complex:
    """Give T at frequencies (k,) in Hz above zero by double injection; the engine then holds a deck of its own.

    Raises EngineError where ngspice gives no result.
    """
    far = len(circuit.nodes)
    ends = (cut.node, far) if cut.source else (far, cut.node)
    parted = tuple(_parted(element, cut, far) for element in circuit.elements)
    behind, before = ends
    voltage = Element("V", VOLTAGE, ends, "", (("dc", 0.0),), ADDED, 0)
    current = Element("I", CURRENT, (0, before), "", (("dc", 0.0),), ADDED, 0)
    nodes = (*circuit.nodes, FAR)
    opened = replace(circuit, nodes=nodes, elements=(*parted, voltage, current))
    v_behind = _run(opened, Port(nodes[behind]), Drive(VOLTAGE, "voltage", 1.0), engine, frequency_hz)
    through = Port("", kind="current", through=VOLTAGE)
    i_behind = -_run(opened, through, Drive(CURRENT, "current", 1.0), engine, frequency_hz)
    rest = v_behind + i_behind
    return np.asarray((1.0 - rest) / rest, dtype=np.complex128)


def _run(circuit: Circuit, port: Port, drive: Drive, engine: Engine, frequency_hz: Real) -> Complex:
    engine.bias(replace(circuit, output=port, drive=(drive,)), ())
    return engine.sweep(frequency_hz).response


def _element(circuit: Circuit, name: str) -> Element:
    for element in circuit.elements:
        if fold(element.name) == fold(name):
            return element
    raise InputError(f"{name} is no element with terminals of its own", "name a transistor or a controlled source")


def _parted(element: Element, cut: Cut, far: int) -> Element:
    if fold(element.name) != fold(cut.element):
        return element
    return replace(element, nodes=tuple(far if k in cut.terminals else at for k, at in enumerate(element.nodes)))
