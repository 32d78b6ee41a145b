"""What a reviewer with two minutes reads: one headline, four figures, four questions with their answers."""

from __future__ import annotations

import math
import re

from msgspec import Struct

from tauledger.record import CauseFacts, EdgeFacts, Help, NodeRow, NoteFacts, PartRow, PoleFacts, Review
from tauledger.report.lower import ends, in_parallel
from tauledger.report.tables.helps import change, kind
from tauledger.report.tables.setting import output_text
from tauledger.report.tables.upper import counting_nodes, places, term_seconds, whole_s
from tauledger.report.tables.way import method_title
from tauledger.report.unity import decibels, degrees, margins, signed
from tauledger.report.wording import (
    AGREEMENT_WARNS,
    EDGE,
    amount,
    fraction,
    move,
    network_rejected,
    nominal,
    number,
    part_title,
    part_titles,
    part_unit,
    retitled,
    share,
    symbol,
    withheld,
)

# Effects on an edge below one, and on the gain below the other, are no help and no cost.
WORTH_TELLING, UNSEEN = 0.005, 5e-4
# A part with less than a fifth of the edge does not own it.
OWNS = 0.2
_DECIBEL = {"V/V": "dB", "A/A": "dB", "ohm": "dBΩ", "Ω": "dBΩ", "S": "dBS"}
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_INNER = re.compile(r"\b[cC]_(?:pi|mu)\b")
ESTIMATE = "All of it rests on the models in the netlist: an estimate, which does not replace measuring the board."


class KeyFigure(Struct, frozen=True):
    """One of the four figures: what it is, its value, and what belongs beside it."""

    label: str
    value: str
    beside: str


class Answer(Struct, frozen=True):
    """One question of a reviewer and its answer."""

    question: str
    answer: str


def headline(review: Review) -> str:
    """Say gain and band, and which node limits them, in one or two sentences."""
    midband = review.midband
    gain = f"{midband.gain_db:.1f} {_DECIBEL.get(midband.unit, 'dB')}"
    low, high = _hz(review.f_low), _hz(review.f_high)
    if high is not None:
        start = "DC" if low is None and midband.from_hz == 0.0 else number(low, "Hz", 3)
        band = (
            f"from {start} to {number(high, 'Hz', 3)}"
            if low is not None or start == "DC"
            else f"up to {number(high, 'Hz', 3)}"
        )
    elif low is not None:
        band = f"from {number(low, 'Hz', 3)} upwards"
    else:
        band = "without band edges in the range looked at"
    said = f"{gain} {band}"
    line = _line_at_the_edge(review)
    if line is not None:
        return f"{said}; above all {part_title(line.name, line.owner)} sets the upper edge."
    node = limiting_node(review)
    if node is None:
        return f"{said}."
    pair = _pair_at_the_edge(review)
    parts = _largest_shares(review)
    if pair is not None:
        owners = f" of {', '.join(parts)}" if parts else ""
        quality = f", Q {pair.q:.2g}" if pair.q is not None else ""
        return f"{said}; a complex pair at {number(pair.f0_hz, 'Hz', 3)}{quality}{owners} sets the upper edge."
    through = f", above all through {parts[0]}" if parts else ""
    return f"{said}; the upper edge is set at {_at(node)}{through}."


def key_figures(review: Review) -> tuple[KeyFigure, ...]:
    """Give gain, both edges and the agreement."""
    midband = review.midband
    gain = complex(midband.gain_real, midband.gain_imag)
    size = gain.real if abs(gain.imag) <= 1e-2 * abs(gain.real) else abs(gain)
    at = "DC" if midband.frequency_hz == 0.0 else number(midband.frequency_hz, "Hz")
    figures = [
        KeyFigure(
            "Gain at mid-band",
            f"{midband.gain_db:.2f} {_DECIBEL.get(midband.unit, 'dB')}",
            f"{number(size, midband.unit)} at {at}",
        )
    ]
    for label, edge in (("Lower edge f_L", review.f_low), ("Upper edge f_H", review.f_high)):
        if edge is None and label.startswith("Lower") and unity_shown(review):
            # the band begins at DC; how it ends for a loop is what is asked of such an amplifier
            figures.append(_unity_figure(review))
            continue
        if edge is None:
            reaches = label.startswith("Lower") and midband.from_hz == 0.0
            figures.append(KeyFigure(label, "none", "the gain holds down to DC" if reaches else "no fall of 3 dB"))
            continue
        alone = "slowest node alone" if label.startswith("Upper") else "highest edge of a capacitor alone"
        by_hand = f"by hand {number(edge.hand_hz, 'Hz')}, {alone}" if edge.hand_hz is not None else "no hand estimate"
        differs = f" ({move(edge.difference)})" if edge.hand_hz is not None and edge.difference is not None else ""
        figures.append(KeyFigure(label, number(_hz(edge), "Hz"), by_hand + differs))
    if review.agreement is None:
        figures.append(KeyFigure("Checked against ngspice", "no", "numbers of the network as given"))
    else:
        error = review.agreement.max_relative_error
        figures.append(
            KeyFigure(
                "Agreement with ngspice",
                power_of_ten(error),
                f"largest difference at {review.agreement.points} frequencies",
            )
        )
    return tuple(figures)


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
    agrees = _does_paper_agree(review)
    if agrees:
        told.append(Answer("Does paper agree?", agrees))
    helps = _what_helps(review)
    if helps:
        told.append(Answer("What would help most?", helps))
    told.append(Answer("Can it be believed?", believed(review)))
    return tuple(told)


def unity_shown(review: Review) -> bool:
    """Whether the report has a section on unity gain."""
    return review.f_unity is not None and bool(review.f_unity.elements)


def _unity_figure(review: Review) -> KeyFigure:
    facts = review.f_unity
    assert facts is not None
    hz = facts.simulated_hz if facts.simulated_hz is not None else facts.exact_hz
    margin, gain_margin = margins(facts)
    beside = f"phase margin {degrees(margin)}"
    if gain_margin is not None:
        beside += f", gain margin {decibels(gain_margin)}"
    return KeyFigure("Unity gain f_u", number(hz, "Hz"), beside)


def _is_it_stable(review: Review) -> str:
    """Say what is left of the phase, and what moves that most."""
    facts = review.f_unity
    assert facts is not None
    margin, gain_margin = margins(facts)
    hz = facts.simulated_hz if facts.simulated_hz is not None else facts.exact_hz
    said = f"{degrees(margin)} of phase are left at {number(hz, 'Hz')}"
    if gain_margin is not None:
        said += f"; where all of it is used up the gain is {decibels(gain_margin)} below 1"
    if margin is not None and margin <= 0.0:
        said = f"No: the phase is {degrees(-margin)} beyond half a turn at {number(hz, 'Hz')}"
    cards = [one for one in facts.elements if one.free]
    if cards:
        most = max(cards, key=lambda one: abs(one.phase_margin_deg))
        of = part_title(most.name, most.owner)
        change = signed(-10.0 * most.phase_margin_deg, "°")
        said += f"; 10 % less of {of} changes the margin by {change} and f_u by {move(0.1 * most.f_unity)}"
    return f"{said}."


def drive_sentence(review: Review) -> str:
    """Say what drives, through what, where the output is taken and what loads it."""
    drives = []
    for drive in review.drive:
        through = f" through {nominal(drive.resistance_ohm, 'Ω')}" if drive.resistance_ohm is not None else ""
        drives.append(f"{drive.source}{through}")
    loads = review.output.load
    load = " ‖ ".join(f"{part.name} {nominal(part.value, part_unit(part.kind))}" for part in loads)
    loaded = f", loaded with {load}" if load else ", without a load to ground"
    return f"Driven by {' and '.join(drives) or 'nothing'}; output {output_text(review.output)}{loaded}."


def limiting_node(review: Review) -> NodeRow | None:
    """Give the counting node with the largest share of f_H; of equal ones the largest time constant.

    The largest time constant alone does not say it: where poles pull each other, a node may even speed the edge up.
    """
    nodes = counting_nodes(review)
    return max(nodes, key=lambda node: round(node.share.f_high or 0.0, 3), default=None)


def cause_text(cause: CauseFacts, review: Review) -> str:
    """Write a cause as sentences: what makes hand and simulation differ, and what to do instead."""
    instead = f" {sentence(cause.instead)}" if cause.instead else ""
    return plain(sentence(cause.says) + instead, review)


def note_text(note: NoteFacts, review: Review) -> str:
    """Write a note, its place before it unless the sentence names it."""
    placed = f"{note.where}: {note.says}" if note.where and note.where not in note.says else note.says
    return plain(sentence(placed), review)


def plain(text: str, review: Review) -> str:
    """Write the names of a device's own capacitances as the trade does."""
    return _INNER.sub(lambda found: symbol(found.group()), retitled(text, review.parts))


def sentence(text: str) -> str:
    """Open with a capital unless the first word is a name or a symbol, close with a full stop."""
    start = text[:1].upper() if text[1:2].islower() else text[:1]
    return start + text[1:] + ("" if text.endswith((".", "!", "?")) else ".")


def power_of_ten(value: float) -> str:
    """Write a small number as 1.2·10⁻¹⁰."""
    if not math.isfinite(value) or value == 0.0:
        return f"{value:g}"
    mantissa, exponent = f"{value:.1e}".split("e")
    return f"{mantissa}·10{str(int(exponent)).translate(_RAISED)}"


def believed(review: Review) -> str:
    """Say how well the rebuilt network and ngspice agree, and that this is an estimate."""
    facts = review.agreement
    if facts is None or review.engine is None:
        return f"No simulation was run: all numbers come from the network as given. {ESTIMATE}"
    engine = f"{review.engine.name} {review.engine.version}"
    error = f"{power_of_ten(facts.max_relative_error)} at {facts.points} frequencies"
    if network_rejected(review):
        return f"No. The rebuilt network differs from the sweep of {engine} by {error}; only the sweep counts here."
    if facts.max_relative_error > AGREEMENT_WARNS:
        return f"With care. The rebuilt network differs from the sweep of {engine} by {error}. {ESTIMATE}"
    return (
        f"The network rebuilt from the operating point agrees with the sweep of {engine} to {error}, so the exact "
        f"numbers are those of the simulation. {ESTIMATE}"
    )


def _line_at_the_edge(review: Review) -> PartRow | None:
    """Give the line that has the largest share of f_H, if that is a line; no node and no pole stands for it."""
    shared = [part for part in review.parts if part.share.f_high is not None]
    largest = max(shared, key=lambda part: abs(part.share.f_high or 0.0), default=None)
    return largest if largest is not None and largest.kind == "line" else None


def _what_limits(review: Review) -> str:
    line = _line_at_the_edge(review)
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

    told = []
    for which, said in (("free", "leaves the bias alone"), ("bias", "moves the bias too"), ("device", "in a device")):
        best = max(
            (one for one in review.helps if kind(one) == which and one.f_high),
            key=effect_of,
            default=None,
        )
        if best is None or effect_of(best) < WORTH_TELLING:
            continue
        rerun = change(best.f_high_rerun_hz, exact)
        effect, gain = (best.f_high, best.gain) if rerun is None else (rerun, best.gain_rerun)
        how = "to first order" if rerun is None else f"to {number(best.f_high_rerun_hz, 'Hz')}, recomputed"
        cost = f"gain {move(gain)}" if abs(gain or 0.0) >= UNSEEN else "gain unchanged"
        told.append(f"{part_title(best.name, best.owner)} {move(effect)} ({how}; {cost}; {said})")
    return f"10 % less of one element raises f_H: {', '.join(told)}." if told else ""


def _largest_shares(review: Review) -> list[str]:
    """Name the parts with the largest shares of f_H, at most three, each with at least a fifth."""
    shares = [(part.share.f_high, part.name) for part in review.parts if part.share.f_high is not None]
    titles = part_titles(review.parts)
    ordered = sorted(shares, key=lambda entry: -entry[0])[:3]
    return [titles.get(name, name) for share, name in ordered if share >= OWNS or name == ordered[0][1]]


def _pair_at_the_edge(review: Review) -> PoleFacts | None:
    """Give the complex pair that makes f_H: the visible pole nearest to it, with a Q above ½."""
    high = _hz(review.f_high)
    if high is None:
        return None
    visible = [pole for pole in review.poles if not pole.cancelled and (pole.real_hz or pole.imag_hz)]
    nearest = min(visible, key=lambda pole: abs(math.log(math.hypot(pole.real_hz, pole.imag_hz) / high)), default=None)
    return nearest if nearest is not None and nearest.imag_hz and nearest.f0_hz else None


def _at(node: NodeRow) -> str:
    """Name a node first and then what it is: "c1, the collector of Q1 and base of Q2"."""
    what = node.title.removesuffix(f" ({node.name})")
    if what == node.title:
        return node.title
    return f"{node.name}, the {' and '.join(what.split(', '))}"


def _hz(edge: EdgeFacts | None) -> float | None:
    if edge is None:
        return None
    return edge.simulated_hz if edge.simulated_hz is not None else edge.exact_hz
