"""Networks with some parts taken as wires: nodes joined, renamed, and what has become a loop left out."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from msgspec.structs import replace

from tauledger.circuit import GROUND, Port, fold
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, assemble, without_loose_ends


def joined_nodes(network: Network, joining: Iterable[Part]) -> dict[str, str]:
    """Give for every node, ground included, the node that stands for all that these two-terminal parts join with it."""
    nodes = [GROUND, *network.unknowns[: network.n_nodes]]
    joined: dict[str, str] = {}
    rank = {node: position for position, node in enumerate([GROUND, network.port.plus, network.port.minus, *nodes])}
    rank |= {network.port.minus: 2, network.port.plus: 1, GROUND: 0}
    for part in joining:
        a, b = sorted((root_of(joined, end) for end in part.nodes[:2]), key=lambda node: rank[node])
        joined[b] = a
    return {node: root_of(joined, node) for node in nodes}


def root_of(joined: dict[str, str], node: str) -> str:
    """Give the node at the end of the chain that leads from this one; the chain is shortened on the way."""
    while (after := joined.get(node, node)) != node:
        joined[node] = joined.get(after, after)
        node = joined[node]
    return node


def renamed(network: Network, parts: list[Part], merged: Mapping[str, str]) -> Network:
    """Rename nodes; leave out what has become a loop or has no value, but no driven source and no output branch."""
    kept = []
    for part in parts:
        nodes = tuple(merged[node] for node in part.nodes)
        if not _is_empty(network, part, nodes):
            kept.append(replace(part, nodes=nodes))
    kept = list(without_loose_ends(kept))
    port = network.port
    if port.kind == "voltage":
        port = Port(merged[port.plus], merged[port.minus])
    sources = ("voltage source", "current source")
    drive = {
        p.owner: complex(network.amplitude(p))
        for p in kept
        if p.kind in sources and fold(p.owner) in network.amplitudes
    }
    return assemble(tuple(kept), port, {fold(name): value for name, value in drive.items()})


def passes(network: Network, part: Part) -> bool:
    """Whether this is an inductor that may be taken out: not the one whose current is the output."""
    through = fold(network.port.through) if network.port.kind == "current" else None
    return part.kind == "inductance" and fold(part.owner) != through


def _is_empty(network: Network, part: Part, nodes: tuple[str, ...]) -> bool:
    if part.kind in ("capacitance", "transcapacitance") and part.value == 0.0:
        return True
    if part.kind in ("mutual inductance", "block"):
        return False
    # a voltage gain without control still forces 0 V
    loop = nodes[0] == nodes[1] or (len(nodes) == 4 and nodes[2] == nodes[3] and part.kind != "voltage gain")
    if not loop:
        return False
    if part.kind == "voltage source":
        carries_output = network.port.kind == "current" and fold(network.port.through) == fold(part.owner)
        return network.amplitude(part) == 0.0 and not carries_output
    return not (part.kind == "inductance" and not passes(network, part))
