"""What it takes to reach a wanted figure: each change, its value, what comes of it exactly and by ngspice."""

from __future__ import annotations

from tauledger.quantity import decibel_unit
from tauledger.record import Remedy, Review, WantChange, WantFacts
from tauledger.report.marks import BIAS
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import NO_NUMBER, degrees, nominal, number, part_title

NAMES = {"margin": "phase margin", "gain_margin": "gain margin", "f_u": "f_u", "f_h": "f_H", "f_l": "f_L"}
SEEN_DB = 0.1
# What is shown beside the wanted figure, and the head over that itself.
BESIDE = {
    "margin": ("f_u", "gain"),
    "gain_margin": ("f_u", "gain"),
    "f_u": ("margin", "gain"),
    "f_h": ("gain",),
    "f_l": ("gain",),
}
OWN = {"margin": "margin", "gain_margin": "gain margin", "f_u": "f_u", "f_h": "f_H", "f_l": "f_L"}
Cells = tuple[str, ...]


def figure(want: WantFacts, value: float | None) -> str:
    """Write a value of the wanted figure: "60.0°", "12.0 dB", "1.000 MHz"."""
    if value is None:
        return NO_NUMBER
    if want.unit == "°":
        return degrees(value)
    return f"{value:.1f} dB" if want.unit == "dB" else number(value, want.unit, 4)


def wanted(want: WantFacts) -> str:
    """Say what is wanted, as the reader gave it: "phase margin 60°"."""
    if want.unit == "Hz":
        return f"{NAMES[want.quantity]} {nominal(want.wanted, 'Hz')}"
    return f"{NAMES[want.quantity]} {want.wanted:.4g}{'°' if want.unit == '°' else ' dB'}"


# Of an amplifier that a loop closes already these are not the margins of that loop.
CLOSED_ONCE_MORE = ("margin", "gain_margin")


def verdict(want: WantFacts, review: Review) -> str:
    """Say in a line whether the figure is met, and with how much to spare, or by how much it is missed."""
    own = next((loop.phase_margin_deg for loop in review.loops if loop.found), None)
    if want.quantity not in CLOSED_ONCE_MORE or own is None:
        return _verdict(want)
    closed = f"as if the amplifier were closed once more with a gain of 1; its own loop has {degrees(own)}"
    return f"{_verdict(want)} ({closed})"


def _verdict(want: WantFacts) -> str:
    if want.now is None and not want.met:
        return f"{wanted(want)}: {want.says}"
    if want.now is None:
        return f"{wanted(want)}: met, the response has no end there"
    bound = "at most" if want.quantity == "f_l" else "at least"
    now = f"{wanted(want)} {bound}: now {figure(want, want.now)}"
    if want.met:
        return f"{now}, met with {figure(want, want.slack)} to spare"
    return f"{now}, missed by {figure(want, abs(want.slack or 0.0))}{f'; {want.says}' if want.says else ''}"


def heads(want: WantFacts) -> Cells:
    """Give the heads of the columns behind the change."""
    return ("value", "by slope", OWN[want.quantity], "ngspice", *BESIDE[want.quantity])


def cells(want: WantFacts, one: Remedy, review: Review) -> Cells:
    """Give the cells of one remedy: the change, its value, what the slope alone says, what comes of it."""
    value = next((change for change in one.changes if not _put_in(change)), None)
    beside = {
        "f_u": number(one.f_unity_hz, "Hz", 4),
        "margin": degrees(one.phase_margin_deg),
        "gain": f"{one.gain_db:.2f} {decibel_unit(review.midband.unit)}",
    }
    others = (beside[head] for head in BESIDE[want.quantity])
    by_slope = "" if value is None or value.first_order is None else number(value.first_order, value.unit, 4)
    return (
        change_text(one),
        "" if value is None else number(value.value, value.unit, 4),
        by_slope,
        figure(want, one.figure),
        figure(want, one.simulated_figure),
        *others,
    )


def _over_gm(change: WantChange) -> str:
    """Write a resistor as a part of 1/gm: "1/gm", "2.3/gm"."""
    over = 1.0 if change.over_gm is None else change.over_gm
    return f"{over:.3g}/gm"


def change_text(one: Remedy) -> str:
    """Name a change: "824 Ω (1/gm) in series with CC, and CC"; marks one that is not enough or moves the bias."""
    put_in = [
        f"{number(c.value, c.unit, 3)} ({_over_gm(c)}) in series with {c.beside}" for c in one.changes if _put_in(c)
    ]
    moved = [f"C put in, {c.beside}" if c.new else part_title(c.name, c.owner) for c in one.changes if not _put_in(c)]
    together = " and ".join(moved) + (BIAS if one.moves_bias else "")
    return ", and ".join(filter(None, (*put_in, together))) + ("" if one.reaches else _not_enough(one))


def _not_enough(one: Remedy) -> str:
    """Say how far the value was tried, beyond which next to nothing is to be had."""
    sought = next((c for c in one.changes if not _put_in(c) and c.before is not None), None)
    if sought is None or sought.before is None or sought.value == sought.before:
        return ": not enough"
    way = "down" if sought.value < sought.before else "up"
    return f": not enough, tried {way} to {number(sought.value, sought.unit, 3)}"


def _put_in(change: WantChange) -> bool:
    """Whether a change is a resistor of given value, put in; a capacitor that is put in has its value sought."""
    return change.new and change.unit == "Ω"


def notes(want: WantFacts) -> str:
    """Say how the values were found, and what the mark means."""
    told = [
        "value: recomputed until it does, operating point held; ngspice: the changed circuit run",
        *dict.fromkeys(
            f"{BIAS} moves the operating point; {one.says}" if one.moves_bias else one.says
            for one in want.remedies
            if one.says
        ),
    ]
    if want.gain_db is not None and any(abs(one.gain_db - want.gain_db) >= SEEN_DB for one in want.remedies):
        told.insert(0, f"gain now {want.gain_db:.2f} dB")
    return "; ".join(told)


def what_it_takes(review: Review) -> tuple[Grid, ...]:
    """Give one table per wanted figure that is missed and for which there is something to try."""
    return tuple(
        Grid(
            f"What {wanted(want)} takes",
            columns("change", *heads(want)),
            tuple(GridRow(cells(want, one, review), part=_part(one)) for one in want.remedies),
            f"{notes(want)}.",
        )
        for want in review.wants
        if want.remedies
    )


def _part(one: Remedy) -> str:
    return next((change.name for change in one.changes if not change.new), "")
