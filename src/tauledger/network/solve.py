"""Forward and adjoint solution of the network at many complex frequencies at once.

Up to `DENSE_LIMIT` unknowns the matrices are solved dense and in batches (LAPACK); above it, one sparse factorisation
per frequency serves both the forward and the adjoint system.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tauledger.errors import NetworkError
from tauledger.network.assemble import Network

DENSE_LIMIT = 150

Complex = NDArray[np.complex128]


@dataclass(frozen=True, slots=True)
class Solution:
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
        return _solve_sparse(network, s)
    y = admittance(network, s)
    try:
        x = np.linalg.solve(y, np.broadcast_to(network.drive, (len(s), network.size))[..., None])[..., 0]
        adjoint = np.linalg.solve(
            y.transpose(0, 2, 1), np.broadcast_to(network.output.astype(complex), x.shape)[..., None]
        )[..., 0]
    except np.linalg.LinAlgError as error:
        raise NetworkError("the small-signal network has no unique solution") from error
    x, adjoint = x.astype(complex, copy=False), adjoint.astype(complex, copy=False)
    return Solution(s, x, adjoint, x @ network.output)


def response(network: Network, frequency_hz: NDArray[np.float64]) -> Complex:
    """Give H(j·2πf) at every frequency (k,) in Hz."""
    s = 2j * np.pi * np.atleast_1d(np.asarray(frequency_hz, dtype=float))
    if network.size > DENSE_LIMIT:
        return _solve_sparse(network, s, adjoint=False).response
    try:
        x = np.linalg.solve(admittance(network, s), np.broadcast_to(network.drive, (len(s), network.size))[..., None])[
            ..., 0
        ]
    except np.linalg.LinAlgError as error:
        raise NetworkError("the small-signal network has no unique solution") from error
    return x @ network.output


def admittance(network: Network, s: Complex) -> Complex:
    """Give Y(s) = G + s·C dense, (k, n, n), for s (k,)."""
    g = network.conductance.dense(network.size)
    c = network.capacitance.dense(network.size)
    return g + s[:, None, None] * c


def _solve_sparse(network: Network, s: Complex, *, adjoint: bool = True) -> Solution:
    from scipy.sparse import csc_array
    from scipy.sparse.linalg import splu

    n = network.size
    g, c = network.conductance, network.capacitance
    row, column = np.concatenate([g.row, c.row]), np.concatenate([g.column, c.column])
    x = np.empty((len(s), n), dtype=complex)
    lam = np.zeros_like(x)
    for k, sk in enumerate(s):
        try:
            factor = splu(csc_array((np.concatenate([g.value, sk * c.value]), (row, column)), shape=(n, n)))
        except RuntimeError as error:
            raise NetworkError("the small-signal network has no unique solution") from error
        x[k] = factor.solve(network.drive)
        if adjoint:
            lam[k] = factor.solve(network.output.astype(complex), "T")
    return Solution(s, x, lam, (x @ network.output).astype(complex))
