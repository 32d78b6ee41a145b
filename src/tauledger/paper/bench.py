"""The circuit worked once more with something changed: what a designer who made that slip would have got.

Resistances and gains are taken from the changed mid-band network, which is what the looking-in rules give; time
constants are formed from them as on paper, with Miller's factors.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.errors import NetworkError
from tauledger.hand.combine import (
    coefficients,
    first_fall,
    root_sum_of_squares_edge,
    two_pole_edge,
    visible_roots,
)
from tauledger.hand.estimate import HandEstimate, InnerLine, MillerTerm, SignalNode
from tauledger.hand.halves import counted, images
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import Bands
from tauledger.network.lower import short_constants
from tauledger.network.spectrum import pole_frequencies, zero_frequencies

FAR_END = "1 + 1/|A|"

Edit = Mapping[str, float]


class Split(Struct, frozen=True):
    """What a factor may depend on: the capacitance, K driven from its node (of the changed network), the overall gain.

    far_end: it is counted at the far end of an inverting stage, with K the gain from there. grounded: at AC ground.
    """

    part: str
    gain: float
    overall: float
    far_end: bool
    grounded: bool
    mirrored: bool


Factor = Callable[[Split], float]


class AtNode(Struct, frozen=True):
    """One signal node worked again: ohm, F, s, and K of the capacitance that `bridging` gives (None: none).

    capacitance: time_constant/resistance. plain: the sum of the parts with their factors, those behind r_b in full.
    miller_factor: that of the capacitance with `miller_gain`, as the slip has it.
    """

    resistance: float
    capacitance: float
    plain: float
    time_constant: float
    miller_gain: float | None
    miller_factor: float | None


class Worked(Struct, frozen=True):
    """The whole worked again. nodes: by name. gain: overall. edges: by edge and method, Hz."""

    nodes: Mapping[str, AtNode]
    gain: float
    edges: Mapping[tuple[str, str], float]


def miller_factor(split: Split) -> float:
    """Give the factor that is right: 1 − K at the driven end, 1 + 1/|A| at the far end, 1 to AC ground."""
    if split.grounded:
        return 1.0
    if split.mirrored:
        return 2.0
    if split.far_end:
        return 1.0 - 1.0 / split.gain if split.gain < 0.0 else 1.0
    return 1.0 - split.gain


def work(
    bands: Bands, hand: HandEstimate, edit: Edit, factor: Factor = miller_factor, *, halves: bool = True
) -> Worked | None:
    """Work the circuit with the values of some parts multiplied and Miller's factors by `factor`.

    edit: factor by part name; 0 takes a conductance or capacitance out. halves: False drives one node of a balanced
    circuit alone. None where the changed network has no solution.
    """
    changed = replace(
        bands,
        network=_edited(bands.network, edit),
        upper=_edited(bands.upper, edit),
        lower=_edited(bands.lower, edit),
    )
    upper = changed.upper
    try:
        z = np.asarray(np.linalg.inv(upper.conductance.dense(upper.size)), dtype=np.float64)
        shorts = short_constants(changed)
    except (np.linalg.LinAlgError, NetworkError):
        return None
    gain = float((upper.output @ z @ upper.drive).real)
    opposite = images(hand.nodes) if halves else {}
    farad = {part.name: part.value for part in changed.network.parts}
    nodes = {row.name: _node(row, changed, z, gain, opposite, farad, factor) for row in hand.nodes}
    taus = [nodes[row.name].time_constant for row in counted(hand.nodes).rows]
    more = 0.0
    if factor is not miller_factor:
        plain = [_node(row, changed, z, gain, opposite, farad, miller_factor) for row in counted(hand.nodes).rows]
        more = math.fsum(taus) - math.fsum(one.time_constant for one in plain)
    edges = _upper_edges([*taus, *(row.time_constant_s for row in hand.inductors if row.in_path)])
    wanted = {name for row in hand.lower if row.in_path for name in row.parts}
    edges |= _lower_edges([part.edge_hz for part in shorts.parts if wanted.intersection(part.names)])
    return Worked(nodes, gain, edges | _by_coefficients(changed, more))


def _by_coefficients(bands: Bands, more_s: float) -> dict[tuple[str, str], float]:
    """Give both edges from two coefficients, and by root-sum-of-squares, of the changed networks.

    more_s: what slips in Miller's factors add to b1; b2 and the poles do not know of it.
    """
    found: dict[tuple[str, str], float | None] = {}
    try:
        poles, lower_poles = pole_frequencies(bands.upper), pole_frequencies(bands.lower)
        zeros, lower_zeros = zero_frequencies(bands.upper, poles), zero_frequencies(bands.lower, lower_poles)
    except NetworkError:
        return {}
    upper, lower = visible_roots(poles, zeros), visible_roots(lower_poles, lower_zeros)
    if len(upper.poles) > 1:
        pair = coefficients(upper.poles)
        found["f_high", "two coefficients"] = two_pole_edge(pair.b1 + more_s, pair.b2)
        if not more_s:
            found["f_high", "root of sum of squares"] = root_sum_of_squares_edge(upper.poles, upper.zeros)
    moving = lower.poles[lower.poles != 0.0]
    if len(moving) > 1 and not more_s:
        pair = coefficients(1.0 / moving)
        squares = root_sum_of_squares_edge(1.0 / moving, 1.0 / lower.zeros[lower.zeros != 0.0])
        for method, omega in (
            ("two coefficients", two_pole_edge(pair.b1, pair.b2)),
            ("root of sum of squares", squares),
        ):
            found["f_low", method] = 1.0 / omega if omega else None
    return {key: omega / (2.0 * math.pi) for key, omega in found.items() if omega}


def bridging(row: SignalNode) -> tuple[InnerLine, MillerTerm] | None:
    """Give the capacitance at a node that its gain multiplies most, and the line it stands on; None without one.

    One across an inverting stage comes first; where there is none it is the one that is bootstrapped most.
    """
    terms = [
        (line, term)
        for line in row.lines
        for term in line.capacitances
        if term.gain and not term.text.startswith(FAR_END) and not (term.factor == 2.0 and term.gain == -1.0)
    ]
    inverting = [found for found in terms if found[1].gain.real < 0.0]
    return max(inverting or terms, key=lambda found: abs(found[1].farad * found[1].gain), default=None)


def _node(
    row: SignalNode,
    bands: Bands,
    z: NDArray[np.float64],
    overall: float,
    opposite: Mapping[str, str],
    farad: Mapping[str, float],
    factor: Factor,
) -> AtNode:
    upper = bands.upper
    main = bridging(row)
    tau, plain, first, gain, multiplied = 0.0, 0.0, math.nan, None, None
    for line in row.lines:
        column = _driven(upper, z, line.at, opposite)
        ohm = float(column[upper.index(line.at)])
        first = ohm if line is row.lines[0] else first
        for term in line.capacitances:
            split = _split(bands, z, line, term, column, opposite, overall)
            times = factor(split)
            counts = farad[term.part] * times
            plain += counts
            tau += ohm * counts
            if main is not None and line is main[0] and term is main[1]:
                gain, multiplied = split.gain, times
    return AtNode(first, tau / first if first else math.nan, plain, tau, gain, multiplied)


def _split(
    bands: Bands,
    z: NDArray[np.float64],
    line: InnerLine,
    term: MillerTerm,
    column: NDArray[np.float64],
    opposite: Mapping[str, str],
    overall: float,
) -> Split:
    upper, here = bands.upper, bands.upper.index(line.at)
    mirrored = term.factor == 2.0 and term.gain == -1.0 and not term.text.startswith(FAR_END)
    ends = {bands.merged[end] for end in bands.network.part(term.part).nodes} - {line.at, GROUND}
    far = next(iter(ends), None)
    if far is None:
        return Split(term.part, 0.0, overall, far_end=False, grounded=True, mirrored=False)
    far_end = term.text.startswith(FAR_END)
    if far_end:
        back = _driven(upper, z, far, opposite)
        gain = float(back[here] / back[upper.index(far)])
    else:
        gain = float(column[upper.index(far)] / column[here])
    return Split(term.part, gain, overall, far_end, grounded=False, mirrored=mirrored)


def _driven(upper: Network, z: NDArray[np.float64], node: str, opposite: Mapping[str, str]) -> NDArray[np.float64]:
    column = z[:, upper.index(node)]
    return column - z[:, upper.index(opposite[node])] if node in opposite else column


def _edited(network: Network, edit: Edit) -> Network:
    if not edit:
        return network
    parts = tuple(replace(part, value=part.value * edit.get(part.name, 1.0)) for part in network.parts)
    return assemble(parts, network.port, network.amplitudes)


def _upper_edges(taus: list[float]) -> dict[tuple[str, str], float]:
    positive = [tau for tau in taus if tau > 0.0]
    if not positive:
        return {}
    together = first_fall(np.array([-1.0 / tau for tau in positive], dtype=complex), np.empty(0, dtype=complex))
    found = {("f_high", "lowest node alone"): 1.0 / max(positive), ("f_high", "sum of time constants"): 1.0 / sum(taus)}
    found |= {("f_high", "all nodes together"): together} if together else {}
    return {key: omega / (2.0 * math.pi) for key, omega in found.items() if omega > 0.0}


def _lower_edges(edges: list[float]) -> dict[tuple[str, str], float]:
    positive = [edge for edge in edges if edge > 0.0 and math.isfinite(edge)]
    if not positive:
        return {}
    found = {("f_low", "highest capacitor alone"): max(positive), ("f_low", "sum of time constants"): sum(positive)}
    together = first_fall(np.array([-edge for edge in positive], dtype=complex) ** -1, np.empty(0, dtype=complex))
    return found | ({("f_low", "all capacitors together"): 1.0 / together} if together else {})
