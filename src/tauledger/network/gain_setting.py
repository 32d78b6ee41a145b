"""Capacitors that set the mid-band gain, and the impedance matrix on either side of mid-band where there are such.

A charge amplifier's gain is −C_S/C_F: neither capacitor is a short or an open, so both stay in the mid-band network,
which is then taken at s₀ = jω_mid. There Z(s₀) = (G + s₀·C)⁻¹ holds poles of both band edges; it is split into the
poles below |s₀| and those above, so that tr(Z·C) = Σ 1/(s₀ − p) holds for each side by itself. On the real axis of
time constants only real parts count: Re 1/(s₀ − p) → −1/p for poles far above.

Source of the trace: d ln det(G + s·C)/ds = tr[(G + s·C)⁻¹·C] (Jacobi's formula). Source of the split by a contour
integral: Kato, "Perturbation theory for linear operators", 2nd ed., 1976, section I.5.
"""

from __future__ import annotations

import numpy as np

from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.midband import MidBand
from tauledger.network.reactances import moments, reactances
from tauledger.network.solve import Complex, admittance, on_axis, solve
from tauledger.network.spectrum import pole_frequencies

SETS_THE_GAIN = 0.2
# The trapezoidal rule on a circle converges like (distance ratio)^-n: a plateau of half a decade gives 1.7^-128.
CONTOUR_POINTS = 128
# A pole nearer to s₀ from below leaves an error of more than 0.7^64 = 1e-10 of that rule.
BELOW = 0.7


def gain_setting(network: Network, midband: MidBand) -> frozenset[str]:
    """Name the capacitors with |∂ln|H_mid|/∂ln C| = |Re(−λᵀ(∂Y/∂ln C)x/H)| ≥ 0.2, parallel ones taken together.

    None without a plateau, and none where the reference is at DC.
    Raises NetworkError where the network has no unique solution at mid-band.
    """
    if not midband.plateau or midband.frequency_hz == 0.0:
        return frozenset()
    at = solve(network, on_axis(midband.frequency_hz))
    terms = reactances(network)
    moved = -(at.s[0] * moments(terms, at)[0]).real
    together: dict[frozenset[str], list[int]] = {}
    for k, part in enumerate(terms.parts):
        if part.kind == "capacitance":
            together.setdefault(frozenset(part.nodes), []).append(k)
    groups = [group for group in together.values() if abs(sum(moved[k] for k in group)) >= SETS_THE_GAIN]
    return frozenset(terms.parts[k].name for group in groups for k in group)


def impedance(network: Network, s: complex) -> Complex:
    """Give Z(s) = (G + s·C)⁻¹, (n, n).

    Raises NetworkError where the network has no unique solution at s.
    """
    try:
        z = np.linalg.inv(admittance(network, np.array([s], dtype=complex))[0])
    except np.linalg.LinAlgError as error:
        raise NetworkError("the mid-band network has no unique solution") from error
    return np.asarray(z, dtype=np.complex128)


def impedance_below(network: Network, s: complex) -> Complex:
    """Give the part of Z(s) that belongs to the poles with |p| < |s|, (n, n): Σ r·lᵀ/(s − p).

    (1/2πi)∮ Z(ζ)/(s − ζ) dζ on a circle between those poles and s.
    Raises NetworkError where the network has no unique solution on the circle.
    """
    poles = np.abs(pole_frequencies(network))
    lower = poles[poles < abs(s)]
    if not len(lower):
        return np.zeros((network.size, network.size), dtype=complex)
    radius = abs(s) * np.sqrt(max(float(lower.max()) / abs(s), 1e-3))
    turns = np.exp(2j * np.pi * (np.arange(CONTOUR_POINTS) + 0.5) / CONTOUR_POINTS)
    try:
        z = np.linalg.inv(admittance(network, radius * turns))
    except np.linalg.LinAlgError as error:
        raise NetworkError("the small-signal network has no unique solution") from error
    weights = radius * turns / (s - radius * turns) / CONTOUR_POINTS
    return np.asarray(np.tensordot(weights, z, axes=1), dtype=np.complex128)


def parts_at(network: Network, s: complex) -> bool:
    """Whether |s| parts the poles: the highest of those below it, a resonance at mid-band among them, is not near."""
    poles = np.abs(pole_frequencies(network))
    return float(np.max(poles[poles < abs(s)], initial=0.0)) <= BELOW * abs(s)


def impedance_above(network: Network, s: complex) -> Complex:
    """Give Z(s) without the poles below |s|: what the time constants of the upper edge are made of, (n, n).

    Raises NetworkError where the network has no unique solution.
    """
    return impedance(network, s) - impedance_below(network, s)
