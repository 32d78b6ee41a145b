"""The estimates of f_H as a stepped line: from the lowest node alone to the simulation."""

from __future__ import annotations

import textwrap

from tauledger.record import Review
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.tables.way import way
from tauledger.report.wording import move, number

MOST_OF_RANGE = 0.25


def way_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw the way from paper to simulation as SVG; empty where there is none."""
    told = way(review, "f_high")
    if not told:
        return ""
    largest = max(step.hz for step in told)
    scale, unit = next(
        (s, u) for s, u in ((1e-9, "GHz"), (1e-6, "MHz"), (1e-3, "kHz"), (1.0, "Hz")) if largest * s >= 1.0 or s == 1.0
    )
    heights = [step.hz * scale for step in told]
    with styled():
        figure = blank(3.2, narrow=narrow)
        axes = figure.add_subplot()
        low, high = min(heights), max(heights)
        room = MOST_OF_RANGE * (high - low) or 0.1 * high
        end = heights[-1]
        axes.axhline(end, color=light("simulated"), linewidth=0.9, linestyle=(0, (1, 2)))
        xs = [x for k in range(len(told)) for x in (k - 0.5, k + 0.5)]
        ys = [height for height in heights for _ in (0, 1)]
        axes.plot(xs[:-1], ys[:-1], color=light("hand"), linewidth=2.0)
        axes.plot(xs[-2:], ys[-2:], color=light("simulated"), linewidth=3.2)
        for k, step in enumerate(told):
            above = k == 0 or heights[k] >= heights[k - 1] or k == len(told) - 1
            text = number(step.hz, "Hz") + ("" if step.change is None else f"\n{move(step.change)}")
            offset = (0, 5) if above else (0, -5)
            axes.annotate(
                text, (k, heights[k]), offset, textcoords="offset points", ha="center", va="bottom" if above else "top"
            )
        axes.set_xticks(
            range(len(told)), [textwrap.fill(step.title, 8 if narrow else 15, break_long_words=False) for step in told]
        )
        if narrow:
            axes.tick_params(axis="x", labelsize=7.0)
        axes.tick_params(axis="x", length=0)
        axes.set_xlim(-0.55, len(told) - 0.45)
        axes.set_ylim(max(0.0, low - 2.2 * room), high + 1.5 * room)
        axes.set_ylabel(f"f_H in {unit}")
        axes.grid(axis="y")
        axes.set_axisbelow(True)
        words = "; ".join(f"{step.title} {number(step.hz, 'Hz')}" for step in told)
        return to_svg(figure, key="way", title=f"Estimates of f_H: {words}", narrow=narrow)
