"""Everything inside one subcircuit instance as one part: a block of matrices, "inside XU1".

The parts of the instance are assembled by themselves, and its inner unknowns, nodes and branch currents alike, stand at
nodes XU1'1, XU1'2, … of the block. Nothing is eliminated: an amplifier of 100 dB would lose five digits by it.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable

import numpy as np

from tauledger.circuit import GROUND, Port, fold
from tauledger.devices.family import inner_node
from tauledger.devices.parts import Matrix, Part, block
from tauledger.errors import InputError
from tauledger.network.assemble import assemble
from tauledger.network.solve import Real

LABEL = "inside"


def obstacle(parts: Iterable[Part], inside: Collection[str], port: Port) -> str:
    """Say what keeps the named parts from being taken together; empty where nothing does."""
    parts = tuple(parts)
    within = [part for part in parts if part.name in inside]
    owners = {fold(part.owner) for part in within}
    if any(part.amplitude for part in within):
        return "a driven source is inside"
    if any(part.kind in ("delayed transconductance", "line") for part in within):
        return "a delay is inside"
    if any(fold(owner) in owners for part in parts if part.name not in inside for owner in part.references):
        return "a source outside refers to a current inside"
    if any(fold(owner) not in owners for part in within for owner in part.references):
        return "a source inside refers to a current outside"
    if port.kind == "current" and fold(port.through) in owners:
        return "the output is a current inside"
    outer = _outer(parts, inside, port)
    touched = {node for part in within for node in part.nodes}
    return "" if touched & set(outer) else "nothing outside is connected to it"


def folded(parts: Iterable[Part], owner: str, inside: Collection[str], port: Port) -> tuple[Part, ...]:
    """Put the named parts into one block of this owner, at the place of the first of them.

    inside: names of the parts. port: the output, whose nodes stay.
    Raises InputError where they cannot be taken together.
    """
    parts = tuple(parts)
    within = tuple(part for part in parts if part.name in inside)
    reason = obstacle(parts, inside, port)
    if reason:
        raise InputError(f"{owner} cannot be folded: {reason}", "fold a smaller instance, or none")
    network = assemble(within, Port(GROUND), {})
    g, c = network.conductance.dense(network.size), network.capacitance.dense(network.size)
    names = network.unknowns
    outer = [node for node in _outer(parts, inside, port) if node in names[: network.n_nodes]]
    first = [names.index(node) for node in outer]
    order = [*first, *(k for k in range(len(names)) if k not in first)]
    g, c = g[np.ix_(order, order)], c[np.ix_(order, order)]
    states = tuple(inner_node(owner, str(k)) for k in range(1, len(g) - len(outer) + 1))
    one = block(owner, (*outer, *states), _rows(g), _rows(c), LABEL)
    at = parts.index(within[0])
    before = tuple(part for part in parts[:at] if part.name not in inside)
    return (*before, one, *(part for part in parts[at:] if part.name not in inside))


def _outer(parts: tuple[Part, ...], inside: Collection[str], port: Port) -> list[str]:
    """Give the nodes that something outside touches, the output's included; ground is no node of a matrix."""
    outside = [node for part in parts if part.name not in inside for node in part.nodes]
    found = dict.fromkeys([*outside, port.plus, port.minus])
    return [node for node in found if node not in (GROUND, "")]


def _rows(matrix: Real) -> Matrix:
    return tuple(tuple(float(value) for value in row) for row in matrix)
