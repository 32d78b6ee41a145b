"""Large signal in the review: the first limit, its cause below f_H, and what is left out."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

import boards
from tauledger.asked import Asked
from tauledger.engine.client import Engine
from tauledger.pipeline import review, review_network
from tauledger.record import Review
from tauledger.report.document import document
from tauledger.report.large_signal import first_limit, large_signal, slew_rate
from tauledger.report.layout import Prose, Table

FIXTURES = Path(__file__).parents[2] / "fixtures"


def reviewed(name: str, engine: Engine, swing_v: float | None = None) -> Review:
    return review(FIXTURES / name, engine=engine, asked=Asked(swing_v=swing_v))


def test_full_power_bandwidth_is_the_slew_rate_over_the_slope_of_a_sine(engine: Engine) -> None:
    facts = reviewed("mos_gain.cir", engine, 0.5).large_signal
    assert facts is not None
    assert (facts.swing_v, facts.asked) == (0.5, True)
    for node in facts.nodes:
        assert node.full_power_hz == pytest.approx(node.output_slew_v_per_s / (2 * math.pi * 0.5))
    assert [node.full_power_hz for node in facts.nodes] == sorted(node.full_power_hz for node in facts.nodes)


def test_one_volt_is_taken_where_no_amplitude_is_given_and_the_line_says_so(engine: Engine) -> None:
    found = reviewed("echo_preamp.cir", engine)
    assert found.large_signal is not None
    assert (found.large_signal.swing_v, found.large_signal.asked) == (1.0, False)
    assert "1 V peak" in first_limit(found)
    assert not [cause for cause in found.causes if cause.cause == "slews-first"]


def test_below_f_high_it_is_a_cause_with_the_ratio_as_its_effect_and_before_what_paper_left_out(engine: Engine) -> None:
    found = reviewed("cable_driver.cir", engine)
    cause = next(cause for cause in found.causes if cause.cause == "slews-first")
    assert found.large_signal is not None
    assert found.f_high is not None
    assert found.f_high.simulated_hz is not None
    assert cause.effect == pytest.approx(found.large_signal.nodes[0].full_power_hz / found.f_high.simulated_hz - 1)
    assert "only" in first_limit(found)
    assert [one.on_paper for one in found.causes] == sorted(one.on_paper for one in found.causes)


def test_a_small_swing_takes_the_cause_away(engine: Engine) -> None:
    found = reviewed("cable_driver.cir", engine, 0.1)
    assert not [cause for cause in found.causes if cause.cause == "slews-first"]
    assert "only" not in first_limit(found)


def test_beyond_its_standing_current_a_stage_is_said_to_be_cut_off(engine: Engine) -> None:
    assert "Q2 is cut off from 79" in first_limit(reviewed("line_driver.cir", engine))
    assert "cut off" not in first_limit(reviewed("line_driver.cir", engine, 0.5))


def test_without_transistors_or_with_a_network_alone_there_is_no_line(engine: Engine) -> None:
    assert reviewed("opamp_filter.cir", engine).large_signal is None
    alone = review_network(boards.weak_stage_with_large_bridge())
    assert alone.large_signal is None
    assert large_signal(alone).blocks == ()


def test_a_current_at_the_output_has_no_slew_rate_in_volts(engine: Engine, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    cards = ["a current output", "VCC vcc 0 9", "VIN in 0 DC 0.7 AC 1", "RS in b 10k", "VOUT vcc c 0", "Q1 c b 0 qn"]
    path.write_text("\n".join([*cards, ".model qn npn(is=5e-15 bf=150 cje=8p cjc=4p)", ".end", ""]))
    found = review(path, engine=engine, output="i(vout)")
    assert found.midband.unit == "S"
    assert found.large_signal is None


def test_what_moves_a_transmission_line_is_not_judged(engine: Engine, tmp_path: Path) -> None:
    """A line is no capacitance: its far end is charged by what arrives, not by the follower at once."""
    lead = "C2 e lead 1u\nL1 lead out 200n"
    text = (FIXTURES / "cable_driver.cir").read_text(encoding="utf-8")
    assert lead in text
    path = tmp_path / "line.cir"
    path.write_text(text.replace(lead, "C2 e lead 1u\nR9 lead near 50\nT1 near 0 out 0 z0=50 td=20n"), encoding="utf-8")
    assert review(path, engine=engine).large_signal is None


def test_all_formats_tell_it(engine: Engine) -> None:
    found = reviewed("mos_gain.cir", engine)
    plain, verbose = large_signal(found), large_signal(found, verbose=True)
    assert [type(block) for block in plain.blocks] == [Prose]
    assert isinstance(verbose.blocks[-1], Table)
    section = next(section for section in document(found).sections if section.key == "large")
    assert len(section.blocks) == 2


@pytest.mark.parametrize(
    ("v_per_s", "written"), [(2.5e9, "2.5 V/ns"), (32.62e6, "32.6 V/µs"), (12e3, "0.012 V/µs"), (900.0, "0.9 V/ms")]
)
def test_slew_rates_are_written_as_data_sheets_do(v_per_s: float, written: str) -> None:
    assert slew_rate(v_per_s) == written
