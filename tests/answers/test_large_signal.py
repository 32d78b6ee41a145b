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
from transient_judge import slope

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
    found = review(path, engine=engine)
    assert found.large_signal is not None
    assert found.large_signal.nodes == ()
    assert found.large_signal.not_judged
    assert large_signal(found).blocks == ()
    assert "large" not in [section.key for section in document(found).sections if section.blocks]


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


FOLDED = """a folded cascode with a load
.model mn nmos level=1 vto=0.6 kp=100u lambda=0.05 gamma=0.4 phi=0.7 tox=15n cgso=0.3n cgdo=0.3n
.model mp pmos level=1 vto=-0.7 kp=40u lambda=0.06 gamma=0.4 phi=0.7 tox=15n cgso=0.3n cgdo=0.3n
VDD vdd 0 3.3
VIN inp 0 dc 1.4 ac 1
LB out inn 1G
CB inn 0 1G
IT tail 0 80u
M1 f1 inp tail 0 mn w=50u l=1u
M2 f2 inn tail 0 mn w=50u l=1u
VB bp 0 2.3
M7 f1 bp vdd vdd mp w=100u l=1u
M8 f2 bp vdd vdd mp w=100u l=1u
VC c 0 1.6
M3 g1 c f1 vdd mp w=60u l=1u
M4 out c f2 vdd mp w=60u l=1u
M5 g1 g1 0 0 mn w=15u l=1u
M6 out g1 0 0 mn w=15u l=1u
CL out 0 2p
.end
"""


def folded(folder: Path, text: str = FOLDED) -> Path:
    path = folder / "folded.cir"
    path.write_text(text, encoding="utf-8")
    return path


def test_the_output_of_a_folded_cascode_is_moved_by_the_tail_current(engine: Engine, tmp_path: Path) -> None:
    """Transient runs of such an amplifier fall within some per cent of I/C; the nodes inside are no limit."""
    found = review(folded(tmp_path), engine=engine)
    assert found.large_signal is not None
    slowest = found.large_signal.nodes[0]
    assert (slowest.node, set(slowest.drivers)) == ("out", {"M1", "M2"})
    assert slowest.output_slew_v_per_s == pytest.approx(80e-6 / 2.1e-12, rel=0.08)
    buffer = FOLDED.replace("LB out inn 1G\nCB inn 0 1G", "VS inn out 0")
    seen = slope(
        folded(tmp_path, buffer),
        tmp_path,
        source="VIN inp 0 dc 1.4 ac 1",
        pulse="PULSE(1.2 1.7 20n 1n 1n)",
        start_v=1.35,
        end_v=1.5,
        stop_s=200e-9,
    )
    assert slowest.output_slew_v_per_s == pytest.approx(seen, rel=0.15)


def test_an_open_amplifier_is_set_beside_its_unity_gain(engine: Engine, tmp_path: Path) -> None:
    text = first_limit(review(folded(tmp_path), engine=engine))
    assert "·f_u" in text
    assert "·f_H" not in text


def test_more_than_the_supplies_allow_is_said(engine: Engine, tmp_path: Path) -> None:
    asked = Asked(swing_v=2.0)
    assert "supplies from 0 V to 3.3" in first_limit(review(folded(tmp_path), engine=engine, asked=asked))
    assert "supplies" not in first_limit(review(folded(tmp_path), engine=engine))


def test_no_rate_is_told_where_the_output_itself_is_not_judged(engine: Engine, tmp_path: Path) -> None:
    """A push-pull output gives more than it stands with; the rate of the stage before it says nothing of it."""
    path = tmp_path / "board.cir"
    cards = """push-pull output
VCC vcc 0 10
VEE vee 0 -10
VIN in 0 DC 0 AC 1
RS in b 1k
Q3 m b e qn
RE e e9 100
IE e9 vee 2m
CE e9 0 100u
R3 vcc m 2.2k
VA a m 0.65
VB m d 0.65
Q1 vcc a e1 qn
Q2 vee d e2 qp
R1 e1 out 10
R2 e2 out 10
RL out 0 1k
CL out 0 1n
.model qn npn(is=5e-15 bf=150 vaf=60 cje=8p cjc=4p tf=400p)
.model qp pnp(is=5e-15 bf=150 vaf=60 cje=8p cjc=4p tf=500p)
.end
"""
    path.write_text(cards, encoding="utf-8")
    found = review(path, engine=engine, output="out")
    assert found.large_signal is not None
    assert found.large_signal.nodes == ()
    assert large_signal(found).blocks == ()
    (line,) = large_signal(found, verbose=True).blocks
    assert isinstance(line, Prose)
    assert line.text.startswith("not judged: ")
