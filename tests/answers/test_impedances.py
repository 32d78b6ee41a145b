"""Input and output impedance of whole boards: ngspice and algebra agree, paper agrees at mid-band."""

from __future__ import annotations

import cmath
import math
from pathlib import Path

import numpy as np
import pytest

import boards
from tauledger.asked import Asked
from tauledger.circuit import Port
from tauledger.devices.parts import capacitance, resistance, transresistance, voltage_source
from tauledger.engine.client import Engine
from tauledger.network.assemble import Network
from tauledger.pipeline import review, review_network
from tauledger.record import ImpedanceFacts, Review
from tauledger.report.charts.impedance import impedance_chart
from tauledger.report.document import document
from tauledger.report.impedances import impedances, in_series, parallel
from tauledger.report.layout import lay_out

FIXTURES = Path(__file__).parents[2] / "fixtures"
BOARDS = ("echo_preamp", "echo_cascode", "mos_gain", "photo_front", "line_driver", "pair")


@pytest.fixture(scope="module")
def reviews(engine: Engine) -> dict[str, Review]:
    return {name: review(FIXTURES / f"{name}.cir", engine=engine, asked=Asked(impedances=True)) for name in BOARDS}


def found(one: Review, side: str, says: str) -> ImpedanceFacts:
    return next(facts for facts in one.impedances if facts.side == side and facts.says.startswith(says))


@pytest.mark.parametrize("name", BOARDS)
def test_ngspice_and_the_rebuilt_network_give_the_same_impedances(name: str, reviews: dict[str, Review]) -> None:
    """1e-6 over the whole curve, load taken away included."""
    assert reviews[name].impedances
    for facts in reviews[name].impedances:
        assert len(facts.curve) > 200
        exact = np.array([phasor(point.exact_ohm, point.exact_deg) for point in facts.curve])
        simulated = np.array([phasor(point.simulated_ohm, point.simulated_deg) for point in facts.curve])
        assert np.max(np.abs(simulated / exact - 1.0)) < 1e-6, (facts.side, facts.says)
        for point in facts.points:
            assert point.simulated_real_ohm is not None
            assert point.simulated_imag_ohm is not None
            assert point.real_ohm is not None
            assert point.imag_ohm is not None
            ours = complex(point.real_ohm, point.imag_ohm)
            assert abs(complex(point.simulated_real_ohm, point.simulated_imag_ohm) / ours - 1.0) < 1e-6


def phasor(ohm: float | None, deg: float | None) -> complex:
    assert ohm is not None
    assert deg is not None
    return cmath.rect(ohm, math.radians(deg))


def test_r_parallel_c_is_the_impedance(reviews: dict[str, Review]) -> None:
    for name in BOARDS:
        for facts in reviews[name].impedances:
            for point in facts.points:
                assert None not in (point.real_ohm, point.imag_ohm, point.parallel_ohm, point.parallel_farad)
                y = 1.0 / point.parallel_ohm + 2j * math.pi * point.hz * point.parallel_farad  # type: ignore[operator]
                assert 1.0 / y == pytest.approx(complex(point.real_ohm, point.imag_ohm), rel=1e-9)  # type: ignore[arg-type]


def test_the_series_resistor_is_left_out_and_counted_in(reviews: dict[str, Review]) -> None:
    one = reviews["echo_preamp"]
    beyond, whole = found(one, "input", "beyond RS"), found(one, "input", "with RS")
    assert beyond.left_out == ("RS",)
    for without, total in zip(beyond.points, whole.points, strict=True):
        assert without.real_ohm is not None
        assert total.real_ohm == pytest.approx(without.real_ohm + 600.0)
        assert total.imag_ohm == pytest.approx(without.imag_ohm)


def test_paper_looks_into_the_base_and_into_the_collector(reviews: dict[str, Review]) -> None:
    """R1 ‖ R2 ‖ (r_b + r_π) within 2 % of the exact R at mid-band; R3 ‖ RL ‖ r_o at the output."""
    one = reviews["echo_preamp"]
    for facts, names in (
        (found(one, "input", "beyond RS"), ("R2", "into base of Q1")),
        (found(one, "output", "with RL, CL"), ("RL", "into collector of Q1")),
        (found(one, "output", "without RL, CL"), ("R3", "into collector of Q1")),
    ):
        assert facts.hand_ohm == pytest.approx(facts.points[0].parallel_ohm, rel=0.02)
        assert all(name in facts.hand_text for name in names)
    assert "RL" not in found(one, "output", "without RL, CL").hand_text.split("=")[1]


def test_feedback_lowers_what_the_output_shows_and_paper_says_by_how_much(reviews: dict[str, Review]) -> None:
    facts = found(reviews["mos_gain"], "output", "with ")
    assert "R0/(1 + T)" in facts.hand_text
    assert facts.hand_ohm == pytest.approx(facts.points[0].parallel_ohm, rel=0.01)


def test_a_pair_in_opposite_phase_is_worked_as_its_half(reviews: dict[str, Review]) -> None:
    """47 kΩ ‖ (r_b + r_π + (β + 1)·R_E): the tail stands still."""
    both = [one for one in reviews["pair"].impedances if one.side == "input" and one.says.startswith("beyond")]
    assert [one.name for one in both] == ["VINP beyond RSP", "VINN beyond RSN"]
    for facts in both:
        assert "opposite" in facts.says
        assert facts.hand_ohm == pytest.approx(facts.points[0].parallel_ohm, rel=1e-3)
        assert facts.hand_ohm == pytest.approx(12.0e3, rel=0.01)


def test_two_sources_that_are_no_pair_are_seen_as_they_drive_and_paper_keeps_silent(
    engine: Engine, tmp_path: Path
) -> None:
    text = (FIXTURES / "pair.cir").read_text(encoding="utf-8")
    path = tmp_path / "pair.cir"
    path.write_text(text.replace("AC 0.5 180", "AC 0.2 180"), encoding="utf-8")
    for facts in review(path, engine=engine, asked=Asked(impedances=True)).impedances:
        if facts.side == "input":
            assert facts.says.endswith(", the other sources driving too")
            assert (facts.hand_ohm, facts.hand_text) == (None, "")


def test_a_photodiode_sees_what_its_current_flows_into(reviews: dict[str, Review]) -> None:
    (facts,) = (one for one in reviews["photo_front"].impedances if one.side == "input")
    assert facts.hand_ohm == pytest.approx(facts.points[0].parallel_ohm, rel=0.01)
    assert "RF/(1 − K)" in facts.hand_text


def test_after_the_answer_the_engine_holds_the_deck_of_the_review_again(engine: Engine) -> None:
    one = review(FIXTURES / "echo_preamp.cir", engine=engine, asked=Asked(impedances=True))
    assert one.f_high is not None
    gain = abs(complex(engine.sweep([one.midband.frequency_hz]).response[0]))
    assert gain == pytest.approx(abs(complex(one.midband.gain_real, one.midband.gain_imag)), rel=1e-6)


def test_they_are_given_when_asked_for_alone(engine: Engine) -> None:
    assert review(FIXTURES / "echo_preamp.cir", engine=engine).impedances == ()


def test_a_current_at_the_output_has_an_input_impedance_alone(engine: Engine) -> None:
    one = review(FIXTURES / "opamp_filter.cir", engine=engine, output="i(VP)", asked=Asked(impedances=True))
    assert {facts.side for facts in one.impedances} == {"input"}


def test_all_formats_show_them(reviews: dict[str, Review]) -> None:
    one = reviews["echo_preamp"]
    lines = [line.text for line in lay_out([impedances(one)], width=80, unicode=True, page=60)]
    assert all(len(line) <= 80 for line in lines)
    assert lines[0].startswith("IMPEDANCES")
    section = next(section for section in document(one).sections if section.key == "impedances")
    assert len(section.blocks) == 3
    for narrow in (False, True):
        assert "out of v(out) without RL, CL" in impedance_chart(one, narrow=narrow)


def test_a_coupling_capacitor_that_still_counts_is_said_in_series(engine: Engine) -> None:
    """1 µF at 15.7 kHz beside r_e: paper's 8.6 Ω is the series resistance, not that of R ‖ C."""
    one = review(FIXTURES / "cable_driver.cir", engine=engine, asked=Asked(impedances=True))
    facts = found(one, "output", "without ")
    assert facts.hand_ohm == pytest.approx(facts.points[0].real_ohm, rel=0.01)
    (first, second) = in_series(one)
    assert "Ω in series with 1.00 µF" in first
    assert "Ω in series with 999 nF" in second
    gate = review(FIXTURES / "mos_gain.cir", engine=engine, asked=Asked(impedances=True))
    assert in_series(gate) == ()


@pytest.mark.parametrize(
    ("ohm", "farad", "written"),
    [
        (1e3, 1e-12, "1.000 kΩ ‖ 1.00 pF"),
        (1e3, 0.0, "1.000 kΩ"),
        (None, 1e-12, "1.00 pF"),
        (1e3, -1.0 / (2 * math.pi * 1e6) ** 2 / 1e-6, "1.000 kΩ ‖ 1.00 µH"),
        (1e3, None, "1.000 kΩ"),
        (None, None, "–"),
    ],
)
def test_what_carries_nothing_is_not_written(ohm: float | None, farad: float | None, written: str) -> None:
    assert parallel(ohm, farad, 1e6) == written


def test_a_network_alone_has_exact_impedances_and_none_simulated() -> None:
    one = review_network(boards.weak_stage_with_large_bridge(), asked=Asked(impedances=True))
    assert {facts.side for facts in one.impedances} == {"input", "output"}
    for facts in one.impedances:
        assert all(point.parallel_ohm is not None for point in facts.points)
        assert all(point.simulated_real_ohm is None for point in facts.points)
        assert all(point.simulated_ohm is None and point.exact_ohm for point in facts.curve)
    lines = [line.text for line in lay_out([impedances(one)], width=80, unicode=True, page=60)]
    assert not any("simulated" in line for line in lines)


def test_an_output_that_a_source_forces_has_no_resistance() -> None:
    parts = [
        voltage_source("VIN", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        resistance("R2", "a", "b", 33e3),
        voltage_source("VS", "b", "0"),
        transresistance("H1", "out", "0", -14.2e3, "VS"),
        resistance("R3", "out", "0", 574.0),
        capacitance("C1", "a", "0", 1e-9),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    all_of_them = review_network(network, asked=Asked(impedances=True)).impedances
    for one in all_of_them:
        if one.side == "output":
            assert [(point.real_ohm, point.parallel_ohm) for point in one.points] == [(0.0, 0.0)] * len(one.points)
    seen = next(one for one in all_of_them if one.side == "input" and one.left_out)
    assert seen.points[0].parallel_ohm == pytest.approx(33e3, rel=1e-9)


def test_a_source_before_a_virtual_short_sees_its_own_resistor_alone() -> None:
    parts = [
        voltage_source("VIN", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        voltage_source("VS", "a", "0"),
        transresistance("H1", "x", "0", -14.2e3, "VS"),
        resistance("R3", "x", "out", 574.0),
        capacitance("C1", "out", "0", 1e-9),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    beyond, whole = (
        one for one in review_network(network, asked=Asked(impedances=True)).impedances if one.side == "input"
    )
    assert beyond.points[0].parallel_ohm == 0.0
    assert whole.points[0].parallel_ohm == pytest.approx(1e3, rel=1e-9)


def test_measuring_aids_are_no_part_of_an_impedance(engine: Engine) -> None:
    """1 GH at the output and 1 GF beyond it, far below the frequency that is told."""
    facts = review(FIXTURES / "servo_gain.cir", engine=engine, asked=Asked(impedances=True))
    assert facts.f_high is not None
    assert facts.f_high.exact_hz is not None
    output = found(facts, "output", "")
    assert output.points[0].hz == pytest.approx(facts.f_high.exact_hz / 30.0)
    assert output.points[0].parallel_farad is not None
    assert output.points[0].parallel_farad > 0.0
    assert output.points[0].parallel_ohm == pytest.approx(output.hand_ohm or math.nan, rel=0.05)
