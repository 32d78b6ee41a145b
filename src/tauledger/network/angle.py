"""The phase of a response, continuous along the frequency axis: poles and zeros choose the turn of the exact phase.

With lines there are no such poles and zeros; then a scan fine enough to follow their delay chooses it.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.network.midband import MidBand
from tauledger.network.solve import Complex, Real


class Angle(Struct, frozen=True):
    """Phase beyond mid-band by poles and zeros (rad/s), continuous along the axis.

    scan_hz, scan_deg: (k,) frequencies and the phase followed along them, in their place; empty without lines.
    """

    poles: Complex
    zeros: Complex
    midband: MidBand
    scan_hz: Real = np.zeros(0)
    scan_deg: Real = np.zeros(0)

    def beyond_midband(self, frequency_hz: float, h: complex) -> float:
        """Give the phase of h at this frequency minus that at mid-band, in degrees, unwrapped."""
        return float(self.along(np.array([frequency_hz]), np.array([h]))[0])

    def along(self, frequency_hz: Real, h: Complex) -> Real:
        """Give the phase of h (k,) at these frequencies (k,) in Hz minus that at mid-band, in degrees, unwrapped."""
        exact = np.angle(h / self.midband.gain, deg=True)
        if len(self.scan_hz):
            turning = np.interp(frequency_hz, self.scan_hz, self.scan_deg)
        else:
            turning = self._sum(self.zeros, frequency_hz) - self._sum(self.poles, frequency_hz)
        return np.asarray(exact + 360.0 * np.round((turning - exact) / 360.0), dtype=np.float64)

    def _sum(self, roots: Complex, frequency_hz: Real) -> Real:
        ends = np.concatenate([[self.midband.frequency_hz], frequency_hz])
        moving = roots[roots != 0.0]
        # seen from a root, the axis point turns through the angle whose tangent is its height over its distance
        height = 2.0 * np.pi * ends[:, None] - moving.imag
        side = np.where(moving.real > 0.0, -1.0, 1.0)
        turn = np.sum(np.arctan2(height, np.abs(moving.real)) * side, axis=1)
        return np.asarray(np.degrees(turn[1:] - turn[0]), dtype=np.float64)


def scanned_angle(midband: MidBand, frequency_hz: Real, h: Complex) -> Angle:
    """Give the phase beyond mid-band followed along a scan (k,) of frequency in Hz and H."""
    followed = np.degrees(np.unwrap(np.angle(h / midband.gain)))
    followed -= 360.0 * np.round(np.interp(midband.frequency_hz, frequency_hz, followed) / 360.0)
    none = np.zeros(0, dtype=complex)
    return Angle(none, none, midband, frequency_hz, followed)
