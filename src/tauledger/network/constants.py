"""Open-circuit time constants: the ledger of the upper band edge.

On the upper network Z = G⁻¹ is the mid-band impedance matrix. A part sees R⁰ = controlᵀ Z out across itself while all
others have no value; τ = R⁰·C, and b1 = Σ τ = tr(ZC) = −Σ 1/p exactly. Its weight w = 1 − H^i/H^0 compares the
mid-band gain with the part shorted (an inductance opened) and without it; Σ w·τ = b1 − a1 is the group delay at s = 0.
Where capacitors set the gain, all is taken at s₀ = jω_mid, with the poles above it alone and real parts:
Σ τ = Re tr(ZC) = Re Σ 1/(s₀ − p), and Σ w·τ is the group delay there.

Sources: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed., 2009, section
7.3 (zero-value time constants); Hajimiri, "Generalized time- and transfer-constant circuit analysis", IEEE Trans.
Circuits Syst. I 57(6), 2010 (transfer constants).
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.devices.parts import PartKind
from tauledger.errors import NetworkError
from tauledger.network.admittance import delay_moments
from tauledger.network.assemble import Network, incidence
from tauledger.network.bands import Bands
from tauledger.network.gain_setting import impedance, impedance_above
from tauledger.network.reactances import by_part, moments, reactances, together
from tauledger.network.solve import Complex, Real, on_axis, solve, times
from tauledger.network.spectrum import pole_frequencies

IN_PATH_WEIGHT = 0.05
IN_PATH_MOMENT = 0.005


class MidBandInverse(Struct, frozen=True):
    """Z = G⁻¹ of a resistive network and its signal solution: z (n, n), x (n,) complex, adjoint (n,), gain H.

    x is driven by the sources; adjoint is Gᵀ⁻¹ e. Z and x are meant at s = 0. Where capacitors set the gain they are
    meant at s₀ = jω_mid, z is the real part of the impedance of the poles above it, and `whole` all of Z(s₀).
    """

    network: Network
    z: Real
    x: Complex
    adjoint: Real | Complex
    gain: complex
    whole: Real | Complex

    def impedance(self, at: str, into: str) -> float:
        """Give the voltage at node `at` for 1 A into node `into`, in ohm; 0 where either is ground."""
        row, column = self.network.index(at), self.network.index(into)
        return 0.0 if row is None or column is None else float(self.z[row, column])

    def across(self, plus: str, minus: str = GROUND) -> float:
        """Give the resistance between two nodes in ohm, drive nulled."""
        return (
            self.impedance(plus, plus)
            - self.impedance(plus, minus)
            - self.impedance(minus, plus)
            + self.impedance(minus, minus)
        )

    def voltage(self, node: str) -> complex:
        """Give the signal voltage of a node in V; 0 at ground."""
        row = self.network.index(node)
        return 0j if row is None else complex(self.x[row])

    def whole_across(self, plus: str, minus: str) -> complex:
        """Give the complex impedance between two nodes in ohm, drive nulled."""
        d = incidence(self.network, plus, minus)
        return complex(d @ self.whole @ d)

    def crossing(self, node: str) -> float:
        """Give ρ = x·λ/(Z_nn·H), the relative gain lost if the node is shorted to ground; 0 where nothing can be."""
        row = self.network.index(node)
        if row is None or self.z[row, row] == 0.0:
            return 0.0
        return float((self.x[row] * self.adjoint[row] / (self.whole[row, row] * self.gain)).real)


class OpenConstant(Struct, frozen=True):
    """One part of the upper network.

    resistance_ohm: R⁰ across it (a transfer impedance for a transcapacitance; for an inductance the resistance that
    its terminals face, infinite where they face none). time_constant_s: R⁰·C, for an inductance L/R.
    weight: 1 − H^i/H^0. in_path: it counts in the path's sums; where not, it is decoupling. delay_s: w·τ, its part of
    the group delay.
    """

    name: str
    kind: PartKind
    nodes: tuple[str, ...]
    value: float
    resistance_ohm: float
    time_constant_s: float
    weight: float
    in_path: bool
    delay_s: float = 0.0


class OpenConstants(Struct, frozen=True):
    """The ledger of the upper network at s = 0.

    sum_s: Σ τ over all parts. inverse_pole_sum_s: −Σ 1/p. weighted_sum_s: Σ w·τ. group_delay_s: −dφ/dω of H.
    Where capacitors set the gain, the first two are those of the poles above mid-band, at s = jω_mid, and the other
    two hold the poles below as well.
    b1_s, b2_s2: coefficients of the denominator 1 + b1·s + b2·s² + … node_time_constant_s: τ_i = Σ_k C_ik Z_ki by
    node of the upper network; branch_time_constant_s: those of the inductors' branch currents by owner. All of them
    add to b1.
    """

    parts: tuple[OpenConstant, ...]
    sum_s: float
    inverse_pole_sum_s: float
    weighted_sum_s: float
    group_delay_s: float
    b1_s: float
    b2_s2: float
    node_time_constant_s: dict[str, float]
    branch_time_constant_s: dict[str, float]

    def part(self, name: str) -> OpenConstant:
        """Give one part's row by its name; KeyError where it is not in the upper network."""
        for constant in self.parts:
            if constant.name == name:
                return constant
        raise KeyError(name)


def midband_inverse(bands: Bands) -> MidBandInverse:
    """Give Z of the mid-band network, i.e. G⁻¹ of the upper one, with its signal solution.

    Raises NetworkError where G of the upper network is singular.
    """
    return inverse(bands.upper, bands.s_mid)


def inverse(network: Network, s: complex = 0.0) -> MidBandInverse:
    """Give G⁻¹ of any network with its signal solution at s = 0, or what stands in its place at s = jω_mid.

    Raises NetworkError where G, or G + s·C, is singular.
    """
    if s:
        whole = impedance(network, s)
        at = np.asarray(network.output @ whole, dtype=np.complex128)
        return MidBandInverse(
            network, impedance_above(network, s).real, whole @ network.drive, at, complex(at @ network.drive), whole
        )
    try:
        z = np.asarray(np.linalg.inv(network.conductance.dense(network.size)), dtype=np.float64)
    except np.linalg.LinAlgError as error:
        raise NetworkError("the mid-band network has no unique solution") from error
    x = (z @ network.drive).astype(complex)
    adjoint = np.asarray(z.T @ network.output, dtype=np.float64)
    return MidBandInverse(network, z, x, adjoint, complex(network.output @ x), z)


def open_constants(bands: Bands) -> OpenConstants:
    """Give R⁰, τ and weight of every part of the upper network, and their sums.

    A part is decoupling, not in the path, where its weight is below 5 % and w·τ below 0.5 % of Σ|w·τ|: shorting it
    changes nothing that reaches the output, nor does its time constant. Such parts change the sums over the path by
    less than 1 %.
    Raises NetworkError where G of the upper network is singular.
    """
    upper, s = bands.upper, bands.s_mid
    mid = midband_inverse(bands)
    terms = reactances(upper)
    solution = solve(upper, np.array([s]))
    tau: Real = terms.value * np.sum(terms.control * (mid.z @ terms.out), axis=0)
    whole = tau if not s else terms.value * np.sum(terms.control * (mid.whole @ terms.out), axis=0)
    delayed = moments(terms, solution)[0]
    tau, whole, delayed = together(terms, tau).real, together(terms, whole), together(terms, delayed)
    moment: Real = delayed.real
    total = float(np.sum(np.abs(moment)))
    rows = []
    for k, part in enumerate(terms.distinct):
        weight = float((delayed[k] / whole[k]).real) if whole[k] != 0.0 else 0.0
        rows.append(
            OpenConstant(
                name=part.name,
                kind=part.kind,
                nodes=part.nodes,
                value=part.value,
                resistance_ohm=_facing(part.kind, part.value, float(tau[k])),
                time_constant_s=float(tau[k]),
                weight=weight,
                in_path=abs(weight) >= IN_PATH_WEIGHT or abs(float(moment[k])) > IN_PATH_MOMENT * total,
                delay_s=float(moment[k]),
            )
        )
    c = upper.capacitance.dense(upper.size)
    zc = mid.z @ c
    b1 = float(np.trace(zc))
    diagonal = np.sum(c * mid.z.T, axis=1)
    poles = pole_frequencies(upper)
    poles = poles[np.abs(poles) > abs(s)]
    n = upper.n_nodes
    return OpenConstants(
        parts=tuple(rows),
        sum_s=float(np.sum(tau)),
        inverse_pole_sum_s=float(np.sum(1.0 / (s - poles)).real) if len(poles) else 0.0,
        weighted_sum_s=float(np.sum(moment)),
        group_delay_s=_group_delay(upper, s),
        b1_s=b1,
        b2_s2=0.5 * (b1 * b1 - float(np.sum(zc * zc.T))),
        node_time_constant_s={node: float(diagonal[i]) for i, node in enumerate(upper.unknowns[:n])},
        branch_time_constant_s={
            owner: float(diagonal[n + i]) for i, owner in enumerate(upper.unknowns[n:]) if diagonal[n + i] != 0.0
        },
    )


def group_delay(network: Network, frequency_hz: float) -> dict[str, float]:
    """Give each reactive part's contribution to the group delay −dφ/dω at one frequency, in s; they add to it.

    Re(C·λ_ab·v_ab/H) for a capacitance, likewise for the other kinds; delays are parts of their own.
    Raises NetworkError where the network has no unique solution there.
    """
    terms = reactances(network)
    at = solve(network, on_axis(frequency_hz))
    delay = moments(terms, at)[0].real
    return by_part(terms, delay) | {name: float(moment[0].real) for name, moment in delay_moments(network, at).items()}


def _group_delay(network: Network, s: complex) -> float:
    solution = solve(network, np.array([s]))
    return float((np.sum(solution.adjoint * times(network.capacitance, solution.x)) / solution.response[0]).real)


def _facing(kind: PartKind, value: float, tau: float) -> float:
    if kind == "inductance":
        return value / tau if tau != 0.0 else float("inf")
    # a block's value is a bare factor, a mutual inductance joins two branches: neither faces a single resistance
    return float("inf") if kind in ("block", "mutual inductance") else tau / value
