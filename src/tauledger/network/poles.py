"""Poles and zeros: where they lie, which parts own each pole, and which pairs cancel.

Scaling one value moves a pole by d ln p/d ln C = −C·(yᵀ out)(controlᵀ v)/(yᵀ C v), v and y being the right and left
eigenvectors of the pencil G + p·C; all of them add to −1, because scaling every reactive value scales all poles.

Source of the sensitivity: Lancaster, "On eigenvalues of matrices dependent on a parameter", Numer. Math. 6, 1964.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tauledger.network.assemble import Network
from tauledger.network.reactances import reactances
from tauledger.network.solve import Complex, Real
from tauledger.network.spectrum import pole_frequencies, zero_frequencies

CANCEL_WITHIN = 0.02
DEFECTIVE = 1e-6


@dataclass(frozen=True, slots=True)
class Pole:
    """One pole, s in rad/s; of a complex pair the one above the axis.

    owners: −d ln p/d ln value by part name, real part; they add to 1. Empty for a pole at the origin and for a multiple
    pole, which no single part owns. f0_hz, q: of a complex pair. cancelled: a zero lies so close that it has no effect.
    """

    s: complex
    owners: Mapping[str, float]
    cancelled: bool
    f0_hz: float | None = None
    q: float | None = None


@dataclass(frozen=True, slots=True)
class Zero:
    """One zero of the transfer function, s in rad/s; of a complex pair the one above the axis."""

    s: complex
    cancelled: bool


@dataclass(frozen=True, slots=True)
class PoleZeroMap:
    """All finite poles and zeros, lowest first. stable: no pole lies to the right of the axis."""

    poles: tuple[Pole, ...]
    zeros: tuple[Zero, ...]
    stable: bool


def find_poles(network: Network) -> PoleZeroMap:
    """Find all finite poles and zeros with owners and cancelled pairs.

    Raises NetworkError where the network has no unique solution.
    """
    p = pole_frequencies(network)
    z = zero_frequencies(network, p)
    pole_cancelled, zero_cancelled = cancelled_pairs(p, z)
    owners = pole_owners(network, p)
    poles = tuple(
        _pole(complex(p[k]), owners[k], bool(pole_cancelled[k])) for k in range(len(p)) if complex(p[k]).imag >= 0.0
    )
    zeros = tuple(Zero(complex(z[k]), bool(zero_cancelled[k])) for k in range(len(z)) if complex(z[k]).imag >= 0.0)
    return PoleZeroMap(poles, zeros, bool(np.all(p.real <= 0.0)))


def cancelled_pairs(poles: Complex, zeros: Complex) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Tell which poles (p,) and which zeros (z,) belong to a pair that has no effect on the response.

    A pair cancels where the zero lies within 2 % of the pole and (s − z)/(s − p) stays within 2 % of 1 on the axis,
    which near a resonance asks for more than closeness.
    """
    pole_gone, zero_gone = np.zeros(len(poles), dtype=bool), np.zeros(len(zeros), dtype=bool)
    if not len(zeros):
        return pole_gone, zero_gone
    for k in range(len(poles)):
        p = poles[k]
        free = np.where(zero_gone, np.inf, np.abs(zeros - p))
        nearest = int(np.argmin(free))
        gap = float(free[nearest])
        if p == 0.0:
            gone = gap == 0.0
        else:
            at = 1j * np.array([abs(p), p.imag, 0.0])
            gone = gap <= CANCEL_WITHIN * float(np.min(np.abs(at - p)))
        if gone:
            pole_gone[k] = zero_gone[nearest] = True
    return pole_gone, zero_gone


def pole_owners(network: Network, poles: Complex) -> tuple[dict[str, float], ...]:
    """Give for every pole (p,) the part that it takes: −d ln p/d ln value (real part) by part name, adding to 1.

    Empty for poles at the origin and for multiple poles.
    """
    terms = reactances(network)
    g = network.conductance.dense(network.size)
    c = network.capacitance.dense(network.size)
    result = []
    for p in poles:
        share = _taken(g, c, complex(p), terms.out, terms.control, terms.value) if p != 0.0 else None
        result.append({} if share is None else dict(zip(terms.names, share.tolist(), strict=True)))
    return tuple(result)


def _taken(g: Real, c: Real, p: complex, out: Real, control: Real, value: Real) -> Real | None:
    """Give the parts' shares in one pole by inverse iteration on both sides; None where the pole is not simple."""
    y = g + p * (1.0 + 1e-9) * c
    try:
        v = w = np.ones(len(g), dtype=complex)
        for _ in range(3):
            v = np.linalg.solve(y, c @ v)
            w = np.linalg.solve(y.T, c.T @ w)
            v, w = v / np.linalg.norm(v), w / np.linalg.norm(w)
    except np.linalg.LinAlgError:
        return None
    taken = value * (w @ out) * (v @ control)
    whole = complex(w @ c @ v)
    if abs(whole) < DEFECTIVE * float(np.sum(np.abs(taken))):
        return None
    return np.asarray((taken / whole).real, dtype=np.float64)


def _pole(s: complex, owners: Mapping[str, float], cancelled: bool) -> Pole:
    if s.imag == 0.0:
        return Pole(s, owners, cancelled)
    return Pole(s, owners, cancelled, abs(s) / (2.0 * np.pi), abs(s) / (-2.0 * s.real))
