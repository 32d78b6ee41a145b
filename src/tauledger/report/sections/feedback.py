"""The sections on unity gain and feedback: margins, who uses up the phase, what it takes, return ratios."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.blocks import Block, Item, Items, Picture, Prose, Section
from tauledger.report.tables import phase, unity, wants


def unity_section(review: Review) -> Section:
    """Give unity gain, its margins, and who sets them."""
    facts = review.f_unity
    if facts is not None and facts.none:
        return Section("unity", "Unity gain", (Prose(f"None: {facts.none}."),))
    if facts is None or not facts.elements:
        return Section("unity", "", ())
    blocks: list[Block] = [unity.unity_gain(facts), unity.who_sets(facts)]
    if facts.nodes:
        blocks.append(unity.at_nodes(facts))
    return Section("unity", "Unity gain", tuple(blocks), ("Unity gain, phase margin, gain margin", "Recomputed"))


def phase_section(review: Review) -> Section:
    """Give the degrees that each pole and zero uses up, with the formulas of paper, and f_u and margin by hand."""
    budget = review.phase_budget
    if budget is None:
        return Section("phase", "", ())
    blocks: list[Block] = [phase.phase_budget(budget)]
    if worked := tuple(Item(lead, text) for lead, text in phase.workings(review)):
        blocks.append(Items(worked))
    if budget.by_hand:
        blocks.append(phase.by_hand(budget))
    if reasons := tuple(Item(step.figure, text) for step, text in phase.step_reasons(budget)):
        blocks.append(Items(reasons))
    return Section("phase", "Phase used up at unity gain", tuple(blocks))


def wants_section(review: Review) -> Section:
    """Give what was wanted, and the changes that would meet it."""
    verdicts = (Prose(f"Wanted: {wants.verdict(want, review)}.") for want in review.wants)
    blocks: tuple[Block, ...] = (*verdicts, *wants.what_it_takes(review))
    return Section("wants", "What it takes", blocks)


def loops_section(review: Review) -> Section:
    """Give the return ratios."""
    if not review.loops:
        return Section("loop", "", ())
    from tauledger.report.tables import loop

    blocks: list[Block] = []
    for k, facts in enumerate(review.loops):
        blocks.append(loop.figures(facts))
        if k == 0:
            margin = "|T| = 1 at the dot, where the phase is above -180° by the margin."
            blocks.append(Picture("loop", f"Return ratio T, {loop.place(facts)}: {margin}"))
        told = [Item(lead, text) for lead, texts in loop.told(facts) for text in texts]
        if told:
            blocks.append(Items(tuple(told)))
        if facts.estimates:
            blocks.append(loop.estimates(facts))
    return Section("loop", "Feedback", tuple(blocks), ("Return ratio",))
