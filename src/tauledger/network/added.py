"""The response with one capacitance more, between any two nodes: each candidate costs one solution per frequency.

A capacitance C between two nodes changes Y by s·C·d·dᵀ with the incidence d of the two, so that
H(s, C) = H0 − s·C·(eᵀY⁻¹d)(dᵀx)/(1 + s·C·dᵀY⁻¹d), exact for every C.

Source of the rank-one formula: Sherman and Morrison, "Adjustment of an inverse matrix corresponding to a change in one
element of a given matrix", Ann. Math. Stat. 21(1), 1950.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct

from tauledger.errors import NetworkError
from tauledger.network.assemble import Network, incidence
from tauledger.network.solve import DENSE_LIMIT, Complex, Real, admittance, on_axis


class Places(Struct, frozen=True):
    """m places for a capacitance: s and H0 (k,), passes = (eᵀY⁻¹d)(dᵀx) and own = dᵀY⁻¹d, both (k, m)."""

    s: Complex
    response: Complex
    passes: Complex
    own: Complex


def places(network: Network, pairs: Sequence[tuple[str, str]], frequency_hz: Real) -> Places:
    """Solve the network for a capacitance between each pair of nodes ("0": ground) at every frequency (k,) in Hz.

    Raises NetworkError where the network has no unique solution.
    """
    s = on_axis(frequency_hz)
    d = np.array([incidence(network, plus, minus) for plus, minus in pairs], dtype=float).reshape(-1, network.size).T
    right = np.concatenate([network.drive[:, None], d.astype(complex)], axis=1)
    batch = len(s) if network.size <= DENSE_LIMIT else 1
    responses, passes, own = [], [], []
    for first in range(0, len(s), batch):
        at = s[first : first + batch]
        try:
            solved = np.linalg.solve(admittance(network, at), np.broadcast_to(right, (len(at), *right.shape)))
        except np.linalg.LinAlgError as error:
            raise NetworkError("the small-signal network has no unique solution") from error
        reached = np.einsum("n,knm->km", network.output, solved)
        responses.append(reached[:, 0])
        passes.append(reached[:, 1:] * np.einsum("nm,kn->km", d, solved[:, :, 0]))
        own.append(np.einsum("nm,knm->km", d, solved[:, :, 1:]))
    return Places(s, np.concatenate(responses), np.concatenate(passes), np.concatenate(own))


def response_with(found: Places, farad: Real) -> Complex:
    """Give H (k, m) with the capacitance farad (m,) at each of the m places, one at a time."""
    added = found.s[:, None] * farad
    return np.asarray(found.response[:, None] - added * found.passes / (1.0 + added * found.own), dtype=np.complex128)
