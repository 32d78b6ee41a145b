"""The equivalent circuit: it has the gain of its stage, a value at every element, and nothing written over another."""

from __future__ import annotations

import itertools
import re
from collections.abc import Iterator
from xml.etree import ElementTree

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.report.drawing import symbols
from tauledger.report.drawing.stage import MOST_STAGES, drawn_stages

LETTER_PX = 7.2


def variants(svg: str) -> dict[str, ElementTree.Element]:
    """The drawings of one stage by their kind: wide, middle, narrow."""
    drawn = ElementTree.fromstring(f"<figure>{svg}</figure>")
    return {(one.get("class") or "").split()[1]: one for one in drawn}


def texts(svg: str, kind: str = "wide") -> list[tuple[float, float, str, str]]:
    """Give x, y, anchor and words of every text."""
    return list(_texts(variants(svg)[kind], 0.0))


def _texts(element: ElementTree.Element, down: float) -> Iterator[tuple[float, float, str, str]]:
    moved = re.fullmatch(r"translate\(0 ([\d.]+)\)", element.get("transform", ""))
    down += float(moved.group(1)) if moved else 0.0
    if element.tag == "text":
        at = (float(element.get("x", "")), down + float(element.get("y", "")))
        yield (*at, element.get("text-anchor", ""), element.text or "")
    for inner in element:
        yield from _texts(inner, down)


def drawings() -> tuple[str, ...]:
    return tuple(svg for _, svg in drawn_stages(ECHO_PREAMP))


def test_source_and_each_stage_have_a_drawing() -> None:
    assert [heading for heading, _ in drawn_stages(ECHO_PREAMP)] == [
        "Source to base of Q1 (b)",
        "Output Q1: base of Q1 (b) to output, collector of Q1 (out)",
    ]


def test_gm_times_r_is_the_gain_of_the_stage() -> None:
    told = [words for *_, words in texts(drawings()[1])]
    siemens = float(told[told.index("Gm·v(b)") + 1].removesuffix(" mS")) * 1e-3
    ohm = float(told[told.index("R") + 1].removesuffix(" kΩ")) * 1e3
    assert siemens * ohm == pytest.approx(179.1, rel=5e-3)


def points_down(svg: str) -> bool:
    """Whether the tip of the arrow beside the controlled source is its lowest point."""
    wires = [line.get("points", "").split() for line in variants(svg)["wide"].iter("polyline")]
    (head,) = [[float(point.split(",")[1]) for point in points] for points in wires if len(points) == 3]
    return head[1] > head[0]


def test_the_arrow_of_an_inverting_stage_points_down() -> None:
    first, second = ECHO_PREAMP.stages
    follower = replace(ECHO_PREAMP, stages=(first, replace(second, gain_hand=0.9, gain_exact=0.9)))
    assert points_down(drawings()[1])
    assert not points_down(drawn_stages(follower)[1][1])


def test_a_stage_with_another_way_for_the_signal_has_no_drawing() -> None:
    first, second = ECHO_PREAMP.stages
    fed_back = replace(ECHO_PREAMP, stages=(first, replace(second, gain_exact=1.2 * -179.1)))
    assert drawn_stages(fed_back) == ()


@pytest.mark.parametrize(
    ("drawing", "name", "value"),
    [
        (0, "R_Th", "428.0 Ω"),
        (0, "C_μ of Q1", "2.16 pF × 180"),
        (0, "C_π of Q1", "54.8 pF × 0.983"),
        (1, "C", "443 pF"),
        (1, "R", "1.704 kΩ"),
        (1, "CL", "50.0 pF"),
    ],
)
def test_every_element_has_its_value(drawing: int, name: str, value: str) -> None:
    told = [words for *_, words in texts(drawings()[drawing])]
    assert told[told.index(name) + 1] == value


def test_a_resistor_is_a_rectangle_and_a_capacitor_two_plates() -> None:
    """IEC 60617: 04-01-01 and 04-02-01 (from memory)."""
    assert "<rect" in symbols.resistor_down(0.0, 0.0, 100.0)
    assert "<rect" in symbols.resistor_across(0.0, 0.0, 100.0)
    plates = re.search(r'class="plate" d="([^"]*)"', symbols.capacitor_down(0.0, 0.0, 100.0))
    assert plates is not None
    assert plates.group(1).count("H") == 2


def long_stage() -> str:
    """A stage whose output has a resistance and three capacitances, too long for a row of a medium screen."""
    base, out, *others = ECHO_PREAMP.nodes
    assert out.working is not None
    terms = tuple(replace(out.working.capacitances[0], part=f"C{k}") for k in range(3))
    more = replace(out, working=replace(out.working, capacitances=terms))
    return drawn_stages(replace(ECHO_PREAMP, nodes=(base, more, *others)))[1][1]


@pytest.mark.parametrize("kind", ["wide", "middle", "narrow"])
@pytest.mark.parametrize("svg", [*drawings(), long_stage()], ids=["input", "stage", "long"])
def test_nothing_is_written_over_another_or_beyond_the_edge(svg: str, kind: str) -> None:
    if kind not in variants(svg):
        assert svg != long_stage()
        return
    _, _, width, height = (float(number) for number in variants(svg)[kind].get("viewBox", "").split())
    assert width <= {"wide": 1060.0, "middle": 760.0, "narrow": 410.0}[kind]
    boxes = []
    for x, y, anchor, words in texts(svg, kind):
        long = LETTER_PX * len(words)
        left = {"start": x, "middle": x - long / 2.0, "end": x - long}[anchor]
        assert left >= 0.0
        assert left + long <= width
        assert 0.0 < y <= height
        boxes.append((left, left + long, y - 10.0, y))
    for (a, b, top, bottom), (c, d, above, below) in itertools.combinations(boxes, 2):
        assert b <= c or d <= a or bottom <= above or below <= top


def test_every_element_stands_in_each_layout() -> None:
    svg = long_stage()
    told = {kind: {words for *_, words in texts(svg, kind)} for kind in ("wide", "middle", "narrow")}
    assert told["wide"] == told["middle"]
    assert told["narrow"] - told["wide"] == {"out, the same node"}
    assert told["wide"] <= told["narrow"]


def test_networks_that_are_no_chain_have_no_drawing() -> None:
    first, second = ECHO_PREAMP.stages
    assert drawn_stages(replace(ECHO_PREAMP, stages=())) == ()
    assert drawn_stages(replace(ECHO_PREAMP, stages=(first, replace(second, node="elsewhere")))) == ()
    assert drawn_stages(replace(ECHO_PREAMP, stages=(first, replace(second, image="outn")))) == ()
    assert drawn_stages(replace(ECHO_PREAMP, stages=(replace(first, gain_hand=None), second))) == ()


def test_a_long_chain_is_drawn_as_far_as_its_caption_says() -> None:
    first, second = ECHO_PREAMP.stages
    assert len(drawn_stages(replace(ECHO_PREAMP, stages=(first, *(40 * (second,)))))) == MOST_STAGES


def test_passive_nodes_before_the_first_stage_are_taken_together() -> None:
    first, second = ECHO_PREAMP.stages
    pad = replace(first, owner="", gain_hand=0.5, gain_exact=0.5)
    pads = replace(ECHO_PREAMP, stages=(replace(pad, node="e"), pad, second))
    told = [words for *_, words in texts(drawn_stages(pads)[0][1])]
    assert told[:2] == ["+", "0.25 ·"]
    assert len(drawn_stages(pads)) == 2


def test_a_passive_node_after_a_stage_has_a_source_of_its_own() -> None:
    first, second = ECHO_PREAMP.stages
    pad = replace(first, owner="", node="e", gain_hand=0.5, gain_exact=0.5)
    told = [words for *_, words in texts(drawn_stages(replace(ECHO_PREAMP, stages=(first, second, pad)))[2][1])]
    assert told[1:3] == ["0.5 ·", "v(out)"]
    assert "Gm·v(out)" not in told
