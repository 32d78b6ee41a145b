"""Poles and zeros with the names that charts and table share: p1, p2 … and z1, z2 … from the lowest upwards."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.record import PoleFacts, Review, ZeroFacts
from tauledger.report.tables.grid import Column, Grid, GridRow, said
from tauledger.report.wording import coefficients, move, number, owners_text, part_titles

# Farther than this from the band a root moves nothing that a reader could measure.
FAR = 50.0
# Of each kind the nearest to the band edges; more names than these nobody tells apart in a picture.
MOST = 24
MAKES_THE_EDGE = 0.5
EFFECT_SHOWN = 0.02
NEXT = 1.5


class Root(Struct, frozen=True):
    """One pole or zero near the band: its name, where it is in Hz, and its row of the record."""

    name: str
    real_hz: float
    imag_hz: float
    facts: PoleFacts | ZeroFacts

    @property
    def size_hz(self) -> float:
        """Distance from the origin in Hz."""
        return math.hypot(self.real_hz, self.imag_hz)

    @property
    def is_pole(self) -> bool:
        """Whether this is a pole."""
        return isinstance(self.facts, PoleFacts)


def band_hz(review: Review) -> tuple[float, float]:
    """Give both band edges in Hz, mid-band standing in for one that does not exist."""
    low = (review.f_low.exact_hz if review.f_low else None) or review.midband.frequency_hz
    high = (review.f_high.exact_hz if review.f_high else None) or review.midband.frequency_hz or math.inf
    return low, high


def near_roots(review: Review) -> tuple[Root, ...]:
    """Name the poles and zeros within a factor of 50 of the band that do not cancel, and zeros at DC; poles first.

    At most 24 of each: those nearest to the band edges.
    """
    low, high = band_hz(review)
    named: list[Root] = []
    for letter, roots in (("p", review.poles), ("z", review.zeros)):
        near: list[PoleFacts | ZeroFacts] = [root for root in roots if not root.cancelled and _near(root, low, high)]
        near.sort(key=lambda root: _away(_size(root), low, high))
        near = sorted(near[:MOST], key=_size)
        named += [Root(f"{letter}{k}", root.real_hz, root.imag_hz, root) for k, root in enumerate(near, start=1)]
    return tuple(named)


def roots_table(review: Review) -> Grid:
    """List poles and zeros near the band: where, by which hand formula, what they do, what sets them."""
    titles = part_titles(review.parts)
    roots = near_roots(review)
    rows = [
        GridRow(
            (
                root.name,
                "DC" if root.size_hz == 0.0 else number(root.size_hz, "Hz"),
                _kind(root),
                _by_hand(root.facts),
                _does(root, review),
                owners_text(root.facts.owners, titles, most=3) if isinstance(root.facts, PoleFacts) else "",
            )
        )
        for root in roots
    ]
    heads = (
        Column("", "l"),
        Column("at"),
        Column("kind", "l"),
        Column("by formula", "l"),
        Column("effect", "l"),
        Column("what sets it", "l"),
    )
    rest = [len(review.poles) - sum(root.is_pole for root in roots)]
    rest.append(len(review.zeros) - len(roots) + sum(root.is_pole for root in roots))
    words = [f"{many} {word}{'s' * (many != 1)}" for many, word in zip(rest, ("pole", "zero"), strict=True) if many]
    notes = [f"Not shown: {' and '.join(words)} that cancel or lie farther off."] if words else []
    if any(root.facts.owners for root in roots if isinstance(root.facts, PoleFacts)):
        notes.append(
            "What sets it: the share of a part in the pole; of 50 %, 1 % less of the part moves it up by 0.5 %."
        )
    if stable_as_drawn(review):
        notes.append("All poles lie in the left half-plane: the circuit is stable at this operating point.")
    return said(Grid("Poles and zeros near the band", heads, tuple(rows), " ".join(notes)))


def stable_as_drawn(review: Review) -> bool:
    """Whether every pole decays; told only where all are known: not with lines, delays or measuring aids."""
    if any(note.note == "measuring-aids" for note in review.notes):
        return False
    known = not any(part.kind == "line" or part.name.endswith(".delay") for part in review.parts)
    delayed = any(owner.part.endswith(".delay") for pole in review.poles for owner in pole.owners)
    return known and not delayed and bool(review.poles) and all(pole.real_hz < 0.0 for pole in review.poles)


def _near(root: PoleFacts | ZeroFacts, low: float, high: float) -> bool:
    size = _size(root)
    if size == 0.0 or (root.real_hz > 0.0 and isinstance(root, PoleFacts)):
        return True
    return low / FAR <= size <= high * FAR


def _away(size: float, low: float, high: float) -> float:
    """Give the distance from the nearer band edge as the logarithm of a ratio; what lies at DC comes first."""
    if size == 0.0:
        return 0.0
    return min((abs(math.log(size / edge)) for edge in (low, high) if 0.0 < edge < math.inf), default=math.log(size))


def _size(root: PoleFacts | ZeroFacts) -> float:
    return math.hypot(root.real_hz, root.imag_hz)


def _kind(root: Root) -> str:
    word = "pole" if root.is_pole else "zero"
    told = f"complex {word} pair, {_quality(root)}" if root.imag_hz else f"real\u00a0{word}"
    if root.real_hz > 0.0:
        told += ", right half-plane" + (": unstable" if root.is_pole else "")
    return told


def _quality(root: Root) -> str:
    return f"Q = {root.size_hz / (2.0 * abs(root.real_hz)):.3g}" if root.real_hz else "undamped"


def _by_hand(root: PoleFacts | ZeroFacts) -> str:
    if not isinstance(root, PoleFacts) or root.hand_hz is None:
        return ""
    return number(root.hand_hz, "Hz") + (f" = {coefficients(root.hand_formula)}" if root.hand_formula else "")


def _does(root: Root, review: Review) -> str:
    effect = root.facts.effect if isinstance(root.facts, PoleFacts) else None
    low, high = band_hz(review)
    if effect is None and root.is_pole and root.imag_hz and review.f_high and high / NEXT < root.size_hz < high * NEXT:
        # its like in the upper network alone lies too far off to tell an effect, and no other pole is at the edge
        return "makes f_H"
    if effect is None or abs(effect) < EFFECT_SHOWN:
        return ""
    edge = "f_L" if review.f_low and root.size_hz**2 < low * high else "f_H"
    return f"makes {edge}" if abs(effect) > MAKES_THE_EDGE else f"without it {edge} {move(effect)}"
