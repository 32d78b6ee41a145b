"""The designer's own figures beside hand and exact, and what is behind those that are off."""

from __future__ import annotations

from tauledger.record import PaperFigure, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.wording import move, number, retitled, symbol

AGREES = 0.02


def own_page(review: Review) -> Section:
    """Give each figure of the page beside hand and exact; below, a sentence for each that is off by more than 2 %."""
    if not review.paper:
        return Section(())
    rows = tuple(
        Row(
            (
                retitled(figure_title(figure), review.parts),
                number(figure.yours, figure.unit),
                number(figure.hand, figure.unit),
                number(figure.exact, figure.unit),
                move(figure.off),
            )
        )
        for figure in review.paper
    )
    blocks: list[Block] = [Table("lrrrr", ("YOUR PAGE", "yours", "hand", "exact", "off by"), rows)]
    for figure in review.paper:
        if figure.off is None or abs(figure.off) > AGREES:
            says = retitled(figure.says, review.parts)
            blocks.append(Prose(f"{retitled(figure_title(figure), review.parts)}: {says}.", lead="  ", hang=4))
    return Section(tuple(blocks), major=True)


def figure_title(figure: PaperFigure) -> str:
    """Name a figure of the page as the trade does: "C_μ of Q1"."""
    key, of, device = figure.title.partition(" of ")
    return f"{symbol(key)}{of}{device}" if figure.key == key else figure.title
