"""The literal review with Miller's factor over frequency: one pole turns and lowers the gain behind it."""

from __future__ import annotations

from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import MillerCurve, MillerCurves

_CURVES = ECHO_PREAMP.curves
assert _CURVES is not None
FREQUENCY = tuple(hz for hz in _CURVES.frequency_hz if 8e3 <= hz <= 2e7)
_FACTORS = tuple(1.0 + 179.0 / (1.0 + 1j * hz / 2.5e6) for hz in FREQUENCY)
FACTORS = MillerCurves(
    FREQUENCY,
    (
        MillerCurve(
            "b",
            "base of Q1, inside",
            "Q1.c_mu",
            180.07,
            tuple(factor.real for factor in _FACTORS),
            tuple(factor.imag for factor in _FACTORS),
        ),
    ),
)
WITH_FACTORS = replace(ECHO_PREAMP, miller=FACTORS)
