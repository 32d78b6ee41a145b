"""What it takes: every change that is said to reach a figure is made in the netlist, and ngspice agrees."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from msgspec.structs import replace

from boards import source_follower
from cells import near
from compensated import TwoStages, network_of
from tauledger.answers.answer import Subject
from tauledger.answers.wants import want_facts
from tauledger.asked import Asked, Want
from tauledger.circuit import NO_CHANGE, Change
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.explain import NOTHING
from tauledger.netlist import read
from tauledger.pipeline import review, review_network, solve
from tauledger.record import Remedy, Review, WantFacts
from tauledger.report.terminal import render

FIXTURES = Path(__file__).parents[2] / "fixtures"
SERVO = FIXTURES / "servo_gain.cir"
PREAMP = FIXTURES / "echo_preamp.cir"


def wanting(*wants: Want) -> Asked:
    return Asked(wants=wants)


@pytest.fixture(scope="module")
def servo(engine: Engine) -> Review:
    asked = wanting(Want("margin", 60.0), Want("gain_margin", 5.0), Want("f_u", 30e6))
    return review(SERVO, engine=engine, asked=asked)


@pytest.fixture(scope="module")
def preamp(engine: Engine) -> Review:
    return review(PREAMP, engine=engine, asked=wanting(Want("f_h", 1e6), Want("f_l", 700.0)))


def want_of(found: Review, quantity: str) -> WantFacts:
    return next(one for one in found.wants if one.quantity == quantity)


def names(one: Remedy) -> tuple[str, ...]:
    return tuple(change.name for change in one.changes)


def remedy(found: Review, quantity: str, *changed: str) -> Remedy:
    return next(one for one in want_of(found, quantity).remedies if names(one) == changed)


def test_what_reaches_the_margin_comes_first_and_does_so_exactly(servo: Review) -> None:
    want = want_of(servo, "margin")
    assert not want.met
    assert want.now == pytest.approx(servo.f_unity.phase_margin_exact_deg if servo.f_unity else 0.0, abs=1e-9)
    assert [one.reaches for one in want.remedies] == sorted((one.reaches for one in want.remedies), reverse=True)
    reached = [one for one in want.remedies if one.reaches]
    assert {names(one) for one in reached} == {("CC",), ("RZ",), ("RZ", "CC"), ("CL",), ("M6.gm",)}
    assert [one.phase_margin_deg for one in reached] == pytest.approx([60.0] * len(reached), abs=1e-4)


def test_ngspice_was_run_for_every_change_of_cards(servo: Review, preamp: Review) -> None:
    for want in (*servo.wants, *preamp.wants):
        for one in want.remedies:
            if one.moves_bias:
                assert one.simulated_figure is None
                assert one.says
            else:
                assert one.simulated_figure == near(one.figure, rel=1e-6)


@pytest.mark.parametrize("card", ["CC", "CL"])
def test_the_netlist_with_the_card_changed_has_the_margin(servo: Review, engine: Engine, card: str) -> None:
    value = remedy(servo, "margin", card).changes[0].value
    changed = review(SERVO, engine=engine, change=Change(elements=((card, value),)))
    assert changed.f_unity is not None
    assert changed.f_unity.phase_margin_deg == pytest.approx(60.0, abs=1e-3)


def test_the_netlist_with_a_resistor_at_one_over_gm_in_series_has_the_margin(
    servo: Review, engine: Engine, tmp_path: Path
) -> None:
    both = remedy(servo, "margin", "RZ", "CC")
    series, capacitor = both.changes
    gm = next(
        figure.value
        for device in servo.devices
        if device.name == "M6"
        for figure in device.figures
        if figure.symbol == "gm"
    )
    assert series.value == near(1.0 / gm, rel=0.01)
    assert (series.new, series.beside, series.before) == (True, "CC", None)
    text = SERVO.read_text()
    assert text.count("CC y out 2.2p") == 1
    board = tmp_path / "nulled.cir"
    board.write_text(text.replace("CC y out 2.2p", f"RZ y z {series.value!r}\nCC z out {capacitor.value!r}"))
    changed = review(board, engine=engine)
    assert changed.f_unity is not None
    assert changed.f_unity.phase_margin_deg == pytest.approx(60.0, abs=1e-3)
    assert changed.f_unity.simulated_hz == near(both.f_unity_hz, rel=1e-3)


def test_a_resistor_above_one_over_gm_does_what_one_over_gm_does_not(
    servo: Review, engine: Engine, tmp_path: Path
) -> None:
    (series,) = remedy(servo, "margin", "RZ").changes
    assert series.over_gm is not None
    assert 1.0 < series.over_gm < 10.0
    board = tmp_path / "nulled.cir"
    board.write_text(SERVO.read_text().replace("CC y out 2.2p", f"RZ y z {series.value!r}\nCC z out 2.2p"))
    changed = review(board, engine=engine)
    assert changed.f_unity is not None
    assert changed.f_unity.phase_margin_deg == pytest.approx(60.0, abs=1e-3)


def test_the_slope_alone_is_not_enough_and_is_told_beside(servo: Review) -> None:
    change = remedy(servo, "margin", "CC").changes[0]
    assert change.first_order is not None
    assert change.first_order < 0.9 * change.value


def test_what_is_met_needs_nothing_and_says_what_is_to_spare(servo: Review) -> None:
    want = want_of(servo, "gain_margin")
    assert want.met
    assert want.remedies == ()
    assert want.now is not None
    assert want.slack == pytest.approx(want.now - 5.0, abs=1e-12)


def test_unity_gain_frequency_is_reached_by_the_compensation_and_by_ngspice(servo: Review, engine: Engine) -> None:
    value = remedy(servo, "f_u", "CC").changes[0].value
    changed = review(SERVO, engine=engine, change=Change(elements=(("CC", value),)))
    assert changed.f_unity is not None
    assert changed.f_unity.simulated_hz == near(30e6, rel=1e-4)


def test_band_edges_of_the_changed_netlist_are_those_wanted(preamp: Review, engine: Engine) -> None:
    high, low = want_of(preamp, "f_h"), want_of(preamp, "f_l")
    for want in (high, low):
        one = next(one for one in want.remedies if one.reaches and not one.moves_bias)
        (change,) = one.changes
        changed = review(PREAMP, engine=engine, change=Change(elements=((change.name, change.value),)))
        edge = changed.f_high if want.quantity == "f_h" else changed.f_low
        assert edge is not None
        assert edge.simulated_hz == near(want.wanted, rel=1e-3)


def test_what_cannot_reach_it_says_so_with_the_best_that_it_brings(preamp: Review) -> None:
    short = [one for one in want_of(preamp, "f_l").remedies if not one.reaches]
    assert short
    now = want_of(preamp, "f_l").now
    assert now is not None
    assert all(one.figure is not None and 700.0 < one.figure < now for one in short)


def test_afterwards_the_engine_holds_the_unchanged_circuit(engine: Engine) -> None:
    numbers = solve(read(SERVO), NO_CHANGE, engine)
    at = np.array([1e3, 1e6, 2e7])
    before = engine.sweep(at).response
    review(SERVO, engine=engine, asked=wanting(Want("margin", 40.0)))
    assert engine.sweep(at).response == near(before, rel=1e-12)
    assert numbers.circuit is not None


def test_a_network_alone_is_worked_out_by_algebra() -> None:
    want = want_of(review_network(network_of(TwoStages(gm_1=0.6e-3)), asked=wanting(Want("margin", 60.0))), "margin")
    assert not want.met
    one = next(one for one in want.remedies if names(one) == ("K7",))
    assert one.reaches
    assert one.simulated_figure is None
    change = one.changes[0]
    again = review_network(network_of(TwoStages(gm_1=0.6e-3, c_c=change.value)))
    assert again.f_unity is not None
    assert again.f_unity.phase_margin_exact_deg == pytest.approx(60.0, abs=1e-4)


def test_an_existing_nulling_resistor_is_given_another_value() -> None:
    one = TwoStages(gm_1=0.6e-3, r_z=200.0)
    want = want_of(review_network(network_of(one), asked=wanting(Want("margin", 60.0))), "margin")
    assert ("K8",) in {names(found) for found in want.remedies}
    assert all(not change.new for found in want.remedies for change in found.changes)


def test_halves_of_a_balanced_circuit_are_changed_together(engine: Engine) -> None:
    found = review(FIXTURES / "pair.cir", engine=engine, asked=wanting(Want("f_h", 3e6)))
    together = [one for one in want_of(found, "f_h").remedies if set(names(one)) == {"CLN", "CLP"}]
    assert len(together) == 1
    assert together[0].reaches
    assert together[0].simulated_figure == near(3e6, rel=1e-6)


def test_a_stage_without_compensation_is_given_one_and_the_netlist_has_the_margin(
    engine: Engine, tmp_path: Path
) -> None:
    """Two common-emitter stages at −52°: no value of a card there reaches 45°, a capacitor across the second does."""
    board = FIXTURES / "gain_pair.cir"
    found = review(board, engine=engine, asked=wanting(Want("margin", 45.0)))
    (one,) = [one for one in want_of(found, "margin").remedies if one.reaches]
    (change,) = one.changes
    assert (change.new, change.before, change.beside, change.unit) == (True, None, "out to c1", "F")
    assert one.simulated_figure == pytest.approx(45.0, abs=1e-3)
    text = board.read_text()
    assert text.count("\nCL ") == 1
    compensated = tmp_path / "compensated.cir"
    compensated.write_text(text.replace("\nCL ", f"\nCX out c1 {change.value!r}\nCL "))
    changed = review(compensated, engine=engine)
    assert changed.f_unity is not None
    assert changed.f_unity.phase_margin_deg == pytest.approx(45.0, abs=1e-3)


def test_a_compensation_inside_a_subcircuit_is_changed_and_run_too(engine: Engine, tmp_path: Path) -> None:
    board = tmp_path / "block.cir"
    board.write_text(
        """River-level gauge, gain block as a subcircuit
VIN in 0 AC 1
RG in 0 1meg
X1 in out block
CL out 0 5p
.subckt block a b
G1 x 0 a 0 0.6m
R1 x 0 100k
C1 x 0 1p
G2 b 0 x 0 3m
R2 b 0 50k
CC x b 2p
.ends
.print ac v(out)
.end
"""
    )
    found = review(board, engine=engine, fold=("none",), asked=wanting(Want("margin", 60.0)))
    want = want_of(found, "margin")
    reached = {names(one): one.simulated_figure for one in want.remedies if one.reaches}
    assert reached[("X1.CC",)] == pytest.approx(60.0, abs=1e-3)
    assert reached[("RZ", "X1.CC")] == pytest.approx(60.0, abs=1e-3)


def test_where_the_network_is_not_trusted_nothing_is_worked_out(engine: Engine) -> None:
    netlist = read(SERVO)
    numbers = solve(netlist, NO_CHANGE, engine)
    assert numbers.agreement is not None
    off = replace(numbers, agreement=replace(numbers.agreement, max_relative_error=0.5))
    found = review_network(network_of(TwoStages()))
    (facts,) = want_facts(found, Subject(off, NOTHING), (Want("margin", 60.0),))
    assert (facts.now, facts.met, facts.remedies) == (None, False, ())
    assert "not the simulated circuit" in facts.says


@pytest.mark.parametrize(("quantity", "reason"), [("margin", "fall"), ("f_u", "fall"), ("gain_margin", "fall")])
def test_a_figure_that_the_circuit_does_not_have_is_refused(quantity: str, reason: str) -> None:
    with pytest.raises(InputError, match=reason):
        review_network(source_follower(), asked=wanting(Want(quantity, 50.0)))  # type: ignore[arg-type]


def test_a_response_without_an_end_meets_any_band_edge() -> None:
    found = review_network(network_of(TwoStages()), asked=wanting(Want("f_l", 10.0)))
    want = want_of(found, "f_l")
    assert want.met
    assert want.now is None or want.now == 0.0


def test_the_page_of_a_real_review_keeps_to_80_columns(servo: Review, preamp: Review) -> None:
    for found in (servo, preamp):
        text = render(found, color=False, unicode=True).splitlines()
        assert sum("WHAT IT TAKES" in line for line in text) == sum(bool(want.remedies) for want in found.wants)
        assert max(len(line) for line in text) <= 80
