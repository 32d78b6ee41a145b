"""What to do instead of a figure: the recommended way, or another that comes nearer to the edge than the figure."""

from __future__ import annotations

import math

from tauledger.causes.evidence import EdgeEvidence, in_hertz

# A way by hand that misses by more is no advice; the same bound as for recommending one.
OF_USE = 0.10
SAME = 0.01
WORDS = {
    "f_high": {
        "sum of time constants": "add the time constant of every node: their sum gives",
        "all nodes together": "take every node, each with a pole of its own:",
        "two coefficients": "take both coefficients, b1 and b2: they give",
        "root of sum of squares": "take 1/√(Σ1/p² − 2·Σ1/z²): it gives",
        "weighted sum": "add the time constants, each weighted by the part of the gain that it takes:",
    },
    "f_low": {
        "sum of time constants": "add the edge of every capacitor: their sum gives",
        "all capacitors together": "take every capacitor, each with a pole of its own:",
        "two coefficients": "take both coefficients, a1 and a2: they give",
        "root of sum of squares": "take √(Σp² − 2·Σz²): it gives",
        "weighted sum": "add the edges of the capacitors, each weighted by the part of the gain that it takes:",
    },
}


def advice(edge: EdgeEvidence, criticised_hz: float) -> str:
    """Say which way comes nearer to the edge than the criticised figure (Hz), with what it gives.

    The recommended one where it does; else the simplest of those by hand that is right within 10 %; else the poles
    (and zeros) themselves; where all of them lead further off, the causes are to be counted together.
    """
    chosen = edge.recommended
    if chosen is not None and chosen.hz is not None and nearer(edge, chosen.hz, criticised_hz):
        return f"{WORDS[edge.edge][chosen.method]} {in_hertz(chosen.hz)}"
    combined = edge.combined
    if combined is None:
        return "count it together with the other causes: taken alone it leads further off"
    together = "all nodes together" if edge.edge == "f_high" else "all capacitors together"
    before = miss(edge, criticised_hz)
    for method, hz in (
        ("sum of time constants", combined.sum_of_constants),
        (together, combined.all_nodes),
        ("two coefficients", combined.two_coefficients),
    ):
        if hz is not None and not _same(hz, criticised_hz) and miss(edge, hz) < min(before, math.log1p(OF_USE)):
            return f"{WORDS[edge.edge][method]} {in_hertz(hz)}"
    for what, hz in (("all poles", combined.all_poles), ("poles and zeros", combined.with_zeros)):
        if hz is not None and miss(edge, hz) < min(before, math.log1p(OF_USE)):
            return f"find the -3 dB frequency from {what} together: {in_hertz(hz)}"
    return "count it together with the other causes: taken alone it leads further off"


def _same(hz: float, criticised_hz: float) -> bool:
    """Whether a way gives what the criticised figure gives: no advice against that."""
    return abs(math.log(hz / criticised_hz)) < SAME


def miss(edge: EdgeEvidence, hz: float | None) -> float:
    """Give |ln(hz/edge)|, the edge with lines as at DC if there are any, as all figures by hand have them.

    Infinite where one of them is missing.
    """
    target = edge.hz if edge.at_rest_hz is None else edge.at_rest_hz
    return math.inf if hz is None or target is None else abs(math.log(hz / target))


def nearer(edge: EdgeEvidence, hz: float | None, criticised_hz: float | None) -> bool:
    """Say whether hz comes nearer to the edge than the criticised figure."""
    return miss(edge, hz) < miss(edge, criticised_hz)
