"""The gain falls before Miller's multiplied capacitance can act."""

from __future__ import annotations

import pytest

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import find_causes
from tauledger.causes.gain_falls_first import gain_falls_first

PF = 1e-12


def test_a_heavy_load_takes_the_gain_away_before_the_gates_pole() -> None:
    """Miller puts the gate's pole at 579 kHz; the second pole is at 7.99 MHz, as b1/b2 says to 2 %."""
    cause = gain_falls_first(evidence(boards.output_pole_first()))
    assert cause is not None
    assert (cause.cause, cause.quantity, cause.where) == ("gain-falls-first", "f_H", "node g")
    numbers = {number.name: number.value for number in cause.numbers}
    assert numbers["pole by hand"] == pytest.approx(578.75e3, rel=1e-4)
    assert numbers["second pole"] == pytest.approx(7.99e6, rel=1e-3)
    assert numbers["Miller factor at mid-band"] == pytest.approx(51.0)


def test_factor_at_the_pole_is_that_of_the_loaded_gain() -> None:
    """|1 − K| with K = −(g_m − sC)R/(1 + sR(C_L + C)) at 579 kHz, evaluated here from the element values."""
    s = 2j * 3.141592653589793 * 578.75e3
    k = -(1e-3 - s * 0.05 * PF) * 50e3 / (1 + s * 50e3 * 20.05 * PF)
    cause = gain_falls_first(evidence(boards.output_pole_first()))
    assert cause is not None
    numbers = {number.name: number.value for number in cause.numbers}
    assert numbers["Miller factor at the pole by hand"] == pytest.approx(abs(1 - k), rel=1e-4)


def test_effect_is_two_coefficients_over_the_lowest_alone() -> None:
    found = evidence(boards.output_pole_first())
    steps = {step.step: step.hz or 0.0 for step in found.upper.steps}
    cause = gain_falls_first(found)
    assert cause is not None
    assert cause.effect == pytest.approx(steps["two-coefficients"] / steps["lowest"] - 1)
    assert cause.effect == pytest.approx(-0.203, abs=1e-3)


def test_a_light_load_lets_the_multiplied_capacitance_act() -> None:
    """The same stage with 0.5 pF: the output's own 110 kHz·… pole lies above the gate's, the gain is still there."""
    network = boards.common_source(100e3, 1e-3, 50e3, 0.2 * PF, 0.05 * PF, 0.5 * PF)
    assert gain_falls_first(evidence(network)) is None


def test_a_compensated_stage_does_not_lose_its_gain_first() -> None:
    assert gain_falls_first(evidence(boards.compensated_stage())) is None
    assert gain_falls_first(evidence(boards.two_common_source_stages())) is None


def test_it_is_not_told_where_it_does_not_move_the_edge() -> None:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.13: far above f_H = 6.2 kHz, where 0.6 % is nothing of note."""
    found = evidence(boards.cascode_with_high_load())
    assert gain_falls_first(found) is not None
    assert "gain-falls-first" not in [cause.cause for cause in find_causes(found)]
