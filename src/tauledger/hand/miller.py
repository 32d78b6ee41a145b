"""Miller's split: a capacitance between two nodes counts as C·(1 − K) at each, K the gain driven from that node.

K comes from the node itself and never from the two signal voltages: at a common base those would give thousands. Where
the gain from the other end to this one is −1 or beyond, the textbook's 1 + 1/|A| stands in place of 1 − K.

Source: Miller, "Dependence of the input impedance of a three-electrode vacuum tube upon the load in the plate circuit",
Scientific Papers of the Bureau of Standards 15(351), 1920; both sides: Gray, Hurst, Lewis and Meyer, 5th ed., 2009,
sec. 7.2.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.hand.branches import Element, Seen, Walk, bare, outside
from tauledger.hand.elements import Capacitor, Cell
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.estimate import MillerTerm, WorkingSource
from tauledger.hand.figures import compact, plain
from tauledger.hand.rules.rule import parallel

ACCEPTED = 0.01
LONGEST_CHAIN = 4
NOT_PRINTED = 0.001
TEXTBOOK_BELOW = -1.0
# 1 + 1/|A| takes the driven end as standing still; where it follows its far end, 1 − K is another number altogether.
STANDS_STILL = 0.5


class HandGain(Struct, frozen=True):
    """K from a node to another: the value used, the line that gives it, and whether it was solved."""

    value: float
    text: str
    source: WorkingSource


class _Hop(Struct, frozen=True):
    element: Element
    start: str
    end: str


def hand_gain(circuit: EquivalentCircuit, start: str, end: str) -> HandGain:
    """Give K = v(end)/v(start) with `start` driven, by hand; solved where 1 − K misses the exact value by over 1 %."""
    if end == GROUND:
        return HandGain(0.0, "", "rule")
    if start == end:
        return HandGain(1.0, "", "rule")
    exact = circuit.gain(start, end)
    missed = ""
    for chain in _chains(circuit, start, end):
        value, text = _along(circuit, start, chain)
        if abs(value - exact) <= ACCEPTED * abs(1.0 - exact):
            return HandGain(value, text, "rule")
        missed = missed or text
    if abs(exact) <= ACCEPTED * abs(1.0 - exact):
        return HandGain(0.0, "", "rule")
    by_hand = f"; by hand {missed}" if missed else ""
    return HandGain(exact, f"K = {plain(exact)}, solved{by_hand}", "solved")


def signal_gain(circuit: EquivalentCircuit, start: str, end: str) -> float | None:
    """Give v(end)/v(start) of the signal by hand where a chain of elements gives it within 1 %, else None.

    For circuits in which capacitors set the gain, where K from real parts is no gain of a signal.
    """
    i, j = circuit.row[start], circuit.row[end]
    exact = complex(circuit.voltage[j] / circuit.voltage[i])
    tried = (_along(circuit, start, chain)[0] for chain in _chains(circuit, start, end))
    return next((value for value in tried if abs(value - exact) <= ACCEPTED * abs(exact)), None)


def miller_term(circuit: EquivalentCircuit, capacitor: Capacitor, node: str) -> MillerTerm:
    """Count one capacitance at one of its nodes: farad·(1 − K), or farad·(1 + 1/|A|) behind an inverting stage.

    Keeps the sign: a gain above 1 makes the capacitance negative. Across a half circuit K is −1.
    """
    if capacitor.mirrored:
        text = "K = −1, the other half moves the other way"
        return MillerTerm(capacitor.part, capacitor.farad, 2.0, -1 + 0j, text, exact_factor=2.0)
    far = capacitor.b if node == capacitor.a else capacitor.a
    here = hand_gain(circuit, node, far)
    if far == GROUND:
        return MillerTerm(capacitor.part, capacitor.farad, 1.0, 0j)
    exact = 1.0 - circuit.gain(node, far)
    back = hand_gain(circuit, far, node)
    if back.value <= TEXTBOOK_BELOW and abs(here.value) <= STANDS_STILL:
        a = -back.value
        text = f"1 + 1/|A| = 1 + 1/{plain(a)} = {plain(1.0 + 1.0 / a)}"
        return MillerTerm(capacitor.part, capacitor.farad, 1.0 + 1.0 / a, complex(-1.0 / a), text, back.source, exact)
    k = here.value
    return MillerTerm(capacitor.part, capacitor.farad, 1.0 - k, complex(k), here.text, here.source, exact)


def _chains(circuit: EquivalentCircuit, start: str, end: str) -> Iterator[tuple[_Hop, ...]]:
    """Give the simple paths from start to end, the shortest first."""
    level: list[tuple[_Hop, ...]] = [()]
    for _ in range(LONGEST_CHAIN):
        longer: list[tuple[_Hop, ...]] = []
        for chain in level:
            node = chain[-1].end if chain else start
            visited = {start, *(hop.end for hop in chain)}
            for hop in _hops(circuit, node):
                if hop.end in visited or hop.end == GROUND:
                    continue
                if hop.end == end:
                    yield (*chain, hop)
                else:
                    longer.append((*chain, hop))
        level = longer


def _hops(circuit: EquivalentCircuit, node: str) -> Iterator[_Hop]:
    for k in circuit.cells_at.get(node, ()):
        cell = circuit.cells[k]
        for end in dict.fromkeys((cell.output, cell.common, cell.control)):
            if end != node:
                yield _Hop(("Q", k), node, end)
    for k in circuit.resistors_at.get(node, ()):
        yield _Hop(("R", k), node, circuit.resistors[k].other(node))
    for k in circuit.transformers_at.get(node, ()):
        yield from (_Hop(("T", k), node, end) for end in circuit.transformers[k].live or () if end != node)


def _along(circuit: EquivalentCircuit, start: str, chain: tuple[_Hop, ...]) -> tuple[float, str]:
    """Multiply the gains of the hops; every node passed is driven, so it ends a branch like ground."""
    value, lines = 1.0, []
    driven = {GROUND, start}
    for hop in chain:
        walk = Walk(ends=frozenset(driven))
        kind, k = hop.element
        if kind == "R":
            factor, line = _through_resistor(circuit, k, hop, walk)
        elif kind == "T":
            factor = circuit.transformers[k].turns_into(hop.end)
            line = f"{circuit.transformers[k].name} = {plain(factor)}"
        else:
            factor, line = _through_cell(circuit, k, hop, walk)
        if walk.left < 0:
            return math.nan, ""
        value *= factor
        lines.append(line)
        driven.add(hop.end)
    if abs(value) < NOT_PRINTED:
        return value, ""
    if len(lines) == 1:
        return value, f"K = {lines[0]}"
    return value, f"K = {' · '.join(f'({line})' for line in lines)} = {plain(value)}"


def _through_resistor(circuit: EquivalentCircuit, k: int, hop: _Hop, walk: Walk) -> tuple[float, str]:
    resistor = circuit.resistors[k]
    load = outside(circuit, hop.end, frozenset({hop.element}), walk)
    share = 1.0 if math.isinf(load.ohm) else load.ohm / (load.ohm + resistor.ohm)
    text = f"R/(R + {resistor.name}) = {plain(load.ohm)}/{plain(load.ohm + resistor.ohm)} = {plain(share)}"
    return share, text


def _through_cell(circuit: EquivalentCircuit, k: int, hop: _Hop, walk: Walk) -> tuple[float, str]:
    """Solve the cell with one node driven at 1 V and the others loaded by what they see without it."""
    cell = circuit.cells[k]
    without = frozenset({hop.element})
    free = [n for n in dict.fromkeys((cell.control, cell.common, cell.output)) if n not in walk.ends and n != hop.start]
    load = {node: outside(circuit, node, without, walk) for node in free}
    voltage = {hop.start: 1.0, **_cell_voltages(cell, hop.start, load)}
    value = voltage.get(hop.end, 0.0)
    return value, _cell_text(cell, hop, load, value)


def _cell_voltages(cell: Cell, driven: str, load: dict[str, Seen]) -> dict[str, float]:
    """Solve the nodal equations of one cell at its free nodes; ground and every other node are at 0 V."""
    nodes = [driven, *load]
    row = {node: k for k, node in enumerate(nodes)}
    y = np.zeros((len(nodes), len(nodes)))
    stamps = [
        (cell.output, cell.common, cell.control, cell.common, cell.gm),
        (cell.output, cell.common, GROUND, cell.common, cell.body_gm),
        (cell.output, cell.common, cell.output, cell.common, 1.0 / cell.r_o),
        (cell.control, cell.common, cell.control, cell.common, 1.0 / cell.r_pi),
        *((node, GROUND, node, GROUND, 1.0 / seen.ohm) for node, seen in load.items() if seen.ohm),
    ]
    for p, m, cp, cm, value in stamps:
        for out, out_sign in ((p, 1.0), (m, -1.0)):
            for control, sign in ((cp, 1.0), (cm, -1.0)):
                if out in row and control in row:
                    y[row[out], row[control]] += out_sign * sign * value
    live = [row[node] for node, seen in load.items() if seen.ohm]
    if not live:
        return dict.fromkeys(load, 0.0)
    try:
        solved = np.linalg.solve(y[np.ix_(live, live)], -y[live, 0])
    except np.linalg.LinAlgError:
        # A node that only a controlled current feeds has no voltage of its own: no hand gain.
        return dict.fromkeys(load, math.nan)
    return {**dict.fromkeys(load, 0.0), **{nodes[k]: float(v) for k, v in zip(live, solved, strict=True)}}


def _cell_text(cell: Cell, hop: _Hop, load: dict[str, Seen], value: float) -> str:
    """Write the gain of a cell with the textbook's formula where that is within 1 % on 1 − K."""
    if abs(value) < NOT_PRINTED:
        return ""
    r_c, r_e = load.get(cell.output, Seen(0.0, "0")), load.get(cell.common, Seen(0.0, "0"))
    into_r_o = _beside(r_c, cell)
    result = plain(value)
    tried: tuple[float, str] | None = None
    if (hop.start, hop.end) == (cell.control, cell.output):
        if r_e.ohm == 0.0:
            k = -cell.gm * into_r_o.ohm
            tried = k, f"−gm·{_bracketed(into_r_o)} = {compact(-cell.gm)}·{plain(into_r_o.ohm)} = {result}"
        else:
            tried = _degenerated(cell, r_c, r_e, result)
    elif (hop.start, hop.end) == (cell.control, cell.common):
        product = cell.gm * parallel(r_e.ohm, cell.r_o)
        text = f"gm·R_E/(1 + gm·R_E) = {plain(product)}/{plain(1.0 + product)} ≈ {result}"
        tried = product / (1.0 + product), text
    elif (hop.start, hop.end) == (cell.common, cell.output):
        k = (cell.gm + cell.body_gm) * into_r_o.ohm
        tried = k, f"gm·{_bracketed(into_r_o)} = {compact(cell.gm + cell.body_gm)}·{plain(into_r_o.ohm)} ≈ {result}"
    if tried is not None and abs(tried[0] - value) <= ACCEPTED * abs(1.0 - value):
        return tried[1]
    words = dict(zip((cell.control, cell.common, cell.output), cell.words, strict=True))
    seen = ", ".join(f"R({words[node]}) = {plain(s.ohm)}" for node, s in load.items() if s.ohm)
    given = f" with {seen}" if seen else ""
    return f"{cell.owner} from {words[hop.start]} to {words[hop.end]} = {result}{given}"


def _degenerated(cell: Cell, r_c: Seen, r_e: Seen, result: str) -> tuple[float, str]:
    """−gm·(R_C ‖ R_o)/(1 + gm·R_E) with R_o = r_o·(1 + gm·R_E); R_o is left out where it carries below 0.1 %."""
    gm = compact(cell.gm)
    loop = 1.0 + cell.gm * r_e.ohm
    r_o = cell.r_o * loop if loop > 0.0 else math.inf
    load = parallel(r_c.ohm, r_o)
    written = "R_C" if r_c.ohm < NOT_PRINTED * r_o else "(R_C ‖ R_o)"
    given = [
        f"R_C = {bare(r_c.symbol)} = {plain(r_c.ohm)}" if r_c.symbol != plain(r_c.ohm) else f"R_C = {plain(r_c.ohm)}"
    ]
    if written != "R_C":
        given.append(f"R_o = r_o·(1 + gm·R_E) = {plain(r_o)}")
    numbers = f"{compact(-cell.gm)}·{plain(load)}/(1 + {gm}·{plain(r_e.ohm)})"
    text = f"−gm·{written}/(1 + gm·R_E) = {numbers} ≈ {result} with {', '.join(given)}"
    return (-cell.gm * load / loop if loop else math.nan), text


def _beside(load: Seen, cell: Cell) -> Seen:
    ohm = parallel(load.ohm, cell.r_o)
    if math.isinf(load.ohm):
        return Seen(ohm, "r_o")
    if math.isinf(cell.r_o) or load.ohm < NOT_PRINTED * cell.r_o:
        return replace(load, ohm=ohm)
    return Seen(ohm, f"{load.symbol} ‖ r_o", load.terms + 1)


def _bracketed(seen: Seen) -> str:
    return seen.symbol if seen.terms == 1 else f"({seen.symbol})"
