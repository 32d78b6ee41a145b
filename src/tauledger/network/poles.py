"""Poles and zeros: where they lie, which parts own each pole, and which pairs cancel.

Scaling one value moves a pole by d ln p/d ln C = −C·(yᵀ out)(controlᵀ v)/(yᵀ C v), v and y being the right and left
eigenvectors of the pencil G + p·C; all of them add to −1, because scaling every reactive value scales all poles.

Source of the sensitivity: Lancaster, "On eigenvalues of matrices dependent on a parameter", Numer. Math. 6, 1964.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.errors import NetworkError
from tauledger.network.admittance import all_pass
from tauledger.network.assemble import Network
from tauledger.network.reactances import by_part, reactances
from tauledger.network.solve import Complex, admittance, log_slope, solve
from tauledger.network.spectrum import pole_frequencies, zero_frequencies

CANCEL_WITHIN = 0.02
DEFECTIVE = 1e-6
SAME_ROOT = 1e-6
# Where rounding makes a zero pivot of what a large coupling capacitor leaves, the next one further off is taken.
BESIDE = (1e-9, 3e-9, 1e-8, 3e-8, 1e-7, 1e-6, 1e-5)
GOLDEN = 0.5 * (np.sqrt(5.0) - 1.0)


class Pole(Struct, frozen=True):
    """One pole, s in rad/s; of a complex pair the one above the axis.

    owners: −d ln p/d ln value by part name, real part; they add to 1. Empty for a pole at the origin and for a multiple
    pole, which no single part owns. f0_hz, q: of a complex pair. cancelled: a zero lies so close that it has no effect.
    """

    s: complex
    owners: Mapping[str, float]
    cancelled: bool
    f0_hz: float | None = None
    q: float | None = None

    @property
    def paired(self) -> bool:
        """Whether its conjugate is a pole as well: poles are those of a real network."""
        return self.s.imag != 0.0


class Zero(Struct, frozen=True):
    """One zero of the transfer function, s in rad/s; of a complex pair the one above the axis.

    paired: its conjugate is a zero as well. Sources that drive with different phases make zeros that stand alone.
    """

    s: complex
    cancelled: bool
    paired: bool = False


class PoleZeroMap(Struct, frozen=True):
    """All finite poles and zeros, lowest first. stable: no pole lies to the right of the axis."""

    poles: tuple[Pole, ...]
    zeros: tuple[Zero, ...]
    stable: bool


def find_poles(network: Network, *, floor_hz: float = 0.0) -> PoleZeroMap:
    """Find all finite poles and zeros with owners and cancelled pairs; a delay is taken as an all-pass.

    floor_hz: leave out those below it, which measuring aids make; what H has there as its slope is at the origin.
    Raises NetworkError where the network has no unique solution.
    """
    network = all_pass(network)
    p = pole_frequencies(network)
    z = zero_frequencies(network, p)
    if floor_hz:
        p, z = _above(network, p, z, floor_hz)
    pole_cancelled, zero_cancelled = cancelled_pairs(p, z)
    owners = pole_owners(network, p)
    poles = tuple(
        _pole(complex(p[k]), owners[k], bool(pole_cancelled[k])) for k in range(len(p)) if complex(p[k]).imag >= 0.0
    )
    paired = _paired(z)
    zeros = tuple(
        Zero(complex(z[k]), bool(zero_cancelled[k]), bool(paired[k]))
        for k in range(len(z))
        if complex(z[k]).imag >= 0.0 or not paired[k]
    )
    return PoleZeroMap(poles, zeros, bool(np.all(p.real <= 0.0)))


def _above(network: Network, p: Complex, z: Complex, floor_hz: float) -> tuple[Complex, Complex]:
    floor = 2.0 * np.pi * floor_hz
    order = round(float(log_slope(network, solve(network, np.array([1j * floor])))[0].real))
    origin = np.zeros(abs(order), dtype=complex)
    # what grows without ringing is an operating point that does not hold, aid or no aid
    latched = (p.imag == 0.0) & (p.real > 0.0)
    p, z = p[(np.abs(p) > floor) | latched], z[np.abs(z) > floor]
    return (p, np.concatenate([origin, z])) if order > 0 else (np.concatenate([origin, p]), z)


def _paired(roots: Complex) -> NDArray[np.bool_]:
    """Tell which roots (k,) have their conjugate among the others."""
    gap = np.abs(roots[:, None] - roots.conj()[None, :])
    twin: NDArray[np.bool_] = np.any(gap <= SAME_ROOT * np.abs(roots)[:, None], axis=1)
    both: NDArray[np.bool_] = np.logical_and(roots.imag != 0.0, twin)
    return both


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
    result: list[dict[str, float]] = [{} for _ in poles]
    moving = np.flatnonzero(poles != 0.0)
    if not len(moving):
        return tuple(result)
    right, left = _eigenvectors(network, poles[moving])
    pushed, seen = left @ terms.out, right @ terms.control
    taken = terms.value * pushed * seen
    whole = np.sum(taken, axis=1)
    # Cauchy and Schwarz bound the whole by these; far below, left and right are orthogonal and the pole is multiple
    bound = np.sqrt(np.abs(pushed) ** 2 @ np.abs(terms.value)) * np.sqrt(np.abs(seen) ** 2 @ np.abs(terms.value))
    simple = np.abs(whole) > DEFECTIVE * bound
    for k in np.flatnonzero(simple):
        result[moving[k]] = by_part(terms, (taken[k] / whole[k]).real)
    return tuple(result)


def _eigenvectors(network: Network, poles: Complex) -> tuple[Complex, Complex]:
    """Give right and left eigenvectors of the pencil at its natural frequencies, (k, n) each, by inverse iteration."""
    try:
        return _iterated(network, poles, BESIDE[0])
    except np.linalg.LinAlgError:
        each = [_iterated_once(network, poles[k : k + 1]) for k in range(len(poles))]
    return np.concatenate([right for right, _ in each]), np.concatenate([left for _, left in each])


def _iterated_once(network: Network, pole: Complex) -> tuple[Complex, Complex]:
    for beside in BESIDE:
        try:
            return _iterated(network, pole, beside)
        except np.linalg.LinAlgError:
            continue
    raise NetworkError("the small-signal network has no unique solution")


def _iterated(network: Network, poles: Complex, beside: float) -> tuple[Complex, Complex]:
    """Iterate just beside the poles, so that the matrices keep an inverse where a pole is exact."""
    c = network.capacitance.dense(network.size)
    y = admittance(network, poles * (1.0 + beside))
    # a start without symmetry: C takes equal voltages to nothing
    start = 1.0 + np.mod(np.arange(1, network.size + 1) * GOLDEN, 1.0)
    right = left = np.broadcast_to(start.astype(complex), (len(poles), network.size))
    for _ in range(3):
        right = np.linalg.solve(y, (right @ c.T)[..., None])[..., 0]
        left = np.linalg.solve(y.transpose(0, 2, 1), (left @ c)[..., None])[..., 0]
        right = right / np.linalg.norm(right, axis=1, keepdims=True)
        left = left / np.linalg.norm(left, axis=1, keepdims=True)
    return right, left


def _pole(s: complex, owners: Mapping[str, float], cancelled: bool) -> Pole:
    if s.imag == 0.0:
        return Pole(s, owners, cancelled)
    q = abs(s) / (-2.0 * s.real) if s.real else float("inf")
    return Pole(s, owners, cancelled, abs(s) / (2.0 * np.pi), q)
