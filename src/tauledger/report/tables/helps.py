"""What would help: what 10 % less of one element does to both edges and the gain, resistors and gm among them."""

from __future__ import annotations

from collections.abc import Collection

from tauledger.record import Help, Review
from tauledger.report.tables.grid import Grid, GridRow, columns, said
from tauledger.report.wording import move, part_title, value_of

MARKS = {"bias": " §", "device": " ¶", "free": ""}


def kind(one: Help) -> str:
    """Say how free one is to change an element: "free", "bias" where that moves the operating point, "device"."""
    if one.free:
        return "free"
    return "bias" if one.moves_bias else "device"


def marks(kinds: Collection[str]) -> tuple[str, ...]:
    """Say what the marks at the names of elements mean, those that stand in the table."""
    told = []
    if "bias" in kinds:
        told.append("§ takes part in the operating point: changed on the board it moves that too.")
    if "device" in kinds:
        told.append("¶ inside a device: another device or another bias, no change of a value.")
    return tuple(told)


def what_would_help(review: Review) -> Grid:
    """Give first-order effects of 10 % less per element, and below it the exact ones where recomputed."""
    rows = []
    for one in review.helps:
        title = part_title(one.name, one.owner) + MARKS[kind(one)]
        value = value_of(one.name, one.owner, one.value, one.unit)
        first = (title, value, move(one.f_high), move(one.f_low), move(one.gain))
        rows.append(GridRow(first, part=one.name))
        if one.gain_rerun is not None:
            high = change(one.f_high_rerun_hz, review.f_high.exact_hz if review.f_high else None)
            low = change(one.f_low_rerun_hz, review.f_low.exact_hz if review.f_low else None)
            rows.append(GridRow(("recomputed", "", move(high), move(low), move(one.gain_rerun)), "part"))
    notes = ["To first order; the operating point is held.", *marks({kind(one) for one in review.helps})]
    heads = columns("10 % less of", "value", "f_H", "f_L", "gain")
    return said(Grid("What 10 % less of one element does", heads, tuple(rows), " ".join(notes)))


def change(hz: float | None, before: float | None) -> float | None:
    """Give a recomputed frequency as a fraction of what it was, less one."""
    return hz / before - 1.0 if hz is not None and before else None
