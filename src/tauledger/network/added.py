"""The response with one capacitance more, between any two nodes: each candidate costs one solution per frequency.

A capacitance C between two nodes changes Y by s·C·d·dᵀ with the incidence d of the two.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tauledger.network.assemble import Network, incidence
from tauledger.network.rank_one import Places as Places
from tauledger.network.rank_one import changed_response, places_of_change
from tauledger.network.solve import Complex, Real, on_axis


def places(network: Network, pairs: Sequence[tuple[str, str]], frequency_hz: Real) -> Places:
    """Solve the network for a capacitance between each pair of nodes ("0": ground) at every frequency (k,) in Hz.

    Raises NetworkError where the network has no unique solution.
    """
    d = np.array([incidence(network, plus, minus) for plus, minus in pairs], dtype=float).reshape(-1, network.size).T
    return places_of_change(network, d, d, on_axis(frequency_hz))


def response_with(found: Places, farad: Real) -> Complex:
    """Give H (k, m) with the capacitance farad (m,) at each of the m places, one at a time."""
    return changed_response(found, found.s[:, None] * farad)
