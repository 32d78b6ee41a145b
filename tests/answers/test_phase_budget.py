"""The phase budget of a two-stage amplifier: exact degrees add up, paper beside them where it has a formula."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from cells import near
from compensated import TwoStages, network_of
from tauledger.asked import Asked
from tauledger.circuit import Port
from tauledger.devices.parts import delayed_transconductance
from tauledger.engine.client import Engine
from tauledger.network.assemble import Network
from tauledger.pipeline import review, review_network
from tauledger.record import PhaseBudget, PhaseRow, Review

FIXTURES = Path(__file__).parents[2] / "fixtures"


@pytest.fixture(scope="module")
def servo(engine: Engine) -> Review:
    return review(FIXTURES / "servo_gain.cir", engine=engine)


def budget_of(found: Review) -> PhaseBudget:
    assert found.phase_budget is not None
    return found.phase_budget


def row(budget: PhaseBudget, name: str) -> PhaseRow:
    return next(one for one in budget.rows if one.name == name)


def total(budget: PhaseBudget) -> float:
    return sum(one.used_deg for one in budget.rows) + budget.others_deg + budget.rest_deg


def test_rows_others_and_rest_leave_the_margin(servo: Review) -> None:
    budget = budget_of(servo)
    assert servo.f_unity is not None
    assert budget.at_hz == servo.f_unity.exact_hz
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)
    # the servo that holds the operating point makes roots far below the band, which count among the others
    assert budget.rest_deg == 0.0
    assert abs(budget.others_deg) < 2.0


def test_ngspice_has_the_same_margin(servo: Review) -> None:
    assert servo.f_unity is not None
    assert budget_of(servo).margin_deg == pytest.approx(servo.f_unity.phase_margin_deg, abs=1e-3)


def test_paper_knows_the_poles_of_the_compensated_stage_within_five_per_cent(servo: Review) -> None:
    budget = budget_of(servo)
    assert budget.stage == "M6, bridged by CC, M6.c_gd from out to y"
    for name in ("dominant pole", "second pole", "zero, right half plane", "mirror pole"):
        one = row(budget, name)
        assert one.difference is not None
        assert abs(one.difference) < 0.05
        assert one.hand_hz is not None
        assert one.hand_deg is not None
        exact = math.hypot(one.real_hz, one.imag_hz)
        assert abs(one.hand_hz) / exact - 1.0 == pytest.approx(one.difference, abs=1e-12)
        assert abs(one.hand_deg - one.used_deg) < 1.0
        assert one.hand_formula
        assert one.hand_values
    assert row(budget, "zero, right half plane").real_hz > 0.0
    assert row(budget, "dominant pole").used_deg == pytest.approx(90.0, abs=0.02)


def test_where_no_formula_fits_there_is_none(servo: Review) -> None:
    bare = [one for one in budget_of(servo).rows if not one.hand_formula]
    assert bare
    assert all(one.hand_hz is None and one.hand_deg is None and one.difference is None for one in bare)


def test_gm1_over_c_c_is_far_off_and_the_second_pole_is_named(servo: Review) -> None:
    single, refined, margin = budget_of(servo).by_hand
    assert single.hand / single.exact > 1.2
    assert "second pole" in single.why
    assert "sits below it" in single.why
    assert refined.hand == near(refined.exact, rel=0.03)
    assert margin.hand == pytest.approx(margin.exact, abs=2.0)


def test_a_network_alone_has_the_budget_of_its_formulas() -> None:
    one = TwoStages(r_z=700.0, c_1=0.1e-12)
    budget = budget_of(review_network(network_of(one)))
    names = [line.name for line in budget.rows]
    assert names == ["dominant pole", "second pole", "zero of the nulling resistor", "third pole"]
    # 700 ohm is above 1/gm2: the zero lies in the left half plane and gives phase
    assert row(budget, "zero of the nulling resistor").used_deg < 0.0
    assert budget.stage == "K5, bridged by K7 and K8 from out to x"
    assert budget.rest_deg == pytest.approx(0.0, abs=1e-6)


def test_an_amplifier_without_a_compensated_stage_has_two_coefficients(engine: Engine) -> None:
    found = review(FIXTURES / "echo_preamp.cir", engine=engine, asked=Asked(unity=True))
    budget = budget_of(found)
    assert budget.stage == ""
    assert budget.by_hand == ()
    formulas = [one.hand_formula for one in budget.rows if one.hand_formula]
    assert "1/(2π·b1)" in formulas
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)


def test_no_budget_without_a_section_on_unity_gain(engine: Engine) -> None:
    assert review(FIXTURES / "echo_preamp.cir", engine=engine).phase_budget is None
    assert review(FIXTURES / "tia_pair.cir", engine=engine).phase_budget is None


def test_what_a_delay_takes_beside_its_all_pass_is_a_row_of_its_own() -> None:
    """A gm1 that acts 2 ns late turns the phase by ω·τ; the all-pass among the poles and zeros by 2·atan(ω·τ/2)."""
    late = 2e-9
    parts = [
        delayed_transconductance(part.owner, part.nodes[:2], part.nodes[2:], part.value, late)  # type: ignore[arg-type]
        if part.name == "K2"
        else part
        for part in network_of(TwoStages()).parts
    ]
    budget = budget_of(review_network(Network.from_parts(parts, output=Port("out"))))
    plain = budget_of(review_network(network_of(TwoStages())))
    turn = 2.0 * math.pi * budget.at_hz * late
    assert budget.at_hz == near(plain.at_hz, rel=1e-9)
    assert budget.margin_deg == pytest.approx(plain.margin_deg - math.degrees(turn), abs=1e-6)
    assert budget.rest_deg == pytest.approx(math.degrees(turn - 2.0 * math.atan(turn / 2.0)), abs=1e-6)
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)
