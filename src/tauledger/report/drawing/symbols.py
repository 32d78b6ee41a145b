"""Symbols after IEC 60617, each a piece of SVG: a resistor is a rectangle, sources are circles with a bar.

A controlled source is drawn as a rhombus, as is common practice; IEC 60617 leaves its outline open.
All coordinates are in px; y grows downwards.
"""

from __future__ import annotations

from tauledger.report.charts.style import escape

ROOM_TO_READ = 13.0


def wire(*points: tuple[float, float]) -> str:
    """Give a wire through the points."""
    path = " ".join(f"{x:g},{y:g}" for x, y in points)
    return f'<polyline class="wire" points="{path}"/>'


def dot(x: float, y: float) -> str:
    """Give the dot of a junction."""
    return f'<circle class="dot" cx="{x:g}" cy="{y:g}" r="3"/>'


def resistor_across(x: float, y: float, length: float) -> str:
    """Give a horizontal resistor that starts at (x, y), with its leads."""
    body, lead = 44.0, (length - 44.0) / 2.0
    return (
        wire((x, y), (x + lead, y))
        + f'<rect class="body" x="{x + lead:g}" y="{y - 8:g}" width="{body:g}" height="16"/>'
        + wire((x + lead + body, y), (x + length, y))
    )


def resistor_down(x: float, top: float, bottom: float) -> str:
    """Give a vertical resistor between two rails."""
    middle = (top + bottom) / 2.0
    return (
        wire((x, top), (x, middle - 22))
        + f'<rect class="body" x="{x - 8:g}" y="{middle - 22:g}" width="16" height="44"/>'
        + wire((x, middle + 22), (x, bottom))
    )


def capacitor_down(x: float, top: float, bottom: float) -> str:
    """Give a vertical capacitor between two rails."""
    middle = (top + bottom) / 2.0
    return (
        wire((x, top), (x, middle - 4))
        + f'<path class="plate" d="M{x - 15:g} {middle - 4:g}H{x + 15:g}M{x - 15:g} {middle + 4:g}H{x + 15:g}"/>'
        + wire((x, middle + 4), (x, bottom))
    )


def voltage_source(x: float, top: float, bottom: float) -> str:
    """Give an ideal voltage source between two rails, plus at the top: a circle with the wire through it."""
    middle = (top + bottom) / 2.0
    return (
        wire((x, top), (x, bottom))
        + f'<circle class="outline" cx="{x:g}" cy="{middle:g}" r="17"/>'
        + text(x - 23, middle - 12, "+", "end")
    )


def controlled_current(x: float, top: float, bottom: float, *, down: bool) -> str:
    """Give a controlled current source between two rails: a rhombus with a bar across; the arrow says which way."""
    middle = (top + bottom) / 2.0
    tip, tail = (middle + 13, middle - 13) if down else (middle - 13, middle + 13)
    head = 6.0 if down else -6.0
    return (
        wire((x, top), (x, middle - 21))
        + f'<polygon class="body" points="{x:g},{middle - 21:g} {x + 17:g},{middle:g} {x:g},{middle + 21:g} '
        + f'{x - 17:g},{middle:g}"/>'
        + f'<path class="wire" d="M{x - 17:g} {middle:g}H{x + 17:g}"/>'
        + wire((x - 25, tail), (x - 25, tip))
        + wire((x - 29, tip - head), (x - 25, tip), (x - 21, tip - head))
        + wire((x, middle + 21), (x, bottom))
    )


def ground(x: float, y: float) -> str:
    """Give the sign of the reference node."""
    return wire((x, y), (x, y + 7)) + f'<path class="plate" d="M{x - 11:g} {y + 7:g}H{x + 11:g}"/>'


def text(x: float, y: float, words: str, anchor: str = "start", *, kind: str = "") -> str:
    """Give a line of text; y is its middle. kind: "", "strong" or "quiet"."""
    style = f' class="{kind}"' if kind else ""
    return f'<text x="{x:g}" y="{y + 4:g}" text-anchor="{anchor}"{style}>{escape(words)}</text>'


def lines(x: float, y: float, words: tuple[str, ...]) -> str:
    """Give lines of text below each other, the first in strong letters, centred about y."""
    start = y - ROOM_TO_READ * (len(words) - 1) / 2.0
    return "".join(text(x, start + ROOM_TO_READ * k, line, kind="" if k else "strong") for k, line in enumerate(words))
