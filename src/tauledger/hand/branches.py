"""The branches at a node of the hand circuit, each by its rule: the recursion of looking in.

A branch ends at AC ground, at a supply or at a driven node. A node that the walk has come from counts as open.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from msgspec import Struct, field
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.figures import compact, plain
from tauledger.hand.rules import Outside, Rule
from tauledger.hand.rules.bipolar import BASE, COLLECTOR, EMITTER
from tauledger.hand.rules.field_effect import DRAIN, SOURCE
from tauledger.hand.rules.transformer import through_transformer_ohm
from tauledger.hand.rules.two_terminal import (
    CONTROL_ON_COMMON,
    DIODE_BOTTOM,
    DIODE_TOP,
    OUTPUT_ON_COMMON,
    diode_siemens,
    diode_through_resistance_ohm,
)

SHORT_FORM = 0.005
NOT_PRINTED = 0.001
VISIT_BUDGET = 200
PRINTED_DEPTH = 2

Element = tuple[str, int]


class Seen(Struct, frozen=True):
    """A resistance in ohm and how it is written; `terms` of it stand in parallel or series without brackets."""

    ohm: float
    symbol: str
    terms: int = 1


class Branch(Struct, frozen=True):
    """One of the branches in parallel at a node.

    ohm: its resistance to AC ground. symbol: how it is written. detail: the working of a cell's rule, or empty.
    far, link_ohm: where it leads and through what resistance, if it is passive at this end; link_ohm None if not.
    """

    name: str
    ohm: float
    symbol: str
    detail: str = ""
    far: str = GROUND
    link_ohm: float | None = None


class Walk(Struct):
    """One look into a circuit: nodes that end a branch, the cell whose gm is taken as 0, and visits left."""

    ends: frozenset[str] = frozenset({GROUND})
    muted: int | None = None
    left: int = VISIT_BUDGET
    path: list[str] = field(default_factory=list)


def outside(circuit: EquivalentCircuit, node: str, without: frozenset[Element], walk: Walk) -> Seen:
    """Give the resistance from a node to AC ground with some elements taken out: 0 at an end, infinite if open."""
    if node in walk.ends:
        return Seen(0.0, "0")
    if node in walk.path:
        return Seen(math.inf, "∞")
    walk.left -= 1
    if walk.left < 0:
        return Seen(math.inf, "∞")
    found = branches(circuit, node, without, walk)
    ohm = total(found)
    if len(walk.path) > PRINTED_DEPTH:
        return Seen(ohm, "")
    shown = carrying(found)
    if len(walk.path) >= PRINTED_DEPTH or len(shown) > 4 or not shown:
        return Seen(ohm, plain(ohm))
    return Seen(ohm, " ‖ ".join(branch.symbol for branch in shown), len(shown))


def branches(circuit: EquivalentCircuit, node: str, without: frozenset[Element], walk: Walk) -> list[Branch]:
    """List the finite branches at a node, elements in `without` taken out."""
    walk.path.append(node)
    found: list[Branch] = []
    skipped = set(without)
    for k in _cells_near(circuit, node):
        joint = diode_joint(circuit, k)
        if ("Q", k) in skipped:
            continue
        branch: Branch | None = None
        if joint is not None and node in (joint.node, circuit.cells[k].common):
            if node == joint.node:
                skipped |= joint.elements
            branch = _diode_through(circuit, node, k, joint, walk)
        elif k in circuit.cells_at.get(node, ()):
            branch = _cell_branch(circuit, node, k, walk)
        if branch is not None and not math.isinf(branch.ohm):
            found.append(branch)
    passive: list[Branch] = []
    for k in circuit.resistors_at.get(node, ()):
        if ("R", k) in skipped:
            continue
        resistor = circuit.resistors[k]
        far = resistor.other(node)
        beyond = outside(circuit, far, frozenset({("R", k)}), walk)
        if math.isinf(beyond.ohm):
            continue
        symbol = resistor.name
        if beyond.ohm:
            symbol = f"({symbol} + {bare(beyond.symbol)})" if beyond.terms == 1 else f"({symbol} + ({beyond.symbol}))"
        passive.append(Branch(resistor.name, resistor.ohm + beyond.ohm, symbol, "", far, resistor.ohm))
    passive += [
        branch
        for k in circuit.transformers_at.get(node, ())
        if ("T", k) not in skipped and (branch := _through_transformer(circuit, node, k, walk)) is not None
    ]
    walk.path.pop()
    return [*passive, *found]


def _through_transformer(circuit: EquivalentCircuit, node: str, k: int, walk: Walk) -> Branch | None:
    """Give a winding as the resistance that it is while the other one has an end at AC ground: n²·R, and what follows.

    R lies at the other winding's live end, n is the number of turns here per turn there.
    """
    transformer = circuit.transformers[k]
    own, other = transformer.windings_from(node)
    live = [end for end in other if end != GROUND]
    if len(live) != 1 or own[0] == own[1]:
        return None
    beyond = outside(circuit, live[0], frozenset({("T", k)}), walk)
    rest = outside(circuit, next(end for end in own if end != node), frozenset({("T", k)}), walk)
    if math.isinf(beyond.ohm) or math.isinf(rest.ohm):
        return None
    n2 = transformer.turns_into(node) ** 2
    within = beyond.symbol if beyond.terms == 1 else f"({beyond.symbol})"
    symbol = f"{plain(n2)}·{within}" if n2 >= 1.0 else f"{within}/{plain(1.0 / n2)}"
    if rest.ohm:
        symbol = f"({symbol} + {rest.symbol})" if rest.terms == 1 else f"({symbol} + ({rest.symbol}))"
    detail = f"{transformer.name}: n² = {plain(max(n2, 1.0 / n2))}"
    return Branch(transformer.name, through_transformer_ohm(transformer, node, beyond.ohm) + rest.ohm, symbol, detail)


class Joint(Struct, frozen=True):
    """Where a transistor's control and output meet outside its series resistances r_b and r_c, ohm."""

    node: str
    r_b: float
    r_c: float
    elements: frozenset[Element]


def diode_joint(circuit: EquivalentCircuit, k: int) -> Joint | None:
    """Give the node at which cell k is diode-connected outside its series resistances, or None."""
    cell = circuit.cells[k]
    base = _only_resistor(circuit, cell.control, k)
    if base is None or cell.diode_connected:
        return None
    node = circuit.resistors[base].other(cell.control)
    elements: set[Element] = {("Q", k), ("R", base)}
    r_c = 0.0
    if node != cell.output:
        collector = _only_resistor(circuit, cell.output, k)
        if collector is None or circuit.resistors[collector].other(cell.output) != node:
            return None
        elements.add(("R", collector))
        r_c = circuit.resistors[collector].ohm
    if node in (GROUND, cell.common):
        return None
    return Joint(node, circuit.resistors[base].ohm, r_c, frozenset(elements))


def _cells_near(circuit: EquivalentCircuit, node: str) -> list[int]:
    """List the cells at a node, and those whose control hangs on it behind one resistor alone."""
    near = list(circuit.cells_at.get(node, ()))
    for r in circuit.resistors_at.get(node, ()):
        far = circuit.resistors[r].other(node)
        near += [k for k in circuit.cells_at.get(far, ()) if circuit.cells[k].control == far and k not in near]
    return near


def _cell_branch(circuit: EquivalentCircuit, node: str, k: int, walk: Walk) -> Branch | None:
    """Choose the rule for one cell at one of its nodes, and find what its other terminals see without it."""
    cell = _unmuted(circuit, k, walk)
    without = frozenset({("Q", k)})

    def seen(at: str) -> Seen:
        return outside(circuit, at, without, walk)

    is_control, is_common, is_output = (node == end for end in (cell.control, cell.common, cell.output))
    if is_control and is_common and is_output:
        return None
    if is_control and is_output:
        beyond = seen(cell.common)
        link = 1.0 / diode_siemens(cell) if cell.body_gm == 0.0 and diode_siemens(cell) > 0.0 else None
        return _by_rule(walk, DIODE_TOP, cell, f"diode-connected {cell.owner}", {"R_S": beyond}, cell.common, link)
    if is_control and is_common:
        return _series(CONTROL_ON_COMMON, cell, f"r_o({cell.owner})", cell.r_o, seen(cell.output), cell.output)
    if is_common and is_output:
        return _series(OUTPUT_ON_COMMON, cell, f"r_π({cell.owner})", cell.r_pi, seen(cell.control), cell.control)
    if is_control:
        if math.isinf(cell.r_pi):
            return None
        if cell.output == cell.common:
            return _series(OUTPUT_ON_COMMON, cell, f"r_π({cell.owner})", cell.r_pi, seen(cell.common), cell.common)
        r_e = seen(cell.common)
        if r_e.ohm == 0.0:
            return Branch(f"r_π({cell.owner})", cell.r_pi, f"r_π({cell.owner})", "", cell.common, cell.r_pi)
        r_c = Seen(0.0, "0") if math.isinf(cell.r_o) else seen(cell.output)
        return _by_rule(walk, BASE, cell, _into(cell, 0), {"R_E": r_e, "R_C": r_c}, cell.common, cell.r_pi)
    if is_common:
        if cell.diode_connected:
            return _by_rule(walk, DIODE_BOTTOM, cell, f"diode-connected {cell.owner}", {"R_D": seen(cell.control)})
        r_c = Seen(0.0, "0") if math.isinf(cell.r_o) else seen(cell.output)
        if math.isinf(cell.r_pi):
            return _by_rule(walk, SOURCE, cell, _into(cell, 1), {"R_D": r_c})
        return _by_rule(walk, EMITTER, cell, _into(cell, 1), {"R_B": seen(cell.control), "R_C": r_c})
    if math.isinf(cell.r_o):
        return None
    if cell.control == cell.common:
        return _series(CONTROL_ON_COMMON, cell, f"r_o({cell.owner})", cell.r_o, seen(cell.common), cell.common)
    r_e = seen(cell.common)
    if r_e.ohm == 0.0:
        return Branch(f"r_o({cell.owner})", cell.r_o, f"r_o({cell.owner})")
    if math.isinf(cell.r_pi):
        return _by_rule(walk, DRAIN, cell, _into(cell, 2), {"R_S": r_e})
    return _by_rule(walk, COLLECTOR, cell, _into(cell, 2), {"R_E": r_e, "R_B": seen(cell.control)})


def _diode_through(circuit: EquivalentCircuit, node: str, k: int, joint: Joint, walk: Walk) -> Branch:
    """Take a transistor diode-connected outside its r_b (and r_c) as one two-terminal part."""
    cell = _unmuted(circuit, k, walk)
    ohm = diode_through_resistance_ohm(cell, joint.r_b, joint.r_c)
    far = cell.common if node == joint.node else joint.node
    beyond = outside(circuit, far, joint.elements, walk)
    name = f"diode-connected {cell.owner}"
    symbol = name if beyond.ohm == 0.0 else f"({name} + {beyond.symbol})"
    given = f"r_π = {plain(cell.r_pi)}, r_b = {plain(joint.r_b)}, β = {plain(cell.beta)}"
    detail = f"{name}: [(r_π + r_b)/(β + 1)] ‖ r_o ≈ {plain(ohm)} with {given}"
    return Branch(name, ohm + beyond.ohm, symbol, detail, far, ohm)


def _only_resistor(circuit: EquivalentCircuit, node: str, k: int) -> int | None:
    """Give the one resistor at a node at which there is nothing else than cell k."""
    if node == GROUND or circuit.cells_at.get(node) != (k,):
        return None
    resistors = circuit.resistors_at.get(node, ())
    return resistors[0] if len(resistors) == 1 and node not in circuit.transformers_at else None


def _unmuted(circuit: EquivalentCircuit, k: int, walk: Walk) -> Cell:
    cell = circuit.cells[k]
    return replace(cell, gm=0.0, g_mb=0.0) if walk.muted == k else cell


def _into(cell: Cell, terminal: int) -> str:
    return f"into {cell.words[terminal]} of {cell.owner}"


def _series(rule: Rule, cell: Cell, symbol: str, ohm: float, beyond: Seen, far: str) -> Branch | None:
    if math.isinf(ohm):
        return None
    text = symbol if beyond.ohm == 0.0 else f"({symbol} + {beyond.symbol})"
    return Branch(f"{rule.name} {cell.owner}", ohm + beyond.ohm, text, "", far, ohm)


def _by_rule(
    walk: Walk,
    rule: Rule,
    cell: Cell,
    name: str,
    seen: dict[str, Seen],
    far: str = GROUND,
    link_ohm: float | None = None,
) -> Branch:
    around = Outside(control=_ohm(seen, "R_B"), common=_ohm(seen, "R_E", "R_S"), output=_ohm(seen, "R_C", "R_D"))
    ohm = rule.ohm(cell, around)
    if len(walk.path) > 1:
        # Only the branches at the node itself are printed with their working.
        return Branch(name, ohm, name, "", far, link_ohm)
    formula, equals = rule.formula, "="
    if rule.short_ohm is not None and close(rule.short_ohm(cell, around), ohm, SHORT_FORM):
        formula, equals = rule.short, "=" if close(rule.short_ohm(cell, around), ohm, 1e-9) else "≈"
    if cell.body_gm == 0.0:
        formula = formula.replace("(gm + g_mb)", "gm").replace("(1 + g_mb·R_S)/g", "1/g").replace("(g + g_mb)", "g")
    own = {"r_π": cell.r_pi, "r_o": cell.r_o, "β": cell.beta, "gm": cell.gm, "g_mb": cell.body_gm}
    shown: list[str] = []
    for symbol in rule.operands:
        if symbol not in formula:
            continue
        if symbol in seen:
            value = plain(seen[symbol].ohm)
            written = bare(seen[symbol].symbol)
            shown.append(f"{symbol} = {value}" if written in (value, "0", "∞") else f"{symbol} = {written} = {value}")
        else:
            write = compact if symbol in ("gm", "g_mb") else plain
            shown.append(f"{symbol} = {write(own.get(symbol, 0.0))}")
    given = f" with {', '.join(shown)}" if shown else ""
    return Branch(name, ohm, name, f"{name}: {formula} {equals} {plain(ohm)}{given}", far, link_ohm)


def _ohm(seen: dict[str, Seen], *symbols: str) -> float:
    return next((seen[symbol].ohm for symbol in symbols if symbol in seen), 0.0)


def total(found: Sequence[Branch]) -> float:
    """Give all branches in parallel, ohm; infinite without any."""
    if any(branch.ohm == 0.0 for branch in found):
        return 0.0
    siemens = sum(1.0 / branch.ohm for branch in found)
    return 1.0 / siemens if siemens else math.inf


def carrying(found: Sequence[Branch]) -> list[Branch]:
    """List the branches that carry at least 0.1 % of the conductance: those worth printing."""
    ohm = abs(total(found))
    return [branch for branch in found if ohm >= NOT_PRINTED * abs(branch.ohm)]


def bare(symbol: str) -> str:
    """Take the brackets off a sum that stands alone: "(RC + r_c(Q1))" → "RC + r_c(Q1)"."""
    if not (symbol.startswith("(") and symbol.endswith(")")):
        return symbol
    depth = 0
    for k, letter in enumerate(symbol):
        depth += (letter == "(") - (letter == ")")
        if depth == 0 and k < len(symbol) - 1:
            return symbol
    return symbol[1:-1]


def close(value: float, exact: float, tolerance: float) -> bool:
    """Say whether two values agree within a fraction of the exact one; an infinite value only with itself."""
    if math.isinf(value) or math.isinf(exact):
        return value == exact
    return abs(value - exact) <= tolerance * abs(exact)
