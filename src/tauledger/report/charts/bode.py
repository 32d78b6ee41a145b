"""The frequency response: magnitude above phase; simulation solid, hand analysis dashed, a measured curve as marks."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from tauledger.record import CurveFacts, Curves, Review, UnityFacts
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.curve import place_text
from tauledger.report.tables.roots import Root, near_roots
from tauledger.report.wording import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes

BELOW_DB = 70.0
BEYOND = 300.0
# So much is shown beyond f_u and below 0 dB where the report is about unity gain.
BEYOND_UNITY, BELOW_UNITY_DB = 10.0, 20.0
# Marks closer than this ratio have no room for both their names above them.
NAME_NEEDS, NARROW_NEEDS = 1.8, 5.0
DECIBEL = {"V/V": "dB", "A/A": "dB", "ohm": "dBΩ", "Ω": "dBΩ", "S": "dBS"}


def bode_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw magnitude and phase as SVG; empty where there are no curves."""
    curves = review.curves
    if curves is None or len(curves.frequency_hz) < 2:
        return ""
    first, last = _range(review, curves)
    with styled():
        figure = blank(5.2, narrow=narrow)
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(1.35, 1.0))
        lines = (
            (
                "hand",
                "by hand, a pole for each node",
                curves.hand_db,
                curves.hand_deg,
                {"linestyle": (0, (5, 2)), "linewidth": 1.5},
            ),
            (
                "exact",
                "exact",
                curves.exact_db if curves.simulated_db is None else None,
                curves.exact_deg,
                {"linewidth": 1.6},
            ),
            ("simulated", "simulated", curves.simulated_db, curves.simulated_deg, {"linewidth": 1.6}),
        )
        shown = [k for k, f in enumerate(curves.frequency_hz) if first <= f <= last]
        frequency = [curves.frequency_hz[k] for k in shown]
        at = _nearest(curves, review.midband.frequency_hz)
        midband_deg = _midband_deg(review)
        for name, label, magnitude, phase, look in lines:
            if magnitude is None or phase is None:
                continue
            turns = 360.0 * round((midband_deg - phase[at]) / 360.0)
            upper.plot(frequency, [magnitude[k] for k in shown], color=light(name), label=label, **look)
            lower.plot(frequency, [phase[k] + turns for k in shown], color=light(name), **look)
        top, bottom = _magnitude_range(review, curves, shown)
        _measured(upper, lower, review, first, last)
        upper.set_xscale("log")
        upper.set_xlim(first, last)
        upper.set_ylim(bottom, top)
        upper.set_ylabel(f"magnitude in {DECIBEL.get(review.midband.unit, 'dB')}")
        lower.set_ylabel("phase in degrees")
        _degrees(lower)
        lower.set_xlabel("frequency")
        _hertz(lower, most=4 if narrow else 8)
        for axes in (upper, lower):
            axes.grid(axis="both")
            axes.set_axisbelow(True)
        _edges(upper, lower, review, narrow=narrow)
        _unity_gain(upper, lower, review, midband_deg)
        _roots(upper, near_roots(review), first, last, narrow=narrow)
        upper.legend(
            loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=1 if narrow else 3, frameon=False, borderpad=0.0
        )
        told = ", ".join(f"{name} at {number(hz, 'Hz')}" for name, hz in _edge_places(review))
        return to_svg(
            figure, key="bode", title=f"Magnitude and phase over frequency; {told or 'no band edges'}", narrow=narrow
        )


def _range(review: Review, curves: Curves) -> tuple[float, float]:
    """Show the band with room around it rather than every decade of the sweep."""
    first, last = curves.frequency_hz[0], curves.frequency_hz[-1]
    places = dict(_edge_places(review))
    if "f_L" in places:
        first = max(first, places["f_L"] / BEYOND)
    elif "f_H" in places:
        first = max(first, places["f_H"] / 1e4)
    if "f_H" in places:
        last = min(last, places["f_H"] * BEYOND)
    if _unity(review) is not None:
        last = min(max(last, BEYOND_UNITY * _unity_hz(review)), curves.frequency_hz[-1])
    return (first, last) if first < last else (curves.frequency_hz[0], curves.frequency_hz[-1])


def _magnitude_range(review: Review, curves: Curves, shown: list[int]) -> tuple[float, float]:
    drawn = [row for row in (curves.simulated_db, curves.exact_db, curves.hand_db) if row is not None]
    values = [row[k] for row in drawn for k in shown]
    top = max(values)
    bottom = max(min(values), review.midband.gain_db - BELOW_DB)
    if _unity(review) is not None:
        bottom = max(min(values), min(bottom, -BELOW_UNITY_DB))
    room = 0.08 * (top - bottom) or 1.0
    return top + room, bottom - 3.2 * room


def _nearest(curves: Curves, hz: float) -> int:
    """Give the place of the frequency next to `hz`, where phases are brought to the same turn."""
    wanted = hz or curves.frequency_hz[0]
    return min(range(len(curves.frequency_hz)), key=lambda k: abs(math.log(curves.frequency_hz[k] / wanted)))


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
        turns = 360.0 * round((_midband_deg(review) - _nearest_deg(review, curve)) / 360.0)
        lower.plot(frequency, [degrees + off + turns for degrees, off in by_phase], **look)


def _midband_deg(review: Review) -> float:
    gain = complex(review.midband.gain_real, review.midband.gain_imag)
    return math.degrees(math.atan2(gain.imag, gain.real))


def _nearest_deg(review: Review, curve: CurveFacts) -> float:
    """Give the phase of the reference at the point next to mid-band, by which its turns are counted."""
    wanted = review.midband.frequency_hz or curve.points[0].frequency_hz
    return min(curve.points, key=lambda point: abs(math.log(point.frequency_hz / wanted))).reference_deg


def _degrees(axes: Axes) -> None:
    from matplotlib.ticker import MultipleLocator

    low, high = axes.get_ylim()
    step = next((step for step in (15, 30, 45, 90, 180) if (high - low) / step <= 6), 360)
    axes.yaxis.set_major_locator(MultipleLocator(step))


def _hertz(axes: Axes, *, most: int) -> None:
    from matplotlib.ticker import FuncFormatter, LogLocator, NullLocator

    first, last = axes.get_xlim()
    every = math.ceil(math.log10(last / first) / most)
    axes.xaxis.set_major_locator(LogLocator(base=10.0**every))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.xaxis.set_major_formatter(FuncFormatter(lambda hz, _: number(hz, "Hz", 1)))


def _edge_places(review: Review) -> list[tuple[str, float]]:
    places = []
    for name, edge in (("f_L", review.f_low), ("f_H", review.f_high)):
        hz = None if edge is None else edge.simulated_hz if edge.simulated_hz is not None else edge.exact_hz
        if hz is not None:
            places.append((name, hz))
    return places


def _edges(upper: Axes, lower: Axes, review: Review, *, narrow: bool) -> None:
    for name, hz in _edge_places(review):
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


def _unity(review: Review) -> UnityFacts | None:
    """Give the facts on unity gain where the report has a section on it."""
    return review.f_unity if review.f_unity is not None and review.f_unity.elements else None


def _unity_hz(review: Review) -> float:
    facts = _unity(review)
    assert facts is not None
    return facts.simulated_hz or facts.exact_hz or 0.0


def _unity_gain(upper: Axes, lower: Axes, review: Review, midband_deg: float) -> None:
    """Mark f_u at 0 dB, and the margin as the way from the phase there to half a turn beyond mid-band."""
    facts = _unity(review)
    if facts is None:
        return
    hz = _unity_hz(review)
    margin = facts.phase_margin_deg if facts.phase_margin_deg is not None else facts.phase_margin_exact_deg
    for axes in (upper, lower):
        axes.axvline(hz, color=light("muted"), linewidth=1.0, linestyle=(0, (1, 2)))
    upper.plot([hz], [0.0], marker="D", markersize=4.5, color=light("ink"), linestyle="none")
    words: dict[str, Any] = {"textcoords": "offset points", "ha": "right", "va": "top"}
    upper.annotate(f"f_u {number(hz, 'Hz')}", (hz, 0.0), (-7, -5), **words)
    if margin is None:
        return
    half_turn = midband_deg - 180.0
    low, high = lower.get_ylim()
    lower.set_ylim(min(low, half_turn - 20.0), high)
    lower.axhline(half_turn, color=light("muted"), linewidth=1.0, linestyle=(0, (1, 2)))
    lower.plot([hz, hz], [half_turn, half_turn + margin], color=light("ink"), linewidth=2.2, solid_capstyle="butt")
    lower.annotate(f"margin {margin:.1f}°", (hz, half_turn + margin / 2.0), (-7, 5), **words)


def _roots(axes: Axes, roots: tuple[Root, ...], first: float, last: float, *, narrow: bool) -> None:
    """Mark poles and zeros on two lines at the foot of the magnitude; names step aside where marks come close.

    On a small screen there is no room aside: of marks close to each other the first has its name.
    """
    transform = axes.get_xaxis_transform()
    for is_pole, height in ((True, 0.045), (False, 0.17)):
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
            sideways, upwards = ((0, 5), (7, -4))[level]
            axes.annotate(
                root.name,
                (root.size_hz, height),
                (sideways, upwards),
                xycoords=transform,
                textcoords="offset points",
                ha="left" if level else "center",
                va="bottom",
            )
