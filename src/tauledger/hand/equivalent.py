"""The mid-band equivalent circuit as drawn on paper: joined nodes, resistors, cells, and its exact impedances.

Short capacitors, inductors that are short and all voltage sources join nodes; joined with ground are the supplies and,
with the input nulled, the driven nodes. What remains is resistors and cells (a cell is one transconductor with its
r_pi and r_o), and the impedance matrix against which every hand rule is checked.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.devices.parts import Part
from tauledger.errors import NetworkError
from tauledger.hand.elements import Capacitor as Capacitor
from tauledger.hand.elements import (
    Cell,
    Resistor,
    TerminalAt,
    Transformer,
    read_cells,
    read_resistors,
    read_terminals,
    read_transformers,
)
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands
from tauledger.network.gain_setting import impedance_below

ROUNDING = 1e-12


class EquivalentCircuit(Struct, frozen=True):
    """Resistors, cells and open capacitances between hand nodes, and the exact matrices on the same nodes.

    at: every node of the whole network → its hand node, "0" for ground, supplies and driven nodes. driven: those
    of the whole network's nodes that a source moves away from their hand node, with their voltage. members: hand node →
    nodes of the whole network, file order.
    nodes: the n live hand nodes. impedance Z: (n, n) ohm, input nulled. whole: the same, complex, at s_mid, which is 0
    but where capacitors set the gain; impedance is then Re Z of the poles above s_mid. voltage x, adjoint λ, injected:
    (n,) complex; injected is the drive as a Norton current into each live node, A. response H.
    inner_names: nodes of the whole network behind a series resistance. output_nodes: netlist nodes of the output.
    products: (n, n) C·Z, s. charge: (n,) C·x per ω, C. floating: live nodes without any DC path.
    """

    at: Mapping[str, str]
    driven: Mapping[str, complex]
    members: Mapping[str, tuple[str, ...]]
    nodes: tuple[str, ...]
    resistors: tuple[Resistor, ...]
    cells: tuple[Cell, ...]
    capacitors: tuple[Capacitor, ...]
    terminals: tuple[TerminalAt, ...]
    inner_names: frozenset[str]
    output_nodes: tuple[str, ...]
    impedance: NDArray[np.float64]
    whole: NDArray[np.complex128]
    s_mid: complex
    voltage: NDArray[np.complex128]
    adjoint: NDArray[np.complex128]
    injected: NDArray[np.complex128]
    response: complex
    products: NDArray[np.float64]
    charge: NDArray[np.complex128]
    floating: frozenset[str]
    row: Mapping[str, int]
    resistors_at: Mapping[str, tuple[int, ...]]
    cells_at: Mapping[str, tuple[int, ...]]
    transformers: tuple[Transformer, ...] = ()
    transformers_at: Mapping[str, tuple[int, ...]] = {}

    @property
    def constant(self) -> NDArray[np.float64]:
        """(n,) diagonal of C·Z, s: the exact time constant of every node."""
        return np.asarray(np.diagonal(self.products), dtype=float)

    @property
    def moment(self) -> NDArray[np.complex128]:
        """(n,) λ_i·(C·x)_i / H, s: what every node adds to the first moment; 0 where there is no response."""
        return self.adjoint * self.charge / self.response if self.response else np.zeros_like(self.adjoint)

    @property
    def output_hand(self) -> tuple[str, str]:
        """Hand nodes of the output, plus and minus; ground twice where the output is a current."""
        plus, minus = (*self.output_nodes, GROUND, GROUND)[:2]
        return self.at[plus], self.at[minus]

    def z(self, i: str, j: str) -> float:
        """Exact transfer resistance in ohm: voltage at i for 1 A into j; 0 where either is ground."""
        if i == GROUND or j == GROUND:
            return 0.0
        if i == j and i in self.floating:
            return math.inf
        return float(self.impedance[self.row[i], self.row[j]])

    def across(self, a: str, b: str) -> float:
        """Exact resistance in ohm between a and b."""
        return self.z(a, a) + self.z(b, b) - self.z(a, b) - self.z(b, a)

    def gain(self, start: str, end: str) -> float:
        """Exact K = Z_end,start / Z_start,start: the gain driven from the node itself; 0 where the end is ground."""
        return 0.0 if end == GROUND or not self.z(start, start) else self.z(end, start) / self.z(start, start)


def upper_circuit(bands: Bands, devices: tuple[Device, ...]) -> EquivalentCircuit:
    """Draw the mid-band circuit in which the open capacitances act.

    Raises NetworkError where a node has no path for direct current, or the circuit no unique solution.
    """
    circuit = equivalent_circuit(bands.upper, bands.merged, devices, bands.network, bands.s_mid)
    if circuit.floating:
        raise NetworkError(f"node {min(circuit.floating)} hangs on capacitors alone at mid-band")
    return circuit


def joined_nodes(network: Network, shorted: Collection[str]) -> dict[str, str]:
    """Give for every node, ground included, the node that stands for all that the parts in `shorted` join with it.

    Ground wins, else the node first in the file.
    """
    order = [GROUND, *network.unknowns[: network.n_nodes]]
    parent = {node: node for node in order}
    rank = {node: k for k, node in enumerate(order)}
    for part in network.parts:
        if part.name in shorted:
            _union(parent, rank, part.nodes[0], part.nodes[1])
    return {node: _find(parent, node) for node in order}


def joined(network: Network, shorted: Collection[str], removed: Collection[str]) -> tuple[Network, Mapping[str, str]]:
    """Join the ends of the parts named in `shorted` and take out those in `removed`.

    Returns the smaller network and every node's new node; ground wins, else the node first in the file.
    """
    at = joined_nodes(network, shorted)
    gone = {*shorted, *removed}
    parts: list[Part] = []
    for part in network.parts:
        nodes = tuple(at[node] for node in part.nodes)
        forced = part.kind.endswith("source") and network.amplitude(part) != 0.0
        idle = nodes[0] == nodes[1] and not forced and part.kind != "block"
        if part.name not in gone and not idle:
            parts.append(replace(part, nodes=nodes))
    drive = {part.owner: complex(network.amplitude(part)) for part in parts if part.kind.endswith("source")}
    port = network.port
    if port.kind == "voltage":
        port = replace(port, plus=at[port.plus], minus=at[port.minus])
    return Network.from_parts(parts, output=port, drive=drive), at


def equivalent_circuit(
    network: Network, merged: Mapping[str, str], devices: tuple[Device, ...], whole: Network, s: complex = 0j
) -> EquivalentCircuit:
    """Draw a network whose capacitances are all open as a hand circuit.

    merged: every node of the whole network → its node in `network`. whole: that network; its names are the
    user's. s: jω_mid where capacitors set the gain; the matrices are then taken there with the capacitances in place,
    the impedances as real parts of what the poles above make of them.
    Raises NetworkError where the circuit has no unique solution.
    """
    order = [GROUND, *network.unknowns[: network.n_nodes]]
    hand = joined_nodes(network, {p.name for p in network.parts if p.kind in ("voltage source", "inductance")})
    # a node that hung on capacitances alone is in no part of this network: no signal is there
    at = {node: hand.get(upper, GROUND) for node, upper in merged.items()}
    nodes = tuple(dict.fromkeys(hand[node] for node in order if hand[node] != GROUND))
    solved = _solve(network, hand, nodes, s)
    moved = {node: complex(v) for node, v in zip(order[1:], solved.forced, strict=False) if v}
    members: dict[str, list[str]] = {}
    for node, h in at.items():
        members.setdefault(h, []).append(node)
    cells, used = read_cells(network, hand, at, devices)
    resistors = read_resistors(network, hand, used)
    transformers = read_transformers(network, hand)
    return EquivalentCircuit(
        at=at,
        driven={node: moved[upper] for node, upper in merged.items() if upper in moved},
        members={h: tuple(names) for h, names in members.items()},
        nodes=nodes,
        resistors=resistors,
        cells=cells,
        capacitors=tuple(
            Capacitor(part.name, hand[part.nodes[0]], hand[part.nodes[1]], part.value)
            for part in network.parts
            if part.kind == "capacitance"
        ),
        terminals=read_terminals(at, devices, cells, whole),
        inner_names=frozenset(t.inner for device in devices for t in device.terminals if t.inner != t.outer),
        output_nodes=(whole.port.plus, whole.port.minus) if whole.port.kind == "voltage" else (),
        impedance=solved.impedance,
        whole=solved.whole,
        s_mid=s,
        voltage=solved.voltage,
        adjoint=solved.adjoint,
        injected=solved.injected,
        response=solved.response,
        products=solved.products,
        charge=solved.charge,
        floating=solved.floating,
        row={node: k for k, node in enumerate(nodes)},
        resistors_at=adjacency([(r.a, r.b) for r in resistors]),
        cells_at=adjacency([(c.control, c.common, c.output) for c in cells]),
        transformers=transformers,
        transformers_at=adjacency([tuple(n for n in (*t.first, *t.second) if n != GROUND) for t in transformers]),
    )


class _Solved(Struct, frozen=True):
    impedance: NDArray[np.float64]
    whole: NDArray[np.complex128]
    forced: NDArray[np.complex128]
    voltage: NDArray[np.complex128]
    adjoint: NDArray[np.complex128]
    injected: NDArray[np.complex128]
    response: complex
    products: NDArray[np.float64]
    charge: NDArray[np.complex128]
    floating: frozenset[str]


def _solve(network: Network, hand: Mapping[str, str], nodes: tuple[str, ...], s: complex) -> _Solved:
    c = network.capacitance.dense(network.size)
    g = network.conductance.dense(network.size)
    g = g + s * c if s else g
    lonely = [k for k in range(network.n_nodes) if not g[k].any() and not g[:, k].any()]
    g[lonely, lonely] = 1.0
    try:
        inverse = np.linalg.inv(g)
    except np.linalg.LinAlgError as error:
        raise NetworkError("the mid-band network has no unique solution") from error
    faced = inverse - impedance_below(network, s) if s else inverse
    x = inverse @ network.drive
    adjoint = inverse.T @ network.output.astype(complex)
    response = complex(network.output @ x)
    groups = np.zeros((len(nodes), network.size))
    first: list[int] = []
    for k, node in enumerate(nodes):
        rows = [row for row in range(network.n_nodes) if hand[network.unknowns[row]] == node]
        groups[k, rows] = 1.0
        first.append(rows[0])
    pick = np.ix_(first, first)
    g[lonely, lonely] = 0.0
    source_current = np.where(np.arange(network.size) < network.n_nodes, network.drive, 0.0)
    # Sources join nodes that they hold at different voltages: against ground, or, where one floats, about their mean.
    mean = groups @ x / groups.sum(axis=1)
    forced = np.where(np.arange(network.size) < network.n_nodes, x - groups.T @ mean, 0.0)
    forced[np.abs(forced) <= ROUNDING * np.abs(x).max(initial=0.0)] = 0.0
    injected = groups @ (source_current - g @ forced)
    return _Solved(
        impedance=np.asarray(faced.real[pick], dtype=float),
        whole=np.asarray(inverse[pick], dtype=complex),
        forced=np.asarray(forced, dtype=complex),
        voltage=np.asarray(mean, dtype=complex),
        adjoint=adjoint[first],
        injected=np.asarray(injected, dtype=complex),
        response=response,
        products=np.asarray(groups @ c @ faced.real[:, first], dtype=float),
        charge=np.asarray(groups @ (c @ x), dtype=complex),
        floating=frozenset(hand[network.unknowns[k]] for k in lonely),
    )


def adjacency(ends: list[tuple[str, ...]]) -> dict[str, tuple[int, ...]]:
    """Give for every node which of the elements, whose end nodes are given, are there."""
    at: dict[str, list[int]] = {}
    for k, nodes in enumerate(ends):
        for node in dict.fromkeys(nodes):
            at.setdefault(node, []).append(k)
    return {node: tuple(which) for node, which in at.items()}


def _find(parent: dict[str, str], node: str) -> str:
    while parent[node] != node:
        parent[node] = parent[parent[node]]
        node = parent[node]
    return node


def _union(parent: dict[str, str], rank: Mapping[str, int], a: str, b: str) -> None:
    first, second = sorted((_find(parent, a), _find(parent, b)), key=rank.__getitem__)
    parent[second] = first
