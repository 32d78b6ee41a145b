"""The sections on what the numbers rest on: what was changed, own figures, netlist lines, proof, agreement."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.blocks import Block, Item, Items, Prose, Section
from tauledger.report.sentences import believed, note_text, plain, sentence
from tauledger.report.tables import outside, setting, way


def set_section(review: Review) -> Section:
    """Give what was changed from outside of the netlist."""
    blocks = (outside.set_values(review),) if review.settings or review.added else ()
    return Section("set", "What was changed" if review.added else "What was set", blocks)


def own_section(review: Review) -> Section:
    """Give the figures of the reader's own page."""
    if not review.paper:
        return Section("own", "", ())
    items = tuple(Item(name, sentence(plain(says, review))) for name, says in outside.verdicts(review))
    blocks: tuple[Block, ...] = (outside.own_figures(review), *((Items(items),) if items else ()))
    return Section("own", "Your own figures", blocks)


def lines_section(review: Review) -> Section:
    """Give the lines of the netlist that matter."""
    return Section("lines", "The netlist lines that matter", (setting.source_lines(review),) if review.lines else ())


def proof_section(review: Review) -> Section:
    """Give what was recomputed."""
    grids = [grid for grid in (way.reruns(review), setting.sums(review)) if grid.rows]
    return Section("proof", "What was recomputed as proof", tuple(grids))


def trust_section(review: Review) -> Section:
    """Give agreement, cautions, notes and versions."""
    blocks: list[Block] = [Prose(believed(review))]
    cautions = [Item("Caution", text) for text in review.cautions]
    notes = [Item("Note", note_text(note, review)) for note in review.notes]
    if cautions or notes:
        blocks.append(Items((*cautions, *notes)))
    blocks.append(setting.versions(review))
    return Section("trust", "Agreement, versions, cautions", tuple(blocks), ("Agreement",))
