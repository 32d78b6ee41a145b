"""The frequency cursor of the page: what it says at each of its places, every number worked out there, none between.

Its places are frequencies of the sweep: from mid-band up those at which Miller's factor is known, elsewhere thinned.
"""

from __future__ import annotations

import cmath
import json
import math

from msgspec import Struct

from tauledger.record import MillerCurve, Review
from tauledger.report.shown import MOST_DEG, Shown, edge_places, midband_deg, shown
from tauledger.report.wording import NO_NUMBER, number, part_titles

EVERY = 3
# From here on three digits would be written with a power of ten.
THOUSAND = 999.5


class Factor(Struct, frozen=True):
    """One capacitance between two nodes: its part, its title, the node from which it is seen, 1 − K at mid-band."""

    part: str
    title: str
    node: str
    midband: str


class Cursor(Struct, frozen=True):
    """What the page shows at one frequency after the other.

    start: the place to begin at, next to f_H. curves: the responses by name. factors: the capacitances.
    places: as a fraction of the frequency axis (k,). texts: at each place the frequency, then gain and phase of every
    curve, then size and angle of every 1 − K.
    """

    start: int
    curves: tuple[str, ...]
    factors: tuple[Factor, ...]
    places: tuple[float, ...]
    texts: tuple[tuple[str, ...], ...]

    @property
    def data(self) -> str:
        """Give places and texts as JSON that may stand inside a script."""
        rows = {"places": [round(place, 5) for place in self.places], "texts": self.texts}
        return json.dumps(rows, ensure_ascii=False, separators=(",", ":")).replace("<", "\\u003c")


def cursor(review: Review) -> Cursor | None:
    """Give the cursor; None where there is no response to read."""
    seen = shown(review, exact=True)
    if seen is None or not seen.curves:
        return None
    curves = review.miller.curves if review.miller is not None else ()
    known = review.miller.frequency_hz if review.miller is not None else ()
    titles, rows = part_titles(review.parts), {node.name: node.title for node in review.nodes}
    at = _places(seen, known)
    log = [math.log(hz) for hz in (seen.first_hz, seen.last_hz)]
    edge = dict(edge_places(review)).get("f_H", review.midband.frequency_hz or seen.first_hz)
    return Cursor(
        start=min(range(len(at)), key=lambda k: abs(math.log(seen.frequency_hz[at[k]] / edge))),
        curves=tuple(curve.label.partition(",")[0] for curve in seen.curves),
        factors=tuple(
            Factor(curve.part, titles.get(curve.part, curve.part), _seen_from(curve, rows), _size(curve.factor))
            for curve in curves
        ),
        places=tuple((math.log(seen.frequency_hz[k]) - log[0]) / (log[1] - log[0]) for k in at),
        texts=tuple(_texts(seen, k, curves, known, midband_deg(review)) for k in at),
    )


def _places(seen: Shown, known: tuple[float, ...]) -> list[int]:
    """Choose among the shown frequencies those with a factor, and every third of those outside of their range."""
    wanted = set(known)
    ends = (known[0], known[-1]) if known else (math.inf, -math.inf)
    return [
        k for k, hz in enumerate(seen.frequency_hz) if (hz in wanted if ends[0] <= hz <= ends[1] else k % EVERY == 0)
    ]


def _seen_from(curve: MillerCurve, rows: dict[str, str]) -> str:
    return rows.get(curve.row, curve.row) if curve.node == curve.row else curve.node


def _texts(
    seen: Shown, k: int, curves: tuple[MillerCurve, ...], known: tuple[float, ...], midband: float
) -> tuple[str, ...]:
    """Write what is known there; the turns of a phase far from mid-band are not counted between two frequencies."""
    texts = [number(seen.frequency_hz[k], "Hz")]
    for curve in seen.curves:
        beyond = curve.phase_deg[k] - midband
        phase = f"{_signed(curve.phase_deg[k], 1)}°" if abs(beyond) <= MOST_DEG else NO_NUMBER
        texts += [_level(curve.magnitude_db[k]), phase]
    there = known.index(seen.frequency_hz[k]) if seen.frequency_hz[k] in known else None
    for row in curves:
        if there is None:
            texts += [NO_NUMBER, NO_NUMBER]
            continue
        size, angle = cmath.polar(complex(row.factor_real[there], row.factor_imag[there]))
        texts += [_size(size), f"{_signed(math.degrees(angle), 0)}°"]
    return tuple(texts)


def _size(factor: float) -> str:
    return f"{factor:.0f}" if abs(factor) >= THOUSAND else number(factor, "", 3)


def _level(db: float) -> str:
    return f"{_signed(db, 2)} dB"


def _signed(value: float, decimals: int) -> str:
    """Write with a true minus, and no minus before a zero."""
    text = f"{value:.{decimals}f}"
    return text.replace("-", "−" if float(text) else "")
