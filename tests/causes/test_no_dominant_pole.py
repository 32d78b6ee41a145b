"""No pole dominates."""

from __future__ import annotations

import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence
from tauledger.causes.no_dominant_pole import no_dominant_pole_above, no_dominant_pole_below


def test_cascode_has_poles_five_to_one_and_a_sum_14_per_cent_low() -> None:
    """Practice values of a MOS cascode: the sum of time constants prints 31.8 MHz, the network has 37.3 MHz."""
    cause = no_dominant_pole_above(evidence(boards.cascode()))
    assert cause is not None
    assert (cause.cause, cause.quantity) == ("no-dominant-pole", "f_H")
    assert cause.effect == pytest.approx(-0.142, abs=1e-3)
    assert cause.says == (
        "no pole dominates: 38.6 MHz and 200 MHz are 5.2 to 1, so the open-circuit sum, 32.0 MHz, comes out 14 % low "
        "against all poles together, 37.3 MHz"
    )
    assert cause.instead == "take every node, each with a pole of its own: 38.1 MHz"


def test_three_low_edges_make_the_short_circuit_sum_high() -> None:
    """Sum 2029 Hz, exact 1779 Hz."""
    cause = no_dominant_pole_below(evidence(boards.three_low_edges()))
    assert cause is not None
    assert cause.quantity == "f_L"
    assert cause.effect == pytest.approx(2029.2 / 1778.6 - 1, abs=1e-4)
    assert "short-circuit sum, 2.03 kHz, comes out 14 % high" in cause.says


def test_its_effect_leaves_the_zeros_to_their_own_cause() -> None:
    """Sum ÷ all poles, whatever the exact edge is: were it 10 % lower by a zero, that is not this cause."""
    found = evidence(boards.three_low_edges())
    assert found.lower.combined is not None
    assert found.lower.combined.all_poles is not None
    moved = replace(found, lower=replace(found.lower, hz=0.9 * found.lower.combined.all_poles))
    told, as_it_is = no_dominant_pole_below(moved), no_dominant_pole_below(found)
    assert told is not None
    assert as_it_is is not None
    assert told.effect == as_it_is.effect


def test_poles_twenty_to_one_have_a_dominant_one() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3: 206 kHz and 4.02 MHz."""
    assert no_dominant_pole_above(evidence(boards.two_common_source_stages())) is None


def test_complex_poles_are_another_cause() -> None:
    assert no_dominant_pole_above(evidence(boards.source_follower_with_load())) is None


def test_a_zero_at_the_edge_is_another_cause() -> None:
    """Poles of the follower with 1 pF are two to one, but its zero lies below f_H."""
    assert no_dominant_pole_above(evidence(boards.emitter_follower(c_mu=1e-12))) is None


def test_nothing_to_say_without_the_edge() -> None:
    assert no_dominant_pole_above(evidence(boards.emitter_follower())) is None
    assert no_dominant_pole_below(evidence(boards.cascode())) is None
