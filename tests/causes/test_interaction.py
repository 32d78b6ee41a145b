"""Capacitances that act on each other with real poles."""

from __future__ import annotations

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence
from tauledger.causes.interaction import interaction_above, interaction_below


def test_two_stages_push_their_poles_apart() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3: 255.4 kHz as separate poles, 205.7 by b1, b2."""
    cause = interaction_above(evidence(boards.two_common_source_stages()))
    assert cause is not None
    assert cause.effect == pytest.approx(205.7 / 255.4 - 1, abs=1e-3)
    assert "push their poles apart (σ = 0.2)" in cause.says


def test_two_capacitors_of_25_hz_push_theirs_to_0_13_and_50_hz() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.15."""
    cause = interaction_below(evidence(boards.two_equal_low_edges()))
    assert cause is not None
    assert cause.quantity == "f_L"
    assert cause.effect == pytest.approx(49.86 / 38.84 - 1, abs=1e-3)
    assert cause.says.endswith("the poles are at 49.9 Hz and 131 mHz, 38.8 Hz becomes 49.9 Hz")


def test_coupling_and_bypass_that_do_not_see_each_other_do_not_interact() -> None:
    cause = interaction_below(evidence(boards.follower_then_common_source_low_edge()))
    assert cause is not None
    assert abs(cause.effect) < 1e-3


def test_sharper_causes_take_its_place() -> None:
    assert interaction_above(evidence(boards.source_follower_with_load())) is None
    assert interaction_above(evidence(boards.output_pole_first())) is None


def test_beside_a_complex_pair_there_is_no_second_real_pole_to_name() -> None:
    """The advice names b1 and b2 as the two poles for real ones alone."""
    found = evidence(boards.two_common_source_stages())
    assert found.upper.combined is not None
    roots = found.upper.combined.roots
    pair = np.array([roots.poles[0], (-1 + 2j) * 9e7, (-1 - 2j) * 9e7])
    combined = replace(found.upper.combined, roots=replace(roots, poles=pair))
    beside = interaction_above(replace(found, upper=replace(found.upper, combined=combined)))
    real = interaction_above(found)
    assert real is not None
    assert beside is not None
    assert "b1/b2 the second" in real.instead
    assert "a pair at" in beside.says
    assert beside.instead == "give no capacitor a pole of its own: b1 and b2 together give 206 kHz"
