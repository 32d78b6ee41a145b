"""Slewing below f_H is told; above it is not."""

from __future__ import annotations

import math

import pytest

from tauledger.causes.slews_first import slews_first
from tauledger.hand.slewing import Slew

TWO_MILLIAMPERE = Slew(
    node="out",
    title="emitter of Q1, output (out)",
    drivers=("Q1",),
    current_a=2e-3,
    capacitance_f=100e-12,
    behind=(),
    ratio=1.0,
    cut_off_v=5.0,
)
FULL_POWER_HZ = 20e6 / (2 * math.pi)


def test_the_effect_is_full_power_bandwidth_over_f_high() -> None:
    cause = slews_first(TWO_MILLIAMPERE, swing_v=1.0, f_high_hz=10e6)
    assert cause is not None
    assert cause.effect == pytest.approx(FULL_POWER_HZ / 10e6 - 1.0)
    assert "2.00 mA into 100 pF" in cause.says
    assert cause.where == "emitter of Q1, output (out)"


def test_just_above_f_high_there_is_no_cause() -> None:
    assert slews_first(TWO_MILLIAMPERE, swing_v=1.0, f_high_hz=FULL_POWER_HZ * 0.999) is None
    assert slews_first(TWO_MILLIAMPERE, swing_v=1.0, f_high_hz=FULL_POWER_HZ * 1.001) is not None


def test_half_the_amplitude_is_twice_the_bandwidth() -> None:
    assert slews_first(TWO_MILLIAMPERE, swing_v=0.5, f_high_hz=FULL_POWER_HZ * 1.9) is None
