"""What of the responses is shown: the frequencies around the band, and phases counted from the same turn."""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.record import Curves, Review, known_hz

BEYOND = 300.0
FAR_BELOW = 1e4
# So much beyond f_u where the report is about unity gain.
BEYOND_UNITY = 10.0
# The phase of a line runs on without end; this much of it, from mid-band, is about the band.
MOST_DEG = 900.0


class ShownCurve(Struct, frozen=True):
    """One response at the frequencies that are shown: its colour's name, how it is called, dB and degrees (k,)."""

    name: str
    label: str
    magnitude_db: tuple[float, ...]
    phase_deg: tuple[float, ...]


class Shown(Struct, frozen=True):
    """The frequencies that are shown (k,) in Hz with the responses, and the ends of their axis."""

    first_hz: float
    last_hz: float
    frequency_hz: tuple[float, ...]
    curves: tuple[ShownCurve, ...]


def shown(review: Review, *, exact: bool = False) -> Shown | None:
    """Give what is shown; None where there are no curves.

    exact: the exact response too; else only where nothing was simulated, for the two lie on each other.
    """
    curves = review.curves
    if curves is None or len(curves.frequency_hz) < 2:
        return None
    first, last = _range(review, curves)
    at = [k for k, f in enumerate(curves.frequency_hz) if first <= f <= last]
    exact_db = curves.exact_db if exact or curves.simulated_db is None else None
    rows = (
        ("hand", "by hand, a pole for each node", curves.hand_db, curves.hand_deg),
        ("exact", "exact", exact_db, curves.exact_deg),
        ("simulated", "simulated", curves.simulated_db, curves.simulated_deg),
    )
    middle = nearest(curves.frequency_hz, review.midband.frequency_hz)
    found = []
    for name, label, magnitude, phase in rows:
        if magnitude is not None and phase is not None:
            turns = turns_deg(review, phase[middle])
            found.append(ShownCurve(name, label, tuple(magnitude[k] for k in at), tuple(phase[k] + turns for k in at)))
    return Shown(first, last, tuple(curves.frequency_hz[k] for k in at), tuple(found))


def turns_deg(review: Review, at_midband_deg: float) -> float:
    """Give the whole turns, in degrees, by which a phase comes to that of the mid-band gain."""
    return 360.0 * round((midband_deg(review) - at_midband_deg) / 360.0)


def midband_deg(review: Review) -> float:
    """Give the phase of the mid-band gain, from -180 to 180 degrees."""
    return math.degrees(math.atan2(review.midband.gain_imag, review.midband.gain_real))


def nearest(frequency_hz: tuple[float, ...], hz: float) -> int:
    """Give the place of the frequency next to `hz`; of the first one for DC."""
    wanted = hz or frequency_hz[0]
    return min(range(len(frequency_hz)), key=lambda k: abs(math.log(frequency_hz[k] / wanted)))


def unity_shown(review: Review) -> bool:
    """Whether the report has a section on unity gain."""
    return review.f_unity is not None and bool(review.f_unity.elements)


def unity_hz(review: Review) -> float | None:
    """Give the unity gain frequency where the report has a section on it."""
    return known_hz(review.f_unity) if unity_shown(review) else None


def edge_places(review: Review) -> list[tuple[str, float]]:
    """Give the band edges by name in Hz, simulated ones where there are."""
    places = []
    for name, edge in (("f_L", review.f_low), ("f_H", review.f_high)):
        hz = known_hz(edge)
        if hz is not None:
            places.append((name, hz))
    return places


def _range(review: Review, curves: Curves) -> tuple[float, float]:
    """Show the band with room around it rather than every decade of the sweep."""
    first, last = curves.frequency_hz[0], curves.frequency_hz[-1]
    places = dict(edge_places(review))
    if "f_L" in places:
        first = max(first, places["f_L"] / BEYOND)
    elif "f_H" in places:
        first = max(first, places["f_H"] / FAR_BELOW)
    if "f_H" in places:
        last = min(last, places["f_H"] * BEYOND)
    f_u = unity_hz(review)
    if f_u is not None:
        last = min(max(last, BEYOND_UNITY * f_u), curves.frequency_hz[-1])
    return (first, last) if first < last else (curves.frequency_hz[0], curves.frequency_hz[-1])
