"""The phase of a response, continuous along the frequency axis: poles and zeros choose the turn of the exact phase.

With lines there are no such poles and zeros; then a scan fine enough to follow their delay chooses it.

Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945 (phase by poles and zeros).
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct, field

from tauledger.network.midband import MidBand
from tauledger.network.solve import Complex, Real


class Angle(Struct, frozen=True):
    """Phase beyond mid-band by poles and zeros (rad/s), continuous along the axis.

    scan_hz, scan_deg: (k,) frequencies and the phase followed along them, in their place; empty without lines.
    """

    poles: Complex
    zeros: Complex
    midband: MidBand
    scan_hz: Real = field(default_factory=lambda: np.zeros(0))
    scan_deg: Real = field(default_factory=lambda: np.zeros(0))

    def beyond_midband(self, frequency_hz: float, h: complex) -> float:
        """Give the phase of h at this frequency minus that at mid-band, in degrees, unwrapped."""
        return float(self.along(np.array([frequency_hz]), np.array([h]))[0])

    def along(self, frequency_hz: Real, h: Complex) -> Real:
        """Give the phase of h (k,) at these frequencies (k,) in Hz minus that at mid-band, in degrees, unwrapped."""
        exact = np.angle(h / self.midband.gain, deg=True)
        if len(self.scan_hz):
            turning = np.interp(frequency_hz, self.scan_hz, self.scan_deg)
        else:
            start_hz = self.midband.frequency_hz
            of_zeros, of_poles = (turned_deg(roots, start_hz, frequency_hz) for roots in (self.zeros, self.poles))
            turning = np.sum(of_zeros, axis=1) - np.sum(of_poles, axis=1)
        return np.asarray(exact + 360.0 * np.round((turning - exact) / 360.0), dtype=np.float64)


def turned_deg(roots: Complex, start_hz: float, frequency_hz: Real) -> Real:
    """Give the degrees (k, m) that the axis point turns through from start_hz to (k,) in Hz, as seen from m roots.

    roots: rad/s. Seen from the right half plane it turns the other way; seen from the origin it does not turn.
    """
    height = 2.0 * np.pi * np.concatenate([[start_hz], frequency_hz])[:, None] - roots.imag
    side = np.where(roots == 0.0, 0.0, np.where(roots.real > 0.0, -1.0, 1.0))
    turn = side * np.arctan2(height, np.abs(roots.real))
    return np.asarray(np.degrees(turn[1:] - turn[0]), dtype=np.float64)


def scanned_angle(midband: MidBand, frequency_hz: Real, h: Complex) -> Angle:
    """Give the phase beyond mid-band followed along a scan (k,) of frequency in Hz and H."""
    followed = np.degrees(np.unwrap(np.angle(h / midband.gain)))
    followed -= 360.0 * np.round(np.interp(midband.frequency_hz, frequency_hz, followed) / 360.0)
    none = np.zeros(0, dtype=complex)
    return Angle(none, none, midband, frequency_hz, followed)
