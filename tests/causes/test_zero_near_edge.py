"""A zero near the band edge."""

from __future__ import annotations

import math

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import find_causes
from tauledger.causes.evidence import hertz, nearest_zero
from tauledger.causes.zero_near_edge import zero_near_lower_edge, zero_near_upper_edge


def test_bypass_zero_makes_the_short_circuit_sum_too_high() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.20(a): sum 504.7 Hz; zero 1/(2π·150·5.3 µ) = 200.2 Hz."""
    cause = zero_near_lower_edge(evidence(boards.follower_then_common_source_low_edge()))
    assert cause is not None
    assert (cause.cause, cause.quantity, cause.where) == ("zero-near-edge", "f_L", "C3, zero at 200 Hz")
    assert cause.effect == pytest.approx(412.7 / 500.5 - 1, abs=1e-3)
    assert cause.says == (
        "C3 has its zero at 200 Hz, not at DC: it makes the short-circuit sum, 505 Hz, too high; "
        "the poles alone give 501 Hz, with the zeros 413 Hz"
    )
    assert cause.instead == "keep the zero: √(Σp² − 2·Σz²) gives 413 Hz"


def test_bypass_zero_far_below_its_pole_is_nothing_of_note() -> None:
    """The same kind of stage with R_E 1.5 kohm: zero 0.26 Hz under a pole of 49.9 Hz (Kumar and Jain, Ex. 10.15)."""
    found = evidence(boards.two_equal_low_edges())
    cause = zero_near_lower_edge(found)
    assert cause is not None
    assert abs(cause.effect) < 1e-3
    assert "zero-near-edge" not in [told.cause for told in find_causes(found)]


def test_coupling_alone_has_no_zero_off_dc() -> None:
    assert zero_near_lower_edge(evidence(boards.coupled_stage(1000.0))) is None


def test_right_half_plane_zero_holds_the_upper_edge_up() -> None:
    """Pole 1.222 MHz, zero g_m/(2π·C_gd) = 3.183 MHz: f_H = 1.455 MHz, 19 % above the pole."""
    cause = zero_near_upper_edge(evidence(boards.weak_stage_with_large_bridge()))
    assert cause is not None
    assert cause.quantity == "f_H"
    assert cause.effect == pytest.approx(0.191, abs=1e-3)
    assert cause.numbers[0].value == pytest.approx(0.2e-3 / (2 * math.pi * 10e-12), rel=1e-6)
    assert "right half plane" in cause.says
    assert cause.instead.endswith("gives 1.46 MHz")


def test_followers_zero_is_in_the_left_half_plane() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.3.1 with C_mu = 1 pF: 417 MHz by poles, 722 MHz."""
    cause = zero_near_upper_edge(evidence(boards.emitter_follower(c_mu=1e-12)))
    assert cause is not None
    assert cause.effect == pytest.approx(722.3 / 417.0 - 1, abs=1e-3)
    assert "left half plane" in cause.says
    assert cause.instead == "keep the zero and find the -3 dB frequency from poles and zeros together"


def test_a_zero_fifty_times_above_is_nothing_of_note() -> None:
    found = evidence(boards.common_emitter_1ma())
    assert "zero-near-edge" not in [cause.cause for cause in find_causes(found)]


def test_the_zero_named_is_the_one_nearest_mid_band() -> None:
    """Gray, Hurst, Lewis and Meyer, sec. 7.3.3: 477 and 955 MHz. Below mid-band it is the highest zero."""
    above = nearest_zero(evidence(boards.two_common_source_stages()).upper)
    assert above is not None
    assert hertz(above) == pytest.approx(477e6, rel=2e-3)
    edge = evidence(boards.follower_then_common_source_low_edge()).lower
    assert edge.combined is not None
    two = replace(edge.combined.roots, zeros=np.array([0.0, -2 * math.pi * 30, -2 * math.pi * 200], dtype=complex))
    below = nearest_zero(replace(edge, combined=replace(edge.combined, roots=two)))
    assert below is not None
    assert hertz(below) == pytest.approx(200.0)


def test_levelling_off_is_a_note_and_no_cause() -> None:
    assert zero_near_upper_edge(evidence(boards.emitter_follower())) is None
