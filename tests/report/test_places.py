"""A signal node that is several places, inside a device and out: each has its own R, and the rows add up."""

from __future__ import annotations

import re

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import CapacitanceTerm, ResistanceTerm, Review, SourceLine, WorkingLine
from tauledger.report.blocks import Picture
from tauledger.report.drawing.stage import drawn_stages
from tauledger.report.questions import answers
from tauledger.report.sections.circuit import stages_section
from tauledger.report.tables import setting, upper
from tauledger.report.wording import coefficients

BASE, OUTPUT, EMITTER = ECHO_PREAMP.nodes


def term(part: str, farad: float, factor: float, ohm: float) -> CapacitanceTerm:
    return CapacitanceTerm(part, farad, factor, 1.0 - factor, 0.0, time_constant_s=ohm * farad * factor)


def line(node: str, ohm: float, names: tuple[str, ...], *terms: CapacitanceTerm) -> WorkingLine:
    seconds = sum(one.time_constant_s or 0.0 for one in terms)
    made = tuple(ResistanceTerm(name, ohm) for name in names)
    return WorkingLine(node, "", "rule", ohm, ohm, made, terms, seconds, seconds)


def inside_and_out() -> Review:
    """The literal review with its base as two places of 500 Ω and 400 Ω."""
    inner = line("base of Q1, inside", 500.0, ("(r_b(Q1) + (RS ‖ R1 ‖ 1.2k))",), term("Q1.c_mu", 2e-12, 100.0, 500.0))
    outer = line("b", 400.0, ("RS", "into base of Q1"), term("Q1.c_bx", 1e-12, 100.0, 400.0))
    both = (inner, outer)
    assert BASE.working is not None
    worked = replace(BASE.working, lines=both, capacitances=(*inner.capacitances, *outer.capacitances))
    seconds = inner.time_constant_s + outer.time_constant_s
    base = replace(
        BASE, working=worked, resistance_hand_ohm=500.0, time_constant_s=seconds, capacitance_f=seconds / 500.0
    )
    lines = (SourceLine("board.cir", 3, "RS in b 600"), SourceLine("board.cir", 4, "R1 b 0 1k"))
    return replace(ECHO_PREAMP, nodes=(base, OUTPUT, EMITTER), lines=lines)


def test_every_place_has_its_own_r_and_its_capacitances_add_up() -> None:
    rows = [row for row in upper.budget(inside_and_out()).rows if row.kind in ("", "place", "part")][:5]
    assert [row.kind for row in rows] == ["", "place", "part", "place", "part"]
    node, inner, mu, outer, bx = (row.cells for row in rows)
    assert inner[:2] == ("at base of Q1, inside; R from RS, R1", "500.0 Ω")
    assert outer[:2] == ("at b; R from RS", "400.0 Ω")
    assert inner[3] == mu[3] == "200.0 pF"
    assert outer[3] == bx[3] == "100.0 pF"
    assert (node[1], node[3], node[4]) == ("500.0 Ω", "280.0 pF", "140.0 ns")


def test_the_note_says_why_c_of_the_node_is_no_sum() -> None:
    assert "places face different resistances" in upper.budget(inside_and_out()).note
    assert "places" not in upper.budget(ECHO_PREAMP).note


def test_the_answer_names_both_resistances() -> None:
    told = answers(inside_and_out())[0].answer
    assert re.search(r"R 500\.0 Ω .* at the base of Q1, inside the device, and 400\.0 Ω at b itself", told)


def test_the_drawing_is_at_the_inner_node_and_says_where_a_capacitance_faces_another_r() -> None:
    first = drawn_stages(inside_and_out())[0][1]
    assert ">base of Q1, inside<" in first
    assert ">at 400.0 Ω<" in first


def test_a_resistor_line_names_the_node_whose_r_it_makes() -> None:
    makes = {row.cells[1].split()[0]: row.cells[2] for row in setting.source_lines(inside_and_out()).rows}
    assert makes["R1"] == "b"


def test_the_lower_edge_has_an_answer() -> None:
    (told,) = (answer.answer for answer in answers(ECHO_PREAMP) if "lower edge" in answer.question)
    assert told.startswith("CE, 100 µF from e to ground, has a share of 94 %")


@pytest.mark.parametrize(
    ("plain", "set_as"),
    [
        ("1/b1 is the first, b1/b2 the second", "1/b₁ is the first, b₁/b₂ the second"),
        ("1/(2π·b1)", "1/(2π·b₁)"),
        ("b1/(2π·b2)", "b₁/(2π·b₂)"),
        ("two coefficients b1, b2", "two coefficients b₁, b₂"),
        ("a1 is the first, a2/a1 the second", "a₁ is the first, a₂/a₁ the second"),
        ("a1 and a2 together give 1.41 kHz", "a₁ and a₂ together give 1.41 kHz"),
        ("take both coefficients, b1 and b2: they give", "take both coefficients, b₁ and b₂: they give"),
        ("f0 = √a2/2π, Q = √a2/a1", "f0 = √a₂/2π, Q = √a₂/a₁"),
        ("between b1 and b2", "between b1 and b2"),
        ("base of Q1 (b1) takes 23 ns", "base of Q1 (b1) takes 23 ns"),
        ("v(b1)/v(in), R(b1) = 1k", "v(b1)/v(in), R(b1) = 1k"),
    ],
)
def test_a_coefficient_is_no_node(plain: str, set_as: str) -> None:
    assert coefficients(plain) == set_as


def test_a_place_without_capacitance_has_no_row() -> None:
    review = inside_and_out()
    base = review.nodes[0]
    assert base.working is not None
    empty = line("inside X1", 0.0, ())
    padded = replace(base, working=replace(base.working, lines=(*base.working.lines, empty, empty)))
    assert upper.budget(replace(review, nodes=(padded, *review.nodes[1:]))).rows == upper.budget(review).rows


def test_no_stage_is_drawn_without_the_node_that_takes_most() -> None:
    """All stages passive: the drawing takes them together and would show the last node alone."""
    assert any(isinstance(block, Picture) for block in stages_section(ECHO_PREAMP).blocks)
    passive = tuple(replace(stage, owner="", gain_hand=1.0, gain_exact=1.0) for stage in ECHO_PREAMP.stages)
    assert passive[-1].node != upper.counting_nodes(ECHO_PREAMP)[0].name
    blocks = stages_section(replace(ECHO_PREAMP, stages=passive)).blocks
    assert not any(isinstance(block, Picture) for block in blocks)
    assert upper.equivalent(ECHO_PREAMP) in blocks
