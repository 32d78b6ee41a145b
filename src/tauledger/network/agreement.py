"""How well the rebuilt network agrees with the engine's sweep."""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.errors import NetworkError
from tauledger.network.solve import Complex, Real

FLOOR = 1e-6


class Agreement(Struct, frozen=True):
    """max_relative_error: largest |ΔH| / max(|H|, 1e-6·|H_mid|), at at_hz, among so many points."""

    max_relative_error: float
    at_hz: float
    points: int


def agreement(frequency_hz: Real, network_response: Complex, sweep_response: Complex, gain_mid: complex) -> Agreement:
    """Compare the network's response with the sweep's at the same frequencies, each (k,).

    gain_mid: H at mid-band; below a millionth of it the error counts against that floor.
    Raises NetworkError where there is nothing to compare or a value is not finite.
    """
    if not len(frequency_hz) or not (np.all(np.isfinite(network_response)) and np.all(np.isfinite(sweep_response))):
        raise NetworkError("network and sweep cannot be compared")
    scale = np.maximum(np.abs(sweep_response), FLOOR * abs(gain_mid))
    error = np.abs(network_response - sweep_response) / scale
    worst = int(np.argmax(error))
    return Agreement(float(error[worst]), float(frequency_hz[worst]), len(frequency_hz))
