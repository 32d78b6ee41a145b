"""Poles and zeros: those near the band with their hand value, their effect and what sets them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from tauledger.record import PoleFacts, Review, ZeroFacts
from tauledger.report.layout import HEADING, Block, Prose, Section
from tauledger.report.wording import coefficients, move, number, owners_text, part_titles

_POLES = 6
_NEAR, _FAR = 5.0, 50.0
_EFFECT_SHOWN = 0.02
_MAKES_THE_EDGE = 0.5
_USED_DEG = 2.0


def poles_and_zeros(review: Review, *, verbose: bool = False) -> Section:
    """List the poles near the band with their hand value, their effect and what sets them, then the zeros."""
    titles = part_titles(review.parts)
    poles = _shown_poles(review, verbose=verbose)
    zeros = _shown_zeros(review, verbose=verbose)
    if not poles and not zeros:
        return Section(())
    blocks: list[Block] = [Prose("POLES AND ZEROS, and what sets them", style=HEADING)]
    places = [number(_size(pole), "Hz") for pole in poles]
    size = max(map(len, places), default=0)
    for pole, place in zip(poles, places, strict=True):
        kind = "pair" if pole.imag_hz else "pole"
        blocks.append(Prose(_about(pole, review, titles), lead=f"  {kind} {place:>{size}}  "))
    rest = "; ".join(filter(None, (_zeros_text(zeros), _hidden(review, len(poles), len(zeros)))))
    if rest:
        blocks.append(Prose(rest, lead="  "))
    return Section(tuple(blocks))


def _shown_poles(review: Review, *, verbose: bool) -> list[PoleFacts]:
    """Choose the poles within a factor of 5 of a band edge, and two on either side of mid-band within 50."""
    ordered = sorted(review.poles, key=_size)
    if verbose:
        return ordered
    low, high = _band(review)
    # without a lower edge every pole belongs to the upper one, and the other way round
    centre = math.sqrt(low * high) if low > 0.0 else 0.0
    visible = [pole for pole in ordered if not pole.cancelled and _size(pole) > 0.0]
    below = [pole for pole in reversed(visible) if _size(pole) < centre]
    above = [pole for pole in visible if _size(pole) >= centre]
    chosen = []
    for side, edge in ((below, low), (above, high)):
        for rank, pole in enumerate(side):
            away = abs(math.log(_size(pole) / edge)) if 0.0 < edge < math.inf else math.inf
            if away <= math.log(_NEAR) or (rank < 2 and away <= math.log(_FAR)) or pole.real_hz > 0.0:
                chosen.append((away, pole))
    nearest = [pole for _, pole in sorted(chosen, key=lambda entry: entry[0])[:_POLES]]
    at_unity = _using_phase(review)
    nearest += [pole for pole in visible if (pole.real_hz, pole.imag_hz) in at_unity and pole not in nearest]
    return sorted(nearest, key=_size)


def _using_phase(review: Review) -> set[tuple[float, float]]:
    """Give the places of the poles that use more than 2° of the phase at unity gain: none of them is far off."""
    rows = review.phase_budget.rows if review.phase_budget is not None else ()
    return {(row.real_hz, row.imag_hz) for row in rows if row.kind == "pole" and abs(row.used_deg) > _USED_DEG}


def _shown_zeros(review: Review, *, verbose: bool) -> list[ZeroFacts]:
    ordered = sorted(review.zeros, key=_size)
    if verbose:
        return ordered
    low, high = _band(review)
    return [
        zero
        for zero in ordered
        if not zero.cancelled and (_size(zero) == 0.0 or low / _FAR <= _size(zero) <= high * _FAR)
    ]


def _size(root: PoleFacts | ZeroFacts) -> float:
    return math.hypot(root.real_hz, root.imag_hz)


def _band(review: Review) -> tuple[float, float]:
    """Give both band edges, mid-band standing in for one that does not exist."""
    low = (review.f_low.exact_hz if review.f_low else None) or review.midband.frequency_hz
    high = (review.f_high.exact_hz if review.f_high else None) or review.midband.frequency_hz or math.inf
    return low, high


def _zero(zero: ZeroFacts) -> str:
    at = number(_size(zero), "Hz") + (" (right half-plane)" if zero.real_hz > 0.0 else "")
    return f"pair {at}, {_quality(zero)}" if zero.imag_hz else at


def _quality(root: PoleFacts | ZeroFacts) -> str:
    return f"Q {_size(root) / (2.0 * abs(root.real_hz)):.3g}" if root.real_hz else "undamped"


def _zeros_text(zeros: Sequence[ZeroFacts]) -> str:
    at_dc = sum(_size(zero) == 0.0 for zero in zeros)
    told = [f"{at_dc} at DC"] if at_dc else []
    told += [_zero(zero) for zero in zeros if _size(zero) > 0.0]
    return f"{'zeros' if len(zeros) > 1 else 'zero'} {', '.join(told)}" if told else ""


def _about(pole: PoleFacts, review: Review, titles: Mapping[str, str]) -> str:
    told = []
    if pole.imag_hz:
        told.append(_quality(pole))
    if pole.real_hz > 0.0:
        told.append("right half-plane: unstable")
    if pole.hand_hz is not None:
        formula = f" ({coefficients(pole.hand_formula)})" if pole.hand_formula else ""
        told.append(f"hand {number(pole.hand_hz, 'Hz')}{formula}")
    if pole.effect is not None and abs(pole.effect) >= _EFFECT_SHOWN:
        low, high = _band(review)
        edge = "f_L" if review.f_low and _size(pole) ** 2 < low * high else "f_H"
        makes = abs(pole.effect) > _MAKES_THE_EDGE
        told.append(f"makes {edge}" if makes else f"without it {edge} {move(pole.effect)}")
    owners = owners_text(pole.owners, titles)
    if owners:
        told.append(owners)
    if pole.cancelled:
        told.append("cancelled by a zero")
    return "; ".join(told)


def _hidden(review: Review, poles: int, zeros: int) -> str:
    """Count what is not shown, so that nobody takes the list for all of them."""
    more_poles, more_zeros = len(review.poles) - poles, len(review.zeros) - zeros
    told = [
        f"{many} {word}{'' if many == 1 else 's'}"
        for many, word in ((more_poles, "pole"), (more_zeros, "zero"))
        if many
    ]
    if not told:
        return ""
    one = more_poles + more_zeros == 1
    return f"{' and '.join(told)} {'cancels or lies' if one else 'cancel or lie'} far off"
