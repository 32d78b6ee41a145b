"""The feedback loop: return ratio and margins, ideal gain and closed loop, what T says of f_H, and it by hand."""

from __future__ import annotations

from tauledger.record import LoopFacts, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.tables.loop import estimate_rows, loop_rows, title, told
from tauledger.report.wording import number

LEADS = {"Gain": "gain  ", "By hand": "hand  ", "Amplifier": "amp   ", "Why": "why   ", "Note": "note  "}
AFTER = ("Why", "Note")


def loops(review: Review) -> Section:
    """Give a block for every loop that was asked for or found."""
    blocks: list[Block] = []
    for facts in review.loops:
        blocks += _loop(facts)
    return Section(tuple(blocks), major=True)


def _loop(facts: LoopFacts) -> list[Block]:
    head = ("FEEDBACK LOOP" if facts.found else "RETURN RATIO", "exact", "simulated")
    rows = tuple(Row(cells) for cells in loop_rows(facts))
    blocks: list[Block] = [Table("lrr", head, rows), Prose(title(facts), lead="  ")]
    blocks += _sentences(facts, after=False)
    if facts.estimates:
        edge = facts.open_edge_hz
        whose = "" if edge is None else f", whose T has its edge at {number(edge, 'Hz')}"
        head = (f"  f_H from the loop{whose}", "f_H", "")
        blocks.append(Table("lrr", head, tuple(Row(cells) for cells in estimate_rows(facts))))
    blocks += _sentences(facts, after=True)
    return blocks


def _sentences(facts: LoopFacts, *, after: bool) -> list[Block]:
    """Give the sentences that stand before the estimates of f_H, or after them."""
    blocks: list[Block] = []
    for lead, texts in told(facts):
        if (lead in AFTER) != after:
            continue
        for k, text in enumerate(texts):
            blocks.append(Prose(text, lead=f"  {LEADS[lead] if k == 0 else ' ' * len(LEADS[lead])}"))
    return blocks
