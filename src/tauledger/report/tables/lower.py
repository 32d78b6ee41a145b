"""The table of the lower edge: one row per coupling and bypass capacitor, with the zero that it makes."""

from __future__ import annotations

from tauledger.record import PartRow, Review
from tauledger.report.lower import ends, in_parallel
from tauledger.report.tables.grid import Grid, GridRow, columns
from tauledger.report.wording import NO_NUMBER, SOLVED, amount, fraction, move, nominal, number, part_title, part_unit


def lower_parts(review: Review) -> tuple[PartRow, ...]:
    """Give the parts in the path that hold the signal back at low frequencies, highest edge first.

    Capacitors that are short at mid-band or set its gain, and inductors that are open there.
    """
    rows = [
        part
        for part in review.parts
        if part.klass in (("open",) if part.kind == "inductance" else ("short", "gain"))
        and part.in_path
        and part.edge_hz is not None
    ]
    return tuple(sorted(rows, key=lambda part: -(part.edge_hz or 0.0)))


def lower_edge(review: Review) -> Grid:
    """Give R by hand and exact, edge, zero, share of f_L and f_L recomputed with 10 % less."""
    exact = review.f_low.exact_hz if review.f_low else None
    rows = []
    groups = in_parallel(list(lower_parts(review)))
    for group in groups:
        part = group[0]
        less = part.ten_percent_less.f_low_hz
        value = amount(part) if len(group) == 1 else nominal(sum(one.value for one in group), part_unit(part.kind))
        shares = [one.share.f_low for one in group if one.share.f_low is not None]
        rows.append(
            GridRow(
                (
                    f"{' ‖ '.join(part_title(one.name, one.owner) for one in group)}{ends(part)}",
                    value,
                    SOLVED if part.resistance_hand_ohm is None else number(part.resistance_hand_ohm, "Ω"),
                    number(part.resistance_exact_ohm, "Ω"),
                    number(part.edge_hz, "Hz"),
                    "at DC" if part.zero_hz == 0.0 else number(part.zero_hz, "Hz"),
                    fraction(sum(shares) if shares else None),
                    number(less, "Hz"),
                    move(less / exact - 1.0) if less is not None and exact else NO_NUMBER,
                ),
                part=part.name,
            )
        )
    heads = columns(
        "Capacitor or inductor" if any(part.kind == "inductance" for part in lower_parts(review)) else "Capacitor",
        "value",
        "R by hand",
        "R exact",
        "edge alone",
        "its zero",
        "share of f_L",
        "10 % less: f_L",
        "change",
    )
    solved = any(part.resistance_hand_ohm is None for part in lower_parts(review))
    notes = [f"{SOLVED} none of the rules fits: the exact resistance is used."] if solved else []
    notes += [
        f"{' ‖ '.join(part.name for part in group)}: 10 % less of {group[0].name} alone."
        for group in groups
        if len(group) > 1
    ]
    if any((part.share.f_low or 0.0) < 0.0 for part in lower_parts(review)):
        notes.append("A negative share: more of that capacitor raises f_L.")
    return Grid("Coupling and bypass capacitors at the lower edge", heads, tuple(rows), " ".join(notes))


def aside(review: Review) -> str:
    """Say which capacitors are left out of the table and why; empty where none is."""
    told = []
    short = [part for part in review.parts if part.klass == "short" and not part.in_path and not part.aid]
    if short and review.budget.lower is not None:
        told.append(f"{_named(short)}: not in the signal path.")
    gain = [part for part in review.parts if part.klass == "gain"]
    if gain:
        told.append(f"{_named(gain)}: sets the mid-band gain.")
    tuned = [part for part in review.parts if part.klass == "tuned"]
    if tuned:
        told.append(f"{_named(tuned)}: resonates, neither short nor open.")
    return " ".join(told)


def _named(parts: list[PartRow]) -> str:
    return ", ".join(part_title(part.name, part.owner) for part in parts)
