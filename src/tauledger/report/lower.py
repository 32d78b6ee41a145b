"""The lower edge: one row per coupling and bypass capacitor, with the zero that it makes."""

from __future__ import annotations

from tauledger.record import LowerBudget, PartRow, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.steps import methods, steps_in_line
from tauledger.report.wording import SOLVED, fraction, move, nominal, number, part_title, part_unit

_ROWS = 6
_KLASSES = {"capacitance": ("short", "gain"), "inductance": ("open",)}


def lower_edge(review: Review, *, verbose: bool = False) -> Section:
    """Give R, edge, zero, share and what 10 % less gives, for every capacitor in the path that is no open."""
    short = [part for part in review.parts if not part.aid and part.klass in _KLASSES.get(part.kind, ())]
    with_edge = [part for part in short if part.in_path and part.edge_hz is not None]
    rows = in_parallel(sorted(with_edge, key=lambda part: (-(part.edge_hz or 0.0), -part.value)))
    blocks: list[Block] = []
    if rows and review.f_low is not None:
        shown = rows if verbose else rows[:_ROWS]
        head = ("LOWER EDGE f_L", "value", "R", "edge", "zero", "share", "10 % less: f_L")
        table = tuple(_row(group, review.f_low.exact_hz) for group in shown)
        blocks.append(Table("lrrrrrr", head, table))
        if len(rows) > len(shown):
            blocks.append(Prose(f"Not shown: {len(rows) - len(shown)} with lower edges.", lead="  "))
    remarks = [steps_in_line(review, "f_low")] if not verbose else []
    remarks += [_sums(review.budget.lower)] if review.budget.lower and rows and verbose else []
    remarks.append(methods(review, "f_low"))
    # Whether signal passes a capacitor is known only where the budget is.
    aside = [part_title(part.name, part.owner) for part in short if not part.in_path and review.budget.lower]
    if aside:
        remarks.append(f"{', '.join(aside)} not in the signal path")
    # Coupled inductors resonate with nothing; a note speaks of them.
    tied = {
        ends for part in review.parts if part.kind == "mutual inductance" for ends in (part.nodes[:2], part.nodes[2:])
    }
    loose = [part for part in review.parts if part.kind != "mutual inductance" and part.nodes not in tied]
    for word, verb, rest in (("gain", "set", " the mid-band gain"), ("tuned", "resonate", ", neither short nor open")):
        named = [part_title(part.name, part.owner) for part in loose if part.klass == word]
        if named:
            remarks.append(f"{', '.join(named)} {verb}{'s' if len(named) == 1 else ''}{rest}")
    remarks += [f"10 % less of {group[0].name} alone" for group in rows if len(group) > 1]
    if any(group[0].resistance_hand_ohm is None for group in rows):
        remarks.append(f"{SOLVED} exact: none of the rules fits")
    if any(remarks):
        blocks.append(Prose("; ".join(filter(None, remarks)), lead="  "))
    return Section(tuple(blocks), major=True)


def in_parallel(parts: list[PartRow]) -> list[list[PartRow]]:
    """Put capacitors with the same edge and zero between the same nodes together: they are one; order kept."""
    groups: dict[tuple[frozenset[str], float | None, float | None], list[PartRow]] = {}
    for part in parts:
        groups.setdefault((frozenset(part.nodes), part.edge_hz, part.zero_hz), []).append(part)
    return list(groups.values())


def _row(group: list[PartRow], f_low: float | None) -> Row:
    part = group[0]
    less = part.ten_percent_less.f_low_hz
    change = f" ({move(less / f_low - 1.0)})" if less is not None and f_low else ""
    shares = [one.share.f_low for one in group if one.share.f_low is not None]
    names = " ‖ ".join(part_title(one.name, one.owner) for one in group)
    hand = part.resistance_hand_ohm
    resistance = number(part.resistance_exact_ohm, "Ω") + SOLVED if hand is None else number(hand, "Ω")
    zero = "at DC" if part.zero_hz == 0.0 else number(part.zero_hz, "Hz", 3)
    return Row(
        (
            names + ends(part),
            nominal(sum(one.value for one in group), part_unit(part.kind)),
            resistance,
            number(part.edge_hz, "Hz"),
            zero,
            fraction(sum(shares) if shares else None),
            number(less, "Hz") + change,
        )
    )


def ends(part: PartRow, before: str = ", ") -> str:
    """Say where a part stands, ", e to ground"; nothing of one that reaches inside a transformer."""
    if any("'" in node for node in part.nodes):
        return ""
    return before + " to ".join("ground" if node == "0" else node for node in part.nodes)


def _sums(budget: LowerBudget) -> str:
    if budget.sum_hz is None:
        return ""
    if budget.pole_sum_hz is None or number(budget.sum_hz, "Hz") == number(budget.pole_sum_hz, "Hz"):
        check = "" if budget.pole_sum_hz is None else " = -Σ p/2π"
        return f"sum over all shorts {number(budget.sum_hz, 'Hz')}{check}"
    return f"sum over all shorts {number(budget.sum_hz, 'Hz')}, -Σ p/2π {number(budget.pole_sum_hz, 'Hz')}"
