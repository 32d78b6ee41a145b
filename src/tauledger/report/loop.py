"""The feedback loop: return ratio and margins, ideal gain and closed loop, what T says of f_H, and it by hand."""

from __future__ import annotations

from tauledger.record import LoopFacts, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.tables.loop import lines, loop_rows, title

LEADS = {
    "Gain": "gain  ",
    "By hand": "hand  ",
    "Amplifier": "amp   ",
    "f_H": "f_H   ",
    "Why": "why   ",
    "Note": "note  ",
}


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
    told = [(LEADS[lead], text) for lead, texts in lines(facts) for text in texts]
    before = ""
    for lead, text in told:
        blocks.append(Prose(text, lead=f"  {lead if lead != before else ' ' * len(lead)}"))
        before = lead
    return blocks
