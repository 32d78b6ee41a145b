"""The small-signal circuit of one stage as the hand analysis has it: R and C at its input, source, R and C after it.

The controlled source gives Gm·v with Gm = gain by hand over R of the output node, so that the drawing has the stage's
mid-band gain; each capacitance stands there with the part that counts at this node.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
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
ELEMENTS_A_ROW = 2
# A letter of the drawing takes about so much, in px; a drawing that is wider than this is for a wide screen.
LETTER, LEGIBLE = 7.0, 850.0


class Element(Struct, frozen=True):
    """One element between node and ground: "resistor" or "capacitor", what is written beside it, its part."""

    kind: str
    words: tuple[str, ...]
    part: str = ""


class Source(Struct, frozen=True):
    """What drives a node through its R_Th, in words."""

    words: tuple[str, ...]


class Controlled(Struct, frozen=True):
    """A controlled current source: what it gives, in words, and whether it draws current from the node."""

    words: tuple[str, ...]
    down: bool


class Node(Struct, frozen=True):
    """A node with what hangs between it and ground."""

    node: NodeRow
    elements: tuple[Element, ...]


Piece = Source | Controlled | Node


class Row(Struct, frozen=True):
    """One row of a drawing, and how wide it is in px."""

    svg: str
    width: float


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

    Each is drawn twice, in one row and, for a small screen, in rows of two elements. Empty where the network is not a
    chain of nodes with a resistance and a gain by hand.
    """
    chain = drawable(review)
    if not chain:
        return ()
    rows = {node.name: node for node in review.nodes}
    first = chain[0]
    drive = review.drive[0].source if len(review.drive) == 1 else "sources"
    title = f"Small-signal circuit of node 1: {_resistance(rows[first.node])}"
    drawings = [
        (f"Source to {rows[first.node].title}", _twice(_passive(review, first, rows[first.node], drive), 0, title))
    ]
    for k, (before, stage) in enumerate(pairwise(chain), start=1):
        what = f"{stage.role} {stage.owner}".strip()
        start, end = rows[before.node], rows[stage.node]
        heading = f"{what[:1].upper()}{what[1:]}: {start.title} to {end.title}"
        if stage.owner:
            title = f"Small-signal circuit of stage {k}: {_resistance(start)}, {_resistance(end)}"
            drawn = _twice(_stage(review, start, stage, end, after_another=k > 1), k, title)
        else:
            title = f"Small-signal circuit of node {k + 1}: {_resistance(end)}"
            drawn = _twice(_passive(review, stage, end, f"v({before.node})"), k, title)
        drawings.append((heading, drawn))
    return tuple(drawings)


def _passive(review: Review, stage: Stage, node: NodeRow, drive: str) -> tuple[Piece, ...]:
    """What drives a node without amplifying, with the resistance and every capacitance that it sees there."""
    return (Source((f"{number(stage.gain_hand, '', 3)} ·", drive)), Node(node, tuple(_elements(node, review)[1:])))


def _stage(review: Review, before: NodeRow, stage: Stage, node: NodeRow, *, after_another: bool) -> tuple[Piece, ...]:
    """One stage: R and C at its input, its controlled source, R and every capacitance at its output."""
    together = Element("capacitor", ("C", number(before.capacitance_f, "F", 3)))
    gain, ohm = stage.gain_hand or 0.0, node.resistance_hand_ohm or 1.0
    return (
        Source(("from the", "stage before" if after_another else "source")),
        Node(before, (together,)),
        Controlled((f"Gm·v({before.name})", number(abs(gain) / ohm, "S", 3)), down=gain < 0.0),
        Node(node, tuple(_elements(node, review))),
    )


def _resistance(node: NodeRow) -> str:
    return f"{number(node.resistance_hand_ohm, 'Ω')} at {node.title}"


def _twice(pieces: tuple[Piece, ...], number_of: int, title: str) -> str:
    """Draw in one row, and in rows that a small screen holds; a long row also with each source in a row of its own."""
    wide, width = _one_row(pieces)
    narrow = _rows(pieces, first=1, others=ELEMENTS_A_ROW)
    key = f"stage-{number_of}"
    if width <= LEGIBLE:
        middle, kind = "", "wide"
    else:
        apart = _rows(pieces, first=MOST_CAPACITORS + 1, others=1)
        middle, kind = _svg(apart, key=f"{key}-middle", title=title, kind="middle"), "wide long"
    narrowly = _svg(narrow, key=f"{key}-narrow", title=title, kind="narrow")
    return _svg([wide], key=key, title=title, kind=kind) + middle + narrowly


def _one_row(pieces: tuple[Piece, ...]) -> tuple[Row, float]:
    drawn: list[str] = []
    x = 0.0
    for piece, after in zip(pieces, (*pieces[1:], None), strict=True):
        match piece:
            case Source():
                assert isinstance(after, Node)
                x = _source(drawn, piece, after)
            case Controlled():
                assert isinstance(after, Node)
                x = _controlled(drawn, piece, x + 24.0, after.elements)
            case Node():
                x = _shunts(drawn, x, piece.node, piece.elements)
    return Row("".join(drawn), x), x


def _rows(pieces: tuple[Piece, ...], *, first: int, others: int) -> list[Row]:
    """Give each source a row with the first elements of its node, then further rows with others of that node."""
    rows: list[Row] = []
    for source, node in zip(pieces[::2], pieces[1::2], strict=True):
        assert isinstance(node, Node)
        row, _ = _one_row((source, Node(node.node, node.elements[:first])))
        rows.append(row)
        for k in range(first, len(node.elements), others):
            drawn: list[str] = []
            elements = node.elements[k : k + others]
            last = _last(MARGIN, elements)
            drawn += [wire((MARGIN, BOTTOM), (last, BOTTOM)), ground(MARGIN, BOTTOM)]
            x = _shunts(drawn, MARGIN, node.node, elements, label=f"{_at(node.node)}, the same node")
            rows.append(Row("".join(drawn), x))
    return rows


def _svg(rows: list[Row], *, key: str, title: str, kind: str) -> str:
    width, height = max(row.width for row in rows) + 24.0, BOTTOM + 26.0
    drawn = "".join(
        row.svg if k == 0 else f'<g transform="translate(0 {k * height:g})">{row.svg}</g>' for k, row in enumerate(rows)
    )
    return (
        f'<svg class="circuit {kind}" viewBox="0 0 {width:g} {height * len(rows):g}" style="--width: {width:g}px" '
        f'role="img" aria-labelledby="{key}-title"><title id="{key}-title">{escape(title)}</title>{drawn}</svg>\n'
    )


def _source(pieces: list[str], source: Source, node: Node) -> float:
    """Draw a source with R_Th, and the rail below the elements at its node; gives where the node may start."""
    left = MARGIN + 22.0
    pieces += [voltage_source(left, TOP, BOTTOM), lines(left + 23, (TOP + BOTTOM) / 2.0, source.words)]
    pieces += [wire((left, TOP), (left + 14, TOP)), resistor_across(left + 14, TOP, 104.0)]
    pieces.append(text(left + 66, TOP - 33, "R_Th", "middle", kind="strong"))
    pieces.append(text(left + 66, TOP - 17, number(node.node.resistance_hand_ohm, "Ω"), "middle"))
    start = left + 118.0
    pieces += [wire((left, BOTTOM), (_last(start, node.elements), BOTTOM)), ground(left, BOTTOM)]
    return start


def _controlled(pieces: list[str], source: Controlled, x: float, elements: tuple[Element, ...]) -> float:
    """Draw a controlled source from x on, and the rail below; gives where its node may start."""
    start = max(x, MARGIN + 10.0)
    node_at = start + 104.0
    pieces += [controlled_current(start, TOP, BOTTOM, down=source.down)]
    pieces += [lines(start + 22, (TOP + BOTTOM) / 2.0, source.words)]
    pieces += [wire((start, TOP), (node_at, TOP)), wire((start, BOTTOM), (_last(node_at, elements), BOTTOM))]
    pieces.append(ground(start, BOTTOM))
    return node_at


def _shunts(
    pieces: list[str], x: float, node: NodeRow, elements: tuple[Element, ...], *, label: str | None = None
) -> float:
    """Hang the elements of a node between the rails from x on; gives where the next may start."""
    start = x
    label = _at(node) if label is None else label
    pieces.append(dot(start, TOP))
    pieces.append(text(start + 5, TOP - 17, label, kind="strong"))
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
    return max(x, start + 5.0 + LETTER * len(label))


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


def _last(start: float, elements: Sequence[Element]) -> float:
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
