"""The response with one element changed, for many candidates at once: one solution per frequency tells all of them.

An element adds a(s)·out·controlᵀ to Y, so that H = H0 − a·(eᵀY⁻¹out)(controlᵀx)/(1 + a·controlᵀY⁻¹out), exact for
every a.

Source: Sherman and Morrison, "Adjustment of an inverse matrix corresponding to a change in one element of a given
matrix", Ann. Math. Stat. 21(1), 1950.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.solve import DENSE_LIMIT, MOST_ENTRIES, Complex, Real, admittance, row_scale


class Places(Struct, frozen=True):
    """m places for a change: s and H0 (k,), passes = (eᵀY⁻¹out)(controlᵀx) and own = controlᵀY⁻¹out, both (k, m)."""

    s: Complex
    response: Complex
    passes: Complex
    own: Complex


def places_of_change(network: Network, out: Real, control: Real, s: Complex) -> Places:
    """Solve the network for the places out, control (n, m) at every s (k,) in rad/s.

    Raises NetworkError where the network has no unique solution.
    """
    right = np.concatenate([network.drive[:, None], out.astype(complex)], axis=1)
    batch = max(1, MOST_ENTRIES // (network.size * right.shape[1])) if network.size <= DENSE_LIMIT else 1
    response, passes, own = [], [], []
    for first in range(0, len(s), batch):
        at = s[first : first + batch]
        y = admittance(network, at)
        scale = row_scale(np.max(np.abs(y), axis=-1, initial=0.0))[..., None]
        try:
            solved = np.linalg.solve(y * scale, right * scale)
        except np.linalg.LinAlgError as error:
            raise NetworkError("the small-signal network has no unique solution") from error
        reached = np.einsum("n,knm->km", network.output, solved)
        response.append(reached[:, 0])
        passes.append(reached[:, 1:] * np.einsum("nm,kn->km", control, solved[:, :, 0]))
        own.append(np.einsum("nm,knm->km", control, solved[:, :, 1:]))
    return Places(s, np.concatenate(response), np.concatenate(passes), np.concatenate(own))


def changed_response(found: Places, change: Complex) -> Complex:
    """Give H (k, m) with the change a (k, m) at each of the m places, one at a time."""
    return np.asarray(found.response[:, None] - change * found.passes / (1.0 + change * found.own), dtype=np.complex128)
