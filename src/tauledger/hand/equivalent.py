"""The mid-band equivalent circuit as drawn on paper: joined nodes, resistors, cells, and its exact impedances.

Short capacitors, inductors that are short and all voltage sources join nodes; joined with ground are the supplies and,
with the input nulled, the driven nodes. What remains is resistors and cells (a cell is one transconductor with its
r_pi and r_o), and the impedance matrix against which every hand rule is checked.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.devices.parts import Part
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands

INTERNAL = ("g_pi", "g_o", "g_mu")
WITHOUT_SIGNAL = ("substrate", "body")
LONE_WORDS = ("input", "common terminal", "output")


@dataclass(frozen=True, slots=True)
class Resistor:
    """One resistor between two hand nodes, ohm; parallel ones between live nodes are taken together."""

    name: str
    a: str
    b: str
    ohm: float

    def other(self, node: str) -> str:
        """Give the end that is not `node`."""
        return self.b if node == self.a else self.a


@dataclass(frozen=True, slots=True)
class Cell:
    """One transconductor between hand nodes: gm·v(control, common) flows from output to common.

    gm, g_mb in S; r_pi, r_o in ohm, infinite where there is none. body: node of the second control, or None.
    words: what the trade calls control, common and output ("base", "emitter", "collector").
    """

    owner: str
    control: str
    common: str
    output: str
    gm: float
    r_pi: float = math.inf
    r_o: float = math.inf
    body: str | None = None
    g_mb: float = 0.0
    words: tuple[str, str, str] = LONE_WORDS

    @property
    def beta(self) -> float:
        """Current gain gm·r_pi; infinite without r_pi."""
        return self.gm * self.r_pi

    @property
    def body_gm(self) -> float:
        """The g_mb that a hand rule knows: that of a body at AC ground."""
        return self.g_mb if self.body == GROUND else 0.0

    @property
    def diode_connected(self) -> bool:
        """Whether the control is its own output."""
        return self.control == self.output


@dataclass(frozen=True, slots=True)
class Capacitor:
    """One open capacitance between hand nodes; `part` is its name, farad its value."""

    part: str
    a: str
    b: str
    farad: float


@dataclass(frozen=True, slots=True)
class TerminalAt:
    """A device terminal in the hand circuit: its word, and the hand nodes of its outer and inner end."""

    owner: str
    word: str
    outer: str
    inner: str
    netlist_node: str


@dataclass(frozen=True, slots=True)
class EquivalentCircuit:
    """Resistors, cells and open capacitances between hand nodes, and the exact matrices on the same nodes.

    at: every node of the whole network → its hand node, "0" for ground, supplies and driven nodes. driven: those
    of the whole network's nodes that a source moves. members: hand node → nodes of the whole network, file order.
    nodes: the n live hand nodes. impedance Z: (n, n) ohm, input nulled. voltage x, adjoint λ, injected: (n,) complex;
    injected is the drive as a Norton current into each live node, A. response H.
    inner_names: nodes of the whole network behind a series resistance. output_nodes: netlist nodes of the output.
    constant: (n,) diagonal of C·Z, s. moment: (n,) λ_i·(C·x)_i / H, s. floating: live nodes without any DC path.
    """

    at: Mapping[str, str]
    driven: frozenset[str]
    members: Mapping[str, tuple[str, ...]]
    nodes: tuple[str, ...]
    resistors: tuple[Resistor, ...]
    cells: tuple[Cell, ...]
    capacitors: tuple[Capacitor, ...]
    terminals: tuple[TerminalAt, ...]
    inner_names: frozenset[str]
    output_nodes: tuple[str, ...]
    impedance: NDArray[np.float64]
    voltage: NDArray[np.complex128]
    adjoint: NDArray[np.complex128]
    injected: NDArray[np.complex128]
    response: complex
    constant: NDArray[np.float64]
    moment: NDArray[np.complex128]
    floating: frozenset[str]
    row: Mapping[str, int] = field(repr=False)
    resistors_at: Mapping[str, tuple[int, ...]] = field(repr=False)
    cells_at: Mapping[str, tuple[int, ...]] = field(repr=False)

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
        return 0.0 if end == GROUND else self.z(end, start) / self.z(start, start)


def upper_circuit(bands: Bands, devices: tuple[Device, ...]) -> EquivalentCircuit:
    """Draw the mid-band circuit in which the open capacitances act.

    Raises NetworkError where a node has no path for direct current, or the circuit no unique solution.
    """
    circuit = equivalent_circuit(bands.upper, bands.merged, devices, bands.network)
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
        idle = nodes[0] == nodes[1] and not forced
        if part.name not in gone and not idle:
            parts.append(replace(part, nodes=nodes))
    drive = {part.owner: complex(network.amplitude(part)) for part in parts if part.kind.endswith("source")}
    port = network.port
    if port.kind == "voltage":
        port = replace(port, plus=at[port.plus], minus=at[port.minus])
    return Network.from_parts(parts, output=port, drive=drive), at


def equivalent_circuit(
    network: Network, merged: Mapping[str, str], devices: tuple[Device, ...], whole: Network
) -> EquivalentCircuit:
    """Draw a network whose capacitances are all open as a hand circuit.

    merged: every node of the whole network → its node in `network`. whole: that network; its names are the
    user's.
    Raises NetworkError where the circuit has no unique solution.
    """
    order = [GROUND, *network.unknowns[: network.n_nodes]]
    hand = joined_nodes(network, {p.name for p in network.parts if p.kind in ("voltage source", "inductance")})
    at = {node: hand[upper] for node, upper in merged.items()}
    nodes = tuple(dict.fromkeys(hand[node] for node in order if hand[node] != GROUND))
    solved = _solve(network, hand, nodes)
    moved = {node for node, v in zip(order[1:], solved.full_voltage, strict=False) if hand[node] == GROUND and v}
    members: dict[str, list[str]] = {}
    for node, h in at.items():
        members.setdefault(h, []).append(node)
    cells, used = _cells(network, hand, at, devices)
    resistors = _resistors(network, hand, used)
    return EquivalentCircuit(
        at=at,
        driven=frozenset(node for node, upper in merged.items() if upper in moved),
        members={h: tuple(names) for h, names in members.items()},
        nodes=nodes,
        resistors=resistors,
        cells=cells,
        capacitors=tuple(
            Capacitor(part.name, hand[part.nodes[0]], hand[part.nodes[1]], part.value)
            for part in network.parts
            if part.kind == "capacitance"
        ),
        terminals=_terminals(at, devices, cells, whole),
        inner_names=frozenset(t.inner for device in devices for t in device.terminals if t.inner != t.outer),
        output_nodes=(whole.port.plus, whole.port.minus) if whole.port.kind == "voltage" else (),
        impedance=solved.impedance,
        voltage=solved.voltage,
        adjoint=solved.adjoint,
        injected=solved.injected,
        response=solved.response,
        constant=solved.constant,
        moment=solved.moment,
        floating=solved.floating,
        row={node: k for k, node in enumerate(nodes)},
        resistors_at=_adjacency([(r.a, r.b) for r in resistors]),
        cells_at=_adjacency([(c.control, c.common, c.output) for c in cells]),
    )


@dataclass(frozen=True, slots=True)
class _Solved:
    impedance: NDArray[np.float64]
    full_voltage: NDArray[np.complex128]
    voltage: NDArray[np.complex128]
    adjoint: NDArray[np.complex128]
    injected: NDArray[np.complex128]
    response: complex
    constant: NDArray[np.float64]
    moment: NDArray[np.complex128]
    floating: frozenset[str]


def _solve(network: Network, hand: Mapping[str, str], nodes: tuple[str, ...]) -> _Solved:
    g = network.conductance.dense(network.size)
    c = network.capacitance.dense(network.size)
    lonely = [k for k in range(network.n_nodes) if not g[k].any() and not g[:, k].any()]
    g[lonely, lonely] = 1.0
    try:
        inverse = np.linalg.inv(g)
    except np.linalg.LinAlgError as error:
        raise NetworkError("the mid-band network has no unique solution") from error
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
    moved = np.array(
        [k < network.n_nodes and hand[network.unknowns[k]] == GROUND for k in range(network.size)], dtype=bool
    )
    g[lonely, lonely] = 0.0
    source_current = np.where(np.arange(network.size) < network.n_nodes, network.drive, 0.0)
    injected = groups @ (source_current - g @ np.where(moved, x, 0.0))
    moment = groups @ (adjoint * (c @ x)) / response if response else np.zeros(len(nodes), dtype=complex)
    return _Solved(
        impedance=np.asarray(inverse[pick], dtype=float),
        full_voltage=x,
        voltage=x[first],
        adjoint=adjoint[first],
        injected=np.asarray(injected, dtype=complex),
        response=response,
        constant=groups @ np.einsum("ij,ji->i", c, inverse),
        moment=moment,
        floating=frozenset(hand[network.unknowns[k]] for k in lonely),
    )


def _cells(
    network: Network, hand: Mapping[str, str], at: Mapping[str, str], devices: tuple[Device, ...]
) -> tuple[tuple[Cell, ...], set[str]]:
    """Give all cells, and the names of the conductances that are inside them."""
    cells: list[Cell] = []
    used: set[str] = set()
    with_words = {device.name: device for device in devices if device.cell is not None and device.terminals}
    for device in with_words.values():
        cell = device.cell
        assert cell is not None
        word = {terminal.inner: terminal.word for terminal in device.terminals if terminal.word not in WITHOUT_SIGNAL}
        control, common, output = (at.get(node, GROUND) for node in (cell.control, cell.common, cell.output))
        cells.append(
            Cell(
                owner=cell.owner,
                control=control,
                common=common,
                output=output,
                gm=cell.gm,
                r_pi=math.inf if cell.r_pi is None else cell.r_pi,
                r_o=math.inf if cell.r_o is None else cell.r_o,
                body=None if cell.body is None else at.get(cell.body, GROUND),
                g_mb=cell.g_mb,
                words=(
                    word.get(cell.control, "control"),
                    word.get(cell.common, "common"),
                    word.get(cell.output, "output"),
                ),
            )
        )
        used.update(part.name for part in device.parts if part.kind == "conductance" and part.label in INTERNAL)
    lone: list[Cell] = []
    for part in network.parts:
        if part.kind == "transconductance" and part.owner not in with_words:
            found = _lone_cell(part, tuple(hand[node] for node in part.nodes))
            if found is not None:
                lone.append(found)
    for found in _with_body(lone):
        inside = [part for part in network.parts if part.kind == "conductance" and part.name not in used]
        r_pi = [part for part in inside if _inside(part, found, found.control, "g_pi", hand)]
        r_o = [part for part in inside if _inside(part, found, found.output, "g_o", hand) and part not in r_pi]
        used.update(part.name for part in (*r_pi, *r_o))
        cells.append(replace(found, r_pi=_parallel_ohm(r_pi), r_o=_parallel_ohm(r_o)))
    return tuple(cells), used


def _lone_cell(part: Part, nodes: tuple[str, ...]) -> Cell | None:
    """Read a controlled source as a cell where its control shares a node with its output; the sign stays with gm."""
    out_plus, out_minus, control_plus, control_minus = nodes
    if out_plus == out_minus or control_plus == control_minus:
        return None
    if (out_plus, out_minus) == (control_plus, control_minus):
        return Cell(part.owner, out_plus, out_minus, out_plus, part.value)
    if (out_minus, out_plus) == (control_plus, control_minus):
        return Cell(part.owner, out_plus, out_minus, out_plus, -part.value)
    for output, common, out_sign in ((out_plus, out_minus, 1.0), (out_minus, out_plus, -1.0)):
        if control_minus == common:
            return Cell(part.owner, control_plus, common, output, out_sign * part.value)
        if control_plus == common:
            return Cell(part.owner, control_minus, common, output, -out_sign * part.value)
    return None


def _with_body(cells: list[Cell]) -> list[Cell]:
    """Take a source between the same two nodes that is controlled from AC ground as the body effect of the first."""
    kept: list[Cell] = []
    for cell in sorted(cells, key=lambda cell: cell.control == GROUND):
        ends = (cell.output, cell.common)
        hosts = [k for k, o in enumerate(kept) if (o.output, o.common) == ends and o.body is None]
        host = hosts[0] if hosts and cell.control == GROUND else None
        if host is None:
            kept.append(cell)
        else:
            kept[host] = replace(kept[host], body=GROUND, g_mb=cell.gm)
    return kept


def _inside(part: Part, cell: Cell, terminal: str, label: str, hand: Mapping[str, str]) -> bool:
    """Say whether a conductance is the cell's own: by owner and label, or because it spans two live nodes of it.

    A resistor from the control to ground is the source network and no r_pi, so ground on either side excludes it.
    """
    if part.owner == cell.owner:
        return part.label == label
    live = GROUND not in (cell.common, terminal) and not cell.diode_connected
    return live and not part.label and {hand[node] for node in part.nodes} == {cell.common, terminal}


def _resistors(network: Network, hand: Mapping[str, str], used: set[str]) -> tuple[Resistor, ...]:
    grouped: dict[tuple[str, str], list[tuple[str, float]]] = {}
    resistors: list[Resistor] = []
    for part in network.parts:
        if part.kind != "conductance" or part.name in used or part.value == 0.0:
            continue
        a, b = sorted(hand[node] for node in part.nodes)
        if a == b:
            continue
        if GROUND in (a, b):
            resistors.append(Resistor(_resistor_name(part), a, b, 1.0 / part.value))
        else:
            grouped.setdefault((a, b), []).append((_resistor_name(part), part.value))
    for (a, b), together in grouped.items():
        name = " ‖ ".join(name for name, _ in together)
        resistors.append(
            Resistor(name if len(together) == 1 else f"({name})", a, b, 1.0 / sum(value for _, value in together))
        )
    return tuple(resistors)


def _resistor_name(part: Part) -> str:
    if not part.label:
        return part.owner
    label = "r_" + part.label.removeprefix("g_") if part.label.startswith("g_") else part.label
    return f"{label.replace('r_pi', 'r_π')}({part.owner})"


def _terminals(
    at: Mapping[str, str], devices: tuple[Device, ...], cells: tuple[Cell, ...], whole: Network
) -> tuple[TerminalAt, ...]:
    found = [
        TerminalAt(device.name, t.word, at.get(t.outer, GROUND), at.get(t.inner, GROUND), t.outer)
        for device in devices
        for t in device.terminals
        if t.word not in WITHOUT_SIGNAL
    ]
    named = {terminal.owner for terminal in found}
    card: dict[str, tuple[str, ...]] = {}
    for part in whole.parts:
        if part.kind == "transconductance":
            card.setdefault(part.owner, part.nodes)
    for cell in cells:
        if cell.owner in named:
            continue
        out, control = card[cell.owner][:2], card[cell.owner][2:]
        ends = (cell.control, cell.common, cell.output)
        for word, node, nodes in zip(cell.words, ends, (control, out, out), strict=True):
            name = next(name for name in nodes if at[name] == node)
            found.append(TerminalAt(cell.owner, word, node, node, name))
    return tuple(found)


def _parallel_ohm(parts: Iterable[Part]) -> float:
    total = sum(part.value for part in parts)
    return 1.0 / total if total else math.inf


def _adjacency(ends: list[tuple[str, ...]]) -> dict[str, tuple[int, ...]]:
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
