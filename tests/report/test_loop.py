"""The section on feedback: the same figures in every format, nothing where there is no loop."""

from __future__ import annotations

import json
import re

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import (
    AmplifierFacts,
    LoopCurve,
    LoopEstimate,
    LoopFacts,
    LoopNodeFacts,
    LoopStageFacts,
    NodeRow,
    Review,
    Working,
)
from tauledger.report.charts.loop import loop_chart
from tauledger.report.csv import to_csv
from tauledger.report.document import document
from tauledger.report.html import to_html
from tauledger.report.json import to_json
from tauledger.report.markdown import to_markdown
from tauledger.report.questions import answers
from tauledger.report.tables.upper import budget
from tauledger.report.terminal import render

WIRE = LoopFacts(
    loop="Q1.base",
    kind="wire",
    where="wire into the base of Q1 (b)",
    found=True,
    through=("b", "out"),
    at_hz=0.0,
    return_ratio_real=99.0,
    return_ratio_imag=0.0,
    return_ratio_simulated=98.9,
    crossover_hz=1e6,
    phase_margin_deg=62.0,
    crossover_simulated_hz=1.001e6,
    phase_margin_simulated_deg=61.9,
    gain_margin_db=14.0,
    gain_margin_at_hz=5e6,
    gain_margin_simulated_db=14.1,
    lower_crossover_hz=0.5,
    lower_phase_margin_deg=88.0,
    open_edge_hz=10e3,
    unit="V/V",
    closing_source="gm of Q1",
    closing_return_ratio=101.0,
    ideal_gain=-10.0,
    feedthrough=0.25,
    closed_gain=-9.9,
    identity_error=1e-12,
    hand_return_ratio=100.0,
    hand_siemens=0.04,
    hand_stages=(
        LoopStageFacts("out", -25e3, -25e3),
        LoopStageFacts("b", 0.1, 0.1),
        LoopStageFacts("Q1'b", 0.98, 0.98),
    ),
    hand_ideal_gain=-10.0,
    hand_ideal_text="-R4/(RS + R3)",
    hand_open_edge_hz=9.5e3,
    hand_open_nodes=(LoopNodeFacts("out", 25e3, 600e-12, 15e-6), LoopNodeFacts("inside Q1", 1e3, 1e-9, 1e-6)),
    estimates=(
        LoopEstimate("by hand, edge of T times 1 + T", 959.5e3, -0.05),
        LoopEstimate("ideal gain alone", 8e6, 7.0),
        LoopEstimate("closed loop, exact", 1.01e6, 0.0),
    ),
    why=("T has not one pole alone",),
)
CURVE = LoopCurve(
    "Q1.base", (1e2, 1e4, 1e6, 5e6, 1e7), (40.0, 37.0, 0.0, -14.0, -22.0), (0.0, -45.0, -118.0, -180.0, -200.0)
)
ADMITTANCE = replace(
    WIRE,
    loop="R4",
    kind="admittance",
    where="admittance of R4, against none",
    found=False,
    through=(),
    return_ratio_real=-0.5,
    return_ratio_simulated=None,
    crossover_hz=None,
    gain_margin_db=None,
    lower_crossover_hz=None,
    ideal_gain=None,
    closed_gain=WIRE.feedthrough,
    hand_return_ratio=None,
    hand_ideal_gain=None,
    hand_open_edge_hz=None,
    estimates=(),
    why=(),
    says=("T is negative at mid-band: what comes back helps, positive feedback",),
)
AMPLIFIER = replace(
    WIRE,
    loop="XU1",
    kind="source",
    where="input source G1 of XU1",
    closing_source="input source G1 of XU1",
    noise_gain=11.0,
    noise_gain_edge_hz=109.1e3,
    amplifier=AmplifierFacts("XU1", 1e5, 12.0, 1.2e6, 3e6),
    hand_return_ratio=None,
    hand_ideal_gain=None,
    hand_open_edge_hz=None,
    estimates=(LoopEstimate("gain-bandwidth over noise gain", 109.1e3, 9.8),),
)


def with_loops(*loops: LoopFacts) -> Review:
    return replace(ECHO_PREAMP, loops=loops, loop_curves=(CURVE,))


def terminal(review: Review) -> str:
    return render(review, color=False, unicode=True)


def words(text: str) -> str:
    return re.sub(r"\s+", " ", text)


def test_a_review_without_a_loop_has_no_section_on_one() -> None:
    assert "FEEDBACK" not in terminal(ECHO_PREAMP)
    assert "loop" not in {section.key for section in document(ECHO_PREAMP).sections}
    assert loop_chart(ECHO_PREAMP) == ""


def test_the_page_tells_margins_of_algebra_and_ngspice_side_by_side() -> None:
    page = terminal(with_loops(WIRE))
    assert re.search(r"return ratio T at DC +99\.00 \(39\.9 dB\) +98\.90", page)
    assert re.search(r"\|T\| = 1, crossover +1\.000 MHz +1\.001 MHz", page)
    assert re.search(r"phase margin +62\.0° +61\.9°", page)
    assert re.search(r"gain margin, at 5\.000 MHz +14\.0 dB +14\.1 dB", page)
    assert re.search(r"\|T\| = 1 below mid-band +500\.0 mHz", page)
    assert "cut at the wire into the base of Q1 (b); it passes b, out; simulated by double injection" in words(page)
    assert all(len(line) <= 80 for line in page.splitlines())


def test_the_page_works_t0_ideal_gain_and_edge_out() -> None:
    page = words(terminal(with_loops(WIRE)))
    assert "T0 = gm of Q1 40.00 mS · 25.00 kΩ (out) · 0.1000 (b) · 0.9800 (r_π over r_π + r_b of Q1) = 100.0" in page
    assert "(-0.99 %)" in page
    assert "A∞ = -R4/(RS + R3) = -10 V/V; A∞·T0/(1 + T0) = -9.901 V/V (+0.01 %); β = 1/A∞ = -0.1" in page
    assert "1/(2π·(25.0 kΩ·600 pF (out) + 1.00 kΩ·1.00 nF (inside Q1))) = 9.500 kHz (-5.0 %)" in page
    assert "A0/(1 + T) = -9.9 V/V with the ideal gain A∞ -10 V/V, feedthrough A0 0.25 V/V, T 101.0 at gm of Q1" in page
    assert "by hand, edge of T · (1 + T0) 959.5 kHz -5.0 %" in page
    assert "ideal gain A∞, with T → ∞ 8.000 MHz 8 times" in page


def test_an_admittance_has_no_simulation_and_no_ideal_gain_where_nothing_passes_it() -> None:
    page = words(terminal(with_loops(ADMITTANCE)))
    assert "RETURN RATIO" in page
    assert "return ratio T at DC -0.5000 (-6.0 dB) –" in page
    assert "is feedthrough A0 alone" in page
    assert "positive feedback" in page
    assert "by hand, edge" not in page
    forward = replace(ADMITTANCE, closing_source="source G1", closed_gain=2.0, feedthrough=0.0)
    told = "T is 0 there: source G1 has no loop; of the gain, 2 V/V, feedthrough A0 is 0 V/V"
    assert told in words(terminal(with_loops(forward)))


def test_an_amplifier_is_told_with_its_noise_gain() -> None:
    page = words(terminal(with_loops(AMPLIFIER)))
    assert "XU1 by itself, unloaded: open-loop gain 100000 (100.0 dB), pole 12.00 Hz" in page
    assert "gain-bandwidth 1.200 MHz, second pole 3.000 MHz" in page
    assert "noise gain 1/β 11.00" in page
    assert "f_H = gain-bandwidth / noise gain = 109.1 kHz" in page
    assert "by hand, gain-bandwidth / noise gain 109.1 kHz 10.8 times" in page
    one_pole = replace(AMPLIFIER, amplifier=AmplifierFacts("XU1", 1e5, 12.0, 1.2e6, None))
    assert "no second pole" in words(terminal(with_loops(one_pole)))
    ideal = replace(AMPLIFIER, amplifier=AmplifierFacts("XU1", 1e5, None, None, None), noise_gain_edge_hz=None)
    assert "no pole" in words(terminal(with_loops(ideal)))


def test_every_format_has_the_section() -> None:
    review = with_loops(WIRE, ADMITTANCE)
    html, markdown, csv = to_html(review).decode(), to_markdown(review).decode(), to_csv(review).decode()
    assert 'id="loop"' in html
    assert "Closed-loop f<sub>H</sub> from the loop" in html
    assert "### Feedback" in markdown
    assert "| phase margin | 62.0° | 61.9° |" in markdown
    assert "loops,Q1.base,crossover_simulated_hz,1001000.0,Hz" in csv
    assert "loops.estimates,Q1.base/ideal gain alone,hz,8000000.0,Hz" in csv
    assert "loop_curves" not in csv
    document_of = json.loads(to_json(review))
    assert document_of["loops"][0]["phase_margin_deg"] == 62.0
    assert document_of["loop_curves"][0]["ratio_db"][0] == 40.0


@pytest.mark.parametrize("narrow", [False, True])
def test_the_picture_names_the_crossover_and_its_margin(narrow: bool) -> None:
    svg = loop_chart(with_loops(WIRE), narrow=narrow)
    assert "1.000 MHz, 62° margin" in svg
    assert "|T| = 1 at 1.000 MHz" in svg
    assert set(re.findall(r"(?<!, )#[0-9a-f]{6}\b", svg)) == set()
    early = replace(WIRE, crossover_hz=1e3)
    assert "1.000 kHz" in loop_chart(replace(with_loops(early)), narrow=narrow)


def test_of_a_loop_without_crossover_the_curve_alone_is_drawn() -> None:
    svg = loop_chart(with_loops(replace(WIRE, crossover_hz=None, gain_margin_db=None)))
    assert "<svg" in svg
    assert "margin" not in svg
    assert loop_chart(replace(with_loops(WIRE), loop_curves=(LoopCurve("Q1.base", (1.0,), (1.0,), (0.0,)),))) == ""


def looped(review: Review) -> Review:
    """The first node worked out with a loop, as inside of a feedback loop."""

    def marked(node: NodeRow) -> NodeRow:
        working = node.working
        assert isinstance(working, Working)
        return replace(node, working=replace(working, source="loop", loop_gain=99.0))

    first, *others = review.nodes
    return replace(review, nodes=(marked(first), *others))


def test_rows_inside_a_loop_are_marked_in_every_table_and_said_to_rank_only() -> None:
    review = looped(with_loops(WIRE))
    said = "divided by 1 + T of the feedback loop R·C ranks nodes, but f_H follows from the loop"
    assert said in words(terminal(review))
    grid = budget(review)
    assert any("‡" in row.cells[1] for row in grid.rows)
    assert said in grid.note
    alone = budget(looped(ECHO_PREAMP))
    assert "‡ R0/(1 + T)" in alone.note
    assert said not in alone.note
    assert "‡" not in budget(ECHO_PREAMP).note


def test_the_answer_whether_paper_agrees_begins_with_the_loop() -> None:
    told = {answer.question: answer.answer for answer in answers(with_loops(WIRE))}["Does paper agree?"]
    assert told.startswith("Round the feedback loop, edge of T · (1 + T0) gives 959.5 kHz, -5.0 %: T has not one pole")
    assert "stand divided by 1 + T and are not the way to f_H" in told
    far = {answer.question: answer.answer for answer in answers(with_loops(AMPLIFIER))}["Does paper agree?"]
    assert "gives 109.1 kHz, 10.8 times too high" in far
    plain = {answer.question: answer.answer for answer in answers(with_loops(ADMITTANCE))}["Does paper agree?"]
    assert plain.startswith("By hand")


def test_a_node_that_takes_more_than_the_sum_is_said_to_do_so() -> None:
    """Where another one is negative a share of the sum above 100 % would read as a fault."""
    first, second, *others = ECHO_PREAMP.nodes
    assert first.time_constant_s is not None
    negative = replace(second, time_constant_s=-0.3 * first.time_constant_s)
    upper = ECHO_PREAMP.budget.upper
    assert upper is not None
    less = replace(ECHO_PREAMP.budget, upper=replace(upper, path_sum_s=0.7 * first.time_constant_s))
    review = replace(ECHO_PREAMP, nodes=(first, negative, *others), budget=less)
    told = {answer.question: answer.answer for answer in answers(review)}["What limits the bandwidth?"]
    assert "which is more than the sum over all nodes" in told
    assert "A negative R·C" in budget(review).note
    assert "A negative R·C" not in budget(ECHO_PREAMP).note


def asked(review: Review) -> dict[str, str]:
    return {one.question: one.answer for one in answers(review)}


def test_whether_a_found_loop_is_stable_is_answered_from_the_poles_and_its_margins() -> None:
    question = "Is the feedback loop stable?"
    assert question not in asked(ECHO_PREAMP)
    looped = replace(ECHO_PREAMP, loops=(WIRE,))
    answer = asked(looped)[question]
    assert answer.startswith("Yes, all poles of the closed circuit decay: phase margin 61.9° at 1.001 MHz")
    assert "gain margin 14.1 dB at 5.000 MHz" in answer
    growing = replace(ECHO_PREAMP.poles[0], real_hz=2e3, imag_hz=0.0)
    assert asked(replace(looped, poles=(growing,)))[question].startswith("No: a pole at 2.000 kHz")
    assert "Yes" not in asked(replace(looped, poles=()))[question]


def test_a_return_ratio_that_is_not_real_is_told_with_its_angle() -> None:
    lagging = replace(
        WIRE,
        return_ratio_real=-0.28,
        return_ratio_imag=-74.0,
        return_ratio_simulated=74.0,
        return_ratio_simulated_deg=-90.2,
        closing_return_ratio=-0.3,
        closing_return_ratio_imag=-70.0,
        open_edge_hz=None,
        flat=False,
    )
    page = words(terminal(with_loops(lagging)))
    assert "return ratio T at DC 74.00 at -90.2° (37.4 dB) 74.00 at -90.2°" in page
    assert "70.00 (-90.2°)" in page
    assert "whose T has its edge" not in page
    negative = replace(WIRE, return_ratio_simulated_deg=180.0, return_ratio_real=-5.0, return_ratio_simulated=5.0)
    assert "return ratio T at DC -5.000 (14.0 dB) -5.000" in words(terminal(with_loops(negative)))


def test_where_gain_bandwidth_over_noise_gain_is_not_f_high_the_reason_stands_instead() -> None:
    not_flat = replace(AMPLIFIER, noise_gain_edge_hz=None, not_f_high="the noise gain is not flat")
    page = words(terminal(with_loops(not_flat)))
    assert "the noise gain is not flat: gain-bandwidth over it is not f_H" in page
    assert "f_H = gain-bandwidth" not in page


def test_t0_of_the_cut_wire_is_the_product_of_the_gains_round_it() -> None:
    stages = (
        LoopStageFacts("inside Q1", 0.98, 0.98),
        LoopStageFacts("out", -500.0, -500.0),
        LoopStageFacts("b", 0.2, 0.2),
    )
    page = words(terminal(with_loops(replace(WIRE, hand_siemens=None, hand_stages=stages, hand_return_ratio=98.0))))
    assert "T0 = 0.9800 (inside Q1) · 500.0 (out) · 0.2000 (b) = 98.00 (-1.0 %)" in page
