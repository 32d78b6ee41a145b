"""What a reviewer asks, with the answers: what limits, does paper agree, what would help, is it to be believed."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.record import Help, PartRow, Review, known_hz
from tauledger.report.headline import limiting_node, line_at_the_edge
from tauledger.report.lower import ends, in_parallel
from tauledger.report.marks import kind
from tauledger.report.sentences import believed, plain, sentence
from tauledger.report.shown import unity_shown
from tauledger.report.tables.roots import stable_as_drawn
from tauledger.report.tables.upper import places, term_seconds, whole_s
from tauledger.report.tables.way import method_title
from tauledger.report.unity import decibels, margins, signed
from tauledger.report.wording import (
    EDGE,
    amount,
    change,
    degrees,
    fraction,
    move,
    network_rejected,
    nominal,
    number,
    part_title,
    part_titles,
    part_unit,
    share,
    withheld,
)

# Effects on an edge below one, and on the gain below the other, are no help and no cost.
WORTH_TELLING, UNSEEN = 0.005, 5e-4
GROUPS = (
    ("free", "of those that leave the bias alone"),
    ("bias", "of those that move it"),
    ("device", "inside a device"),
)


class Answer(Struct, frozen=True):
    """One question of a reviewer and its answer."""

    question: str
    answer: str


def answers(review: Review) -> tuple[Answer, ...]:
    """Answer what a reviewer asks: what limits, does paper agree, what would help, is it to be believed."""
    told = []
    if withheld(review):
        told.append(Answer("What is missing?", withheld(review)))
    limit = _what_limits(review)
    if limit:
        told.append(Answer("What limits the bandwidth?", limit))
    lower = _what_sets_the_lower_edge(review)
    if lower:
        told.append(Answer("What sets the lower edge?", lower))
    if unity_shown(review):
        told.append(Answer("Is it stable, closed around with a gain of 1?", _is_it_stable(review)))
    told += [Answer("Is the feedback loop stable?", said) for said in _is_the_loop_stable(review)]
    agrees = _does_paper_agree(review)
    if agrees:
        told.append(Answer("Does paper agree?", agrees))
    helps = _what_helps(review)
    if helps:
        told.append(Answer("What would help most?", helps))
    told.append(Answer("Can it be believed?", believed(review)))
    return tuple(told)


def _is_it_stable(review: Review) -> str:
    """Say what is left of the phase, and what moves that most."""
    facts = review.f_unity
    assert facts is not None
    margin, gain_margin = margins(facts)
    hz = known_hz(facts)
    if facts.margin_at_hz is not None and facts.margin_at_hz != facts.exact_hz:
        hz = facts.margin_at_hz
    yes = {True: "Yes: a", False: "No, in spite of it: a", None: "A"}[facts.follower_stable]
    said = f"{yes} phase margin of {degrees(margin)} is left at {number(hz, 'Hz')}"
    if gain_margin is not None:
        said += f" and a gain margin of {decibels(gain_margin)}"
    if margin is not None and margin <= 0.0:
        said = f"No: the phase is {degrees(-margin)} beyond half a turn at {number(hz, 'Hz')}"
    if margin is None:
        return "No margin can be told: the phase at mid-band does not say which polarity the amplifier has."
    cards = [one for one in facts.elements if one.free]
    if cards:
        most = max(cards, key=lambda one: abs(one.phase_margin_deg))
        of = part_title(most.name, most.owner)
        moved = signed(-10.0 * most.phase_margin_deg, "°")
        said += f"; 10 % less of {of} changes the phase margin by {moved} and f_u by {move(0.1 * most.f_unity)}"
    return f"{said}."


def _is_the_loop_stable(review: Review) -> tuple[str, ...]:
    """Say of a feedback loop that was found whether all poles decay, and its margins; nothing without a loop."""
    facts = next((loop for loop in review.loops if loop.found), None)
    if facts is None or network_rejected(review):
        return ()
    growing = next((pole for pole in review.poles if pole.real_hz > 0.0), None)
    if growing is not None:
        size = math.hypot(growing.real_hz, growing.imag_hz)
        return (f"No: a pole at {number(size, 'Hz')} lies in the right half-plane and grows.",)
    margin, hz = facts.phase_margin_simulated_deg, facts.crossover_simulated_hz
    if margin is None or hz is None:
        margin, hz = facts.phase_margin_deg, facts.crossover_hz
    if margin is None:
        return ()
    said = f"phase margin {degrees(margin)} at {number(hz, 'Hz')}, where |T| = 1"
    simulated = facts.gain_margin_simulated_db
    gain_margin = facts.gain_margin_db if simulated is None else simulated
    if gain_margin is not None:
        said += f"; gain margin {gain_margin:.1f} dB at {number(facts.gain_margin_at_hz, 'Hz')}"
    if stable_as_drawn(review):
        return (f"Yes, all poles of the closed circuit decay: {said}.",)
    return (f"{said[:1].upper()}{said[1:]}.",)


def _what_limits(review: Review) -> str:
    line = line_at_the_edge(review)
    if line is not None:
        nodes = f"{line.nodes[0]} to {line.nodes[2]}"
        return (
            f"The line {line.owner} from {nodes}, {amount(line)}: {part_title(line.name, line.owner)} has a share of "
            f"{share(line.share.f_high)}. No node's time constant holds it."
        )
    node = limiting_node(review)
    if node is None:
        return ""
    whole = whole_s(review)
    part = (node.time_constant_s or 0.0) / whole if whole else math.nan
    where = places(node)
    inner = f" at the {where[0].node} the device," if where and where[0].node != node.name else ""
    outer = next((line for line in where[1:] if line.node == node.name), None)
    if inner and outer is not None:
        inner += f" and {number(outer.resistance_hand_ohm, 'Ω')} at {node.name} itself"
    text = (
        f"{sentence(node.title)[:-1]}: R {number(node.resistance_hand_ohm, 'Ω')} by hand "
        f"({number(node.resistance_exact_ohm, 'Ω')} exact){inner}, C {number(node.capacitance_f, 'F')}, "
        f"R·C {number(node.time_constant_s, 's')}, which is {_of_the_sum(part, whole)}."
    )
    terms = node.working.capacitances if node.working else ()
    largest = max(terms, key=lambda term: term_seconds(term, node), default=None)
    if largest is not None:
        title = part_titles(review.parts).get(largest.part, largest.part)
        size = number(largest.farad, "F", 3)
        times = "" if abs(largest.factor - 1.0) < 0.05 else f", which counts {largest.factor:.4g} times there"
        text += f" The largest piece of it is {title}, {size}{times}."
    return text


def _of_the_sum(part: float, whole: float) -> str:
    """Say how much of the sum a node takes; where others are negative it may be more than all of it."""
    if part <= 1.0:
        return f"{fraction(part)} of the sum over all nodes"
    return f"more than the sum over all nodes, {number(whole, 's')}, from which negative ones take away"


def _what_sets_the_lower_edge(review: Review) -> str:
    if review.f_low is None or not review.f_low.exact_hz:
        return ""
    groups = in_parallel([part for part in review.parts if part.share.f_low is not None and part.edge_hz is not None])
    if not groups:
        return ""

    def taken(group: list[PartRow]) -> float:
        return math.fsum(part.share.f_low or 0.0 for part in group)

    group = max(groups, key=taken)
    part = group[0]
    names = " ‖ ".join(part_title(one.name, one.owner) for one in group)
    value = nominal(math.fsum(one.value for one in group), part_unit(part.kind))
    ohm = part.resistance_exact_ohm if part.resistance_hand_ohm is None else part.resistance_hand_ohm
    zero = "" if not part.zero_hz else f", with a zero at {number(part.zero_hz, 'Hz')}"
    text = (
        f"{names}, {value}{ends(part, ' from ')}, has a share of {fraction(taken(group))}: with R {number(ohm, 'Ω')} "
        f"its edge alone is {number(part.edge_hz, 'Hz')}{zero}."
    )
    best = next((e for e in review.estimates if e.edge == "f_low" and e.recommended), None)
    if best is not None and best.hz is not None and best.difference is not None:
        gives = f"{number(best.hz, 'Hz')}, {move(best.difference)}"
        text += f" The method to use here, {method_title(best.method, best.edge)}, gives {gives}."
    return text


def _does_paper_agree(review: Review) -> str:
    if review.f_high is None or review.f_high.hand_hz is None:
        return ""
    against = "simulation" if review.f_high.simulated_hz is not None else "exact value"
    alone = f"{number(review.f_high.hand_hz, 'Hz')}, {move(review.f_high.difference)} against the {against}"
    text = f"By hand, the slowest node alone gives {alone}"
    summed = next((e for e in review.estimates if e.edge == "f_high" and e.method == "sum of time constants"), None)
    if summed is not None and summed.hz is not None and summed.difference is not None:
        text += f"; the sum of the exact time constants gives {number(summed.hz, 'Hz')}, {move(summed.difference)}"
    best = next((e for e in review.estimates if e.edge == "f_high" and e.recommended), None)
    if best is not None and best.method != "sum of time constants" and best.difference is not None:
        text += f"; the method to use here, {method_title(best.method, best.edge)}, {move(best.difference)}"
    text += "."
    for loop in review.loops:
        if loop.found:
            from tauledger.report.tables.loop import around_the_loop

            text = f"{around_the_loop(loop)} {text}".lstrip()
    differ = (cause for cause in review.causes if not cause.on_paper)
    cause = next((cause for cause in differ if EDGE.get(cause.quantity, cause.quantity) == "f_H"), None)
    if cause is not None:
        text += f" Largest cause ({move(cause.effect)}): {plain(cause.says, review)}."
    return text


def _what_helps(review: Review) -> str:
    exact = review.f_high.exact_hz if review.f_high else None
    if not exact:
        return ""
    if review.helps:
        return _what_helps_most(review, exact)
    titles = part_titles(review.parts)

    def gain(part: PartRow) -> float:
        less = part.ten_percent_less.f_high_hz
        return less / exact - 1.0 if less is not None else -math.inf

    ordered = sorted(review.parts, key=lambda part: -gain(part))
    best = next(iter(ordered), None)
    if best is None or gain(best) <= 0.0:
        return ""
    text = (
        f"10 % less {titles[best.name]} raises f_H by {fraction(gain(best))} to "
        f"{number(best.ten_percent_less.f_high_hz, 'Hz')} (recomputed)."
    )
    card = next((part for part in ordered if part.owner == part.name), None)
    if card is not None and card is not best and gain(card) > 0.0:
        text += f" Of the parts on the board it is {titles[card.name]}: {move(gain(card))}."
    return text


def _what_helps_most(review: Review, exact: float) -> str:
    """Name of each kind of element the one of which 10 % less or more raises f_H most, with what it costs in gain."""

    def effect_of(one: Help) -> float:
        rerun = change(one.f_high_rerun_hz, exact)
        return (one.f_high or 0.0) if rerun is None else rerun

    def told_of(one: Help) -> str:
        rerun = change(one.f_high_rerun_hz, exact)
        effect, gain = (one.f_high, one.gain) if rerun is None else (rerun, one.gain_rerun)
        how = "to first order" if rerun is None else f"to {number(one.f_high_rerun_hz, 'Hz')}, recomputed"
        cost = f"gain {move(gain)}" if abs(gain or 0.0) >= UNSEEN else "gain unchanged"
        return f"{part_title(one.name, one.owner)} {move(effect)} ({how}; {cost})"

    told = []
    for which, said in GROUPS:
        group = [one for one in review.helps if kind(one) == which and effect_of(one) >= WORTH_TELLING]
        best = max(group, key=effect_of, default=None)
        if best is None:
            continue
        told.append(f"{said}: {told_of(best)}")
        keeps = [one for one in group if abs(one.gain or 0.0) < UNSEEN]
        if which == "free" and best not in keeps and keeps:
            told.append(f"with the gain unchanged: {told_of(max(keeps, key=effect_of))}")
    return f"f_H rises with 10 % less of one element. Best {'; '.join(told)}." if told else ""
