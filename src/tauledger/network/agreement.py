"""How well the rebuilt network agrees with the engine's sweep."""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.errors import NetworkError
from tauledger.network.solve import Complex, Real

FLOOR = 1e-6


class Agreement(Struct, frozen=True):
    """How far network and engine differ, at most, among so many points of the range that counts.

    max_relative_error: largest |ΔH| / max(|H|, 1e-6·|H_mid|), at at_hz. beyond, beyond_at_hz: the same outside of that
    range, 0 where nothing was compared there.
    """

    max_relative_error: float
    at_hz: float
    points: int
    beyond: float = 0.0
    beyond_at_hz: float = 0.0


def agreement(
    frequency_hz: Real,
    network_response: Complex,
    sweep_response: Complex,
    gain_mid: complex,
    within_hz: tuple[float, float] = (0.0, np.inf),
) -> Agreement:
    """Compare the network's response with the sweep's at the same frequencies, each (k,).

    gain_mid: H at mid-band; below a millionth of it the error counts against that floor. within_hz: the range that
    counts, lowest and highest frequency; where the sweep has no point in it, all of it counts.
    Raises NetworkError where there is nothing to compare or a value is not finite.
    """
    if not len(frequency_hz) or not (np.all(np.isfinite(network_response)) and np.all(np.isfinite(sweep_response))):
        raise NetworkError("network and sweep cannot be compared")
    scale = np.maximum(np.abs(sweep_response), FLOOR * abs(gain_mid))
    error = np.abs(network_response - sweep_response) / scale
    counts = (frequency_hz >= within_hz[0]) & (frequency_hz <= within_hz[1])
    if not np.any(counts):
        counts = np.ones(len(error), dtype=bool)
    worst = int(np.argmax(np.where(counts, error, -1.0)))
    found = Agreement(float(error[worst]), float(frequency_hz[worst]), int(counts.sum()))
    if np.all(counts):
        return found
    other = int(np.argmax(np.where(counts, -1.0, error)))
    return replace(found, beyond=float(error[other]), beyond_at_hz=float(frequency_hz[other]))
