"""What a small change of one element does to both band edges and the mid-band gain, to first order and exactly.

∂ln H/∂ln v = −v·(λᵀ out)(controlᵀ x)/H for a part v·out·controlᵀ of Y (times s for a reactive one); the edge f_c moves
by ∂ln f_c/∂ln v = −[Re ∂ln H(f_c)/∂ln v − Re ∂ln H(f_mid)/∂ln v] / (d ln|H|/d ln f at f_c), f_mid held (at a
maximum of |H|, which moves, that is the same to first order). Of coupled inductors k is held, so that M follows.

Source: Director and Rohrer, "The generalized adjoint network and network sensitivities", IEEE Trans. Circuit Theory
CT-16(3), 1969.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
from msgspec import Struct

from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, incidence
from tauledger.network.edges import HALF_POWER, Edges
from tauledger.network.lines import line_moments
from tauledger.network.midband import MidBand, in_changed
from tauledger.network.reactances import at_held_coupling, moments, reactances, together
from tauledger.network.recompute import edge_frequencies, scaled
from tauledger.network.solve import Real, log_slope, on_axis, solve

RESISTIVE = ("conductance", "transconductance", "delayed transconductance")
# Newton's step in ln f; the next one is its square.
CONVERGED = 1e-6
STEPS = 8


class Sensitivity(Struct, frozen=True):
    """∂ln f_H, ∂ln f_L and ∂ln|H_mid| over ∂ln of one part's value (S, F, H); None for an edge that does not exist."""

    f_high: float | None
    f_low: float | None
    gain: float


class Recomputed(Struct, frozen=True):
    """Both band edges in Hz and |H| at mid-band, exact; None for an edge that does not exist."""

    f_high: float | None
    f_low: float | None
    gain: float


def sensitivities(network: Network, midband: MidBand, edges: Edges, parts: Iterable[Part]) -> Mapping[str, Sensitivity]:
    """Give the sensitivity to every reactive part, line, and (trans)conductance among `parts`, by part name.

    Raises NetworkError where the network has no unique solution.
    """
    found = [edge.hz if edge is not None else None for edge in (edges.f_high, edges.f_low)]
    mid = midband.frequency_hz
    at = solve(network, on_axis(np.array([mid, *(mid if hz is None else hz for hz in found)])))
    slope = log_slope(network, at).real
    terms = reactances(network)
    reactive = np.array([together(terms, row) for row in -at.s[:, None] * moments(terms, at)])
    of_parts = {part.name: reactive[:, k] for k, part in enumerate(terms.distinct)}
    moved = {name: change.real for name, change in at_held_coupling(terms.distinct, of_parts).items()}
    moved |= {name: (-at.s * moment / at.response).real for name, moment in line_moments(network, at).items()}
    for part in parts:
        if part.kind not in RESISTIVE or not part.value:
            continue
        out = at.adjoint @ incidence(network, part.nodes[0], part.nodes[1])
        control = at.x @ incidence(network, part.nodes[-2], part.nodes[-1])
        moved[part.name] = (-part.value * np.exp(-at.s * part.delay_s) * out * control / at.response).real

    def of_edge(change: Real, k: int) -> float | None:
        return None if found[k - 1] is None or not slope[k] else -float((change[k] - change[0]) / slope[k])

    return {
        name: Sensitivity(of_edge(change, 1), of_edge(change, 2), float(change[0])) for name, change in moved.items()
    }


def rerun(network: Network, midband: MidBand, edges: Edges, factors: Mapping[str, float]) -> Recomputed:
    """Give band edges and gain with the named parts' values multiplied: the exact answer for a change of some per cent.

    Each edge is followed from where it was by Newton's method on ln|H|; where that leads nowhere, it is searched for.
    Raises NetworkError where the network has no unique solution, KeyError where a name belongs to no part.
    """
    changed = scaled(network, factors)
    reference = in_changed(changed, midband)
    gain = abs(reference.gain)
    if network.lines:
        # the first of many crossings may be another one now
        both = edge_frequencies(changed, midband)
        return Recomputed(both.f_high, both.f_low, gain)
    starts = [edge.hz if edge is not None else None for edge in (edges.f_high, edges.f_low)]
    # the edges of a resonance go with its maximum
    moved = reference.frequency_hz / midband.frequency_hz if midband.maximum else 1.0
    known = moved * np.array([hz for hz in starts if hz is not None])
    followed = follow_level(changed, HALF_POWER * gain, known) if len(known) else known
    if followed is None:
        both = edge_frequencies(changed, midband)
        return Recomputed(both.f_high, both.f_low, gain)
    hz = iter(followed.tolist())
    f_high, f_low = (None if start is None else float(next(hz)) for start in starts)
    return Recomputed(f_high, f_low, gain)


def follow_level(network: Network, level: float, start_hz: Real) -> Real | None:
    """Follow |H| = level from every start_hz (k,), in Hz; None where steps do not get small or lead off by a factor 2.

    Raises NetworkError where the network has no unique solution.
    """
    start = np.log(start_hz)
    u = start.copy()
    for _ in range(STEPS):
        at = solve(network, on_axis(np.exp(u)))
        slope = log_slope(network, at).real
        if not np.all(slope):
            return None
        step = -np.log(np.abs(at.response) / level) / slope
        u = u + step
        if np.any(np.abs(u - start) > np.log(2.0)):
            return None
        if np.all(np.abs(step) < CONVERGED):
            return np.asarray(np.exp(u), dtype=np.float64)
    return None
