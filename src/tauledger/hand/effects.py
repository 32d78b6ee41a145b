"""What each pole does to the band edge: where the edge would lie were the pole not there."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from tauledger.hand.combine import Complex, Roots, first_fall


def pole_effects(roots: Roots, *, lower: bool) -> Mapping[complex, float]:
    """Give for every visible pole (of a pair the one above the axis) f_edge(without it)/f_edge − 1.

    roots: of the upper network, or of the lower one. Empty where the response does not fall 3 dB on this side; a pole
    without which it would not is left out. The members of a pair are taken out together.
    """
    poles = roots.poles[roots.poles != 0]
    zeros = roots.zeros[roots.zeros != 0]
    edge = _edge(poles, zeros, lower=lower)
    if edge is None:
        return {}
    effects = {}
    for pole in (complex(pole) for pole in poles if pole.imag >= 0):
        left = poles[(poles != pole) & (poles != np.conj(pole))]
        without = _edge(left, zeros, lower=lower)
        if without is not None:
            effects[pole] = without / edge - 1.0
    return effects


def _edge(poles: Complex, zeros: Complex, *, lower: bool) -> float | None:
    if not lower:
        return first_fall(poles, zeros)
    omega = first_fall(1.0 / poles, 1.0 / zeros)
    return None if omega is None else 1.0 / omega
