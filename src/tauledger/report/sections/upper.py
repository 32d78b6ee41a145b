"""The sections on the upper edge: budget, time constants, shares, the way from paper, causes, what would help."""

from __future__ import annotations

from collections.abc import Iterable

from tauledger.record import CauseFacts, NodeRow, Review
from tauledger.report.blocks import Block, Folded, Item, Items, Picture, Prose, Section
from tauledger.report.charts.bars import bars_text
from tauledger.report.sentences import cause_text
from tauledger.report.tables import helps, upper, way
from tauledger.report.tables.working import working
from tauledger.report.wording import EDGE, fraction, move, withheld
from tauledger.report.working import node_title

MEASURED = (
    "Each per cent says how far a cause moves the edge: a better estimate over a simpler one, or the edge with the "
    "cause over that without it. They need not add up, for causes act on each other."
)


def budget_section(review: Review) -> Section:
    """Give the time-constant budget with the working of each node, and the nodes that hardly count."""
    blocks: list[Block] = []
    if withheld(review):
        blocks.append(Prose(withheld(review)))
    nodes = upper.counting_nodes(review)
    if nodes:
        blocks.append(upper.budget(review))
        blocks.extend(
            Folded(
                f"Working, in Ω and S: {node_title(node)}, share of f_H {fraction(node.share.f_high)}",
                working(node, review),
            )
            for node in nodes
            if node.working is not None
        )
    rest = upper.smaller_nodes(review)
    if rest.rows:
        blocks.append(Folded(rest.caption, (rest,)))
    return Section(
        "budget",
        "The time-constant budget of the upper edge",
        tuple(blocks),
        ("Signal node", "R", *_inside(nodes), "Time constant", "Miller factor", "1 pF more", *_charges(review)),
    )


def _inside(nodes: Iterable[NodeRow]) -> tuple[str, ...]:
    """Give the term for rows below a node, where there are any."""
    return ("R inside a device",) if any(upper.places(node) for node in nodes) else ()


def _charges(review: Review) -> tuple[str, ...]:
    """Give the terms of a bipolar transistor's capacitances that no schematic shows."""
    said = (("c_bx", "C_bx"), ("cexbc", "dQ_be/dV_bc"))
    return tuple(term for label, term in said if any(part.name == f"{part.owner}.{label}" for part in review.parts))


def time_section(review: Review) -> Section:
    """Give the time constant of every capacitance as bars."""
    picture = Picture(
        "time",
        "R·C of every capacitance that matters, by hand above exact, under the node where it counts most. With "
        "those too small to show the bars add up to the sum of time constants." + bars_text(review),
    )
    return Section("time", "Where the time goes", (picture,) if upper.counting_nodes(review) else ())


def shares_section(review: Review) -> Section:
    """Give the shares of f_H."""
    if not upper.by_share(review):
        return Section("shares", "", ())
    picture = Picture(
        "shares",
        "Share of f_H, exact, taken at the edge itself. The order may differ from that of the time constants above, "
        "which hold at mid-band: between there and f_H the gain that multiplies a capacitance falls.",
    )
    return Section("shares", "Whose capacitance sets f_H", (picture, upper.shares(review)), ("Share", "Recomputed"))


def way_section(review: Review) -> Section:
    """Give the estimates of f_H one after the other, and the methods side by side."""
    blocks: list[Block] = []
    if way.way(review, "f_high"):
        blocks.append(Picture("way", "Estimates of f_H, each with one more thing taken into account."))
        blocks.append(way.way_table(review, "f_high"))
        methods = way.methods_table(review, "f_high")
        if methods.rows:
            blocks.append(Folded(methods.caption, (methods,)))
    title = "From paper to simulation"
    return Section(
        "way", title, tuple(blocks), ("Slowest node alone", "Sum of time constants", "Coefficients b₁, b₂", "σ")
    )


def causes_section(review: Review) -> Section:
    """Give the causes of the difference, and what paper that leaves it out would be off by."""
    if withheld(review):
        return Section("causes", "", ())
    differ = _items([cause for cause in review.causes if not cause.on_paper], review)
    kept = _items([cause for cause in review.causes if cause.on_paper], review)
    blocks: list[Block] = [Items(differ) if differ else Prose("No cause moves an edge by 2 % or more.")]
    if differ:
        blocks.insert(0, Prose(MEASURED))
    if kept:
        blocks += [
            Prose("The figures by hand here take the following into account; paper that leaves it out is off by:"),
            Items(kept),
        ]
    return Section("causes", "Why paper and simulation differ", tuple(blocks))


def _items(causes: Iterable[CauseFacts], review: Review) -> tuple[Item, ...]:
    return tuple(
        Item(f"{EDGE.get(cause.quantity, cause.quantity)} {move(cause.effect)}", cause_text(cause, review))
        for cause in causes
    )


def helps_section(review: Review) -> Section:
    """Give what 10 % less of each element does."""
    return Section("helps", "What would help", (helps.what_would_help(review),) if review.helps else ())
