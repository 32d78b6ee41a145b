"""The return ratio of a loop: magnitude above phase, with its crossover and the margins there."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import TYPE_CHECKING

from tauledger.record import LoopCurve, LoopFacts, Review
from tauledger.report.charts.bode import over_frequency
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.wording import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes


def loop_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw T of the first loop as SVG; empty where there is none."""
    if not review.loops or not review.loop_curves:
        return ""
    facts, curve = review.loops[0], review.loop_curves[0]
    if len(curve.frequency_hz) < 2:
        return ""
    with styled():
        figure = blank(4.2, narrow=narrow)
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(1.3, 1.0))
        upper.plot(curve.frequency_hz, curve.ratio_db, color=light("exact"), linewidth=1.6)
        lower.plot(curve.frequency_hz, curve.phase_deg, color=light("exact"), linewidth=1.6)
        upper.set_xscale("log")
        upper.set_xlim(curve.frequency_hz[0], curve.frequency_hz[-1])
        upper.axhline(0.0, color=light("muted"), linewidth=0.9)
        lower.axhline(-180.0, color=light("muted"), linewidth=0.9)
        upper.set_ylabel("|T| in dB")
        lower.set_ylabel("phase in degrees")
        lower.set_ylim(_phase_range(curve))
        over_frequency(upper, lower, narrow=narrow)
        _mark(upper, lower, facts, curve)
        return to_svg(figure, key="loop", title=_title(facts), narrow=narrow)


def _phase_range(curve: LoopCurve) -> tuple[float, float]:
    """Show the phase down to somewhat beyond −180° and no further than there is any."""
    low, high = min(curve.phase_deg), max(curve.phase_deg)
    return max(low, -270.0) - 15.0 if low < -150.0 else -195.0, min(high, 270.0) + 15.0


def _mark(upper: Axes, lower: Axes, facts: LoopFacts, curve: LoopCurve) -> None:
    """Mark where |T| = 1 and where the phase is −180°, with the margins."""
    if facts.crossover_hz is not None and facts.phase_margin_deg is not None:
        for axes in (upper, lower):
            axes.axvline(facts.crossover_hz, color=light("muted"), linestyle=":", linewidth=1.0)
        upper.plot([facts.crossover_hz], [0.0], marker="o", color=light("ink"), markersize=4)
        phase = _phase_there(curve, facts.crossover_hz)
        lower.plot([facts.crossover_hz], [phase], marker="o", color=light("ink"), markersize=4)
        upper.annotate(
            f" {number(facts.crossover_hz, 'Hz')}, {facts.phase_margin_deg:.0f}° margin",
            (facts.crossover_hz, 0.0),
            # T falls from the upper left to the lower right: there is room on the other two sides
            xytext=(-5, -5) if _late(upper, facts.crossover_hz) else (4, 4),
            textcoords="offset points",
            ha="right" if _late(upper, facts.crossover_hz) else "left",
            va="top" if _late(upper, facts.crossover_hz) else "bottom",
        )
    if facts.gain_margin_db is not None and facts.gain_margin_at_hz is not None:
        first, last = upper.get_xlim()
        if first < facts.gain_margin_at_hz < last:
            upper.plot([facts.gain_margin_at_hz], [-facts.gain_margin_db], marker="s", color=light("ink"), markersize=4)


def _phase_there(curve: LoopCurve, hz: float) -> float:
    """Give the unwrapped phase of the curve at a frequency, straight in log f between its points."""
    points = list(zip(curve.frequency_hz, curve.phase_deg, strict=True))
    for (low, first), (high, last) in pairwise(points):
        if low <= hz <= high:
            return first + (last - first) * math.log(hz / low) / math.log(high / low)
    return points[0][1] if hz < points[0][0] else points[-1][1]


def _late(axes: Axes, hz: float) -> bool:
    """Whether a mark stands in the right third, where words must lead to the left."""
    first, last = axes.get_xlim()
    return bool(hz**3 > first * last**2)


def _title(facts: LoopFacts) -> str:
    told = "" if facts.crossover_hz is None else f"; |T| = 1 at {number(facts.crossover_hz, 'Hz')}"
    return f"Return ratio of {facts.loop}, magnitude and phase over frequency{told}"
