"""What every element does to unity gain frequency, margins, peaking, gain and phase: exact by the adjoint.

A part is v·out·controlᵀ in Y (times s for a reactive one), hence ∂ln H/∂ln v = −v·(λᵀ out)(controlᵀ x)/H, a complex
number: its real part moves ln|H|, its imaginary part the phase. A frequency f at which ln|H| or the phase is held moves
by ∂ln f/∂ln v = −(that part at f)/(slope at f), and what is read off there moves along with f. Mid-band is held at its
frequency.

Source: Director and Rohrer, "The generalized adjoint network and network sensitivities", IEEE Trans. Circuit Theory
CT-16(3), 1969.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.devices.parts import Part
from tauledger.network.altered import AddedCapacitor, with_capacitor
from tauledger.network.assemble import Network, incidence
from tauledger.network.first_order import follow_level
from tauledger.network.follower import polarity, polarity_offset_deg
from tauledger.network.identities import ON_THE_AXIS, Identity
from tauledger.network.lines import line_moments
from tauledger.network.midband import MidBand, in_changed
from tauledger.network.reactances import REACTIVE, at_held_coupling, moments, reactances, together
from tauledger.network.solve import Complex, Real, log_slope, on_axis, solve
from tauledger.network.unity import HALF_TURN_DEG, Unity, find_unity

DB = 20.0 / np.log(10.0)
PERCENT = 0.01
CONVERGED = 1e-12
STEPS = 12
NEARBY = 1e-3


class LogSensitivity(Struct, frozen=True):
    """∂ln H at k frequencies.

    parts: ∂ln H/∂ln(value), (k,) complex, by the name of every part that has a value (F, H, S, V/V, A/A, Ω).
    nodes: ∂ln H/∂C for a capacitance from the node to ground, (k,) complex in 1/F, by node. slope: d ln H/d ln s, (k,).
    """

    parts: Mapping[str, Complex]
    nodes: Mapping[str, Complex]
    slope: Complex


class UnityMove(Struct, frozen=True):
    """What a relative change does (of a value), or what a capacitance to ground does per farad.

    f_unity: ∂ln f_u. phase_margin_deg, gain_margin_db: of the margins, the latter None where there is none.
    gain_bandwidth: ∂ln(|A_mid|·f_H), None where there is no f_H.
    """

    f_unity: float
    phase_margin_deg: float
    gain_margin_db: float | None
    gain_bandwidth: float | None


class UnityMoves(Struct, frozen=True):
    """`UnityMove` of every part by its name, per unit of relative change, and of every node, per farad to ground."""

    parts: Mapping[str, UnityMove]
    nodes: Mapping[str, UnityMove]


class GainMove(Struct, frozen=True):
    """What a relative change does at one frequency: ∂ln|H|, and the phase there and beyond mid-band in degrees."""

    gain: float
    phase_deg: float
    beyond_midband_deg: float


class Followed(Struct, frozen=True):
    """Unity gain frequency in Hz and phase margin in degrees of a changed network."""

    hz: float
    phase_margin_deg: float | None


def log_sensitivity(network: Network, frequency_hz: Real) -> LogSensitivity:
    """Give ∂ln H over every part and every node at these frequencies (k,) in Hz.

    Raises NetworkError where the network has no unique solution.
    """
    at = solve(network, on_axis(frequency_hz))
    terms = reactances(network)
    reactive = [together(terms, row) for row in -at.s[:, None] * moments(terms, at)]
    moved: dict[str, Complex] = {
        part.name: np.array([row[k] for row in reactive], dtype=complex) for k, part in enumerate(terms.distinct)
    }
    moved = at_held_coupling(terms.distinct, moved)
    moved |= {name: -at.s * moment / at.response for name, moment in line_moments(network, at).items()}
    for part in network.parts:
        term = _resistive(network, part)
        if term is not None:
            out, control = term
            lag = part.value * np.exp(-at.s * part.delay_s)
            moved[part.name] = -lag * (at.adjoint @ out) * (at.x @ control) / at.response
    per_farad = -at.s[:, None] * at.adjoint * at.x / at.response[:, None]
    return LogSensitivity(
        parts={part.name: moved[part.name] for part in network.parts if part.name in moved},
        nodes={name: per_farad[:, k] for k, name in enumerate(network.unknowns[: network.n_nodes])},
        slope=log_slope(network, at),
    )


def unity_moves(network: Network, midband: MidBand, unity: Unity, f_high_hz: float | None = None) -> UnityMoves:
    """Give what every part and every node does to f_u, both margins and, with f_H given, the gain-bandwidth product.

    Raises NetworkError where the network has no unique solution.
    """
    asked = [midband.frequency_hz, unity.hz, unity.margin_at_hz, unity.gain_margin_at_hz, f_high_hz]
    found = log_sensitivity(network, np.array([hz if hz is not None else unity.hz for hz in asked]))
    _, at_unity, at_margin, at_half_turn, at_edge = found.slope
    # a margin by which the gain may fall grows with the gain
    grows = 1.0 if _may_fall(unity) else -1.0

    def move(changed: Complex) -> UnityMove:
        mid, one, least, turned, edge = changed
        f_unity = -one.real / at_unity.real
        phase = least.imag - at_margin.imag * least.real / at_margin.real
        # the frequency of the half turn moves too, and |H| is read off there
        turned_hz = -turned.imag / at_half_turn.imag
        edge_hz = -(edge.real - mid.real) / at_edge.real
        return UnityMove(
            f_unity=float(f_unity),
            phase_margin_deg=float(np.degrees(phase)),
            gain_margin_db=(
                None
                if unity.gain_margin_at_hz is None
                else float(grows * DB * (turned.real + at_half_turn.real * turned_hz))
            ),
            gain_bandwidth=None if f_high_hz is None else float(mid.real + edge_hz),
        )

    return UnityMoves(
        parts={name: move(changed) for name, changed in found.parts.items()},
        nodes={name: move(changed) for name, changed in found.nodes.items()},
    )


def _may_fall(unity: Unity) -> bool:
    """Whether the gain margin is one by which the gain may fall, or by which it must rise."""
    if unity.gain_margin_db is None:
        return False
    turn = next(one for one in unity.half_turns if one.hz == unity.gain_margin_at_hz)
    return turn.below_db * unity.gain_margin_db < 0.0


def unity_identities(network: Network, moves: UnityMoves) -> tuple[Identity, ...]:
    """Σ ∂ln f_u over all that is reactive = −1 (k held), for that scales frequency; none beside plain delays."""
    if network.delayed:
        return ()
    scales = [kind for kind in (*REACTIVE, "line") if kind != "mutual inductance"]
    reactive = [moves.parts[part.name].f_unity for part in network.parts if part.kind in scales]
    scale = 1.0 + sum(abs(move) for move in reactive)
    return (Identity("shares of f_u add to 1", -sum(reactive), 1.0, ON_THE_AXIS, scale),)


def gain_moves(network: Network, midband: MidBand, hz: float) -> Mapping[str, GainMove]:
    """Give what every part does to gain and phase at one frequency in Hz, per unit of relative change.

    Raises NetworkError where the network has no unique solution.
    """
    found = log_sensitivity(network, np.array([midband.frequency_hz, hz]))
    return {
        name: GainMove(float(at.real), float(np.degrees(at.imag)), float(np.degrees(at.imag - mid.imag)))
        for name, (mid, at) in found.parts.items()
    }


def peaking_moves(network: Network, midband: MidBand, peak_hz: float) -> Mapping[str, float]:
    """Give what every part does to the peaking in dB above mid-band, per unit of relative change.

    peak_hz: where it is, to 1e-4. At the peak |H| is stationary, so that its frequency may be held.
    Raises NetworkError where the network has no unique solution.
    """
    found = log_sensitivity(network, np.array([midband.frequency_hz, _summit(network, peak_hz)]))
    return {name: float(DB * (at.real - mid.real)) for name, (mid, at) in found.parts.items()}


def with_capacitance(network: Network, node: str, farad: float) -> Network:
    """Give the network with a capacitance of so many farad from a node to ground."""
    name = "probe"
    while any(part.name == name for part in network.parts):
        name += "'"
    return with_capacitor(network, AddedCapacitor(name, node, GROUND, farad))


def follow_unity(changed: Network, midband: MidBand, unity: Unity) -> Followed | None:
    """Give f_u and phase margin of a changed network; None where it has none any more.

    f_u is followed from where it was, the phase keeps the turn that lies nearest. Where that leads nowhere, or to a
    rise, it is searched for. midband, unity: of the unchanged network.
    Raises NetworkError where the changed network has no unique solution.
    """
    reference = in_changed(changed, midband)
    alone = not unity.further_hz and len(unity.half_turns) < 2
    hz = follow_level(changed, 1.0, np.array([unity.hz])) if alone else None
    offset = polarity_offset_deg(reference.gain)
    if hz is not None and unity.phase_margin_deg is not None and offset is not None:
        at = solve(changed, on_axis(hz))
        if log_slope(changed, at)[0].real < 0.0:
            margin = HALF_TURN_DEG + float(np.angle(at.response[0] * polarity(reference.gain), deg=True))
            turns = 360.0 * round((unity.phase_margin_deg - margin) / 360.0)
            return Followed(float(hz[0]), margin + turns)
    found = find_unity(changed, reference)
    return None if found is None else Followed(found.hz, found.phase_margin_deg)


def _summit(network: Network, near_hz: float) -> float:
    """Give where |H| is stationary, in Hz, by the secant method on its slope; near_hz where it is not nearby."""
    u, step, before = float(np.log(near_hz)), 1e-5, None
    for _ in range(STEPS):
        slope = float(log_slope(network, solve(network, on_axis(np.exp(u))))[0].real)
        if before is not None:
            step = -step * slope / (slope - before) if slope != before else 0.0
        before, u = slope, u + step
        if abs(step) < CONVERGED * max(1.0, abs(u)):
            break
    return float(np.exp(u)) if abs(u - np.log(near_hz)) < NEARBY else near_hz


def _resistive(network: Network, part: Part) -> tuple[Real, Real] | None:
    """Give out and control, (n,) each, of a part whose value stands in G; None for any other."""
    if not part.value:
        return None
    match part.kind:
        case "conductance" | "transconductance" | "delayed transconductance":
            return incidence(network, *part.nodes[:2]), incidence(network, *part.nodes[-2:])
        case "voltage gain":
            return _unit(network, part.owner), -incidence(network, *part.nodes[2:4])
        case "current gain":
            return incidence(network, *part.nodes[:2]), _unit(network, part.references[0])
        case "transresistance":
            return _unit(network, part.owner), -_unit(network, part.references[0])
        case _:
            return None


def _unit(network: Network, owner: str) -> Real:
    """Give the (n,) vector with 1 at the branch current of this owner."""
    found = np.zeros(network.size)
    found[network.branch(owner)] = 1.0
    return found
