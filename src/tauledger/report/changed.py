"""What was set from outside of the netlist with the headline before and after, and what of it was read past."""

from __future__ import annotations

from tauledger.record import MovedFigure, Review
from tauledger.report.layout import HEADING, Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, move, nominal, number, part_unit

# Simulated edges are refined to this.
_STANDS_STILL = 1e-6


def changed(review: Review) -> Section:
    """Give the figures that move, before and after; empty where nothing was set."""
    if not review.settings and not review.added:
        return Section(())
    moved = [figure for figure in review.moved if not same(figure)]
    still = [figure.figure for figure in review.moved if same(figure)]
    rows = tuple(
        Row((figure.figure, shown(figure, figure.before), shown(figure, figure.after), by(figure))) for figure in moved
    )
    blocks: list[Block] = []
    if review.settings:
        blocks.append(Prose(f"SET {set_text(review)}", style=HEADING))
    if review.added:
        blocks.append(Prose(f"ADDED {added_text(review)}", style=HEADING))
    if rows:
        blocks.append(Table("lrrr", ("figure", "as in the netlist", so(review), "change"), rows))
    if still:
        blocks.append(Prose(", ".join(still), lead="  unchanged: "))
    return Section(tuple(blocks))


def set_text(review: Review) -> str:
    """Say what was set: "R3 = 4700, load = 2000"."""
    return ", ".join(f"{setting.name} = {setting.value:.6g}" for setting in review.settings)


def added_text(review: Review) -> str:
    """Say what was added: "at out 10 MΩ ‖ 12 pF, at b 1 pF"."""
    at: dict[str, list[str]] = {}
    for part in review.added:
        at.setdefault(part.node, []).append(nominal(part.value, part_unit(part.kind)))
    return ", ".join(f"at {node} {' ‖ '.join(values)}" for node, values in at.items())


def so(review: Review) -> str:
    """Head the column of figures after the change."""
    if review.settings and review.added:
        return "as changed"
    return "as set" if review.settings else "with it"


def read_past(review: Review) -> Section:
    """List what was read past, card by card; empty where nothing was."""
    if not review.netlist.passed:
        return Section(())
    lines = tuple(Prose(passed, lead="  ") for passed in review.netlist.passed)
    return Section((Prose("READ PAST", style=HEADING), *lines))


def same(figure: MovedFigure) -> bool:
    """Whether a figure stands still, or reads the same."""
    if figure.before is None or figure.after is None:
        return figure.before is figure.after
    still = abs(figure.after - figure.before) <= _STANDS_STILL * max(abs(figure.before), abs(figure.after))
    return still or shown(figure, figure.before) == shown(figure, figure.after)


def shown(figure: MovedFigure, value: float | None) -> str:
    """Write a value of a figure with its unit."""
    if value is None:
        return NO_NUMBER
    if figure.unit.startswith("dB"):
        return f"{value:.2f} {figure.unit}"
    if figure.unit != "deg":
        return number(value, figure.unit)
    # a shift leads or lags; what is left of a margin is an amount
    return f"{value:.1f}°" if figure.figure.startswith("phase margin") else f"{value:+.1f}°"


def by(figure: MovedFigure) -> str:
    """Word the change: in dB and degrees as a difference, else in per cent."""
    if figure.before is None or figure.after is None:
        return NO_NUMBER
    if figure.unit.startswith("d"):
        sign = f"{figure.after - figure.before:+.2f}"
        return f"{sign} dB" if figure.unit.startswith("dB") else f"{figure.after - figure.before:+.1f}°"
    return move(figure.after / figure.before - 1.0) if figure.before else NO_NUMBER
