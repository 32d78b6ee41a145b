"""The half circuit: of a balanced circuit that is driven in opposite phase, one half says everything.

What lies on the axis does not move and is ground; what leads across to its own mirror image is halved. Source: Gray,
Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed., 2009, sec. 3.5.5 (from memory).
"""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.hand.elements import Capacitor, Cell, Resistor
from tauledger.hand.equivalent import EquivalentCircuit, adjacency
from tauledger.network.assemble import Network

EQUAL = 1e-6
ROUNDING = 1e-9


class Mirror(Struct, frozen=True):
    """A balanced circuit: the hand nodes of one half, each with its mirror image, and those on the axis."""

    image: Mapping[str, str]
    axis: frozenset[str]

    @property
    def other(self) -> Mirror:
        """The same, seen from the other half."""
        return Mirror({there: here for here, there in self.image.items()}, self.axis)


def find_mirror(circuit: EquivalentCircuit) -> Mirror | None:
    """Give the halves of a circuit whose nodes move in opposite phase, the half of the output's plus node first.

    None where the drive is not balanced, an element crosses to another node than its own image, the halves differ by
    more than 1e-6, a transformer is in it, or capacitors set the gain (their circuit is complex, and taken whole).
    """
    plus = circuit.output_hand[0]
    if plus == GROUND or circuit.floating or circuit.s_mid or circuit.transformers:
        return None
    opposite = _opposite(circuit)
    if opposite is None or plus not in opposite or opposite[plus] == plus:
        return None
    axis = frozenset(node for node, image in opposite.items() if node == image)
    if not _balanced(circuit, opposite):
        return None
    half = _half_of(circuit, opposite, axis, plus)
    return None if half is None else Mirror({node: opposite[node] for node in half}, axis)


def half_circuit(circuit: EquivalentCircuit, mirror: Mirror) -> EquivalentCircuit:
    """Draw one half: Z(i, j) − Z(i, image of j) between its nodes, the axis at ground, the bridges halved."""
    nodes = tuple(node for node in circuit.nodes if node in mirror.image)
    here = [circuit.row[node] for node in nodes]
    there = [circuit.row[mirror.image[node]] for node in nodes]
    impedance = circuit.impedance[np.ix_(here, here)] - circuit.impedance[np.ix_(here, there)]
    whole = circuit.whole[np.ix_(here, here)] - circuit.whole[np.ix_(here, there)]
    products = circuit.products[np.ix_(here, here)] - circuit.products[np.ix_(here, there)]
    row = {node: k for k, node in enumerate(nodes)}
    out, sign = _output_of(circuit, mirror)
    adjoint = sign * whole[row[out]]
    response = complex(sign * circuit.voltage[circuit.row[out]])
    resistors = tuple(kept for kept in (_resistor(r, mirror) for r in circuit.resistors) if kept is not None)
    cells = tuple(kept for kept in (_cell(c, mirror) for c in circuit.cells) if kept is not None)
    at = {node: hand if hand in mirror.image else GROUND for node, hand in circuit.at.items()}
    members: dict[str, list[str]] = {}
    for node, hand in at.items():
        members.setdefault(hand, []).append(node)
    owners = {t.owner for t in circuit.terminals if {t.outer, t.inner} & mirror.image.keys()}
    return replace(
        circuit,
        at=at,
        members={hand: tuple(names) for hand, names in members.items()},
        nodes=nodes,
        resistors=resistors,
        cells=cells,
        capacitors=tuple(kept for kept in (_capacitor(c, mirror) for c in circuit.capacitors) if kept is not None),
        terminals=tuple(
            replace(t, outer=_end(t.outer, mirror), inner=_end(t.inner, mirror))
            for t in circuit.terminals
            if t.owner in owners
        ),
        impedance=impedance,
        whole=whole,
        voltage=circuit.voltage[here],
        adjoint=adjoint,
        injected=circuit.injected[here],
        response=response,
        products=products,
        charge=circuit.charge[here],
        row=row,
        resistors_at=adjacency([(r.a, r.b) for r in resistors]),
        cells_at=adjacency([(c.control, c.common, c.output) for c in cells]),
    )


def _output_of(circuit: EquivalentCircuit, mirror: Mirror) -> tuple[str, float]:
    """Give the node of this half that moves as the output's plus node does, and the sign with which it does."""
    plus = circuit.output_hand[0]
    return (plus, 1.0) if plus in mirror.image else (mirror.other.image[plus], -1.0)


def _opposite(circuit: EquivalentCircuit) -> dict[str, str] | None:
    """Give every node's image: one with the same impedance and the opposite voltage; a resting node is its own."""
    scale = float(np.abs(circuit.voltage).max(initial=0.0))
    image: dict[str, str] = {}
    for node in circuit.nodes:
        if node in image:
            continue
        v, z = circuit.voltage[circuit.row[node]], circuit.z(node, node)
        if abs(v) <= EQUAL * scale:
            image[node] = node
            continue
        other = next(
            (
                far
                for far in circuit.nodes
                if far not in image
                and far != node
                and abs(circuit.voltage[circuit.row[far]] + v) <= EQUAL * abs(v)
                and abs(circuit.z(far, far) - z) <= EQUAL * abs(z)
            ),
            None,
        )
        if other is None:
            return None
        image[node], image[other] = other, node
    return image


def _balanced(circuit: EquivalentCircuit, image: Mapping[str, str]) -> bool:
    """Say whether resistances and time constants are the same after every node is exchanged for its image."""
    order = [circuit.row[image[node]] for node in circuit.nodes]
    for matrix in (circuit.impedance, circuit.products):
        size = EQUAL * np.sqrt(np.abs(np.outer(np.diagonal(matrix), np.diagonal(matrix))))
        if bool(np.any(np.abs(matrix[np.ix_(order, order)] - matrix) > size + ROUNDING * np.abs(matrix).max())):
            return False
    return True


def _half_of(
    circuit: EquivalentCircuit, image: Mapping[str, str], axis: frozenset[str], plus: str
) -> frozenset[str] | None:
    """Follow the elements from the output: what is reached without crossing the axis is one half."""
    links: dict[str, set[str]] = {node: set() for node in circuit.nodes}
    ends = [(r.a, r.b) for r in circuit.resistors] + [(c.a, c.b) for c in circuit.capacitors]
    ends += [
        pair for c in circuit.cells for pair in ((c.control, c.common), (c.output, c.common), (c.control, c.output))
    ]
    ends += [(c.body, c.common) for c in circuit.cells if c.body is not None]
    for a, b in ends:
        if GROUND not in (a, b) and not {a, b} & axis and image[a] != b:
            links[a].add(b)
            links[b].add(a)
    half: set[str] = set()
    for start in (plus, *circuit.nodes):
        if start in axis or start in half or image[start] in half:
            continue
        reached, waiting = {start}, [start]
        while waiting:
            for far in links[waiting.pop()] - reached:
                reached.add(far)
                waiting.append(far)
        if any(image[node] in reached for node in reached):
            return None
        half |= reached
    return frozenset(half)


def _end(node: str, mirror: Mirror) -> str:
    return node if node in mirror.image else GROUND


def _resistor(resistor: Resistor, mirror: Mirror) -> Resistor | None:
    a, b = resistor.a, resistor.b
    if not {a, b} & mirror.image.keys():
        return None
    if mirror.image.get(a) == b or mirror.image.get(b) == a:
        return Resistor(
            f"{resistor.name}/2", a if a in mirror.image else b, GROUND, resistor.ohm / 2.0, resistor.inside
        )
    return replace(resistor, a=_end(a, mirror), b=_end(b, mirror))


def _cell(cell: Cell, mirror: Mirror) -> Cell | None:
    if not {cell.control, cell.common, cell.output} & mirror.image.keys():
        return None
    control, common, output = (_end(node, mirror) for node in (cell.control, cell.common, cell.output))
    body = None if cell.body is None else _end(cell.body, mirror)
    return replace(cell, control=control, common=common, output=output, body=body)


def _capacitor(capacitor: Capacitor, mirror: Mirror) -> Capacitor | None:
    a, b = capacitor.a, capacitor.b
    if not {a, b} & mirror.image.keys():
        return None
    if mirror.image.get(a) == b or mirror.image.get(b) == a:
        return Capacitor(capacitor.part, a if a in mirror.image else b, GROUND, capacitor.farad, mirrored=True)
    return replace(capacitor, a=_end(a, mirror), b=_end(b, mirror))


def drive_of_halves(network: Network) -> float | None:
    """Give the amplitude that drives each half, a floating source half to either; None where they differ by 1e-6."""
    sizes = [
        abs(amplitude) / (1.0 if GROUND in part.nodes else 2.0)
        for part in network.parts
        if part.kind.endswith("source") and (amplitude := network.amplitude(part))
    ]
    if not sizes or any(not math.isclose(size, sizes[0], rel_tol=EQUAL) for size in sizes):
        return None
    return sizes[0]
