"""The upper edge: the time-constant budget node by node, and whose capacitance sets f_H."""

from __future__ import annotations

import math
from collections.abc import Mapping

from tauledger.record import CapacitanceTerm, InductorFacts, NodeRow, PartRow, Review, UpperBudget, Working
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.wording import (
    LOOP,
    NO_NUMBER,
    SOLVED,
    amount,
    by_loop,
    group_delay,
    move,
    number,
    part_titles,
    retitled,
    share,
)
from tauledger.report.working import node_title, workings

_PICOFARAD = 1e-12
_LEAST_PROBE = 1e-17
_FIRST_ORDER = 0.1
_MATTERS = 0.01
_WORTH_A_ROW = 0.02
_NODES, _TERMS, _SHARES = 6, 4, 5
_EQUAL = 1e-6
_SAME_OHM = 0.005


def upper_budget(review: Review, *, verbose: bool = False) -> Section:
    """Give per signal node R, C, R·C by hand and exact, and what 1 pF more costs; below it its capacitances."""
    if not any(node.capacitance_f for node in review.nodes):
        return Section(())
    titles = part_titles(review.parts)
    first = [node for node in review.nodes if not node.second]
    shown = [node for node in first if (verbose and _carries(node)) or _node_matters(node, review)]
    hidden = len(first) - len(shown)
    if not verbose:
        hidden += max(len(shown) - _NODES, 0)
        shown = sorted(shown, key=lambda node: -abs(node.time_constant_s or 0.0))[:_NODES]
    f_high = review.f_high.exact_hz if review.f_high else None
    probe = _probe(shown, f_high)
    rows: list[Row] = []
    for node in shown:
        rows.append(_node_row(node, f_high, probe))
        if node.working:
            rows.extend(_term_rows(node, node.working, titles, least=0.0 if verbose else _WORTH_A_ROW * _whole(review)))
    coils = [row for row in review.inductors if verbose or (row.in_path and _coil_matters(row, review))]
    rows += [_coil_row(row, review) for row in coils]
    title = f"UPPER EDGE f_H, {len(shown)} of {len(first)} nodes" if hidden else "UPPER EDGE f_H, by node"
    head = (title, "R", "C", "R·C hand", "exact", f"+{number(probe, 'F', 1)}")
    blocks: list[Block] = [Table("lrrrrr", head, tuple(rows))]
    if any(_mark(node) == SOLVED for node in shown) or any(row.source == "solved" for row in coils):
        blocks.append(Prose("solved exactly: none of the rules fits this node", lead=f"  {SOLVED} "))
    elif any(cell.endswith(SOLVED) for row in rows for cell in row.cells):
        blocks.append(Prose("K solved exactly: no chain of hand gains fits", lead=f"  {SOLVED} "))
    if any(_mark(node) == LOOP for node in shown):
        blocks.append(Prose(by_loop(review), lead=f"  {LOOP} "))
    if review.budget.upper:
        halves, delay = any(n.image for n in first), group_delay(review)
        blocks.append(Prose(_sums(review.budget.upper, halves=halves, delay=delay), lead="  "))
    if verbose:
        blocks.extend(workings(review, [node for node in shown if node.working]).blocks)
        blocks.extend(_coil_working(row, review) for row in coils)
    return Section(tuple(blocks), major=True)


def upper_shares(review: Review, *, verbose: bool = False) -> Section:
    """Give each part's share of f_H and what 10 % less of it gives, recomputed; the rest in one line."""
    if review.f_high is None:
        return Section(())
    with_share = [(part, part.share.f_high) for part in review.parts if part.share.f_high is not None]
    ordered = _alike(sorted(with_share, key=lambda entry: -abs(entry[1])))
    shown = [e for e in ordered if verbose or abs(e[0][1]) >= _WORTH_A_ROW][: None if verbose else _SHARES]
    if not shown:
        return Section(())
    titles = part_titles(review.parts)
    rows = [_share_row(alike, titles, review.f_high.exact_hz) for alike in shown]
    rest = [entry for alike in ordered[len(shown) :] for entry in alike]
    if rest:
        told = f"{_count(len(rest), 'other')} together"
        rows.append(Row((told, "", share(sum(value for _, value in rest)), "")))
    head = ("WHOSE CAPACITANCE SETS f_H", "value", "share", "10 % less, recomputed: f_H")
    return Section((Table("lrrr", head, tuple(rows)),))


def _carries(node: NodeRow) -> bool:
    """Whether there is any capacitance at a node, so that there is something to work out."""
    return node.working is None or bool(node.working.capacitances)


def _node_matters(node: NodeRow, review: Review) -> bool:
    if not node.in_path or node.second:
        return False
    return abs(node.share.f_high or 0.0) >= _MATTERS or abs(node.time_constant_s or 0.0) >= _MATTERS * _whole(review)


def _whole(review: Review) -> float:
    """Give the sum of the time constants that count, in s."""
    nodes = sum(abs(row.time_constant_s or 0.0) for row in review.nodes if row.in_path and not row.second)
    return nodes + sum(row.time_constant_s for row in review.inductors if row.in_path)


def _probe(nodes: list[NodeRow], f_high: float | None) -> float:
    """Choose what is added at each node, 1 pF or a tenth, a hundredth … of it, so that f_H moves by 10 % at most.

    The column is first order in it: of 1 pF at an integrated node it would say what no probe does.
    """
    costs = [abs(node.per_farad.f_high or 0.0) for node in nodes]
    probe = _PICOFARAD
    while f_high and probe > _LEAST_PROBE and max(costs, default=0.0) * probe > _FIRST_ORDER * f_high:
        probe /= 10.0
    return probe


def _node_row(node: NodeRow, f_high: float | None, probe: float) -> Row:
    cost = node.per_farad.f_high
    return Row(
        (
            node_title(node),
            number(node.resistance_hand_ohm, "Ω") + _mark(node),
            number(node.capacitance_f, "F"),
            number(node.time_constant_s, "s"),
            number(node.time_constant_exact_s, "s"),
            move(cost * probe / f_high) if cost is not None and f_high else NO_NUMBER,
        )
    )


def _coil_matters(row: InductorFacts, review: Review) -> bool:
    return abs(row.time_constant_s) >= _MATTERS * _whole(review)


def _coil_row(row: InductorFacts, review: Review) -> Row:
    """Write an inductor's L/R in the columns of R·C: its henry stands where a capacitance would."""
    return Row(
        (
            retitled(row.title, review.parts),
            number(row.resistance_hand_ohm, "Ω") + (SOLVED if row.source == "solved" else ""),
            number(row.henry, "H"),
            number(row.time_constant_s, "s"),
            number(row.time_constant_exact_s, "s"),
            "",
        )
    )


def _coil_working(row: InductorFacts, review: Review) -> Prose:
    quotient = f"L/R {number(row.time_constant_s, 's')} by hand, {number(row.time_constant_exact_s, 's')} exact"
    return Prose(retitled(f"{row.title}: {row.text}; {quotient}", review.parts), lead="  ", hang=2)


def _mark(node: NodeRow) -> str:
    """Mark a resistance that paper alone does not give."""
    source = node.working.source if node.working else "rule"
    return {"solved": SOLVED, "loop": LOOP, "branch": LOOP}.get(source, "")


def _term_rows(node: NodeRow, working: Working, titles: Mapping[str, str], *, least: float) -> list[Row]:
    """One row per capacitance that adds at least `least` seconds; what the others add, in one more."""
    ordered = sorted(working.capacitances, key=lambda term: -abs(_seconds(term, node)))
    shown = [term for term in ordered if abs(_seconds(term, node)) >= least][:_TERMS]
    rows = [
        Row(
            (
                f"  {titles.get(term.part, term.part)}{_times(term)}",
                _own_resistance(term, node),
                number(term.farad * term.factor, "F"),
                number(_seconds(term, node), "s"),
                "",
                "",
            )
        )
        for term in shown
    ]
    rest = (node.time_constant_s or 0.0) - sum(_seconds(term, node) for term in shown)
    if shown and abs(rest) >= max(least, _MATTERS * abs(node.time_constant_s or 0.0)):
        others = _count(len(ordered) - len(shown), "smaller one")
        rows.append(Row((f"  {others}", "", "", number(rest, "s"), "", "")))
    return rows


def _seconds(term: CapacitanceTerm, node: NodeRow) -> float:
    """Give what one capacitance adds to its row, with the resistance that it faces itself."""
    if term.time_constant_s is not None:
        return term.time_constant_s
    return (node.resistance_hand_ohm or 0.0) * term.farad * term.factor


def _own_resistance(term: CapacitanceTerm, node: NodeRow) -> str:
    """Show the resistance that one capacitance faces where it is another than the row's: R·C then multiply in its line.

    What hangs on the outer node faces less than what lies inside, behind a series resistance of the device.
    """
    farad = term.farad * term.factor
    if term.time_constant_s is None or not farad or not node.resistance_hand_ohm:
        return ""
    ohm = term.time_constant_s / farad
    return "" if abs(ohm / node.resistance_hand_ohm - 1.0) <= _SAME_OHM else number(ohm, "Ω")


def _times(term: CapacitanceTerm) -> str:
    """Show the Miller factor where it is one: " 2.16 pF × 180.1"."""
    solved = SOLVED if term.gain_source == "solved" else ""
    return "" if abs(term.factor - 1.0) < 5e-4 else f" {number(term.farad, 'F', 3)} × {term.factor:.4g}{solved}"


def _sums(budget: UpperBudget, *, halves: bool, delay: str) -> str:
    path = "" if budget.path_sum_s is None else f"Σ R·C {number(budget.path_sum_s, 's')}; "
    weighted = _pair("weighted", budget.weighted_sum_s, delay, budget.group_delay_s)
    whose = "both halves" if halves else "all parts"
    return f"{path}{weighted}; {_pair(whose, budget.sum_s, '-Σ 1/p', budget.inverse_pole_sum_s)}"


def _pair(name: str, value: float, check: str, other: float) -> str:
    """Write two numbers that must be equal as one where they are, to the digits that are printed."""
    if number(value, "s") == number(other, "s"):
        return f"{name} {number(value, 's')} = {check}"
    return f"{name} {number(value, 's')}, {check} {number(other, 's')}"


def _alike(ordered: list[tuple[PartRow, float]]) -> list[list[tuple[PartRow, float]]]:
    """Put parts together that are the same in all that a row says, as those of two halves are; order kept."""
    groups: list[list[tuple[PartRow, float]]] = []
    for part, value in ordered:
        mine = (part.value, value, part.ten_percent_less.f_high_hz or 0.0)
        for group in groups:
            first, its = group[0]
            theirs = (first.value, its, first.ten_percent_less.f_high_hz or 0.0)
            same = first.kind == part.kind and first.name.removeprefix(first.owner) == part.name.removeprefix(
                part.owner
            )
            if same and all(math.isclose(a, b, rel_tol=_EQUAL) for a, b in zip(mine, theirs, strict=True)):
                group.append((part, value))
                break
        else:
            groups.append([(part, value)])
    return groups


def _share_row(alike: list[tuple[PartRow, float]], titles: Mapping[str, str], f_high: float | None) -> Row:
    part, value = alike[0]
    less = part.ten_percent_less.f_high_hz
    change = f" ({move(less / f_high - 1.0)})" if less is not None and f_high else ""
    return Row((_each(alike, titles), amount(part), share(value), number(less, "Hz") + change))


def _each(alike: list[tuple[PartRow, float]], titles: Mapping[str, str]) -> str:
    """Name one part, or "each of CLP, CLN", "C_μ of each of QP, QN"."""
    names = [titles[part.name] for part, _ in alike]
    if len(names) == 1:
        return names[0]
    label, of, _ = names[0].partition(" of ")
    owners = ", ".join(name.removeprefix(f"{label}{of}") for name in names) if of else ", ".join(names)
    return f"{label} of each of {owners}" if of else f"each of {owners}"


def _count(many: int, word: str) -> str:
    return f"{many} {word}" if many == 1 else f"{many} {word}s"
