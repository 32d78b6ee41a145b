"""Tables of the upper edge: the budget node by node, and what every capacitance takes and costs."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping

from tauledger.record import CapacitanceTerm, InductorFacts, NodeRow, PartRow, ResistanceTerm, Review, WorkingLine
from tauledger.report.tables.grid import Column, Grid, GridRow, columns
from tauledger.report.wording import (
    LOOP,
    NO_NUMBER,
    SOLVED,
    amount,
    by_loop,
    change,
    fraction,
    move,
    number,
    part_title,
    part_titles,
    retitled,
    share,
)
from tauledger.report.working import node_title

PICOFARAD = 1e-12
# A charge controlled from elsewhere below this part of the sum is not seen in four digits.
_SEEN = 1e-3
_NAME = re.compile(r"(?<![\w.])(?:\w+\.)*[rR]\w*(?![\w(.])")
# Rows that take less of the sum stand apart, so that a reader of a large board sees what matters.
MATTERS = 0.005
WORTH_A_ROW = 0.002
SHARES = 12


def whole_s(review: Review) -> float:
    """Give the sum of the time constants of the nodes that count, in s; halves of a pair are counted once in it."""
    upper = review.budget.upper
    if upper is not None and upper.path_sum_s:
        return upper.path_sum_s
    coils = math.fsum(row.time_constant_s for row in review.inductors if row.in_path)
    return coils + math.fsum(node.time_constant_s or 0.0 for node in counted(review))


def counted(review: Review) -> list[NodeRow]:
    """Give the nodes that count in the sums: those in the path, of a balanced circuit those of one half."""
    return [node for node in review.nodes if node.in_path and not node.second]


def counting_nodes(review: Review) -> tuple[NodeRow, ...]:
    """Give the nodes that take at least half a per cent of the sum, largest first."""
    least = MATTERS * abs(whole_s(review))
    rows = [node for node in counted(review) if abs(node.time_constant_s or 0.0) >= least]
    return tuple(sorted(rows, key=lambda node: -abs(node.time_constant_s or 0.0)))


def budget(review: Review) -> Grid:
    """Give per node that counts R, C and R·C by hand and exact with its share of the sum, and its capacitances."""
    nodes = counting_nodes(review)
    rows = _node_rows(nodes, review)
    rows += [_coil_row(row, review) for row in review.inductors if row.in_path]
    sums = review.budget.upper
    others = len(counted(review)) - len(nodes)
    if sums is not None and sums.path_sum_s is not None:
        name = "Sum over all nodes of the signal path" if others else "Sum"
        cells = (name, "", "", "", number(sums.path_sum_s, "s"), _exact_sum(review), "100 %", "")
        rows.append(GridRow(cells, "sum"))
    return Grid(
        "Time-constant budget of the upper edge, by signal node",
        BUDGET_COLUMNS,
        tuple(rows),
        " ".join(_remarks(nodes, review)),
    )


def places(node: NodeRow) -> tuple[WorkingLine, ...]:
    """Give the places that a row is made of where it is more than the node itself: inside a device, and the node."""
    every = node.working.lines if node.working is not None else ()
    lines = tuple(line for line in every if line.capacitances or line.time_constant_s)
    return lines if len(lines) > 1 or any(line.node != node.name for line in lines) else ()


def resistors_at(terms: Iterable[ResistanceTerm], review: Review) -> tuple[str, ...]:
    """Give the resistors of the netlist that make a resistance, as named in its working and listed among the lines."""
    known = {line.text.split()[0].casefold() for line in review.lines if line.text[:1] in ("r", "R")}
    known |= {one.name.rsplit(".", 1)[-1].casefold() for one in review.helps if one.unit == "Ω"}
    words = [word for term in terms for word in _NAME.findall(term.name)]
    return tuple(word for word in dict.fromkeys(words) if word.rsplit(".", 1)[-1].casefold() in known)


def _remarks(nodes: Iterable[NodeRow], review: Review) -> list[str]:
    """Say what must be known to add the table up."""
    told = []
    if any(len(places(node)) > 1 for node in nodes):
        told.append(
            "R of a node is that of the first place named below it, where most of its R·C stands; the places face "
            "different resistances, and C of the node is its R·C over that R. C adds up in each place, R·C all through."
        )
    marks = {_mark(node) for node in nodes}
    if f" {SOLVED}" in marks:
        told.append(f"{SOLVED} solved exactly: none of the rules fits this node.")
    terms = [term for node in nodes if node.working is not None for term in node.working.capacitances]
    if any(term.gain_source == "solved" and abs(term.factor - 1.0) >= 5e-4 for term in terms):
        told.append(f"{SOLVED} after a factor: K solved exactly, no chain of hand gains fits.")
    if f" {LOOP}" in marks:
        told.append(f"{LOOP} {by_loop(review)}.")
    if any((node.time_constant_s or 0.0) < 0.0 for node in nodes):
        told.append(
            "A negative R·C, of a capacitance whose far end moves more than its near one, takes away from the sum: "
            "the others may be more than 100 % of it."
        )
    least = _SEEN * abs(whole_s(review))
    for part in review.parts:
        seconds = part.time_constant_s or 0.0
        if part.kind == "transcapacitance" and part.in_path and abs(seconds) >= least:
            title = part_title(part.name, part.owner)
            told.append(f"R·C exact holds {title} too, {number(seconds, 's', 3)}, which paper leaves out.")
    return told


def smaller_nodes(review: Review) -> Grid:
    """Give the nodes that hardly count and those that no signal passes, in the same columns."""
    shown = {node.name for node in counting_nodes(review)}
    rest = [node for node in review.nodes if node.name not in shown and not node.second]
    rest.sort(key=lambda node: (not node.in_path, -abs(node.time_constant_s or 0.0)))
    return Grid(
        "Nodes that hardly count, and nodes off the signal path", BUDGET_COLUMNS, tuple(_node_rows(rest, review))
    )


def equivalent(review: Review) -> Grid:
    """Give the network of the hand analysis as a table: every node by itself, R in parallel with its capacitances."""
    titles = part_titles(review.parts)
    rows = []
    for node in counting_nodes(review):
        terms = node.working.capacitances if node.working else ()
        ordered = sorted(terms, key=lambda term: -abs(term_seconds(term, node)))
        told = "; ".join(f"{titles.get(term.part, term.part)} {term_text(term)}" for term in ordered)
        rows.append(GridRow((node_title(node), number(node.resistance_hand_ohm, "Ω"), told), part=node.name))
    heads = (Column("Node", "l"), Column("R"), Column("in parallel with", "l"))
    return Grid("Every node by itself: its resistance and the capacitances with their Miller part", heads, tuple(rows))


BUDGET_COLUMNS = columns(
    "Node and its capacitances",
    "R by hand",
    "R exact",
    "C",
    "R·C by hand",
    "R·C exact",
    "of the sum",
    "1 pF more: f_H",
)


def shares(review: Review) -> Grid:
    """Give every part's share of f_H, and f_H recomputed with 10 % less of it."""
    exact = review.f_high.exact_hz if review.f_high else None
    titles = part_titles(review.parts)
    ordered = by_share(review)
    shown = [part for part in ordered[:SHARES] if abs(part.share.f_high or 0.0) >= WORTH_A_ROW]
    rows = [
        GridRow(
            (
                titles[part.name],
                amount(part),
                share(part.share.f_high),
                number(part.ten_percent_less.f_high_hz, "Hz"),
                move(change(part.ten_percent_less.f_high_hz, exact)),
            ),
            part=part.name,
        )
        for part in shown
    ]
    rest = ordered[len(shown) :]
    if rest:
        total = math.fsum(part.share.f_high or 0.0 for part in rest)
        name = "1 other" if len(rest) == 1 else f"{len(rest)} others together"
        rows.append(GridRow((name, "", share(total), "", "")))
    heads = columns("Capacitance or inductance", "value", "share of f_H", "10 % less of it: f_H", "change")
    return Grid("Share of every capacitance and inductance in the upper edge", heads, tuple(rows))


def by_share(review: Review) -> list[PartRow]:
    """Give the parts with a share of f_H, largest first."""
    return sorted(
        (part for part in review.parts if part.share.f_high is not None),
        key=lambda part: -abs(part.share.f_high or 0.0),
    )


def term_text(term: CapacitanceTerm) -> str:
    """Write a capacitance with its Miller factor where it has one: "1.20 pF × 115.8 = 138.7 pF"."""
    if abs(term.factor - 1.0) < 5e-4:
        return number(term.farad, "F")
    return f"{_product(term)} = {number(term.farad * term.factor, 'F')}"


def _product(term: CapacitanceTerm) -> str:
    solved = f" {SOLVED}" if term.gain_source == "solved" else ""
    return f"{number(term.farad, 'F', 3)} × {term.factor:.4g}{solved}"


def term_seconds(term: CapacitanceTerm, node: NodeRow) -> float:
    """Give what one capacitance adds to its node, with the resistance that it faces itself."""
    if term.time_constant_s is not None:
        return term.time_constant_s
    return (node.resistance_hand_ohm or 0.0) * term.farad * term.factor


def _node_rows(nodes: Iterable[NodeRow], review: Review) -> list[GridRow]:
    titles = part_titles(review.parts)
    exact = review.f_high.exact_hz if review.f_high else None
    whole = whole_s(review)
    rows: list[GridRow] = []
    for node in nodes:
        cost = node.per_farad.f_high
        rows.append(
            GridRow(
                (
                    node_title(node),
                    number(node.resistance_hand_ohm, "Ω") + _mark(node),
                    number(node.resistance_exact_ohm, "Ω"),
                    number(node.capacitance_f, "F"),
                    number(node.time_constant_s, "s"),
                    number(node.time_constant_exact_s, "s"),
                    _of(node.time_constant_s, whole) if node.in_path else NO_NUMBER,
                    move(cost * PICOFARAD / exact) if cost is not None and exact else NO_NUMBER,
                ),
                part=node.name,
            )
        )
        rows.extend(_place_rows(node, review, titles, whole))
    return rows


def _mark(node: NodeRow) -> str:
    """Mark a resistance that paper alone does not give."""
    source = node.working.source if node.working is not None else "rule"
    return {"solved": f" {SOLVED}", "loop": f" {LOOP}", "branch": f" {LOOP}"}.get(source, "")


def _place_rows(node: NodeRow, review: Review, titles: Mapping[str, str], whole: float) -> list[GridRow]:
    """Give the capacitances of a node, each below the place where it hangs if the node is several."""
    if not places(node):
        return _term_rows(node, titles, whole)
    rows = []
    for line in places(node):
        made = ", ".join(resistors_at(line.resistances, review))
        cells = (
            f"at {line.node}" + (f"; R from {made}" if made else ""),
            number(line.resistance_hand_ohm, "Ω"),
            number(line.resistance_exact_ohm, "Ω"),
            number(math.fsum(term.farad * term.factor for term in line.capacitances), "F"),
            number(line.time_constant_s, "s"),
            number(line.time_constant_exact_s, "s"),
            _of(line.time_constant_s, whole) if node.in_path else "",
            "",
        )
        rows.append(GridRow(cells, "place"))
        ordered = sorted(line.capacitances, key=lambda term: -abs(term_seconds(term, node)))
        rows.extend(_term_row(term, node, titles, whole) for term in ordered)
    return rows


def _term_rows(node: NodeRow, titles: Mapping[str, str], whole: float) -> list[GridRow]:
    terms = node.working.capacitances if node.working is not None else ()
    if len(terms) < 2 and all(abs(term.factor - 1.0) < 5e-4 for term in terms):
        return [_term_row(term, node, titles, whole) for term in terms]
    ordered = sorted(terms, key=lambda term: -abs(term_seconds(term, node)))
    return [_term_row(term, node, titles, whole) for term in ordered]


def _term_row(term: CapacitanceTerm, node: NodeRow, titles: Mapping[str, str], whole: float) -> GridRow:
    seconds = term_seconds(term, node)
    times = "" if abs(term.factor - 1.0) < 5e-4 else f", {_product(term)}"
    cells = (
        titles.get(term.part, term.part) + times,
        "",
        "",
        number(term.farad * term.factor, "F"),
        number(seconds, "s"),
        "",
        _of(seconds, whole) if node.in_path else "",
        "",
    )
    return GridRow(cells, "part", term.part)


def _exact_sum(review: Review) -> str:
    coils = math.fsum(row.time_constant_exact_s for row in review.inductors if row.in_path)
    return number(coils + math.fsum(node.time_constant_exact_s or 0.0 for node in counted(review)), "s")


def _coil_row(row: InductorFacts, review: Review) -> GridRow:
    """Write an inductor's L/R in the columns of R·C: its henry stands where a capacitance would."""
    cells = (
        retitled(row.title, review.parts),
        number(row.resistance_hand_ohm, "Ω") + (f" {SOLVED}" if row.source == "solved" else ""),
        number(row.resistance_exact_ohm, "Ω"),
        number(row.henry, "H"),
        number(row.time_constant_s, "s"),
        number(row.time_constant_exact_s, "s"),
        _of(row.time_constant_s, whole_s(review)),
        "",
    )
    return GridRow(cells, part=row.part)


def _of(seconds: float | None, whole: float) -> str:
    return fraction(seconds / whole) if seconds is not None and whole else NO_NUMBER
