"""The elements of the hand circuit: resistors, cells, capacitors and device terminals, read from the parts.

A cell is one transconductor with its r_pi and r_o. A device brings its own; a lone controlled source is one where its
control shares a node with its output, and a source from AC ground between the same two nodes is its body effect.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping

from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network
from tauledger.network.transformers import REFLECTED, TURNS

INTERNAL = ("g_pi", "g_o", "g_mu")
WITHOUT_SIGNAL = ("substrate", "body")
CONTROL_WORDS = ("base", "gate", "input")
COMMON_WORDS = ("emitter", "source", "common terminal")
OUTPUT_WORDS = ("collector", "drain", "output")
LONE_WORDS = ("input", "common terminal", "output")


class Resistor(Struct, frozen=True):
    """One resistor between two hand nodes, ohm; parallel ones between live nodes are taken together.

    inside: it is no card of the netlist, but a device's own, as r_o.
    """

    name: str
    a: str
    b: str
    ohm: float
    inside: bool = False

    def other(self, node: str) -> str:
        """Give the end that is not `node`."""
        return self.b if node == self.a else self.a


class Cell(Struct, frozen=True):
    """One transconductor between hand nodes: gm·v(control, common) flows from output to common.

    gm, g_mb in S; r_pi, r_o in ohm, infinite where there is none. body: node of the second control, or None.
    words: what the trade calls control, common and output ("base", "emitter", "collector"). kind: of its device, as
    "npn"; empty for a lone source.
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
    kind: str = ""

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


class Capacitor(Struct, frozen=True):
    """One open capacitance between hand nodes; `part` is its name, farad its value.

    mirrored: in a half circuit, it leads to the mirror image of `a`, which moves the opposite way; b is ground then.
    """

    part: str
    a: str
    b: str
    farad: float
    mirrored: bool = False


class Transformer(Struct, frozen=True):
    """An ideal transformer between hand nodes: v(second) = turns·v(first), each from its first end to its second.

    name: of the coupling's windings, "L1 : L2".
    """

    name: str
    first: tuple[str, str]
    second: tuple[str, str]
    turns: float

    @property
    def live(self) -> tuple[str, str] | None:
        """The end of either winding whose other end is at AC ground, None where a winding floats or is shorted."""
        ends = [[node for node in winding if node != GROUND] for winding in (self.first, self.second)]
        return (ends[0][0], ends[1][0]) if [len(end) for end in ends] == [1, 1] else None

    @property
    def ratio(self) -> float:
        """Voltage from the live end of the first winding to that of the second, signed as the windings stand."""
        same_way = (self.first[1] == GROUND) == (self.second[1] == GROUND)
        return self.turns if same_way else -self.turns

    def windings_from(self, node: str) -> tuple[tuple[str, str], tuple[str, str]]:
        """Give the winding that has an end at this node, and the other one."""
        return (self.first, self.second) if node in self.first else (self.second, self.first)

    def turns_into(self, node: str) -> float:
        """Give the turns of the winding at this node per turn of the other, signed where both have an end at ground."""
        ratio = self.turns if self.live is None else self.ratio
        return 1.0 / ratio if node in self.first else ratio


class TerminalAt(Struct, frozen=True):
    """A device terminal in the hand circuit: its word, and the hand nodes of its outer and inner end."""

    owner: str
    word: str
    outer: str
    inner: str
    netlist_node: str


def read_cells(
    network: Network, hand: Mapping[str, str], at: Mapping[str, str], devices: tuple[Device, ...]
) -> tuple[tuple[Cell, ...], set[str]]:
    """Give all cells, and the names of the conductances that are inside them."""
    cells: list[Cell] = []
    used: set[str] = set()
    with_words = {device.name: device for device in devices if device.cell is not None and device.terminals}
    for device in with_words.values():
        cell = device.cell
        assert cell is not None
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
                    _word(device, cell.control, CONTROL_WORDS, "control"),
                    _word(device, cell.common, COMMON_WORDS, "common"),
                    _word(device, cell.output, OUTPUT_WORDS, "output"),
                ),
                kind=device.kind,
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


def _word(device: Device, node: str, usual: tuple[str, ...], else_word: str) -> str:
    """Give the word of the terminal at a node, the usual one where several are joined there."""
    words = [t.word for t in device.terminals if t.inner == node and t.word not in WITHOUT_SIGNAL]
    return next((word for word in words if word in usual), words[0] if words else else_word)


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


def read_transformers(network: Network, hand: Mapping[str, str]) -> tuple[Transformer, ...]:
    """Give every pair of windings that was drawn out as an ideal transformer."""
    reflected = {part.owner: part for part in network.parts if part.label == REFLECTED}
    found = []
    for part in network.parts:
        if part.kind == "voltage gain" and part.label == TURNS and part.owner in reflected:
            second, first = (tuple(hand[node] for node in pair) for pair in (part.nodes[:2], part.nodes[2:]))
            found.append(
                Transformer(f"turns of {part.owner}", (first[0], first[1]), (second[0], second[1]), part.value)
            )
    return tuple(found)


def read_resistors(network: Network, hand: Mapping[str, str], used: set[str]) -> tuple[Resistor, ...]:
    """Give every resistor of the network between hand nodes, those between the same two nodes taken together.

    used: names of the parts that belong to a cell already.
    """
    grouped: dict[tuple[str, str], list[Part]] = {}
    resistors: list[Resistor] = []
    for part in network.parts:
        if part.kind != "conductance" or part.name in used or part.value == 0.0:
            continue
        a, b = sorted(hand[node] for node in part.nodes)
        if a == b:
            continue
        if GROUND in (a, b):
            resistors.append(Resistor(_resistor_name(part), a, b, 1.0 / part.value, bool(part.label)))
        else:
            grouped.setdefault((a, b), []).append(part)
    for (a, b), together in grouped.items():
        name = " ‖ ".join(map(_resistor_name, together))
        inside = all(part.label for part in together)
        resistors.append(Resistor(name if len(together) == 1 else f"({name})", a, b, _parallel_ohm(together), inside))
    return tuple(resistors)


def _resistor_name(part: Part) -> str:
    if not part.label:
        return part.owner
    label = "r_" + part.label.removeprefix("g_") if part.label.startswith("g_") else part.label
    return f"{label.replace('r_pi', 'r_π')}({part.owner})"


def read_terminals(
    at: Mapping[str, str], devices: tuple[Device, ...], cells: tuple[Cell, ...], whole: Network
) -> tuple[TerminalAt, ...]:
    """Give every terminal of the devices and of the lone cells with the hand nodes of its outer and inner end.

    at: hand node by node of the network.
    """
    found = [
        TerminalAt(device.name, t.word, at.get(t.outer, GROUND), at.get(t.inner, GROUND), t.outer)
        for device in devices
        for t in device.terminals
        if t.word not in WITHOUT_SIGNAL
    ]
    named = {terminal.owner for terminal in found}
    for cell in cells:
        if cell.owner in named:
            continue
        ends = (cell.control, cell.common, cell.output)
        out, control = _source_of(cell, ends, at, whole)
        for word, node, nodes in zip(cell.words, ends, (control, out, out), strict=True):
            name = next(name for name in nodes if at[name] == node)
            found.append(TerminalAt(cell.owner, word, node, node, name))
    return tuple(found)


def _source_of(
    cell: Cell, ends: tuple[str, ...], at: Mapping[str, str], whole: Network
) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Give output and control nodes of the source behind a lone cell: a card with several controls makes several."""
    sources = [part.nodes for part in whole.parts if part.kind == "transconductance" and part.owner == cell.owner]
    nodes = next(nodes for nodes in sources if set(ends) <= {at[node] for node in nodes})
    return nodes[:2], nodes[2:]


def _parallel_ohm(parts: Iterable[Part]) -> float:
    total = sum(part.value for part in parts)
    return 1.0 / total if total else math.inf
