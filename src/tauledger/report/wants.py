"""What it takes, as text: wanted figures that are met in one line each, and what the others need."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.layout import CAUTION, HEADING, Block, Prose, Row, Section, Table
from tauledger.report.tables.wants import cells, heads, notes, verdict


def what_it_takes(review: Review) -> Section:
    """Give every wanted figure: met with what is to spare, or the changes that reach it, and those that do not."""
    blocks: list[Block] = []
    for want in review.wants:
        blocks.append(Prose(verdict(want, review), lead="WANTED  ", style=HEADING if want.met else CAUTION))
        if want.remedies:
            rows = tuple(Row(cells(want, one, review)) for one in want.remedies)
            head = ("WHAT IT TAKES", *heads(want))
            blocks.append(Table("l" + "r" * len(heads(want)), head, rows))
            blocks.append(Prose(notes(want), lead="  "))
    return Section(tuple(blocks), major=True)
