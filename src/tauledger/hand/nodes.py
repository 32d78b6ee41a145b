"""Signal nodes: which circuit nodes make one row, what the trade calls them, and which of them the signal crosses."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.hand.elements import TerminalAt
from tauledger.hand.equivalent import EquivalentCircuit

CROSSING_IN_PATH = 0.05
MOMENT_IN_PATH = 0.02
LISTED_OWNERS = 3

OUTPUT_WORDS = ("collector", "drain", "output", "anode")
CONTROL_WORDS = ("base", "gate", "input")
PLURAL = {"base": "bases", "gate": "gates", "emitter": "emitters", "source": "sources", "collector": "collectors"}
PLURAL |= {"drain": "drains", "anode": "anodes", "cathode": "cathodes", "input": "inputs", "output": "outputs"}
PLURAL |= {"common terminal": "common terminals"}


class Group(Struct, frozen=True):
    """The hand nodes of one row, the netlist's own node first, and what they are called.

    name: unique. title: as the trade says it. role: terminal word(s), "output" or "node".
    owner: the first device there.
    """

    nodes: tuple[str, ...]
    name: str
    title: str
    role: str
    owner: str


class Passage(Struct, frozen=True):
    """How the signal passes one row: ρ = x·λ/(Z·H), signed part of Σ|m|, and whether the row counts."""

    crossing: float
    moment: float
    in_path: bool


def groups(circuit: EquivalentCircuit) -> tuple[Group, ...]:
    """List the rows in the order of the file: every live node, with the inner nodes of devices folded into the outer.

    An inner node whose outer node is at AC ground has a row of its own, and all that is inside a block has one.
    """
    inner = _inner_nodes(circuit)
    host: dict[str, str] = {}
    states: dict[str, str] = {}
    for node in circuit.nodes:
        terminal = inner.get(node)
        if block_of(node):
            host[node] = states.setdefault(block_of(node), node)
            continue
        host[node] = node if terminal is None or terminal.outer == GROUND else terminal.outer
    rows: dict[str, list[str]] = {}
    for node in circuit.nodes:
        rows.setdefault(host[node], []).append(node)
    found: list[Group] = []
    taken: set[str] = set()
    for head, nodes in rows.items():
        ordered = (head, *(node for node in nodes if node != head))
        terminal = inner.get(head)
        if terminal is None:
            role, owner, title = _describe(circuit, head)
            name = title if block_of(head) else node_name(circuit, head)
        else:
            role, owner = f"{terminal.word}, inside", terminal.owner
            at = "" if terminal.netlist_node == GROUND else f" ({terminal.netlist_node})"
            title = f"{terminal.word} of {owner}, inside{at}"
            outside = terminal.word if terminal.netlist_node == GROUND else terminal.netlist_node
            name = f"{outside} (inside {owner})"
            if name in taken:
                name = f"{outside} (inside {owner}, {terminal.word})"
        taken.add(name)
        found.append(Group(ordered, name, title, role, owner))
    return tuple(found)


def block_of(node: str) -> str:
    """Give the owner of a block (a fitted device, a folded instance) whose inner node this is, else nothing."""
    owner, _, number = node.rpartition("'")
    return owner if number.isdigit() else ""


def node_name(circuit: EquivalentCircuit, node: str) -> str:
    """Give the netlist's name of a hand node: the output if it is in it, else the one with most device terminals.

    An inner node is called "base of Q1, inside".
    """
    terminal = _inner_nodes(circuit).get(node)
    if terminal is not None:
        return f"{terminal.word} of {terminal.owner}, inside"
    if node == GROUND:
        return GROUND
    members = circuit.members[node]
    for wanted in circuit.output_nodes:
        if wanted in members:
            return wanted
    count = {member: sum(t.netlist_node == member for t in circuit.terminals) for member in members}
    return max(members, key=lambda member: count[member])


def node_title(circuit: EquivalentCircuit, node: str) -> str:
    """Give what the trade calls a hand node: "base of Q1 (b)", "collector of Q1, output (out)", "node x"."""
    terminal = _inner_nodes(circuit).get(node)
    if terminal is not None:
        return f"{terminal.word} of {terminal.owner}, inside ({terminal.netlist_node})"
    return "ground" if node == GROUND else _describe(circuit, node)[2]


def passages(circuit: EquivalentCircuit, rows: Iterable[Group]) -> Mapping[str, Passage]:
    """Judge for every row, by name, whether the signal passes it.

    ρ = x·λ/(Z_nn·H) is the relative gain lost if the node is shorted; m = λ·(C·x)/H its part of the first moment
    b1 − a1. A row counts if |ρ| ≥ 0.05 or |m| ≥ 2 % of Σ|m|. The ρ of a row is that of its node with the largest.
    """
    rows = tuple(rows)
    moment = {row.name: sum(float(circuit.moment[circuit.row[node]].real) for node in row.nodes) for row in rows}
    total = sum(abs(value) for value in moment.values())
    found: dict[str, Passage] = {}
    for row in rows:
        rho = max((crossing(circuit, node) for node in row.nodes), key=abs)
        m = moment[row.name] / total if total else 0.0
        found[row.name] = Passage(rho, m, abs(rho) >= CROSSING_IN_PATH or abs(m) >= MOMENT_IN_PATH)
    return found


def crossing(circuit: EquivalentCircuit, node: str) -> float:
    """Give ρ = x·λ/(Z_nn·H) of one node: 1 where all signal crosses it, 0 off the path."""
    k = circuit.row[node]
    z = complex(circuit.whole[k, k]) if circuit.s_mid else circuit.z(node, node)
    scale = z * circuit.response
    return float((circuit.voltage[k] * circuit.adjoint[k] / scale).real) if scale else 0.0


def _inner_nodes(circuit: EquivalentCircuit) -> dict[str, TerminalAt]:
    """Give the terminals of those hand nodes that stand behind a device's series resistance and nothing else."""
    return {
        terminal.inner: terminal
        for terminal in circuit.terminals
        if terminal.inner not in (terminal.outer, GROUND) and not _netlist_members(circuit, terminal.inner)
    }


def _netlist_members(circuit: EquivalentCircuit, node: str) -> list[str]:
    return [member for member in circuit.members[node] if member not in circuit.inner_names]


def _describe(circuit: EquivalentCircuit, node: str) -> tuple[str, str, str]:
    """Give role, owner and title of a netlist node."""
    here = [terminal for terminal in circuit.terminals if terminal.outer == node]
    by_word: dict[str, list[str]] = {}
    for terminal in sorted(here, key=lambda terminal: _precedence(terminal.word)):
        owners = by_word.setdefault(terminal.word, [])
        if terminal.owner not in owners:
            owners.append(terminal.owner)
    phrases = [_phrase(word, owners) for word, owners in by_word.items()]
    words = list(by_word)
    sign = _output_sign(circuit, node)
    if sign:
        phrases.append(sign)
        words = [*(word for word in words if word != "output"), "output"]
    owner = next(iter(by_word.values()))[0] if by_word else ""
    name = node_name(circuit, node)
    if not phrases:
        inside = block_of(node)
        return ("node", inside, f"inside {inside}") if inside else ("node", owner, f"node {name}")
    return ", ".join(words), owner, f"{', '.join(phrases)} ({name})"


def _phrase(word: str, owners: list[str]) -> str:
    if len(owners) == 1:
        return f"{word} of {owners[0]}"
    plural = PLURAL.get(word, word)
    return f"{plural} of {', '.join(owners)}" if len(owners) <= LISTED_OWNERS else f"{plural} of {len(owners)} devices"


def _precedence(word: str) -> int:
    return 0 if word in OUTPUT_WORDS else 1 if word in CONTROL_WORDS else 2


def _output_sign(circuit: EquivalentCircuit, node: str) -> str:
    plus, minus = circuit.output_hand
    if node == plus and node != minus:
        return "output" if circuit.output_nodes[1] == GROUND else "output +"
    return "output −" if node == minus and node != plus else ""
