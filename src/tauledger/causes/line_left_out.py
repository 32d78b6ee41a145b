"""Lines: paper takes them as they are at DC, the edge has their delay, reflections and capacitance in it."""

from __future__ import annotations

import math
from collections.abc import Sequence

from tauledger.causes.cause import Cause, Note
from tauledger.causes.evidence import EdgeEvidence, Evidence, in_hertz
from tauledger.causes.evidence import in_words as part_in_words
from tauledger.devices.parts import Part
from tauledger.network.lines import series_and_shunt
from tauledger.quantity import engineering, percent
from tauledger.record import NamedNumber

# 10 % less moves an edge with a share of 1 by 10.5 %; what is off by half of that has moved to another dip.
JUMPS = 0.05


def line_left_out_above(evidence: Evidence) -> Cause | None:
    """Lines move f_H. Effect: f_H ÷ f_H with every line as it is at DC; −1 where there is none then."""
    return _left_out(evidence, evidence.upper)


def line_left_out_below(evidence: Evidence) -> Cause | None:
    """Lines move f_L. Effect: f_L ÷ f_L with every line as it is at DC."""
    return _left_out(evidence, evidence.lower)


def lines_as_at_dc(evidence: Evidence) -> Note | None:
    """Lines, of which poles, zeros, budget and the hand side see only what they are at DC."""
    if not evidence.lines:
        return None
    one, wires = len(evidence.lines) == 1, all(line.series_ohm == 0.0 for line in evidence.lines)
    what = ("a wire" if one else "wires") if wires else "what resistance it has" if one else "what resistance they have"
    return Note(
        "lines",
        ", ".join(line.owner for line in evidence.lines),
        f"{in_words(evidence.lines)}: response, band edges and shares are exact; poles, zeros, time constants and "
        f"figures by hand leave out "
        f"{'its delay and take it' if one else 'their delays and take them'} as at DC, {what}",
    )


def ripple_followed_so_far(evidence: Evidence) -> Note | None:
    """The ripple of long lines is not followed as far as f_H."""
    limit, hz = evidence.followed_to_hz, evidence.upper.hz
    if limit is None or (hz is not None and hz <= limit):
        return None
    return Note(
        "ripple-followed",
        ", ".join(line.owner for line in evidence.lines),
        f"the ripple that lines make is followed up to {in_hertz(limit)}; beyond, |H| may fall below -3 dB between two "
        "frequencies looked at",
    )


def another_dip(evidence: Evidence) -> Note | None:
    """A part of which 10 % less moves f_H to another dip of a line's ripple, so that its share says little of that."""
    edge, parts = evidence.upper, {part.name: part for part in (*evidence.bands.network.parts, *evidence.lines)}
    if edge.hz is None:
        return None
    jumps = []
    for name, share in edge.shares.items():
        less = evidence.ten_percent_less.get(name)
        if less is not None and abs(math.log(less / edge.hz) + share * math.log(0.9)) > JUMPS:
            jumps.append((abs(share), name, less))
    if not jumps:
        return None
    _, name, less = max(jumps)
    moved, of_share = percent(less / edge.hz - 1.0), percent(edge.shares[name]).removeprefix("+")
    return Note(
        "another-dip",
        "f_H",
        f"f_H is one of several dips of a ripple: 10 % less of {part_in_words(parts[name])} moves it to another, by "
        f"{moved}, where its share, {of_share}, says what a small change does",
    )


def in_words(lines: Sequence[Part]) -> str:
    """Say which are lines, and what: "T1, O1 are lines (75 Ω, 50 ns; 1 kΩ and 1 nF)"."""
    names, told = ", ".join(line.owner for line in lines), "; ".join(_what(line) for line in lines)
    return f"{names} {'is a line' if len(lines) == 1 else 'are lines'} ({told})"


def _what(line: Part) -> str:
    ohm, _, farad = series_and_shunt(line)
    if not line.surge_ohm:
        return f"{_short(ohm, 'Ω')} and {_short(farad, 'F')}"
    along = f", {_short(ohm, 'Ω')} along it" if ohm else ""
    return f"{_short(line.surge_ohm, 'Ω')}, {_short(line.value, 's')}{along}"


def _left_out(evidence: Evidence, edge: EdgeEvidence) -> Cause | None:
    if not evidence.lines or edge.hz is None or (edge.at_rest_hz is None and edge.edge == "f_low"):
        return None
    rest = edge.at_rest_hz
    at_rest = f"{edge.quantity} would be {in_hertz(rest)}" if rest is not None else f"there would be no {edge.quantity}"
    of_all = [series_and_shunt(line) for line in evidence.lines]
    farad, henry = sum(c for _, _, c in of_all), sum(h for _, h, _ in of_all)
    names = ", ".join(line.owner for line in evidence.lines)
    instead = f"put {_short(farad, 'F')} into the circuit, half of it at either end"
    if henry:
        lumped = f"{_short(farad, 'F')} across and {_short(henry, 'H')} along"
        instead = (
            f"end a line with its own resistance, or where it is short against the wavelength put {lumped} into the "
            "circuit"
        )
    return Cause(
        cause="line-left-out",
        quantity=edge.quantity,
        effect=edge.hz / (math.inf if rest is None else rest) - 1.0,
        where=names,
        says=f"{in_words(evidence.lines)}: taken as at DC, as on paper, {at_rest}; it is {in_hertz(edge.hz)}",
        instead=instead,
        numbers=(
            *([] if rest is None else [NamedNumber(f"{edge.quantity} with lines as at DC", rest, "Hz")]),
            NamedNumber("C of all lines", farad, "F"),
            NamedNumber("L of all lines", henry, "H"),
        ),
    )


def _short(value: float, unit: str) -> str:
    return engineering(value, unit, 3, zeros=False)
