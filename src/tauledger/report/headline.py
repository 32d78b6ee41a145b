"""What a reviewer reads first: one headline and four figures."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.quantity import decibel_unit
from tauledger.record import NodeRow, PartRow, PoleFacts, Review, known_hz
from tauledger.report.sentences import power_of_ten
from tauledger.report.shown import unity_shown
from tauledger.report.tables.upper import counting_nodes
from tauledger.report.unity import decibels, margins
from tauledger.report.wording import (
    degrees,
    move,
    number,
    part_title,
    part_titles,
)

# A part with less than a fifth of the edge does not own it.
OWNS = 0.2


class KeyFigure(Struct, frozen=True):
    """One of the four figures: what it is, its value, and what belongs beside it."""

    label: str
    value: str
    beside: str


def headline(review: Review) -> str:
    """Say gain and band, and which node limits them, in one or two sentences."""
    midband = review.midband
    gain = f"{midband.gain_db:.1f} {decibel_unit(midband.unit)}"
    low, high = known_hz(review.f_low), known_hz(review.f_high)
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
    line = line_at_the_edge(review)
    if line is not None:
        return f"{said}; above all {part_title(line.name, line.owner)} sets the upper edge."
    node = limiting_node(review)
    if node is None:
        return f"{said}."
    pair = _pair_at_the_edge(review)
    parts = _largest_shares(review)
    if pair is not None:
        quality = f" with Q {pair.q:.2g}" if pair.q is not None else ""
        through = f", above all through {' and '.join(parts)}" if parts else ""
        return f"{said}; the upper edge is set by a complex pair at {number(pair.f0_hz, 'Hz', 3)}{quality}{through}."
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
            f"{midband.gain_db:.2f} {decibel_unit(midband.unit)}",
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
        figures.append(KeyFigure(label, number(known_hz(edge), "Hz"), by_hand + differs))
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


def limiting_node(review: Review) -> NodeRow | None:
    """Give the counting node with the largest share of f_H; of equal ones the largest time constant.

    The largest time constant alone does not say it: where poles pull each other, a node may even speed the edge up.
    """
    nodes = counting_nodes(review)
    return max(nodes, key=lambda node: round(node.share.f_high or 0.0, 3), default=None)


def _unity_figure(review: Review) -> KeyFigure:
    facts = review.f_unity
    assert facts is not None
    hz = known_hz(facts)
    margin, gain_margin = margins(facts)
    beside = f"phase margin {degrees(margin)}"
    if gain_margin is not None:
        beside += f", gain margin {decibels(gain_margin)}"
    return KeyFigure("Unity gain f_u", number(hz, "Hz"), beside)


def _largest_shares(review: Review) -> list[str]:
    """Name the parts with the largest shares of f_H, at most three, each with at least a fifth."""
    shares = [(part.share.f_high, part.name) for part in review.parts if part.share.f_high is not None]
    titles = part_titles(review.parts)
    ordered = sorted(shares, key=lambda entry: -entry[0])[:3]
    return [titles.get(name, name) for share, name in ordered if share >= OWNS or name == ordered[0][1]]


def _pair_at_the_edge(review: Review) -> PoleFacts | None:
    """Give the complex pair that makes f_H: the visible pole nearest to it, with a Q above ½."""
    high = known_hz(review.f_high)
    if high is None:
        return None
    visible = [pole for pole in review.poles if not pole.cancelled and (pole.real_hz or pole.imag_hz)]
    nearest = min(visible, key=lambda pole: abs(math.log(math.hypot(pole.real_hz, pole.imag_hz) / high)), default=None)
    return nearest if nearest is not None and nearest.imag_hz and nearest.f0_hz else None


def line_at_the_edge(review: Review) -> PartRow | None:
    """Give the line that has the largest share of f_H, if that is a line; no node and no pole stands for it."""
    shared = [part for part in review.parts if part.share.f_high is not None]
    largest = max(shared, key=lambda part: abs(part.share.f_high or 0.0), default=None)
    return largest if largest is not None and largest.kind == "line" else None


def _at(node: NodeRow) -> str:
    """Name a node first and then what it is: "c1, the collector of Q1 and base of Q2"."""
    what = node.title.removesuffix(f" ({node.name})")
    if what == node.title:
        return node.title
    return f"{node.name}, the {' and '.join(what.split(', '))}"
