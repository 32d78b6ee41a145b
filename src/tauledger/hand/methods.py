"""The classical methods side by side for each band edge, and which of them this network asks for."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from tauledger.hand.combine import Combined
from tauledger.hand.estimate import Edge, LowerRow, MethodEstimate
from tauledger.quantity import percent

Reasons = Mapping[Edge, str]
NOTHING_LEFT_OUT: Reasons = {}

# Measured over 311 networks: for σ ≤ 1.5 and no zero near the edge the sum of time constants never came out high for
# f_H; with σ < 0.5 and b1²/b2 > 10 it was 0…14 % low, while between 0.5 and 1.5 all poles by hand were within −3…+14 %.
SPLITTING = 0.5
PULLING = 1.5
SEPARATED = 10.0
ZERO_MATTERS = 0.10
AS_GOOD = 0.04
OF_USE = 0.10
BY_LUCK = 0.05
# All poles and zeros are the whole response but for the other edge; lines are judged before.
OUTSIDE = 0.50
UPPER = ("lowest node alone", "all nodes together")
LOWER = ("highest capacitor alone", "all capacitors together")
SIMPLEST = ("sum of time constants", "two coefficients", "root of sum of squares", "weighted sum")


def methods(
    upper: Combined | None,
    lower: Combined | None,
    *,
    upper_hz: float | None,
    lower_hz: float | None,
    upper_weighted_hz: float | None = None,
    lower_weighted_hz: float | None = None,
    left_out: Reasons = NOTHING_LEFT_OUT,
) -> tuple[MethodEstimate, ...]:
    """Give every method's f_H and f_L, the recommended one marked; the last of each edge is the exact one.

    upper, lower: of `combine_upper` and `combine_lower`, None where the hand side is withheld. upper_hz, lower_hz:
    the edges of the full network, None where there is none. An edge without poles has no methods. *_weighted_hz: of
    `weighted_upper` and `weighted_lower`.
    No method is recommended where there is no such edge, where a zero moves it by more than 10 %, as no sum of time
    constants sees zeros, where none comes within 10 % of it, and for an edge in left_out, what no method counts there.
    """
    return (
        *_edge("f_high", upper, upper_hz, upper_weighted_hz, left_out.get("f_high", "")),
        *_edge("f_low", lower, lower_hz, lower_weighted_hz, left_out.get("f_low", "")),
    )


def none_recommended(
    estimates: Sequence[MethodEstimate],
    upper: Combined | None,
    lower: Combined | None,
    left_out: Reasons = NOTHING_LEFT_OUT,
) -> Reasons:
    """Give the reason for each edge that has methods and none of them recommended.

    estimates: of `methods`, from the same upper, lower and left_out.
    """
    found: dict[Edge, str] = {}
    edges: tuple[tuple[Edge, Combined | None, tuple[str, str]], ...] = (
        ("f_high", upper, UPPER),
        ("f_low", lower, LOWER),
    )
    for edge, combined, what in edges:
        told = [row for row in estimates if row.edge == edge]
        if combined is None or not told or any(row.recommended for row in told):
            continue
        by_method = {row.method: row.hz for row in told[:-2]}
        _, reason = _choice(combined, what, by_method, told[-1].hz, left_out.get(edge, ""))
        found |= {edge: reason} if reason else {}
    return found


def weighted_upper(weighted_sum_s: float) -> float | None:
    """Give 1/(2π·Σ w·R·C) in Hz, w = 1 − H(C shorted)/H; None where the sum is not positive.

    Source: Hajimiri, "Generalized time- and transfer-constant circuit analysis", IEEE Trans. Circuits Syst. I 57(6),
    2010.
    """
    return 1.0 / (2.0 * math.pi * weighted_sum_s) if weighted_sum_s > 0.0 else None


def weighted_lower(rows: Sequence[LowerRow]) -> float | None:
    """Give Σ f_k·(1 − H(open)/H(short)) in Hz by hand; None where it is not positive. Source as above, with 1/s."""
    total = math.fsum(
        row.edge_hand_hz * (1.0 - row.zero_hz / row.edge_exact_hz)
        for row in rows
        if row.in_path and row.edge_exact_hz > 0.0
    )
    return total if total > 0.0 else None


def recommended(combined: Combined) -> str | None:
    """Name the simplest method that suits the network, None where a zero near the edge defeats them all.

    σ < 0.5 and b1²/b2 > 10: the sum of time constants, simple and on the safe side. 0.5 ≤ σ ≤ 1.5: all time constants
    as separate poles, unless the dominant ones are complex. Otherwise, and where poles are hidden under zeros, the two
    coefficients.
    """
    if not combined.stable or combined.all_poles is None or combined.with_zeros is None:
        return None
    if abs(combined.with_zeros / combined.all_poles - 1.0) > ZERO_MATTERS:
        return None
    sigma = combined.sigma
    if combined.hidden:
        return "two coefficients"
    if sigma is not None and SPLITTING <= sigma <= PULLING and not combined.complex_pair:
        return "all together"
    # Where one time constant counts, a negative b2 comes only from rounding of a single pole.
    dominant = combined.coefficients.separation > SEPARATED or combined.coefficients.b2 <= 0
    if (sigma is None or sigma < SPLITTING) and dominant:
        return "sum of time constants"
    return "two coefficients"


def _edge(
    edge: Edge, combined: Combined | None, exact_hz: float | None, weighted_hz: float | None, left_out: str
) -> tuple[MethodEstimate, ...]:
    if combined is None or len(combined.roots.poles) == 0:
        return ()
    what = UPPER if edge == "f_high" else LOWER
    estimates = (
        (what[0], "", combined.lowest),
        (what[1], "all together", combined.all_nodes),
        ("sum of time constants", "sum of time constants", combined.sum_of_constants),
        ("weighted sum", "", weighted_hz),
        ("root of sum of squares", "", combined.root_sum_of_squares),
        ("two coefficients", "two coefficients", combined.two_coefficients),
        ("all poles", "", combined.all_poles),
        ("exact", "", exact_hz),
    )
    choice, _ = _choice(combined, what, {name: hz for name, _, hz in estimates}, exact_hz, left_out)
    return tuple(MethodEstimate(edge, name, hz, name == choice) for name, _, hz in estimates)


def _choice(
    combined: Combined, what: tuple[str, str], hz: Mapping[str, float | None], exact_hz: float | None, left_out: str
) -> tuple[str | None, str]:
    """Give the recommended method, or None and the reason; no reason where there is no edge to speak of."""
    if exact_hz is None or left_out:
        return None, left_out
    condition = recommended(combined)
    if condition is None:
        return None, _defeated(combined)
    names = {"all together": what[1]}
    choice = names.get(condition, condition)
    judged = _judged(choice, hz, what[1], exact_hz)
    return judged, "" if judged is not None else _misses(combined, what, hz, exact_hz)


def _defeated(combined: Combined) -> str:
    """Say what no sum of time constants sees: the reason why the conditions recommend nothing."""
    if not combined.stable:
        return "a pole lies in the right half plane"
    if combined.all_poles is None or combined.with_zeros is None:
        return "with its zeros the response never falls 3 dB, which no time constant sees"
    moved = combined.with_zeros / combined.all_poles - 1.0
    return f"a zero near the edge moves it by {percent(moved)}, which no time constant sees"


def _misses(combined: Combined, what: tuple[str, str], hz: Mapping[str, float | None], exact_hz: float) -> str:
    """Say why the method that the conditions ask for is none: by luck another is right, or none comes near."""
    off = {name: f / exact_hz - 1.0 for name, f in hz.items() if f is not None}
    alone = what[0]
    best = min((name for name in off if name in (*SIMPLEST, what[1])), key=lambda name: abs(off[name]))
    if alone in off and abs(off[alone]) <= OF_USE and abs(off[alone]) < abs(off[best]):
        return (
            f"{alone} is {percent(off[alone])} off by luck, its errors cancel; {best}, the nearest that has a reason, "
            f"is {percent(off[best])} off"
        )
    why = _why_far(combined)
    if combined.with_zeros is not None and abs(combined.with_zeros / exact_hz - 1.0) > OUTSIDE:
        why = f"what poles and zeros leave out sets the edge, they give {percent(combined.with_zeros / exact_hz - 1.0)}"
    return f"{why}; {best}, the nearest, is {percent(off[best])} off"


def _why_far(combined: Combined) -> str:
    sigma, poles = combined.sigma, combined.roots.poles
    if combined.hidden:
        return "the output does not see all poles"
    if combined.complex_pair:
        q = combined.coefficients.q
        third = " and a third pole counts" if len(poles) > 2 else ""
        return f"the poles are a complex pair{'' if q is None else f' (Q = {q:.2g} from two coefficients)'}{third}"
    if sigma is not None and sigma > PULLING:
        return f"the time constants pull each other (σ = {sigma:.2g})"
    return f"more than two of {len(poles)} poles count" if len(poles) > 2 else "the zeros count"


def _judged(choice: str, hz: Mapping[str, float | None], together: str, exact_hz: float) -> str | None:
    """Judge what the conditions recommend by this network: they were measured over many, it may be an odd one.

    Where another of the methods misses by 4 % of f less, the simplest of those within 4 % of the best takes its place.
    None where even that misses by more than 10 %, or where the dominant time constant alone, which no condition
    recommends, is right by 5 % more: errors cancel there, and no method is to be trusted for it.
    """
    miss = {name: math.inf if f is None else abs(f / exact_hz - 1.0) for name, f in hz.items()}
    simplest_first = (SIMPLEST[0], together, *SIMPLEST[1:])
    best = min(miss[name] for name in simplest_first)
    if miss[choice] > best + AS_GOOD:
        choice = next(name for name in simplest_first if miss[name] <= best + AS_GOOD)
    alone = min(miss[name] for name in hz if name.endswith("alone"))
    return None if miss[choice] > OF_USE or alone < miss[choice] - BY_LUCK else choice
