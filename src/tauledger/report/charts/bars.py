"""Bars per capacitance: its time constant by hand beside the exact one, and its signed share of f_H."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from msgspec import Struct

from tauledger.record import PartRow, Review
from tauledger.report.charts.style import blank, light, marked, quiet, styled, to_svg
from tauledger.report.tables.upper import by_share, counted, counting_nodes, term_seconds, whole_s
from tauledger.report.wording import fraction, number, part_titles
from tauledger.report.working import node_title

if TYPE_CHECKING:
    from matplotlib.axes import Axes

WORTH_A_BAR = 0.004
MOST_BARS = 24
ROW_IN = 0.34


class TimeBar(Struct, frozen=True):
    """One capacitance: its name, its time constant by hand and exact, in s."""

    part: str
    title: str
    hand_s: float
    exact_s: float | None


class TimeGroup(Struct, frozen=True):
    """The capacitances of one node."""

    title: str
    bars: tuple[TimeBar, ...]


def time_groups(review: Review) -> tuple[TimeGroup, ...]:
    """Put every open capacitance in the path under the node where most of its time constant by hand stands.

    A capacitance between two nodes has one bar, for both its ends: R by hand times C beside R exact times C. In a
    balanced circuit the bars are those of the half circuit, and exact is what the capacitance and its image take of the
    group delay. Those below 0.4 % of the sum are left out.
    """
    titles = part_titles(review.parts)
    rows = {part.name: part for part in review.parts if part.klass in ("open", "gain") and part.in_path}
    least = WORTH_A_BAR * abs(whole_s(review))
    home: dict[str, tuple[float, str]] = {}
    hand: dict[str, float] = {}
    for node in review.nodes:
        for term in node.working.capacitances if node.working and not node.second else ():
            seconds = term_seconds(term, node)
            hand[term.part] = hand.get(term.part, 0.0) + seconds
            if abs(seconds) > home.get(term.part, (0.0, ""))[0]:
                home[term.part] = (abs(seconds), node.name)
    groups = []
    for node in counting_nodes(review):
        here = [name for name, (_, at) in home.items() if at == node.name and abs(hand[name]) >= least and name in rows]
        here.sort(key=lambda name: -abs(hand[name]))
        bars = tuple(TimeBar(name, titles[name], hand[name], _exact_s(rows[name], review)) for name in here)
        if bars:
            groups.append(TimeGroup(node_title(node), bars))
    return tuple(groups)


def bars_text(review: Review) -> str:
    """Say how the largest bar that stands for two nodes adds up: " C_μ of Q2: 261.0 ns at c1 and …"; empty for none."""
    shown = {bar.part for group in time_groups(review) for bar in group.bars}
    ends: dict[str, list[tuple[float, str]]] = {}
    for node in counted(review):
        for term in node.working.capacitances if node.working else ():
            if term.part in shown:
                ends.setdefault(term.part, []).append((term_seconds(term, node), node.name))
    both = [(part, told) for part, told in ends.items() if len(told) > 1]
    if not both:
        return ""
    part, told = max(both, key=lambda entry: math.fsum(seconds for seconds, _ in entry[1]))
    pieces = " and ".join(f"{number(seconds, 's')} at {name}" for seconds, name in told)
    together = number(math.fsum(seconds for seconds, _ in told), "s")
    return (
        f" A capacitance between two nodes has one bar for both its ends: {part_titles(review.parts)[part]} takes "
        f"{pieces} in the table, {together} together."
    )


def _exact_s(part: PartRow, review: Review) -> float | None:
    """Give R·C of a part; in a balanced circuit, where its R holds for one half alone, its part of the group delay."""
    second = {member for node in review.nodes if node.second for member in node.members}
    if not second or part.time_constant_s is None or part.weight is None:
        return part.time_constant_s
    first = {member for node in review.nodes if node.image and not node.second for member in node.members}
    is_its_own_image = any(end in first for end in part.nodes) and any(end in second for end in part.nodes)
    return part.weight * part.time_constant_s * (1.0 if is_its_own_image else 2.0)


def time_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw time constants by hand and exact per capacitance, grouped by node, as SVG; empty where there are none."""
    groups, left = [], MOST_BARS
    for group in time_groups(review):
        bars = group.bars[:left]
        left -= len(bars)
        if bars:
            groups.append(TimeGroup(group.title, bars))
    if not groups:
        return ""
    biggest = max(max(abs(bar.hand_s), abs(bar.exact_s or 0.0)) for group in groups for bar in group.bars)
    scale, unit = _engineering(biggest)
    rows = sum(1 + len(group.bars) for group in groups)
    from matplotlib.transforms import blended_transform_factory

    with styled():
        figure = blank(0.75 + ROW_IN * rows + 0.1 * len(groups), narrow=narrow)
        axes = figure.add_subplot()
        y, ticks, names = 0.0, [], []
        for group in groups:
            across = blended_transform_factory(figure.transFigure if narrow else axes.transAxes, axes.transData)
            head = axes.text(0.0, y, group.title, transform=across, weight="bold", va="center", in_layout=not narrow)
            head.set_fontsize(8.0 if narrow else 9.0)
            y += 0.95
            for bar in group.bars:
                _pair(axes, y, bar, scale)
                ticks.append(y)
                names.append(bar.title)
                y += 1.0
            y += 0.25
        axes.set_yticks(ticks, names)
        axes.set_ylim(y - 0.3, -0.6)
        axes.set_xlim(
            min(0.0, *(bar.hand_s * scale for group in groups for bar in group.bars)),
            (1.9 if narrow else 1.32) * biggest * scale,
        )
        axes.set_xlabel(f"R·C in {unit}")
        axes.grid(axis="x")
        axes.set_axisbelow(True)
        quiet(axes)
        _legend(axes)
        told = "; ".join(f"{bar.title} {number(bar.hand_s, 's', 3)}" for group in groups for bar in group.bars[:2])
        return to_svg(
            figure, key="time", title=f"Time constant of every capacitance by hand and exact: {told}", narrow=narrow
        )


def share_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw the signed shares of f_H, largest first, as SVG; empty where there are none."""
    parts = [part for part in by_share(review) if abs(part.share.f_high or 0.0) >= WORTH_A_BAR][:MOST_BARS]
    if not parts:
        return ""
    titles = part_titles(review.parts)
    with styled():
        figure = blank(0.7 + ROW_IN * max(len(parts), 2), narrow=narrow)
        axes = figure.add_subplot()
        values = [100.0 * (part.share.f_high or 0.0) for part in parts]
        for y, (part, value) in enumerate(zip(parts, values, strict=True)):
            _share_bar(axes, y, part, value)
        low, high = min(0.0, *values, 0.0), max(0.0, *values, 0.0)
        room = (0.3 if narrow else 0.16) * (high - low)
        axes.set_xlim(low, max(high + room, 0.25 * (high - low)))
        axes.set_ylim(len(parts) - 0.4, -0.6)
        axes.set_yticks(range(len(parts)), [titles[part.name] for part in parts])
        axes.axvline(0.0, color=light("ink"), linewidth=1.0)
        signs = (
            "per cent of f_H; to the left of zero: more of it raises f_H"
            if low < 0.0 and not narrow
            else "per cent of f_H"
        )
        axes.set_xlabel(f"share, {signs}")
        axes.grid(axis="x")
        axes.set_axisbelow(True)
        quiet(axes)
        told = "; ".join(f"{titles[part.name]} {fraction(part.share.f_high)}" for part in parts[:4])
        return to_svg(figure, key="shares", title=f"Share of each capacitance in f_H: {told}", narrow=narrow)


def _pair(axes: Axes, y: float, bar: TimeBar, scale: float) -> None:
    hand = axes.barh(
        y - 0.18, bar.hand_s * scale, 0.32, facecolor="none", edgecolor=light("hand"), hatch="////", linewidth=1.1
    )
    hand[0].set_gid(marked(bar.part))
    exact = (bar.exact_s or 0.0) * scale
    solid = axes.barh(y + 0.18, exact, 0.32, color=light("exact"), linewidth=0.0)
    solid[0].set_gid(marked(bar.part))
    label = number(bar.hand_s, "s", 3)
    if bar.exact_s is not None and number(bar.exact_s, "s", 3) != label:
        label += f", exact {number(bar.exact_s, 's', 3)}"
    axes.annotate(label, (max(bar.hand_s * scale, exact, 0.0), y), (5, 0), textcoords="offset points", va="center")


def _share_bar(axes: Axes, y: int, part: PartRow, value: float) -> None:
    if value >= 0.0:
        drawn = axes.barh(y, value, 0.56, color=light("exact"), linewidth=0.0)
    else:
        drawn = axes.barh(y, value, 0.56, facecolor="none", edgecolor=light("faster"), hatch="\\\\\\\\", linewidth=1.1)
    drawn[0].set_gid(marked(part.name))
    told = fraction(part.share.f_high).replace("-", "−")
    # Left of its bar a text would run into the names.
    axes.annotate(told, (max(value, 0.0), y), (5, 0), textcoords="offset points", va="center", ha="left")


def _legend(axes: Axes) -> None:
    from matplotlib.patches import Patch

    handles = [
        Patch(facecolor="none", edgecolor=light("hand"), hatch="////", label="by hand"),
        Patch(facecolor=light("exact"), label="exact"),
    ]
    axes.legend(handles=handles, loc="lower right", bbox_to_anchor=(1.0, 1.0), ncols=2, frameon=False, borderpad=0.0)


def _engineering(biggest: float) -> tuple[float, str]:
    exponent = 3 * math.floor(math.log10(biggest) / 3.0) if biggest > 0.0 else 0
    prefix = {0: "", -3: "m", -6: "µ", -9: "n", -12: "p", -15: "f"}.get(exponent)
    return (10.0**-exponent, f"{prefix}s") if prefix is not None else (1.0, "s")
