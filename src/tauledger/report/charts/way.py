"""The estimates of f_H as a stepped line: from the lowest node alone to the simulation."""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING

from tauledger.record import Review
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.tables.way import Told, way
from tauledger.report.wording import move, number

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_OF_RANGE = 0.25
ROW_IN = 0.42


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
    words = "; ".join(f"{step.title} {number(step.hz, 'Hz')}" for step in told)
    with styled():
        # On a small screen the steps stand below each other, each with its number beside it.
        figure = blank(0.7 + ROW_IN * len(told), narrow=True) if narrow else blank(3.2)
        axes = figure.add_subplot()
        if narrow:
            _downwards(axes, told, heights, unit)
        else:
            _along(axes, told, heights, unit)
        axes.set_axisbelow(True)
        return to_svg(figure, key="way", title=f"Estimates of f_H: {words}", narrow=narrow)


def _along(axes: Axes, told: tuple[Told, ...], heights: list[float], unit: str) -> None:
    """Draw the steps from left to right, f_H upwards."""
    low, high = min(heights), max(heights)
    room = MOST_OF_RANGE * (high - low) or 0.1 * high
    axes.axhline(heights[-1], color=light("simulated"), linewidth=0.9, linestyle=(0, (1, 2)))
    places, levels = _corners(heights)
    axes.plot(places[:-1], levels[:-1], color=light("hand"), linewidth=2.0)
    axes.plot(places[-2:], levels[-2:], color=light("simulated"), linewidth=3.2)
    for k, step in enumerate(told):
        above = k == 0 or heights[k] >= heights[k - 1] or k == len(told) - 1
        text = number(step.hz, "Hz") + ("" if step.change is None else f"\n{move(step.change)}")
        offset = (0, 5) if above else (0, -5)
        axes.annotate(
            text,
            (k, heights[k]),
            offset,
            textcoords="offset points",
            ha="center",
            va="bottom" if above else "top",
            bbox={"facecolor": light("paper"), "edgecolor": "none", "pad": 0.6},
        )
    axes.set_xticks(range(len(told)), [textwrap.fill(step.title, 15) for step in told])
    axes.tick_params(axis="x", length=0)
    axes.set_xlim(-0.55, len(told) - 0.45)
    axes.set_ylim(max(0.0, low - 2.2 * room), high + 1.5 * room)
    axes.set_ylabel(f"f_H in {unit}")
    axes.grid(axis="y")


def _downwards(axes: Axes, told: tuple[Told, ...], heights: list[float], unit: str) -> None:
    """Draw the steps from top to bottom, f_H to the right, every number to the right of the line."""
    low, high = min(heights), max(heights)
    span = high - low or 0.1 * high
    axes.axvline(heights[-1], color=light("simulated"), linewidth=0.9, linestyle=(0, (1, 2)))
    places, levels = _corners(heights)
    axes.plot(levels[:-1], places[:-1], color=light("hand"), linewidth=2.0)
    axes.plot(levels[-2:], places[-2:], color=light("simulated"), linewidth=3.2)
    for k, step in enumerate(told):
        text = number(step.hz, "Hz") + ("" if step.change is None else f", {move(step.change)}")
        axes.annotate(text, (heights[k], k), (5, 0), textcoords="offset points", ha="left", va="center", fontsize=8.0)
    axes.set_yticks(range(len(told)), [textwrap.fill(step.title, 15) for step in told])
    axes.tick_params(axis="y", length=0, labelsize=8.0)
    axes.set_ylim(len(told) - 0.45, -0.55)
    axes.set_xlim(low - 0.15 * span, high + 1.4 * span)
    axes.locator_params(axis="x", nbins=4)
    axes.set_xlabel(f"f_H in {unit}")
    axes.grid(axis="x")


def _corners(heights: list[float]) -> tuple[list[float], list[float]]:
    """Give the corners of the stepped line: along the steps, and in f_H."""
    return [at for k in range(len(heights)) for at in (k - 0.5, k + 0.5)], [h for h in heights for _ in (0, 1)]
