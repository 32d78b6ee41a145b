"""Forward and adjoint solution of the network at many complex frequencies at once.

Up to `DENSE_LIMIT` unknowns the matrices are solved dense and in batches (LAPACK); above it, one sparse factorisation
per frequency serves both the forward and the adjoint system.

Every row is brought to a largest entry near 1 first: beside the gigafarad of a measuring aid pivots are chosen by the
size of a row's aid, and digits are lost that the output has. The factors are powers of two, which round nothing.
Source: Golub and Van Loan, "Matrix Computations", 4th ed. 2013, section 3.5.2 (row scaling).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, cast

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.errors import NetworkError
from tauledger.network.admittance import DENSE_LIMIT as DENSE_LIMIT
from tauledger.network.admittance import admittance as admittance
from tauledger.network.admittance import coordinates, slope_moment
from tauledger.network.admittance import times as times
from tauledger.network.assemble import Network

if TYPE_CHECKING:
    from collections.abc import Callable

    from scipy.sparse.linalg import SuperLU

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

MOST_ENTRIES = 2_000_000
MOST_SCALED = 1000
LEAST = float(np.finfo(float).tiny / np.finfo(float).eps)


class Solution(Struct, frozen=True):
    """x and λ at each complex frequency s: s (k,), x (k, n), adjoint λ (k, n), response H (k,)."""

    s: Complex
    x: Complex
    adjoint: Complex
    response: Complex


def solve(network: Network, s: Complex) -> Solution:
    """Solve Y(s) x = b and Y(s)ᵀ λ = e at every s (k,) in rad/s.

    Raises NetworkError where Y(s) is singular.
    """
    s = np.atleast_1d(np.asarray(s, dtype=complex))
    if network.size > DENSE_LIMIT:
        x, adjoint = _sparse(network, s, adjoint=True)
    else:
        output = network.output.astype(complex)
        solved = []
        for some in batches(network, s):
            y = admittance(network, some)
            solved.append((_dense(y, network.drive), _dense(y.transpose(0, 2, 1), output)))
        x, adjoint = (np.concatenate(found) for found in zip(*solved, strict=True))
    return Solution(s, x, adjoint, _output(network, x))


def response(network: Network, frequency_hz: Real) -> Complex:
    """Give H(j·2πf) at every frequency (k,) in Hz.

    Raises NetworkError where Y is singular.
    """
    s = on_axis(frequency_hz)
    if network.size > DENSE_LIMIT:
        x, _ = _sparse(network, s, adjoint=False)
    else:
        x = np.concatenate([_dense(admittance(network, some), network.drive) for some in batches(network, s)])
    return _output(network, x)


def batches(network: Network, s: Complex) -> list[Complex]:
    """Cut s (k,) into pieces for which the matrices that are solved at once stay small."""
    count = max(1, MOST_ENTRIES // max(network.size, 1) ** 2)
    return [s[first : first + count] for first in range(0, max(len(s), 1), count)]


def on_axis(frequency_hz: Real | float) -> Complex:
    """Give s = j·2πf in rad/s at every frequency in Hz, (k,)."""
    s: Complex = (2j * np.pi * np.atleast_1d(np.asarray(frequency_hz, dtype=float))).astype(complex, copy=False)
    return s


def log_slope(network: Network, solution: Solution) -> Complex:
    """Give d ln H / d ln s = −λᵀ(s·dY/ds)x / H at every s (k,).

    On the axis its real part is d ln|H| / d ln f, and its imaginary part d arg H / d ln f in radian. Where H is so
    small that it is no full number any more, as far beyond the edge of a line of R and C, it is −∞.
    Source: adjoint sensitivity, Director and Rohrer, "The generalized adjoint network and network sensitivities",
    IEEE Trans. Circuit Theory CT-16(3), 1969.
    """
    lost = np.abs(solution.response) < LEAST
    slope = -solution.s * slope_moment(network, solution) / np.where(lost, 1.0, solution.response)
    return np.asarray(np.where(lost, -np.inf, slope), dtype=np.complex128)


def _output(network: Network, x: Complex) -> Complex:
    return (x @ network.output).astype(complex, copy=False)


def _dense(y: Complex, right: Complex) -> Complex:
    scale = row_scale(np.max(np.abs(y), axis=-1, initial=0.0))
    try:
        x = np.linalg.solve(y * scale[..., None], (right * scale)[..., None])[..., 0]
    except np.linalg.LinAlgError as error:
        raise NetworkError("the small-signal network has no unique solution") from error
    if not np.all(np.isfinite(x)):
        raise NetworkError("the small-signal network has no finite solution")
    return x.astype(complex, copy=False)


def _sparse(network: Network, s: Complex, *, adjoint: bool) -> tuple[Complex, Complex]:
    x = np.empty((len(s), network.size), dtype=complex)
    lam = np.zeros_like(x)
    for k, sk in enumerate(s):
        factor, scale = _factor(network, complex(sk))
        x[k] = factor.solve(scale * network.drive)
        if adjoint:
            # scipy's stubs leave out the second argument, which asks for the transposed system
            solve_transposed = cast("Callable[[Complex, str], Complex]", factor.solve)
            lam[k] = scale * solve_transposed(network.output.astype(complex), "T")
    return x, lam


def _factor(network: Network, s: complex) -> tuple[SuperLU[np.complex128], Real]:
    """Factorise Y(s) with its rows scaled, and give the scale (n,)."""
    from scipy.sparse import csc_array
    from scipy.sparse.linalg import splu

    n = network.size
    row, column, value = coordinates(network, s)
    y = csc_array((value, (row, column)), shape=(n, n))
    y.sum_duplicates()
    largest = np.zeros(n)
    np.maximum.at(largest, y.indices, np.abs(y.data))
    scale = row_scale(largest)
    y.data *= scale[y.indices]
    try:
        return splu(y), scale
    except RuntimeError as error:
        raise NetworkError("the small-signal network has no unique solution") from error


def row_scale(largest: Real) -> Real:
    """Give the power of two that brings the largest entry of a row near 1; 1 for a row of nothing."""
    _, exponent = np.frexp(largest)
    return np.asarray(np.ldexp(1.0, -np.clip(exponent, -MOST_SCALED, MOST_SCALED)), dtype=np.float64)
