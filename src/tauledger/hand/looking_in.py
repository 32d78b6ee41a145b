"""The resistance that a node sees, as worked on paper, checked against the exact value and marked with its source.

On a tree of cells the rules are exact, and a resistor across base and emitter may count in r_π. Elsewhere the result is
accepted only within 1 % of the exact driving-point resistance; where it is not, a resistor that bridges a stage is
taken by Miller, R_F/(1 − K), or one loop is taken out, R0/(1 + T), then the branch form with the exact node ratios is
tried, and what is left is marked as solved.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.hand.arrangements import SERIES
from tauledger.hand.branches import Branch, Walk, bare, branches, carrying, close, outside, total
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.estimate import LookingIn, Resistance
from tauledger.hand.figures import plain
from tauledger.hand.folded import folded_in_r_pi
from tauledger.hand.miller import hand_gain

ACCEPTED = 0.01
LOOP_ACCEPTED = 0.005


def looking_in(circuit: EquivalentCircuit, node: str, label: str) -> LookingIn:
    """Give the resistance from a hand node to AC ground by hand, worked, and where its value comes from.

    label: what stands in the brackets of R(…). Accepted by rule within 1 % of the exact value; else as one loop within
    0.5 %, as branch form, or solved.
    """
    exact = circuit.z(node, node)
    walk = Walk()
    found = branches(circuit, node, frozenset(), walk)
    rule_ohm = total(found)
    spent = walk.left < 0
    if not spent and close(rule_ohm, exact, ACCEPTED):
        return LookingIn(rule_ohm, "looking in", _line(f"R({label})", found, rule_ohm), _resistances(found), "rule")
    folded = None if spent else _in_r_pi(circuit, node, label, exact)
    if folded is not None:
        return folded
    bridged = None if spent else _by_miller(circuit, node, label, exact)
    if bridged is not None:
        return bridged
    loop = None if spent else _one_loop(circuit, node, label, rule_ohm, exact)
    if loop is not None:
        return replace(loop, rule_ohm=rule_ohm)
    return _branch_form(circuit, node, label, exact, None if spent else rule_ohm) or LookingIn(
        exact,
        "solved",
        f"R({label}) = {plain(exact)}, solved" + ("" if spent else f"; {_misses(circuit)} gives {plain(rule_ohm)}"),
        _resistances(found),
        "solved",
        rule_ohm=None if spent else rule_ohm,
    )


def _misses(circuit: EquivalentCircuit) -> str:
    return "looking in without the capacitors that set the gain" if circuit.s_mid else "looking in without the loops"


def loop_resistance(circuit: EquivalentCircuit, node: str, k: int) -> float:
    """Give the exact driving-point resistance in ohm with the gm and g_mb of cell k set to 0.

    One rank-1 update: G − u·wᵀ with u from output to common and w the control vector; Sherman and Morrison, 1950.
    """
    cell = circuit.cells[k]
    size = len(circuit.nodes)
    u, w = np.zeros(size), np.zeros(size)
    for target, end, value in (
        (u, cell.output, 1.0),
        (u, cell.common, -1.0),
        (w, cell.control, cell.gm),
        (w, cell.common, -cell.gm - cell.g_mb),
        (w, cell.body or GROUND, cell.g_mb),
    ):
        if end != GROUND:
            target[circuit.row[end]] += value
    z, i = circuit.impedance, circuit.row[node]
    denominator = 1.0 - w @ z @ u
    return float(z[i, i] + (z[i] @ u) * (w @ z[:, i]) / denominator) if denominator else math.inf


def _in_r_pi(circuit: EquivalentCircuit, node: str, label: str, exact: float) -> LookingIn | None:
    """By the rules, with every resistor across base and emitter counted in r_π."""
    smaller, told = folded_in_r_pi(circuit)
    if not told:
        return None
    walk = Walk()
    found = branches(smaller, node, frozenset(), walk)
    if walk.left < 0 or not close(total(found), exact, ACCEPTED):
        return None
    text = "; ".join([_line(f"R({label})", found, total(found)), *told])
    return LookingIn(total(found), "looking in", text, _resistances(found), "rule")


def _by_miller(circuit: EquivalentCircuit, node: str, label: str, exact: float) -> LookingIn | None:
    """R_F/(1 − K) in parallel with what else is there: K the hand gain from the node to the resistor's far end."""
    for k in circuit.resistors_at.get(node, ()):
        resistor = circuit.resistors[k]
        far = resistor.other(node)
        if far == GROUND:
            continue
        gain = hand_gain(circuit, node, far)
        if gain.source != "rule" or gain.value >= 1.0 or not gain.text:
            continue
        walk = Walk()
        others = branches(circuit, node, frozenset({("R", k)}), walk)
        ohm = resistor.ohm / (1.0 - gain.value)
        found = [*others, Branch(resistor.name, ohm, f"{resistor.name}/(1 − K)", gain.text)]
        if walk.left >= 0 and close(total(found), exact, ACCEPTED):
            text = _line(f"R({label})", found, total(found))
            return LookingIn(total(found), f"looking in, {resistor.name} by Miller", text, _resistances(found), "rule")
    return None


def _one_loop(circuit: EquivalentCircuit, node: str, label: str, rule_ohm: float, exact: float) -> LookingIn | None:
    """R = R0/(1 + T): R0 by the rules with one gm at 0, where that is the exact resistance then, within 0.5 %."""
    best: tuple[float, int, list[Branch], float] | None = None
    for k, cell in enumerate(circuit.cells):
        without_ohm = loop_resistance(circuit, node, k)
        if not cell.gm or close(without_ohm, exact, LOOP_ACCEPTED):
            continue
        walk = Walk(muted=k)
        found = branches(circuit, node, frozenset(), walk)
        r0 = total(found)
        if walk.left < 0 or not close(r0, without_ohm, LOOP_ACCEPTED):
            continue
        change = abs(r0 - rule_ohm)
        if best is None or change < best[0]:
            best = (change, k, found, r0)
    if best is None:
        return None
    _, k, found, r0 = best
    owner = circuit.cells[k].owner
    t = r0 / exact - 1.0
    head = _line(f"R0({label}) with gm({owner}) = 0", found, r0)
    raised = " (the loop raises it)" if t < 0.0 else ""
    text = f"{head}; R = R0/(1 + T) = {plain(r0)}/{_one_plus(t)} = {plain(exact)}{raised}"
    return LookingIn(exact, f"one loop through {owner}", text, _resistances(found), "loop", loop_gain=t)


def _branch_form(
    circuit: EquivalentCircuit, node: str, label: str, exact: float, rule_ohm: float | None
) -> LookingIn | None:
    """1/R = Σ (1 − K_m)/R_m over passive branches, each raised or lowered by the exact ratio of its far end."""
    if any(node in (circuit.cells[k].output, circuit.cells[k].common) for k in circuit.cells_at.get(node, ())):
        return None
    links = [_link(circuit, node, k) for k in circuit.resistors_at.get(node, ())]
    for k in circuit.cells_at.get(node, ()):
        cell = circuit.cells[k]
        if not math.isinf(cell.r_pi):
            links.append(_divided(circuit, node, f"r_π({cell.owner})", cell.common, cell.r_pi))
    told = [link for link in links if link is not None]
    if not told or len(told) < len(links) or any(link.ohm <= 0.0 for link in told):
        return None
    if not close(total(told), exact, ACCEPTED):
        return None
    text = _line(f"R({label})", told, exact) + "; each branch divided by 1 − K of its far end"
    return LookingIn(exact, "branches with the solved ratios", text, _resistances(told), "branch", rule_ohm=rule_ohm)


def _link(circuit: EquivalentCircuit, node: str, k: int) -> Branch | None:
    """Take the branch that begins with resistor k: to ground where all behind it is passive, else to its far end.

    What is in series is joined first. None for a transistor's series resistance alone: paper knows no ratio across it.
    """
    resistor = circuit.resistors[k]
    far = resistor.other(node)
    if _passive(circuit, far, k, node):
        beyond = outside(circuit, far, frozenset({("R", k)}), Walk())
        if beyond.ohm == 0.0:
            return Branch(resistor.name, resistor.ohm, resistor.name)
        behind = bare(beyond.symbol) if beyond.terms == 1 else f"({beyond.symbol})"
        return Branch(resistor.name, resistor.ohm + beyond.ohm, f"({resistor.name} + {behind})")
    cells, resistors = circuit.cells_at.get(far, ()), circuit.resistors_at.get(far, ())
    if len(cells) == 1 and len(resistors) == 1:
        cell = circuit.cells[cells[0]]
        if far == cell.control not in (cell.common, cell.output) and not math.isinf(cell.r_pi):
            name = f"({resistor.name} + r_π({cell.owner}))"
            return _divided(circuit, node, name, cell.common, resistor.ohm + cell.r_pi)
    if not cells and len(resistors) == 2:
        after = circuit.resistors[next(other for other in resistors if other != k)]
        return _divided(circuit, node, f"({resistor.name} + {after.name})", after.other(far), resistor.ohm + after.ohm)
    inside = SERIES.fullmatch(resistor.name)
    if inside is not None and inside.group(1) in {cell.owner for cell in circuit.cells}:
        return None
    return _divided(circuit, node, resistor.name, far, resistor.ohm)


def _divided(circuit: EquivalentCircuit, node: str, name: str, far: str, ohm: float) -> Branch:
    rest = 1.0 - circuit.gain(node, far)
    value = ohm / rest if rest else math.inf
    return Branch(name, value, name if rest == 1.0 else f"{name}/{plain(rest)}")


def _passive(circuit: EquivalentCircuit, start: str, without: int, node: str) -> bool:
    """Say whether resistors alone lie behind `start`, resistor `without` taken out, and none leads back to `node`."""
    seen, ahead = {GROUND}, [start]
    while ahead:
        here = ahead.pop()
        if here in seen:
            continue
        seen.add(here)
        if here == node or circuit.cells_at.get(here):
            return False
        ahead += [circuit.resistors[k].other(here) for k in circuit.resistors_at.get(here, ()) if k != without]
    return True


def _line(head: str, found: Sequence[Branch], ohm: float) -> str:
    shown = carrying(found)
    if not shown:
        return f"{head} = {plain(ohm)}"
    symbols = " ‖ ".join(branch.symbol for branch in shown) if len(shown) > 1 else bare(shown[0].symbol)
    values = " ‖ ".join(plain(branch.ohm) for branch in shown)
    parts = [head, symbols, values] if len(shown) == 1 else [head, symbols, values, plain(ohm)]
    return "; ".join([" = ".join(parts), *(branch.detail for branch in shown if branch.detail)])


def _resistances(found: Sequence[Branch]) -> tuple[Resistance, ...]:
    return tuple(Resistance(branch.symbol, branch.ohm) for branch in carrying(found))


def _one_plus(t: float) -> str:
    return f"(1 + {plain(t)})" if t >= 0.0 else f"(1 − {plain(-t)})"
