"""What would help: resistors and transconductance beside capacitances, with what each costs in gain."""

from __future__ import annotations

from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import Help, PoleFacts, Review
from tauledger.report.blocks import Picture
from tauledger.report.document import document
from tauledger.report.headline import headline
from tauledger.report.questions import answers
from tauledger.report.tables.helps import what_would_help
from tauledger.report.wording import part_titles

LOAD = Help("CL", "CL", ("out", "0"), 50e-12, "F", True, False, 0.029, 0.0, 0.0, 598.2e3, 121.9, 0.0)
COLLECTOR = Help("RC", "RC", ("vcc", "out"), 3.3e3, "Ω", False, True, 0.071, 0.001, -0.081)
INSIDE = Help("Q1.c_mu", "Q1", ("b", "out"), 2.16e-12, "F", False, False, 0.064, 0.0, 0.0)
HELPED = replace(ECHO_PREAMP, helps=(LOAD, COLLECTOR, INSIDE))


def told(review: Review) -> str:
    (answer,) = (answer.answer for answer in answers(review) if answer.question == "What would help most?")
    return answer


def test_the_answer_names_one_of_each_kind_with_its_cost() -> None:
    answer = told(HELPED)
    assert "of those that leave the bias alone: CL +3.0 % (to 598.2 kHz, recomputed; gain unchanged)" in answer
    assert "of those that move it: RC +7.1 % (to first order; gain -8.1 %)" in answer
    assert "inside a device: C_μ of Q1 +6.4 % (to first order; gain unchanged)" in answer


def test_where_the_best_costs_gain_the_best_that_does_not_is_told_too() -> None:
    costly = replace(LOAD, name="RF", owner="RF", f_high=0.08, f_high_rerun_hz=None, gain=-0.09)
    answer = told(replace(ECHO_PREAMP, helps=(costly, LOAD)))
    assert "leave the bias alone: RF +8.0 % (to first order; gain -9.0 %); with the gain unchanged: CL +3.0 %" in answer


def test_a_column_that_says_nothing_is_left_out() -> None:
    dc = replace(HELPED, helps=tuple(replace(one, f_low=None, f_low_rerun_hz=None) for one in HELPED.helps))
    assert [column.head for column in what_would_help(HELPED).columns][2:4] == ["f_H", "f_L"]
    grid = what_would_help(dc)
    assert [column.head for column in grid.columns] == ["10 % less of", "value", "f_H", "gain"]
    assert all(len(row.cells) == 4 for row in grid.rows)


def test_what_hardly_helps_is_not_named() -> None:
    weak = replace(ECHO_PREAMP, helps=(replace(LOAD, f_high=0.001, f_high_rerun_hz=581.3e3), COLLECTOR, INSIDE))
    assert "CL" not in told(weak)


def test_the_table_marks_what_is_no_free_choice_and_sets_the_proof_below() -> None:
    grid = what_would_help(HELPED)
    assert [row.cells[0] for row in grid.rows] == ["CL", "recomputed", "RC §", "C_μ of Q1 ¶"]
    assert grid.rows[1].kind == "part"
    assert grid.rows[1].cells[2] == "+3.0 %"
    assert "§ takes part in the operating point" in grid.note
    assert "helps" in {section.key for section in document(HELPED).sections}
    assert "helps" not in {section.key for section in document(ECHO_PREAMP).sections}


def pictures(review: Review) -> set[str]:
    return {block.name for part in document(review).sections for block in part.blocks if isinstance(block, Picture)}


def test_the_plane_is_drawn_where_it_shows_more_than_a_line() -> None:
    pair = PoleFacts(-2e5, 5e5, None, "", None, (), f0_hz=5.4e5, q=1.3)
    assert "plane" not in pictures(ECHO_PREAMP)
    assert "plane" in pictures(replace(ECHO_PREAMP, poles=(*ECHO_PREAMP.poles, pair)))


def test_the_headline_names_the_part_with_the_largest_share_and_a_pair_where_one_makes_the_edge() -> None:
    shared = sorted(
        (part for part in ECHO_PREAMP.parts if part.share.f_high is not None),
        key=lambda part: -(part.share.f_high or 0.0),
    )
    assert f"above all through {part_titles(ECHO_PREAMP.parts)[shared[0].name]}" in headline(ECHO_PREAMP)
    high = ECHO_PREAMP.f_high
    assert high is not None
    assert high.exact_hz is not None
    pair = PoleFacts(-0.1 * high.exact_hz, high.exact_hz, None, "", None, (), f0_hz=high.exact_hz, q=5.0)
    told = headline(replace(ECHO_PREAMP, poles=(pair,)))
    assert "a complex pair at" in told
    assert "Q 5" in told
