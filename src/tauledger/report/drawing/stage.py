"""The small-signal circuit of one stage as the hand analysis has it: R and C at its input, source, R and C after it.

The controlled source gives Gm·v with Gm = gain by hand over R of the output node, so that the drawing has the stage's
mid-band gain; each capacitance stands there with the part that counts at this node.
"""

from __future__ import annotations

import math
from itertools import pairwise

from msgspec import Struct
from msgspec.structs import replace

from tauledger.record import CapacitanceTerm, NodeRow, Review, Stage
from tauledger.report.charts.style import escape
from tauledger.report.drawing.symbols import (
    capacitor_down,
    controlled_current,
    dot,
    ground,
    lines,
    resistor_across,
    resistor_down,
    text,
    voltage_source,
    wire,
)
from tauledger.report.tables.upper import places, term_seconds
from tauledger.report.wording import number, part_titles

TOP, BOTTOM = 50.0, 176.0
COLUMN, MARGIN = 136.0, 22.0
MOST_CAPACITORS = 3
SMALL = 0.03
MOST_STAGES = 24
FAITHFUL = 0.1
SAME_OHM = 0.005


class Element(Struct, frozen=True):
    """One element between node and ground: "resistor" or "capacitor", what is written beside it, its part."""

    kind: str
    words: tuple[str, ...]
    part: str = ""


def drawable(review: Review) -> tuple[Stage, ...]:
    """Give the chain of nodes that can be drawn, at most 24 and the first with its gain from the source.

    Passive nodes before the first stage are taken together. Empty for other networks: of two halves, or with a stage
    whose gain by hand is not the exact one within 10 %.
    """
    rows = {node.name: node for node in review.nodes}
    leading = 0
    while leading < len(review.stages) and not review.stages[leading].owner:
        leading += 1
    before, chain = review.stages[: max(leading - 1, 0)], review.stages[max(leading - 1, 0) :]
    if not chain or not all(_as_drawn(stage, rows) for stage in review.stages):
        return ()
    gain = math.prod(stage.gain_hand or 0.0 for stage in (*before, chain[0]))
    return (replace(chain[0], gain_hand=gain), *chain[1:MOST_STAGES])


def _as_drawn(stage: Stage, rows: dict[str, NodeRow]) -> bool:
    """Whether one resistance and one source make the stage: not where signal takes another way too, as by feedback."""
    if stage.image or stage.node not in rows or stage.gain_hand is None or stage.gain_exact is None:
        return False
    faithful = abs(stage.gain_hand - stage.gain_exact) <= FAITHFUL * abs(stage.gain_exact)
    return faithful and bool(rows[stage.node].resistance_hand_ohm)


def drawn_stages(review: Review) -> tuple[tuple[str, str], ...]:
    """Give heading and SVG for each stage of the signal path, the source with its first node before them.

    Empty where the network is not a chain of nodes with a resistance and a gain by hand.
    """
    chain = drawable(review)
    if not chain:
        return ()
    rows = {node.name: node for node in review.nodes}
    first = chain[0]
    drive = review.drive[0].source if len(review.drive) == 1 else "sources"
    drawings = [
        (f"Source to {rows[first.node].title}", _draw_passive(review, first, rows[first.node], drive, number_of=0))
    ]
    for k, (before, stage) in enumerate(pairwise(chain), start=1):
        what = f"{stage.role} {stage.owner}".strip()
        heading = f"{what[:1].upper()}{what[1:]}: {rows[before.node].title} to {rows[stage.node].title}"
        if stage.owner:
            svg = _draw_stage(review, rows[before.node], stage, rows[stage.node], number_of=k)
        else:
            svg = _draw_passive(review, stage, rows[stage.node], f"v({before.node})", number_of=k)
        drawings.append((heading, svg))
    return tuple(drawings)


def _draw_passive(review: Review, stage: Stage, node: NodeRow, drive: str, *, number_of: int) -> str:
    """Draw what drives a node without amplifying, with the resistance and every capacitance that it sees there."""
    pieces: list[str] = []
    x = _source(pieces, (f"{number(stage.gain_hand, '', 3)} ·", drive), node, _elements(node, review)[1:])
    title = f"Small-signal circuit of node {number_of + 1}: {_resistance(node)}"
    return _svg(pieces, x, key=f"stage-{number_of}", title=title)


def _draw_stage(review: Review, before: NodeRow, stage: Stage, node: NodeRow, *, number_of: int) -> str:
    """Draw one stage: R and C at its input, its controlled source, R and every capacitance at its output."""
    pieces: list[str] = []
    together = Element("capacitor", ("C", number(before.capacitance_f, "F", 3)))
    x = _source(pieces, ("from the", "stage before" if number_of > 1 else "source"), before, [together])
    gain, ohm = stage.gain_hand or 0.0, node.resistance_hand_ohm or 1.0
    start = x + 24.0
    words = (f"Gm·v({before.name})", number(abs(gain) / ohm, "S", 3))
    pieces += [controlled_current(start, TOP, BOTTOM, down=gain < 0.0)]
    pieces += [lines(start + 22, (TOP + BOTTOM) / 2.0, words)]
    node_at = start + 104.0
    elements = _elements(node, review)
    last = _last(node_at, elements)
    pieces += [wire((start, TOP), (node_at, TOP)), wire((start, BOTTOM), (last, BOTTOM)), ground(start, BOTTOM)]
    x = _shunts(pieces, node_at, node, elements)
    title = f"Small-signal circuit of stage {number_of}: {_resistance(before)}, {_resistance(node)}"
    return _svg(pieces, x, key=f"stage-{number_of}", title=title)


def _resistance(node: NodeRow) -> str:
    return f"{number(node.resistance_hand_ohm, 'Ω')} at {node.title}"


def _svg(pieces: list[str], x: float, *, key: str, title: str) -> str:
    width, height = x + 24.0, BOTTOM + 26.0
    return (
        f'<svg class="circuit" viewBox="0 0 {width:g} {height:g}" style="--width: {width:g}px" role="img" '
        f'aria-labelledby="{key}-title"><title id="{key}-title">{escape(title)}</title>{"".join(pieces)}</svg>\n'
    )


def _source(pieces: list[str], words: tuple[str, ...], node: NodeRow, elements: list[Element]) -> float:
    """Draw a source with R_Th and the elements at its node; gives where the next may start."""
    left = MARGIN + 22.0
    pieces += [voltage_source(left, TOP, BOTTOM), lines(left + 23, (TOP + BOTTOM) / 2.0, words)]
    pieces += [wire((left, TOP), (left + 14, TOP)), resistor_across(left + 14, TOP, 104.0)]
    pieces.append(text(left + 66, TOP - 33, "R_Th", "middle", kind="strong"))
    pieces.append(text(left + 66, TOP - 17, number(node.resistance_hand_ohm, "Ω"), "middle"))
    start = left + 118.0
    pieces += [wire((left, BOTTOM), (_last(start, elements), BOTTOM)), ground(left, BOTTOM)]
    return _shunts(pieces, start, node, elements)


def _shunts(pieces: list[str], x: float, node: NodeRow, elements: list[Element]) -> float:
    """Hang the elements of a node between the rails from x on; gives where the next may start."""
    start = x
    pieces.append(dot(start, TOP))
    pieces.append(text(start + 5, TOP - 17, _at(node), kind="strong"))
    for element in elements:
        x += 22.0
        symbol = resistor_down if element.kind == "resistor" else capacitor_down
        beside = 14.0 if element.kind == "resistor" else 20.0
        words = lines(
            x + beside,
            (TOP + BOTTOM) / 2.0 + 21.0 if element.kind == "capacitor" else (TOP + BOTTOM) / 2.0,
            element.words,
        )
        group = f"{symbol(x, TOP, BOTTOM)}{words}"
        pieces.append(f'<g data-part="{escape(element.part)}">{group}</g>' if element.part else group)
        pieces += [wire((start, TOP), (x, TOP))]
        x += COLUMN - 22.0
    return x


def _own_ohm(term: CapacitanceTerm, node: NodeRow) -> float | None:
    """Give the resistance that a capacitance faces where it is visibly another than the one drawn."""
    farad, ohm = term.farad * term.factor, node.resistance_hand_ohm
    if not farad or not ohm:
        return None
    own = term_seconds(term, node) / farad
    return own if abs(own / ohm - 1.0) > SAME_OHM else None


def _at(node: NodeRow) -> str:
    """Name the place whose resistance is drawn: the node, or what lies inside a device behind it."""
    where = places(node)
    return where[0].node if where else node.name


def _factor(factor: float) -> str:
    return f"{factor:.3g}" if abs(factor) < 1000.0 else f"{factor:.0f}"


def _last(start: float, elements: list[Element]) -> float:
    """Give where the last of the elements at a node stands."""
    return start + 22.0 + COLUMN * (len(elements) - 1)


def _elements(node: NodeRow, review: Review) -> list[Element]:
    """Give the resistance of a node and its largest capacitances, the small ones taken together."""
    titles = part_titles(review.parts)
    terms = node.working.capacitances if node.working else ()
    ordered = sorted(terms, key=lambda term: -abs(term_seconds(term, node)))
    whole = abs(node.time_constant_s or 0.0)
    large = [term for term in ordered if abs(term_seconds(term, node)) >= SMALL * whole]
    shown = large[: MOST_CAPACITORS if len(ordered) <= MOST_CAPACITORS else MOST_CAPACITORS - 1]
    elements = [Element("resistor", ("R", number(node.resistance_hand_ohm, "Ω")))]
    for term in shown:
        counts = number(term.farad * term.factor, "F", 3)
        plain = abs(term.factor - 1.0) < 5e-4
        words = (counts,) if plain else (f"{number(term.farad, 'F', 3)} × {_factor(term.factor)}", f"= {counts}")
        own = _own_ohm(term, node)
        if own is not None:
            words = (*words, f"at {number(own, 'Ω')}")
        elements.append(Element("capacitor", (titles.get(term.part, term.part), *words), term.part))
    rest = ordered[len(shown) :]
    if rest:
        together = sum(term_seconds(term, node) for term in rest) / (node.resistance_hand_ohm or 1.0)
        name = titles.get(rest[0].part, rest[0].part) if len(rest) == 1 else f"{len(rest)} smaller"
        elements.append(Element("capacitor", (name, number(together, "F", 3))))
    return elements
