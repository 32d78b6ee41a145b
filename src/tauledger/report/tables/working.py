"""The working of one signal node for a page: what is in parallel, what each capacitance counts, hand against exact."""

from __future__ import annotations

from msgspec import Struct

from tauledger.record import CapacitanceTerm, NodeRow, Review, WorkingLine
from tauledger.report.sentences import plain, sentence
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.tables.upper import term_text
from tauledger.report.wording import NO_NUMBER, number, part_titles

HOW = {
    "rule": "by rule",
    "loop": "one loop",
    "branch": "by branches, with solved ratios",
    "solved": "solved, no rule fits",
}


class Lines(Struct, frozen=True):
    """Lines of working as they stand on paper."""

    lines: tuple[str, ...]


def working(node: NodeRow, review: Review) -> tuple[Lines | Grid, ...]:
    """Give the working of a row, each of its nodes by itself where the row has several."""
    if node.working is None:
        return ()
    if node.working.lines:
        return tuple(block for line in node.working.lines for block in _line(line, review))
    about_gain = {term.text for term in node.working.capacitances}
    lines = [line for line in node.working.text.split("; ") if line not in about_gain]
    lines.append(f"exact: {number(node.resistance_exact_ohm, 'Ω')}")
    titles = part_titles(review.parts)
    for term in node.working.capacitances:
        because = f" because {term.text}" if term.text else ""
        lines.append(f"{titles.get(term.part, term.part)}: {term_text(term)}{because}")
    return (Lines(tuple(plain(line, review) for line in lines)),)


def _line(line: WorkingLine, review: Review) -> tuple[Lines | Grid, ...]:
    titles = part_titles(review.parts)
    hand, exact = number(line.resistance_hand_ohm, "Ω"), number(line.resistance_exact_ohm, "Ω")
    about_gain = {term.text for term in line.capacitances if term.text}
    texts = [text for text in line.text.split("; ") if not any(text in told for told in about_gain)]
    for told in dict.fromkeys(term.text for term in line.capacitances if term.text):
        names = ", ".join(titles.get(term.part, term.part) for term in line.capacitances if term.text == told)
        texts.append(f"{names}: {told}")
    blocks: tuple[Lines | Grid, ...] = (Lines(tuple(plain(text, review) for text in texts)),)
    if not line.capacitances:
        return blocks
    edge = review.f_high.exact_hz if review.f_high else None
    at_edge = "× at f_H" if edge is None else f"× at {number(edge, 'Hz', 3)}"
    rows = tuple(
        GridRow(
            (
                titles.get(term.part, term.part),
                number(term.farad, "F", 3),
                f"{term.factor:.4g}",
                _at_edge(term),
                number(term.farad * term.factor, "F"),
                number(term.time_constant_s, "s"),
            ),
            part=term.part,
        )
        for term in line.capacitances
    )
    heads = columns("Capacitance", "C", "× at mid-band", at_edge, "counts", "R·C by hand")
    ends = f"R·C {number(line.time_constant_s, 's')} by hand, {number(line.time_constant_exact_s, 's')} exact."
    why = f" {sentence(line.why)}" if line.why else ""
    caption = f"{line.node}: R = {hand}, {HOW[line.source]}; exact {exact}"
    return (*blocks, Grid(caption, heads, rows, plain(ends + why, review)))


def _at_edge(term: CapacitanceTerm) -> str:
    """Write the factor at the edge as real and imaginary part."""
    if term.edge_factor_real is None or term.edge_factor_imag is None:
        return NO_NUMBER if term.factor != 1.0 else "1"
    sign = "+" if term.edge_factor_imag >= 0.0 else "−"
    return f"{term.edge_factor_real:.3g} {sign} j{abs(term.edge_factor_imag):.3g}"
