"""The frequency response: magnitude above phase; simulation solid, hand analysis dashed, a measured curve as marks."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from tauledger.quantity import decibel_unit
from tauledger.record import Review
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.curve import place_text
from tauledger.report.shown import MOST_DEG, Shown, edge_places, midband_deg, nearest, shown, turns_deg, unity_hz
from tauledger.report.tables.roots import Root, near_roots
from tauledger.report.wording import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

BELOW_DB = 70.0
SOLID: Mapping[str, Any] = {"linewidth": 1.6}
LOOKS: Mapping[str, Mapping[str, Any]] = {"hand": {"linestyle": (0, (5, 2)), "linewidth": 1.5}}
# So much is shown below 0 dB where the report is about unity gain.
BELOW_UNITY_DB = 20.0
# Marks closer than this ratio have no room for both their names above them.
NAME_NEEDS, NARROW_NEEDS = 1.8, 5.0


def bode_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw magnitude and phase as SVG; empty where there are no curves."""
    seen = shown(review)
    if seen is None:
        return ""
    first, last = seen.first_hz, seen.last_hz
    with styled():
        figure = blank(5.2, narrow=narrow)
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(1.35, 1.0))
        for curve in seen.curves:
            look: Mapping[str, Any] = {"color": light(curve.name), **LOOKS.get(curve.name, SOLID)}
            upper.plot(seen.frequency_hz, curve.magnitude_db, label=curve.label, **look)
            lower.plot(seen.frequency_hz, curve.phase_deg, **look)
        top, bottom = _magnitude_range(review, seen)
        _measured(upper, lower, review, first, last)
        upper.set_xscale("log")
        upper.set_xlim(first, last)
        upper.set_ylim(bottom, top)
        upper.set_ylabel(f"magnitude in {decibel_unit(review.midband.unit)}")
        lower.set_ylabel("phase in degrees")
        low, high = lower.get_ylim()
        lower.set_ylim(max(low, midband_deg(review) - MOST_DEG), min(high, midband_deg(review) + MOST_DEG))
        over_frequency(upper, lower, narrow=narrow)
        _edges(upper, lower, review, narrow=narrow)
        _unity_gain(upper, lower, review)
        _roots(upper, near_roots(review), first, last, narrow=narrow)
        upper.legend(
            loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=1 if narrow else 3, frameon=False, borderpad=0.0
        )
        told = ", ".join(f"{name} at {number(hz, 'Hz')}" for name, hz in edge_places(review))
        title = f"Magnitude and phase over frequency; {told or 'no band edges'}"
        svg = to_svg(figure, key="bode", title=title, narrow=narrow)
        return svg.replace("<svg ", f'<svg data-axes="{_place(figure, upper, lower)}" ', 1)


def _place(figure: Figure, upper: Axes, lower: Axes) -> str:
    """Give left, right, top and bottom of both axes together in the picture's own units, for the frequency cursor."""
    width, height = (72.0 * inches for inches in figure.get_size_inches())
    above, below = upper.get_position(), lower.get_position()
    places = (above.x0 * width, above.x1 * width, (1.0 - above.y1) * height, (1.0 - below.y0) * height)
    return " ".join(f"{place:.2f}" for place in places)


def _magnitude_range(review: Review, seen: Shown) -> tuple[float, float]:
    values = [level for curve in seen.curves for level in curve.magnitude_db]
    top = max(values)
    bottom = max(min(values), review.midband.gain_db - BELOW_DB)
    if unity_hz(review) is not None:
        bottom = max(min(values), min(bottom, -BELOW_UNITY_DB))
    room = 0.08 * (top - bottom) or 1.0
    return top + room, bottom - 5.0 * room


def _measured(upper: Axes, lower: Axes, review: Review, first: float, last: float) -> None:
    """Mark the points of a measured curve, its level taken out, and draw ngspice with the best stray as a line."""
    curve = review.curve
    if curve is None:
        return
    points = [point for point in curve.points if first <= point.frequency_hz <= last]
    frequency = [point.frequency_hz for point in points]
    look: Mapping[str, Any] = {
        "linestyle": "none",
        "marker": "s",
        "markersize": 3.4,
        "markerfacecolor": "none",
        "color": light("yours"),
    }
    upper.plot(frequency, [point.reference_db + point.difference_db for point in points], label="measured", **look)
    explained = [point.explained_db for point in points if point.explained_db is not None]
    if explained and len(explained) == len(points):
        label = f"with {place_text(curve.strays[0])}"
        level = [gain - curve.offset_db for gain in explained]
        dotted: Mapping[str, Any] = {"linestyle": (0, (1, 1.4)), "linewidth": 1.6, "color": light("yours")}
        upper.plot(frequency, level, label=label, **dotted)
    by_phase = [(point.reference_deg, point.difference_deg) for point in points if point.difference_deg is not None]
    if by_phase and review.curves is not None:
        middle = nearest(tuple(point.frequency_hz for point in curve.points), review.midband.frequency_hz)
        turns = turns_deg(review, curve.points[middle].reference_deg)
        lower.plot(frequency, [degrees + off + turns for degrees, off in by_phase], **look)


def over_frequency(upper: Axes, lower: Axes, *, narrow: bool) -> None:
    """Give two stacked panels, the lower one in degrees, one frequency axis in Hz below them and a grid."""
    degree_ticks(lower)
    lower.set_xlabel("frequency")
    hertz_ticks(lower, most=4 if narrow else 8)
    for axes in (upper, lower):
        axes.grid(axis="both")
        axes.set_axisbelow(True)


def degree_ticks(axes: Axes) -> None:
    """Put the ticks of a phase at round angles, six of them at most."""
    from matplotlib.ticker import MultipleLocator

    low, high = axes.get_ylim()
    turns = 360 * 2 ** max(0, math.ceil(math.log2((high - low) / (6.0 * 360.0))))
    step = next((step for step in (15, 30, 45, 90, 180) if (high - low) / step <= 6), turns)
    axes.yaxis.set_major_locator(MultipleLocator(step))


def hertz_ticks(axes: Axes, *, most: int) -> None:
    """Put the ticks of a frequency at decades, `most` of them at most, written with their unit."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullLocator

    first, last = axes.get_xlim()
    every = math.ceil(math.log10(last / first) / most)
    axes.xaxis.set_major_locator(LogLocator(base=10.0**every))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.xaxis.set_major_formatter(FuncFormatter(lambda hz, _: number(hz, "Hz", 1)))


def _edges(upper: Axes, lower: Axes, review: Review, *, narrow: bool) -> None:
    for name, hz in edge_places(review):
        for axes in (upper, lower):
            axes.axvline(hz, color=light("muted"), linewidth=1.0, linestyle=(0, (1, 2)))
        level = review.midband.gain_db - 20.0 * math.log10(math.sqrt(2.0))
        upper.plot([hz], [level], marker="D", markersize=4.5, color=light("ink"), linestyle="none")
        inwards = 7 if name == "f_L" else -7
        upper.annotate(
            f"{name} {number(hz, 'Hz')}",
            (hz, level),
            # Where the band is narrow on the page the two stand below each other.
            (inwards, -22 if narrow and name == "f_H" else -7),
            textcoords="offset points",
            ha="left" if name == "f_L" else "right",
            va="top",
        )


def _unity_gain(upper: Axes, lower: Axes, review: Review) -> None:
    """Mark f_u at 0 dB, and the margin as the way from the phase there to half a turn beyond mid-band."""
    facts, hz = review.f_unity, unity_hz(review)
    if facts is None or hz is None:
        return
    margin = facts.phase_margin_deg if facts.phase_margin_deg is not None else facts.phase_margin_exact_deg
    at_hz = facts.margin_at_hz if facts.margin_at_hz is not None and facts.further_hz else hz
    for axes in (upper, lower):
        axes.axvline(hz, color=light("muted"), linewidth=1.0, linestyle=(0, (1, 2)))
    upper.plot([hz], [0.0], marker="D", markersize=4.5, color=light("ink"), linestyle="none")
    words: dict[str, Any] = {"textcoords": "offset points", "ha": "right", "va": "top"}
    upper.annotate(f"f_u {number(hz, 'Hz')}", (hz, 0.0), (-7, -5), **words)
    if margin is None:
        return
    half_turn = 180.0 * round(midband_deg(review) / 180.0) - 180.0
    low, high = lower.get_ylim()
    lower.set_ylim(min(low, half_turn - 20.0), high)
    lower.axhline(half_turn, color=light("muted"), linewidth=1.0, linestyle=(0, (1, 2)))
    lower.plot(
        [at_hz, at_hz], [half_turn, half_turn + margin], color=light("ink"), linewidth=2.2, solid_capstyle="butt"
    )
    lower.annotate(f"margin {margin:.1f}°", (at_hz, half_turn + margin / 2.0), (-7, 5), **words)


def _roots(axes: Axes, roots: tuple[Root, ...], first: float, last: float, *, narrow: bool) -> None:
    """Mark poles and zeros on two lines at the foot of the magnitude, every other name higher where close.

    On a small screen there is no room for two names: of marks close to each other the first has its name.
    """
    transform = axes.get_xaxis_transform()
    for is_pole, height in ((True, 0.04), (False, 0.23)):
        visible = [root for root in roots if root.is_pole is is_pole and first <= root.size_hz <= last]
        level, before = 0, 0.0
        for root in sorted(visible, key=lambda root: root.size_hz):
            close = before > 0.0 and root.size_hz < (NARROW_NEEDS if narrow else NAME_NEEDS) * before
            level = 1 - level if close else 0
            before = before if close and narrow else root.size_hz
            axes.plot(
                [root.size_hz],
                [height],
                transform=transform,
                marker="x" if is_pole else "o",
                markersize=6.0,
                markeredgewidth=1.5,
                markerfacecolor="none",
                color=light("ink"),
                linestyle="none",
            )
            if narrow and close:
                continue
            axes.annotate(
                root.name,
                (root.size_hz, height),
                (0, (5, 15)[level]),
                xycoords=transform,
                textcoords="offset points",
                ha="center",
                va="bottom",
            )
