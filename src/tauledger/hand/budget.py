"""The upper time-constant budget: one row per signal node, worked by hand and beside it the exact constant.

A row's time constant is the sum over its nodes of R·C in Miller's picture. The exact constants of all rows add to
tr(Z·C), the sum −Σ 1/p of the upper network without its inductors.
"""

from __future__ import annotations

from collections.abc import Mapping

from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.hand.elements import Capacitor
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import InnerLine, LookingIn, MillerTerm, Resistance, SignalNode, WorkingSource
from tauledger.hand.figures import plain
from tauledger.hand.looking_in import looking_in
from tauledger.hand.miller import hand_gain, miller_term
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.hand.nodes import Group, Passage, block_of, groups, node_name, passages
from tauledger.network.bands import Bands
from tauledger.quantity import engineering, percent

ACCEPTED = 0.01
NOT_WORTH_A_FACTOR = 1e-3
WORTH_A_REASON = 0.02
LEAST_SURE: tuple[WorkingSource, ...] = ("rule", "loop", "branch", "solved")


def signal_nodes(bands: Bands, devices: tuple[Device, ...]) -> tuple[SignalNode, ...]:
    """Give the rows of the upper budget in the order of the file, those off the path included.

    A balanced circuit is worked as two half circuits, and nodes on its axis are off the path.
    Raises NetworkError where the mid-band circuit has no unique solution.
    """
    circuit = upper_circuit(bands, devices)
    mirror = find_mirror(circuit)
    if mirror is None:
        return _rows(circuit)
    first = _rows(half_circuit(circuit, mirror))
    second = _rows(half_circuit(circuit, mirror.other))
    at = {member: row for row in (*first, *second) for member in row.members}
    image = {**mirror.image, **mirror.other.image}
    found: dict[str, SignalNode] = {}
    for group in groups(circuit):
        node = group.nodes[0]
        if node in mirror.axis:
            found[group.name] = replace(_row(circuit, group, Passage(0.0, 0.0, False)), crossing=0.0)
            continue
        row = at[circuit.members[node][0]]
        partner = at[circuit.members[image[node]][0]]
        found[row.name] = replace(row, image=partner.name, second=node not in mirror.image)
    return tuple(found.values())


def _rows(circuit: EquivalentCircuit) -> tuple[SignalNode, ...]:
    rows = groups(circuit)
    passed = passages(circuit, rows)
    return tuple(_row(circuit, row, passed[row.name]) for row in rows)


def part_resistances(bands: Bands, devices: tuple[Device, ...]) -> Mapping[str, LookingIn]:
    """Give the hand resistance in ohm across every open capacitance, by part name.

    Raises NetworkError where the mid-band circuit has no unique solution.
    """
    circuit = upper_circuit(bands, devices)
    seen: dict[str, LookingIn] = {}
    found: dict[str, LookingIn] = {}
    at_node: dict[str, LookingIn] = {}
    for capacitor in circuit.capacitors:
        pair = (capacitor.a, capacitor.b)
        key = " ".join(sorted(pair))
        if key not in seen:
            seen[key] = resistance_across(circuit, *pair, at_node=at_node)
        found[capacitor.part] = seen[key]
    return found


def resistance_across(
    circuit: EquivalentCircuit, a: str, b: str, *, at_node: dict[str, LookingIn] | None = None
) -> LookingIn:
    """Give R_a·(1 − K_ab) + R_b·(1 − K_ba), the resistance in ohm between two nodes by hand; solved where it is off.

    With nothing between them that is R_a + R_b; across a common emitter's C_mu it is R_B·(1 + gm·R_C) + R_C.
    at_node: what was found at single nodes of this circuit, looked up and added to: most nodes end several capacitors.
    """
    known = {} if at_node is None else at_node

    def seen_at(node: str) -> LookingIn:
        if node not in known:
            known[node] = looking_in(circuit, node, node_name(circuit, node))
        return known[node]

    if a == b:
        return LookingIn(0.0, "joined", "both ends at one node", (), "rule")
    if GROUND in (a, b):
        node = b if a == GROUND else a
        return seen_at(node)
    exact = circuit.across(a, b)
    sides = []
    for here, there in ((a, b), (b, a)):
        name = node_name(circuit, here)
        seen, gain = seen_at(here), hand_gain(circuit, here, there)
        sides.append((name, seen, gain))
    ohm = sum(seen.ohm * (1.0 - gain.value) for _, seen, gain in sides)
    still = [abs(gain.value) < NOT_WORTH_A_FACTOR for _, _, gain in sides]
    symbols = " + ".join(
        f"R({name})" if alone else f"R({name})·(1 − K)" for (name, _, _), alone in zip(sides, still, strict=True)
    )
    values = " + ".join(
        plain(seen.ohm) if alone else f"{plain(seen.ohm)}·{plain(1.0 - gain.value)}"
        for (_, seen, gain), alone in zip(sides, still, strict=True)
    )
    source = max((source for _, seen, gain in sides for source in (seen.source, gain.source)), key=LEAST_SURE.index)
    parts = tuple(Resistance(f"at {name}", seen.ohm * (1.0 - gain.value)) for name, seen, gain in sides)
    if abs(ohm - exact) > ACCEPTED * abs(exact):
        text = f"R = {plain(exact)}, solved; {symbols} gives {plain(ohm)}"
        return LookingIn(exact, "solved", text, parts, "solved", rule_ohm=ohm)
    lines = [f"R = {symbols} = {values} = {plain(ohm)}"]
    lines += [seen.text for _, seen, _ in sides]
    lines += [f"{gain.text} from {name}" for name, _, gain in sides if gain.text]
    return LookingIn(ohm, "both ends", "; ".join(lines), parts, source)


def _row(circuit: EquivalentCircuit, group: Group, passage: Passage) -> SignalNode:
    lines = [_node_line(circuit, node) for node in group.nodes]
    carrying = [line for line in lines if line.capacitances or block_of(line.at)] or lines[:1]
    carrying.sort(key=lambda line: -abs(line.time_constant_s))
    first = carrying[0]
    tau = sum(line.time_constant_s for line in lines)
    return SignalNode(
        name=group.name,
        title=group.title,
        role=group.role,
        owner=group.owner,
        members=tuple(member for node in group.nodes for member in circuit.members[node]),
        crossing=passage.crossing,
        moment=passage.moment,
        in_path=passage.in_path,
        lines=tuple(carrying),
        resistance_hand_ohm=first.resistance.ohm,
        resistance_exact_ohm=first.resistance_exact_ohm,
        # a node that a controlled voltage source holds has no resistance and no time constant
        capacitance_f=tau / first.resistance.ohm if first.resistance.ohm else first.capacitance_f,
        time_constant_s=tau,
        time_constant_exact_s=float(sum(circuit.constant[circuit.row[node]] for node in group.nodes)),
    )


def _node_line(circuit: EquivalentCircuit, node: str) -> InnerLine:
    name = node_name(circuit, node)
    if block_of(node):
        return _inside(circuit, node)
    resistance = looking_in(circuit, node, name)
    terms = tuple(miller_term(circuit, capacitor, node) for capacitor in circuit.capacitors if _at(capacitor, node))
    farad = sum(term.farad * term.factor for term in terms)
    line = InnerLine(
        node=name,
        at=node,
        resistance=resistance,
        resistance_exact_ohm=circuit.z(node, node),
        capacitances=terms,
        capacitance_f=farad,
        time_constant_s=resistance.ohm * farad,
        time_constant_exact_s=float(circuit.constant[circuit.row[node]]),
    )
    return replace(line, why=difference_reason(line))


def _inside(circuit: EquivalentCircuit, node: str) -> InnerLine:
    """Give the line of what is inside a block: no hand rule looks into it, its time constant is the exact one."""
    ohm, tau = circuit.z(node, node), float(circuit.constant[circuit.row[node]])
    text = f"inside {block_of(node)}, solved: time constant {engineering(tau, 's', 3)}"
    return InnerLine(
        node=f"inside {block_of(node)}",
        at=node,
        resistance=LookingIn(ohm, "solved", text, (), "solved"),
        resistance_exact_ohm=ohm,
        capacitances=(),
        capacitance_f=tau / ohm if ohm else 0.0,
        time_constant_s=tau,
        time_constant_exact_s=tau,
    )


def difference_reason(line: InnerLine) -> str:
    """Name what makes R·C by hand and the exact time constant of a line differ by more than 2 %; empty below that.

    The exact one is Z·Σ C·(1 − K) with exact K, plus what controlled charges (transcapacitances) add.
    """
    hand, exact = line.time_constant_s, line.time_constant_exact_s
    if abs(hand - exact) <= WORTH_A_REASON * abs(exact):
        return ""
    z = line.resistance_exact_ohm
    off: dict[str, float] = {}
    for term in line.capacitances:
        about = _about(term)
        off[about] = off.get(about, 0.0) + z * term.farad * (term.factor - term.exact_factor)
    off["the resistance by hand"] = (line.resistance.ohm - z) * line.capacitance_f
    off["a charge controlled from elsewhere, which paper leaves out"] = hand - exact - sum(off.values())
    name = max(off, key=lambda one: abs(off[one]))
    return f"{name}: {percent(off[name] / exact)} of {percent(hand / exact - 1.0)}"


def _about(term: MillerTerm) -> str:
    if term.text.startswith("1 + 1/|A|"):
        return "1 + 1/|A| stands for 1 − K"
    return f"the gain by hand across {term.part}"


def _at(capacitor: Capacitor, node: str) -> bool:
    return node in (capacitor.a, capacitor.b) and capacitor.a != capacitor.b
