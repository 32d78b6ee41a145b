"""Poles and zeros in the s-plane, the distance from the origin by decades, so that audio and radio fit one picture."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from tauledger.record import Review
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.tables.roots import Root, near_roots
from tauledger.report.wording import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes

INNERMOST = 0.6
# A name takes so much of the picture's width for each letter, and so much again to keep from the next; one that has no
# room goes up a line, in points.
LETTER, LINE = 0.0125, 11


def plane_chart(review: Review) -> str:
    """Draw poles and zeros near the band as SVG; empty where there are none away from the origin."""
    roots = near_roots(review)
    sizes = [root.size_hz for root in roots if root.size_hz > 0.0]
    if not sizes:
        return ""
    first, last = math.floor(math.log10(min(sizes)) - 0.2), math.ceil(math.log10(max(sizes)) + 0.1)

    def place(root: Root) -> tuple[float, float]:
        if root.size_hz == 0.0:
            return 0.0, 0.0
        radius = math.log10(root.size_hz) - first + INNERMOST
        return radius * root.real_hz / root.size_hz, radius * root.imag_hz / root.size_hz

    placed = [(root, *place(root)) for root in roots]
    outermost = last - first + INNERMOST
    highest = max(abs(y) for _, _, y in placed)
    right = max(x for _, x, _ in placed)
    half = max(highest + 0.7, 0.17 * outermost)
    with styled():
        from matplotlib.patches import Circle

        right_edge = max(right + 0.6, 0.3 * outermost)
        span = outermost + 0.25 + right_edge
        figure = blank(min(4.6, max(1.9, 7.2 * 2.0 * half / span + 0.3)))
        axes = figure.add_subplot()
        every = 1 if last - first <= 7 else 2
        for decade in range(first, last + 1):
            radius = decade - first + INNERMOST
            axes.add_patch(Circle((0.0, 0.0), radius, fill=False, edgecolor=light("rule"), linewidth=0.7))
            if (decade - first) % every == 0:
                label = number(10.0**decade, "Hz", 1)
                axes.annotate(
                    label,
                    (-radius, 0.0),
                    (0, -7),
                    textcoords="offset points",
                    ha="center" if radius > 1.0 else "right",
                    va="top",
                    fontsize=7.5,
                    color=light("muted"),
                )
        axes.axhline(0.0, color=light("muted"), linewidth=0.8)
        axes.axvline(0.0, color=light("muted"), linewidth=0.8)
        _marks(axes, placed, letter=LETTER * span)
        axes.set_xlim(-outermost - 0.25, right_edge)
        axes.set_ylim(-half, half)
        axes.set_aspect("equal")
        axes.set_axis_off()
        axes.text(-outermost - 0.2, -half, "falls off: stable", va="bottom", ha="left", color=light("muted"))
        axes.text(right_edge, -half, "grows", va="bottom", ha="right", color=light("muted"))
        told = "; ".join(f"{root.name} {number(root.size_hz, 'Hz')}" for root in roots)
        return to_svg(figure, key="plane", title=f"Poles and zeros in the s-plane: {told}")


def _marks(axes: Axes, placed: list[tuple[Root, float, float]], *, letter: float) -> None:
    at_origin = [root.name for root, x, y in placed if x == 0.0 and y == 0.0]
    ends: list[float] = []
    for root, x, y in sorted(placed, key=lambda entry: entry[1]):
        if x == 0.0 and y == 0.0 and root.name != at_origin[0]:
            continue
        name = ", ".join(at_origin) if x == 0.0 and y == 0.0 else root.name
        level = 0
        if y == 0.0:
            half = 0.5 * letter * (len(name) + 1)
            level = next((k for k, end in enumerate(ends) if end <= x - half), len(ends))
            ends[level : level + 1] = [x + half]
        for height in {y, -y}:
            axes.plot(
                [x],
                [height],
                marker="x" if root.is_pole else "o",
                markersize=7.0,
                markeredgewidth=1.6,
                markerfacecolor="none",
                color=light("exact" if root.is_pole else "hand"),
                linestyle="none",
            )
        sideways = 2 if x == 0.0 else 0
        axes.annotate(
            name,
            (x, y),
            (sideways, 8 + LINE * level),
            textcoords="offset points",
            ha="left" if sideways else "center",
            va="bottom",
        )
