"""Unity gain: f_u and its margins from three sources, who sets them, and what a picofarad at each node costs."""

from __future__ import annotations

from tauledger.record import Review, UnityElement, UnityFacts, UnityNode
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.marks import in_short, mark
from tauledger.report.wording import NO_NUMBER, coefficients, degrees, move, number, part_title, value_of

_MOST_ELEMENTS, _MOST_NODES = 6, 4
MEANS_NOTHING = 3.0
FIRST_ORDER = "to first order, operating point held"


def unity_gain(review: Review) -> Section:
    """Give f_u, margins and gain-bandwidth product, simulated, exact and by hand, where they are what it is about."""
    facts = review.f_unity
    if facts is not None and facts.none:
        return Section((Prose(f"none: {facts.none}", lead="UNITY GAIN: "),))
    if facts is None or not facts.elements:
        return Section(())
    rows = tuple(Row(cells) for cells in figures(facts))
    blocks: list[Block] = [Table("lrrr", ("UNITY GAIN", "simulated", "exact", "by hand"), rows)]
    blocks += [Prose(remark, lead="  ") for remark in remarks(facts)]
    return Section(tuple(blocks), major=True)


def who_sets(review: Review, *, verbose: bool = False) -> Section:
    """Give what 10 % less of an element does to f_u and margin, the first two recomputed, and 1 pF at each node."""
    facts = review.f_unity
    if facts is None or not facts.elements:
        return Section(())
    shown = facts.elements if verbose else facts.elements[:_MOST_ELEMENTS]
    rows: list[Row] = []
    for one in shown:
        rows.append(Row(element_cells(one)))
        if one.f_unity_rerun_hz is not None:
            rows.append(Row(("  recomputed", *again_cells(one, facts))))
    head = ("WHO SETS f_u AND MARGIN: 10 % less of", "value", "f_u", "margin", "gain margin")
    blocks: list[Block] = [Table("lrrrr", head, tuple(rows))]
    blocks.append(Prose("; ".join((FIRST_ORDER, *in_short(shown))), lead="  "))
    nodes = facts.nodes if verbose else facts.nodes[:_MOST_NODES]
    if nodes:
        at = tuple(Row(node_cells(node, facts)) for node in nodes)
        blocks.append(Table("lrrr", ("1 pF TO GROUND AT, recomputed", "f_u", "margin", "gain margin"), at))
    return Section(tuple(blocks), major=True)


def figures(facts: UnityFacts) -> tuple[tuple[str, str, str, str], ...]:
    """Give the rows: what, simulated, exact, by hand with its difference."""
    by_hand = NO_NUMBER if facts.hand_hz is None else f"{number(facts.hand_hz, 'Hz')} ({move(facts.difference)})"
    rows = [
        ("f_u", number(facts.simulated_hz, "Hz"), number(facts.exact_hz, "Hz"), by_hand),
        ("phase margin", degrees(facts.phase_margin_deg), degrees(facts.phase_margin_exact_deg), ""),
    ]
    if facts.gain_margin_db is not None or facts.gain_margin_exact_db is not None:
        rows.append(("gain margin", decibels(facts.gain_margin_db), decibels(facts.gain_margin_exact_db), ""))
        at = (number(facts.gain_margin_at_hz, "Hz"), number(facts.gain_margin_exact_at_hz, "Hz"))
        rows.append(("  -180° reached at", *at, ""))
    product = (number(facts.gain_bandwidth_hz, "Hz"), number(facts.gain_bandwidth_exact_hz, "Hz"))
    if _of_one_pole(facts):
        rows.append(("gain · f_H", *product, ""))
    return tuple(rows)


def _of_one_pole(facts: UnityFacts) -> bool:
    """Whether gain · f_H is anywhere near f_u; with several poles or zeros in between it says nothing of it."""
    for product, hz in ((facts.gain_bandwidth_hz, facts.simulated_hz), (facts.gain_bandwidth_exact_hz, facts.exact_hz)):
        if product is not None and hz is not None:
            return 1.0 / MEANS_NOTHING < product / hz < MEANS_NOTHING
    return True


def remarks(facts: UnityFacts) -> tuple[str, ...]:
    """Say what the figures do not: how the hand figure is meant, no gain margin, instability, further crossings."""
    said = []
    if facts.hand_hz is not None and facts.hand_formula:
        said.append(f"f_u by hand: {coefficients(facts.hand_formula)}.")
    elif facts.hand_hz is not None:
        said.append("f_u by hand: mid-band gain times f_H by hand, as one pole alone has it.")
    said += _of_the_margins(facts)
    said += _closed_around(facts)
    return tuple(said)


def _of_the_margins(facts: UnityFacts) -> list[str]:
    """Say where margins are missing, and where there are several |H| = 1 or half turns."""
    if facts.exact_hz is None:
        return []
    if facts.phase_margin_exact_deg is None:
        phase = NO_NUMBER if facts.midband_phase_deg is None else f"{facts.midband_phase_deg:.0f}°"
        return [f"No margin: the phase at mid-band, {phase}, is more than 60° from 0° and 180°; polarity is not clear."]
    said = []
    if facts.further_hz:
        places = ", ".join(number(hz, "Hz") for hz in facts.further_hz)
        said.append(f"|H| is 1 again at {places}; the margin is the smallest, at {number(facts.margin_at_hz, 'Hz')}.")
    if not facts.half_turns:
        said.append("No gain margin: the phase never reaches -180° beyond mid-band.")
    if len(facts.half_turns) > 1:
        turns = ", ".join(f"{number(one.hz, 'Hz')} ({one.gain_db:+.1f} dB)" for one in facts.half_turns)
        said.append(f"The phase is -180° with |H| at {turns}.")
    return said


def _closed_around(facts: UnityFacts) -> list[str]:
    """Say whether the follower is stable, and by how much the gain may rise or fall before it is not."""
    margin, _ = margins(facts)
    if facts.follower_stable is None:
        unstable = margin is not None and margin <= 0.0
        return ["No margin is left: closed around with a gain of 1 it is unstable."] if unstable else []
    if not facts.follower_stable:
        why = "No margin is left" if margin is not None and margin <= 0.0 else "In spite of the margin at f_u"
        return [f"{why}: closed around with a gain of 1 it is unstable (poles of the follower)."]
    fall = [one.gain_db for one in facts.half_turns if one.gain_db > 0.0]
    rise = [-one.gain_db for one in facts.half_turns if one.gain_db <= 0.0]
    if not fall:
        return ["Closed around with a gain of 1 it is stable (poles of the follower)."]
    ways = [f"the gain may rise by {min(rise):.1f} dB"] if rise else []
    ways.append(f"{'' if rise else 'the gain '}may fall by {min(fall):.1f} dB")
    return [f"Closed around with a gain of 1 it is conditionally stable: {', and '.join(ways)}."]


def margins(facts: UnityFacts) -> tuple[float | None, float | None]:
    """Give phase margin in degrees and gain margin in dB: simulated, or exact where nothing was simulated."""
    if facts.simulated_hz is None:
        return facts.phase_margin_exact_deg, facts.gain_margin_exact_db
    return facts.phase_margin_deg, facts.gain_margin_db


def element_cells(one: UnityElement) -> tuple[str, str, str, str, str]:
    """Give an element with its value and what 10 % less of it does to f_u, margin and gain margin, to first order."""
    value = value_of(one.name, one.owner, one.value, one.unit)
    gain_margin = NO_NUMBER if one.gain_margin_db is None else signed(-10.0 * one.gain_margin_db, " dB")
    return (
        part_title(one.name, one.owner) + mark(one),
        value,
        move(0.1 * one.f_unity),
        signed(-10.0 * one.phase_margin_deg, "°"),
        gain_margin,
    )


def again_cells(one: UnityElement, facts: UnityFacts) -> tuple[str, str, str, str]:
    """Give the same element recomputed: no value, f_u, margin, no gain margin."""
    return "", _hz_move(one.f_unity_rerun_hz, facts), _margin_move(one.phase_margin_rerun_deg, facts), ""


def node_cells(node: UnityNode, facts: UnityFacts) -> tuple[str, str, str, str]:
    """Give a node with what 1 pF from it to ground does to f_u and both margins, recomputed."""
    left, now = node.one_picofarad_gain_margin_db, facts.gain_margin_exact_db
    return (
        node.title,
        _hz_move(node.one_picofarad_hz, facts),
        _margin_move(node.one_picofarad_margin_deg, facts),
        NO_NUMBER if now is None else "none" if left is None else signed(left - now, " dB"),
    )


def _hz_move(hz: float | None, facts: UnityFacts) -> str:
    return NO_NUMBER if hz is None or not facts.exact_hz else move(hz / facts.exact_hz - 1.0)


def _margin_move(deg: float | None, facts: UnityFacts) -> str:
    exact = facts.phase_margin_exact_deg
    return NO_NUMBER if deg is None or exact is None else signed(deg - exact, "°")


def decibels(db: float | None) -> str:
    """Write a margin in decibel, a dash where there is none."""
    return NO_NUMBER if db is None else f"{db:.2f} dB"


def signed(value: float, unit: str) -> str:
    """Write a change with its sign, to two digits below ten: "-1.9°", "+0.16 dB"."""
    decimals = 2 if abs(value) < 0.995 else 1
    text = f"{value:+.{decimals}f}"
    return f"0.00{unit}" if float(text) == 0.0 else f"{text}{unit}"
