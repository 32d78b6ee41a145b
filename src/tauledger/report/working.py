"""The working of a signal node: what is in parallel there, what each capacitance counts, hand against exact."""

from __future__ import annotations

from collections.abc import Mapping

from tauledger.record import CapacitanceTerm, NodeRow, Review, WorkingLine
from tauledger.report.layout import STRONG, Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, SOLVED, number, part_titles, retitled, share

_HOW = {
    "rule": "by rule",
    "loop": "one loop",
    "branch": "by branches, with solved ratios",
    "solved": f"solved {SOLVED}, no rule fits",
}


def find_nodes(review: Review, wanted: str) -> list[NodeRow]:
    """Give the signal nodes that a name means: a node of the netlist, upper or lower case."""
    folded = wanted.strip().lower()
    return [
        node
        for node in review.nodes
        if folded in (node.name.lower(), node.title.lower(), *(member.lower() for member in node.members))
    ]


def workings(review: Review, nodes: list[NodeRow]) -> Section:
    """Give the working of each node."""
    titles = part_titles(review.parts)
    blocks: list[Block] = []
    for node in nodes:
        blocks.extend(_node(node, review, titles))
    return Section(tuple(blocks))


def node_title(node: NodeRow) -> str:
    """Name a row: "base of Q1 (b)"; in a balanced circuit the node of either half; and whether it is off the path."""
    title = f"each of {node.name}, {node.image} (half circuit)" if node.image else node.title
    return title if node.in_path else f"{title}, off path"


def _node(node: NodeRow, review: Review, titles: Mapping[str, str]) -> list[Block]:
    if node.working is None:
        return []
    shares = f"share of f_H {share(node.share.f_high)}" if node.share.f_high is not None else "no share of f_H"
    blocks: list[Block] = [Prose(f"WORKING, {node_title(node)}: {shares}", style=STRONG)]
    if not node.working.lines:
        lines = retitled(node.working.text, review.parts).split("; ")
        blocks.extend(Prose(line, lead="    ", hang=6) for line in lines)
    for line in node.working.lines:
        blocks.extend(_line(line, node, review, titles))
    if len(node.working.lines) > 1:
        both = f"{number(node.time_constant_s, 's')} by hand, {number(node.time_constant_exact_s, 's')} exact"
        blocks.append(Prose(f"together R·C {both}", lead="  "))
    return blocks


def _line(line: WorkingLine, node: NodeRow, review: Review, titles: Mapping[str, str]) -> list[Block]:
    loop = node.working.loop_gain if node.working is not None and line is node.working.lines[0] else None
    gain = "" if loop is None else f", loop gain T = {loop:.4g}"
    hand, exact = number(line.resistance_hand_ohm, "Ω"), number(line.resistance_exact_ohm, "Ω")
    blocks: list[Block] = [Prose(f"R = {hand}, {_HOW[line.source]}{gain}; exact {exact}", lead=f"  {line.node}: ")]
    texts = retitled(line.text, review.parts).split("; ")
    gains = {retitled(term.text, review.parts) for term in line.capacitances}
    wanted = [text for text in texts if text not in gains and not any(text in gain for gain in gains)]
    blocks.extend(Prose(text, lead="    ", hang=6) for text in wanted)
    if line.capacitances:
        blocks.append(_capacitances(line, review, titles))
        for term in _with_text(line):
            blocks.append(
                Prose(retitled(term.text, review.parts), lead=f"    {titles.get(term.part, term.part)}: ", hang=6)
            )
        ends = f"R·C {number(line.time_constant_s, 's')} by hand, {number(line.time_constant_exact_s, 's')} exact"
        why = f"; {retitled(line.why, review.parts)}" if line.why else ""
        blocks.append(Prose(ends + why, lead="    ", hang=6))
    return blocks


def _capacitances(line: WorkingLine, review: Review, titles: Mapping[str, str]) -> Table:
    edge = review.f_high.exact_hz if review.f_high else None
    rows = tuple(
        Row(
            (
                titles.get(term.part, term.part),
                number(term.farad, "F", 3),
                f"{term.factor:.4g}",
                _complex(term),
                number(term.farad * term.factor, "F"),
                number(term.time_constant_s, "s"),
            )
        )
        for term in line.capacitances
    )
    at_edge = f"× at {number(edge, 'Hz', 3)}" if edge is not None else "× at f_H"
    return Table("lrrrrr", ("    capacitance", "C", "× mid-band", at_edge, "counts", "R·C"), rows, indent=4)


def _complex(term: CapacitanceTerm) -> str:
    """Write the factor at the edge as real and imaginary part; a dash where there is none."""
    if term.edge_factor_real is None or term.edge_factor_imag is None:
        return NO_NUMBER if term.factor != 1.0 else "1"
    sign = "+" if term.edge_factor_imag >= 0.0 else "−"
    return f"{term.edge_factor_real:.3g} {sign} j{abs(term.edge_factor_imag):.3g}"


def _with_text(line: WorkingLine) -> list[CapacitanceTerm]:
    """Give the first term of each different line for K."""
    return list({term.text: term for term in reversed(line.capacitances) if term.text}.values())[::-1]
