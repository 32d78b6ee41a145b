"""Unity gain of whole boards: against ngspice on the original netlist, and against changed cards."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from msgspec.structs import replace

from answers.unity_judge import judge
from tauledger.answers.answer import Subject
from tauledger.answers.unity import unity_facts
from tauledger.asked import Asked
from tauledger.circuit import NO_CHANGE, Change, Port
from tauledger.devices.parts import capacitance, resistance, transconductance, voltage_source
from tauledger.engine.client import Engine
from tauledger.explain import NOTHING
from tauledger.netlist import read
from tauledger.network.agreement import Agreement
from tauledger.network.assemble import Network
from tauledger.network.poles import find_poles
from tauledger.numbers import solve
from tauledger.pipeline import review, review_network
from tauledger.record import Review, UnityElement, UnityFacts

FIXTURES = Path(__file__).parents[2] / "fixtures"
SERVO = FIXTURES / "servo_gain.cir"
WITHIN = 1e-3


Asking = Callable[[str], Review]


@pytest.fixture(scope="module")
def asked(engine: Engine) -> Asking:
    """A board of the fixtures with its unity gain asked for, reviewed once."""
    done: dict[str, Review] = {}

    def once(board: str) -> Review:
        if board not in done:
            done[board] = review(FIXTURES / board, engine=engine, asked=Asked(unity=True))
        return done[board]

    return once


@pytest.fixture(scope="module")
def servo(engine: Engine) -> Review:
    return review(SERVO, engine=engine)


def facts_of(found: Review) -> UnityFacts:
    assert found.f_unity is not None
    return found.f_unity


# board, output, where the plateau is read (None: where the review has mid-band), how far the sweep goes
BOARDS = (
    ("servo_gain.cir", "v(out)", 0.1, 3e8),
    ("mos_gain.cir", "v(out)", 100.0, 3e8),
    ("series_shunt.cir", "v(out)", None, 1e9),
    ("opamp_filter.cir", "v(adc)", 1.0, 1e6),
    ("pair.cir", "v(outp)-v(outn)", 10.0, 1e9),
    ("gain_pair.cir", "v(out)", None, 1e9),
)


@pytest.mark.parametrize(("board", "output", "mid_hz", "stop_hz"), BOARDS)
def test_f_u_and_margins_are_those_of_ngspice_on_the_netlist_as_written(
    board: str, output: str, mid_hz: float | None, stop_hz: float, asked: Asking, tmp_path: Path
) -> None:
    found = asked(board)
    facts = facts_of(found)
    # a plateau that reaches down to DC is read where the phase has come to rest
    ran = judge(FIXTURES / board, tmp_path, output, mid_hz or found.midband.frequency_hz, stop_hz)
    reference = ran.output[0]
    hz = ran.level_hz(1.0)
    assert facts.simulated_hz == pytest.approx(hz, rel=WITHIN / 10)
    # margins count from 0° or 180°, whatever is left of that at mid-band
    reference = complex(np.copysign(1.0, reference.real))
    phase = ran.phase_beyond(reference)
    assert facts.phase_margin_deg == pytest.approx(180.0 + ran.at(hz, phase), abs=0.02)
    if facts.gain_margin_db is None:
        assert phase.min() > -180.0
    else:
        turned = ran.turned_hz(reference)
        assert facts.gain_margin_at_hz == pytest.approx(turned, rel=WITHIN)
        left = -20.0 * ran.at(turned, np.log10(np.abs(ran.output)))
        assert facts.gain_margin_db == pytest.approx(left, abs=0.02)
    gain = abs(ran.output[0])
    product = gain * ran.level_hz(gain / math.sqrt(2.0))
    assert facts.gain_bandwidth_hz == pytest.approx(product, rel=WITHIN)


@pytest.mark.parametrize("board", [board for board, *_ in BOARDS])
def test_the_rebuilt_network_gives_the_same(board: str, asked: Asking) -> None:
    facts = facts_of(asked(board))
    assert facts.exact_hz == pytest.approx(facts.simulated_hz, rel=1e-7)
    assert facts.phase_margin_exact_deg == pytest.approx(facts.phase_margin_deg, abs=1e-5)
    assert facts.gain_margin_exact_db == pytest.approx(facts.gain_margin_db, abs=1e-5)
    assert facts.gain_margin_exact_at_hz == pytest.approx(facts.gain_margin_at_hz, rel=1e-6)
    assert facts.gain_bandwidth_exact_hz == pytest.approx(facts.gain_bandwidth_hz, rel=1e-6)


def changed(name: str, factor: float, value: float, engine: Engine) -> UnityFacts:
    """ngspice on the netlist with one card's value changed."""
    return facts_of(review(SERVO, engine=engine, change=Change(elements=((name, value * factor),))))


def card(found: Review, name: str) -> UnityElement:
    return next(one for one in facts_of(found).elements if one.name == name)


@pytest.mark.parametrize("name", ["CC", "CL"])
def test_shares_are_what_ngspice_says_of_a_changed_card(name: str, servo: Review, engine: Engine) -> None:
    """Cards that leave the operating point alone, 1 % up and down: f_u, both margins, gain-bandwidth product."""
    one = card(servo, name)
    step = 0.01
    more, less = (changed(name, math.exp(by), one.value, engine) for by in (step, -step))

    def slope(up: float | None, down: float | None) -> float:
        assert up is not None
        assert down is not None
        return (up - down) / (2.0 * step)

    f_u = slope(math.log(more.simulated_hz or 0.0), math.log(less.simulated_hz or 0.0))
    assert -one.f_unity == pytest.approx(f_u, abs=WITHIN)
    assert 100.0 * one.phase_margin_deg == pytest.approx(
        slope(more.phase_margin_deg, less.phase_margin_deg), rel=WITHIN
    )
    assert one.gain_margin_db is not None
    assert 100.0 * one.gain_margin_db == pytest.approx(slope(more.gain_margin_db, less.gain_margin_db), abs=0.01)
    product = slope(math.log(more.gain_bandwidth_hz or 0.0), math.log(less.gain_bandwidth_hz or 0.0))
    assert one.gain_bandwidth is not None
    assert -one.gain_bandwidth == pytest.approx(product, abs=WITHIN)


def test_ten_per_cent_less_was_computed_again_for_the_first_two_and_ngspice_agrees(
    servo: Review, engine: Engine
) -> None:
    elements = facts_of(servo).elements
    assert [one.f_unity_rerun_hz is not None for one in elements] == [True, True, *[False] * (len(elements) - 2)]
    first = elements[0]
    assert (first.name, first.free) == ("CC", True)
    ran = changed("CC", 0.9, first.value, engine)
    assert first.f_unity_rerun_hz == pytest.approx(ran.simulated_hz, rel=1e-7)
    # the changed circuit's mid-band, where the phase is counted from, lies elsewhere on the plateau
    assert first.phase_margin_rerun_deg == pytest.approx(ran.phase_margin_deg, abs=1e-3)


def test_elements_come_with_the_largest_effect_first_and_a_degree_counts_like_a_per_cent(servo: Review) -> None:
    sizes = [max(abs(one.f_unity), abs(one.phase_margin_deg)) for one in facts_of(servo).elements]
    assert sizes == sorted(sizes, reverse=True)


@pytest.mark.parametrize("node", ["x", "y", "out"])
def test_a_picofarad_costs_what_ngspice_says_of_a_netlist_with_it(
    node: str, servo: Review, engine: Engine, tmp_path: Path
) -> None:
    path = tmp_path / "probed.cir"
    path.write_text(SERVO.read_text().replace("\n.ac ", f"\nCPROBE {node} 0 1p\n.ac "))
    ran = facts_of(review(path, engine=engine))
    told = next(one for one in facts_of(servo).nodes if one.node == node)
    assert told.one_picofarad_hz == pytest.approx(ran.simulated_hz, rel=1e-7)
    assert told.one_picofarad_margin_deg == pytest.approx(ran.phase_margin_deg, abs=1e-3)


def test_nodes_are_called_as_the_rest_of_the_review_calls_them(servo: Review) -> None:
    titles = {row.name: row.title for row in servo.nodes}
    assert facts_of(servo).nodes
    assert all(titles[one.node] == one.title for one in facts_of(servo).nodes)


def test_the_hand_figure_is_that_of_its_formulas_else_the_gain_times_the_edge_by_hand(
    servo: Review, engine: Engine
) -> None:
    facts = facts_of(servo)
    assert servo.phase_budget is not None
    assert facts.hand_hz == servo.phase_budget.by_hand[1].hand
    quiet = review(FIXTURES / "series_shunt.cir", engine=engine)
    plain = facts_of(quiet)
    assert quiet.f_high is not None
    assert quiet.f_high.hand_hz is not None
    gain = abs(complex(quiet.midband.gain_real, quiet.midband.gain_imag))
    assert plain.hand_hz == pytest.approx(gain * quiet.f_high.hand_hz)
    assert plain.hand_formula == ""
    assert facts.difference == pytest.approx((facts.hand_hz or 0.0) / (facts.simulated_hz or 1.0) - 1.0)


def test_who_sets_it_is_told_unasked_only_where_the_band_begins_at_dc_with_gain_to_spare(
    engine: Engine, asked: Asking
) -> None:
    quiet = review(FIXTURES / "series_shunt.cir", engine=engine)
    assert facts_of(quiet).elements == ()
    assert facts_of(quiet).nodes == ()
    assert facts_of(quiet).simulated_hz is not None
    assert facts_of(asked("series_shunt.cir")).elements


@pytest.mark.parametrize(
    ("board", "why"),
    [
        ("line_follower.cir", "gain at mid-band is 0.98"),
        ("tia_pair.cir", "a gain in Ω does not fall to 1"),
        ("cable_driver.cir", "no more than 1"),
    ],
)
def test_a_gain_below_one_and_a_transimpedance_have_no_unity_gain_and_say_so_when_asked(
    board: str, why: str, engine: Engine
) -> None:
    assert review(FIXTURES / board, engine=engine).f_unity is None
    found = facts_of(review(FIXTURES / board, engine=engine, asked=Asked(unity=True)))
    assert why in found.none
    assert found.simulated_hz is found.exact_hz is None


def test_a_gain_that_levels_off_above_one_has_no_unity_gain() -> None:
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            transconductance("M1", ("out", "0"), ("in", "0"), 1e-2, label="gm"),
            resistance("R1", "out", "0", 1e3),
            resistance("R2", "out", "x", 250.0),
            capacitance("C1", "x", "0", 1e-9),
        ],
        output=Port("out"),
    )
    assert review_network(network).f_unity is None
    none = facts_of(review_network(network, asked=Asked(unity=True))).none
    assert none == "the gain does not fall to 1 beyond mid-band"


def test_an_amplifier_with_one_pole_far_below_f_u_is_swept_to_there(engine: Engine, tmp_path: Path) -> None:
    path = tmp_path / "one_pole.cir"
    path.write_text(
        "one pole\nVIN in 0 DC 0 AC 1\nG1 0 out in 0 1\nR1 out 0 1meg\nC1 out 0 1.59154943u\n.print ac v(out)\n.end\n"
    )
    facts = facts_of(review(path, engine=engine))
    assert facts.simulated_hz == pytest.approx(1e5, rel=1e-6)
    assert facts.exact_hz == pytest.approx(facts.simulated_hz, rel=1e-9)
    assert facts.phase_margin_deg == pytest.approx(90.0, abs=1e-3)
    assert facts.gain_margin_db is None
    assert facts.hand_hz == pytest.approx(facts.simulated_hz, rel=1e-3)


def test_a_network_alone_has_the_exact_figures_and_differences_against_them() -> None:
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            transconductance("M1", ("out", "0"), ("in", "0"), 2e-3, label="gm"),
            resistance("R1", "out", "0", 1e5),
            capacitance("C1", "out", "0", 1e-9),
        ],
        output=Port("out"),
    )
    facts = facts_of(review_network(network))
    assert facts.exact_hz == pytest.approx(math.sqrt(200.0**2 - 1.0) / (2.0 * math.pi * 1e-4))
    assert (facts.simulated_hz, facts.phase_margin_deg, facts.gain_bandwidth_hz) == (None, None, None)
    assert facts.difference == pytest.approx((facts.hand_hz or 0.0) / (facts.exact_hz or 1.0) - 1.0)
    assert [one.name for one in facts.elements] == ["M1.gm", "C1"]
    assert facts.elements[1].f_unity == pytest.approx(1.0, abs=1e-4)


def test_a_circuit_with_a_pole_in_the_right_half_plane_has_no_margin_to_speak_of() -> None:
    """Two inverting stages, the output fed back to the input with the sign that helps."""
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            resistance("RS", "in", "a", 1e4),
            capacitance("CA", "a", "0", 1e-12),
            transconductance("M1", ("y", "0"), ("a", "0"), 2e-3, label="gm"),
            resistance("R1", "y", "0", 1e4),
            capacitance("C1", "y", "0", 1e-12),
            transconductance("M2", ("out", "0"), ("y", "0"), 2e-3, label="gm"),
            resistance("R2", "out", "0", 1e4),
            capacitance("C2", "out", "0", 1e-12),
            resistance("RF", "out", "a", 1e5),
        ],
        output=Port("out"),
    )
    assert not find_poles(network).stable
    assert review_network(network).f_unity is None
    assert "unstable" in facts_of(review_network(network, asked=Asked(unity=True))).none


def test_a_network_that_is_not_trusted_leaves_the_figures_of_ngspice_alone(engine: Engine) -> None:
    netlist = read(SERVO)
    numbers = replace(solve(netlist, NO_CHANGE, engine), agreement=Agreement(0.1, 1e3, 100))
    found = review(SERVO, engine=engine)
    facts = unity_facts(found, Subject(numbers, NOTHING, netlist, NO_CHANGE, engine), asked=True)
    assert facts is not None
    assert facts.simulated_hz == pytest.approx(facts_of(found).simulated_hz, rel=1e-7)
    assert facts.phase_margin_deg == pytest.approx(facts_of(found).phase_margin_deg, abs=1e-5)
    assert (facts.exact_hz, facts.phase_margin_exact_deg, facts.slope) == (None, None, None)
    assert (facts.elements, facts.nodes) == ((), ())
