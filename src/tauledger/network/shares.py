"""Shares: whose capacitance sets a band edge, exact by the adjoint.

With F = ln|H(f_c)| − ln|H(f_mid)| fixed at an edge f_c, a change of one value moves the edge by ∂ln f_c/∂ln C =
−share, share = [Re(−λᵀ(∂Y/∂ln C)x/H) at f_c − the same at f_mid] / (d ln|H|/d ln f at f_c), with f_mid held where it
is. A maximum of |H| moves with the change, which to first order is the same. Scaling all reactive values scales
frequency, so the shares add to 1 − slope(f_mid)/slope(f_c); the last term is the defect, 0 where the reference is
stationary.

Source: Director and Rohrer, "The generalized adjoint network and network sensitivities", IEEE Trans. Circuit Theory
CT-16(3), 1969 (adjoint sensitivities).
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct

from tauledger.network.admittance import delay_moments
from tauledger.network.assemble import Network
from tauledger.network.bands import BandClass
from tauledger.network.midband import MidBand
from tauledger.network.reactances import by_part, moments, reactances
from tauledger.network.solve import Complex, Real, log_slope, on_axis, solve


class Shares(Struct, frozen=True):
    """What sets one band edge, at frequency hz.

    parts: −∂ln f/∂ln value by name of every reactive part of the whole network, and of every delay.
    nodes: the rows λ_i·s(Cx)_i of the open capacitors by node of the whole network, on the same scale: a convention
    that gives a bridging capacitor to its two nodes as Miller's picture does. per_farad: ∂f/∂C in Hz/F for
    capacitance from that node to ground, free of any convention.
    slope: d ln|H|/d ln f at the edge. defect: slope(f_mid)/slope; the shares of all parts add to 1 − defect.
    """

    hz: float
    slope: float
    defect: float
    parts: Mapping[str, float]
    nodes: Mapping[str, float]
    per_farad: Mapping[str, float]


def zero_shares(network: Network, zero: complex) -> dict[str, float]:
    """Give −∂ln z/∂ln value by part name, the real part, for a zero z (rad/s) of the network's response.

    By the adjoint: H(z) = 0 stays so under a change, hence ∂z/∂ln C = −z·m/Σm with m = value·(λᵀ out)(controlᵀ x);
    the shares add to 1. Without parts where the zero lies on a pole.
    Raises NetworkError where the network has no unique solution at z.
    """
    at, terms = solve(network, np.array([zero])), reactances(network)
    moment = terms.value * (at.adjoint[0] @ terms.out) * (at.x[0] @ terms.control)
    whole = complex(moment.sum())
    return by_part(terms, (moment / whole).real) if whole else {}


def find_shares(network: Network, midband: MidBand, edge_hz: float, class_of: Mapping[str, BandClass]) -> Shares:
    """Give every part's and every node's share in the band edge at edge_hz.

    class_of: the class at mid-band by part name; those that are open, or set the gain, count in the nodes' rows.
    Raises NetworkError where the network has no unique solution there.
    """
    at = solve(network, on_axis(np.array([edge_hz, midband.frequency_hz])))
    slopes = log_slope(network, at).real
    slope = float(slopes[0])

    def share(moment: Complex) -> Real:
        lost: Real = (at.s.reshape(-1, *[1] * (moment.ndim - 1)) * moment).real
        return np.asarray((lost[1] - lost[0]) / slope, dtype=np.float64)

    terms = reactances(network)
    of_parts = share(moments(terms, at))
    acts = ("open", "gain")
    of_delays = {name: float(share(moment)) for name, moment in delay_moments(network, at).items()}
    open_value = [
        p.value if p.kind not in ("inductance", "mutual inductance") and class_of[p.name] in acts else 0.0
        for p in terms.parts
    ]
    opened = (terms.out * np.array(open_value)) @ terms.control.T
    n = network.n_nodes
    per_response = at.adjoint / at.response[:, None]
    of_nodes = share((per_response * (at.x @ opened.T))[:, :n])
    per_farad = -edge_hz * share((per_response * at.x)[:, :n])
    names = network.unknowns[:n]
    return Shares(
        hz=edge_hz,
        slope=slope,
        defect=float(slopes[1]) / slope,
        parts=by_part(terms, of_parts) | of_delays,
        nodes={name: float(value) for name, value in zip(names, of_nodes, strict=True)},
        per_farad={name: float(value) for name, value in zip(names, per_farad, strict=True)},
    )
