"""The charts: lengths and places are the numbers, what is told is told by more than colour."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from functools import cache
from xml.etree import ElementTree

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import EdgePair, PoleFacts, Review
from tauledger.report.charts.bars import share_chart, time_chart, time_groups
from tauledger.report.charts.bode import bode_chart
from tauledger.report.charts.plane import plane_chart
from tauledger.report.charts.style import PALETTE
from tauledger.report.charts.way import way_chart

CHARTS = {"time": time_chart, "shares": share_chart, "way": way_chart, "bode": bode_chart, "plane": plane_chart}


@cache
def drawn(name: str) -> str:
    """Give a chart of the literal review, drawn once for all claims."""
    return CHARTS[name](ECHO_PREAMP)


def extents(svg: str, part: str) -> list[tuple[float, float]]:
    """Give left and right end of every bar of a part, in px, in drawing order."""
    found = []
    for group in ElementTree.fromstring(svg).iter():
        if group.get("data-part") == part:
            for path in group.iter():
                outline = path.get("d")
                if outline:
                    xs = [float(x) for x in re.findall(r"[ML] (-?[\d.]+) ", outline)]
                    found.append((min(xs), max(xs)))
    return found


def texts(svg: str) -> list[str]:
    return ["".join(text.itertext()) for text in ElementTree.fromstring(svg).iter() if text.tag.endswith("text")]


@pytest.mark.parametrize("name", CHARTS)
def test_the_same_review_gives_the_same_bytes(name: str) -> None:
    assert drawn(name) == CHARTS[name](replace(ECHO_PREAMP))


@pytest.mark.parametrize("name", CHARTS)
def test_every_colour_is_a_variable_of_the_page(name: str) -> None:
    svg = drawn(name)
    loose = set(re.findall(r"(?<!, )#[0-9a-f]{6}\b", svg))
    assert loose == set()
    assert set(re.findall(r"var\(--(\w+)", svg)) <= set(PALETTE)


@pytest.mark.parametrize("name", CHARTS)
def test_no_chart_brings_a_style_for_the_whole_page(name: str) -> None:
    assert "<style" not in drawn(name)


def test_bars_are_as_long_as_the_time_constants() -> None:
    svg = drawn("time")
    hand_mu, exact_mu = extents(svg, "Q1.c_mu")
    hand_load, exact_load = extents(svg, "CL")
    px_per_s = (hand_load[1] - hand_load[0]) / 85.2e-9
    assert hand_mu[1] - hand_mu[0] == pytest.approx(px_per_s * (166.47e-9 + 3.70e-9), rel=1e-3)
    assert exact_mu[1] - exact_mu[0] == pytest.approx(px_per_s * 78.7748e3 * 2.16e-12, rel=1e-3)
    assert exact_load[1] - exact_load[0] == pytest.approx(px_per_s * 1703.66 * 50e-12, rel=1e-3)


def test_hand_and_exact_differ_by_hatch_and_not_by_colour_alone() -> None:
    svg = drawn("time")
    assert "<pattern" in svg
    assert {"by hand", "exact"} <= set(texts(svg))


def test_a_capacitance_stands_once_under_the_node_where_it_counts_most() -> None:
    groups = time_groups(ECHO_PREAMP)
    assert [group.title for group in groups] == ["base of Q1 (b)", "output, collector of Q1 (out)"]
    assert [bar.part for bar in groups[0].bars] == ["Q1.c_mu", "Q1.c_pi"]
    assert [bar.part for bar in groups[1].bars] == ["CL", "Q1.c_sub"]


def balanced() -> Review:
    """The literal review as the half of a balanced circuit: its nodes have images, its parts a weight of one half."""
    base, output, emitter = ECHO_PREAMP.nodes
    half = (replace(base, image="bn"), replace(output, image="outn"))
    other = tuple(replace(node, name=f"{node.name}n", members=(f"{node.name}n",), second=True) for node in half)
    parts = tuple(replace(part, weight=0.5) for part in ECHO_PREAMP.parts)
    across = replace(parts[5], name="CD", owner="CD", nodes=("out", "outn"), weight=1.0)
    return replace(ECHO_PREAMP, nodes=(*half, *other, emitter), parts=(*parts, across))


def test_exact_in_a_balanced_circuit_is_what_a_capacitance_and_its_image_take_of_the_delay() -> None:
    usual = {bar.part: bar.exact_s for group in time_groups(ECHO_PREAMP) for bar in group.bars}
    half = {bar.part: bar.exact_s for group in time_groups(balanced()) for bar in group.bars}
    assert half == usual


def with_shares(**shares: float) -> Review:
    parts = tuple(
        replace(part, share=EdgePair(shares.get(part.name.replace(".", "_"), part.share.f_high), None))
        for part in ECHO_PREAMP.parts
    )
    return replace(ECHO_PREAMP, parts=parts)


def test_a_share_that_speeds_up_lies_left_of_zero_and_says_so() -> None:
    svg = share_chart(with_shares(CL=-0.3))
    (slows,) = extents(svg, "Q1.c_mu")
    (speeds,) = extents(svg, "CL")
    assert slows[0] == pytest.approx(speeds[1], abs=0.01)
    assert (slows[1] - slows[0]) / (speeds[1] - speeds[0]) == pytest.approx(0.6359 / 0.3, rel=1e-3)
    assert "−30 %" in texts(svg)
    assert any("more of it raises" in text for text in texts(svg))


def test_the_response_marks_edges_poles_and_zeros_by_name() -> None:
    assert {"by hand, a pole for each node", "simulated", "f_L 121.9 Hz", "f_H 580.7 kHz", "p1"} <= set(
        texts(drawn("bode"))
    )


def test_the_phase_at_mid_band_is_within_half_a_turn() -> None:
    """Whole turns say nothing: a curve shifted by 720° gives the same picture."""
    assert ECHO_PREAMP.curves is not None
    phase = ECHO_PREAMP.curves.simulated_deg
    assert phase is not None
    shifted = replace(ECHO_PREAMP.curves, simulated_deg=tuple(value + 720.0 for value in phase))
    assert bode_chart(replace(ECHO_PREAMP, curves=shifted)) == drawn("bode")


def test_the_stepped_line_ends_at_the_simulation() -> None:
    told = texts(drawn("way"))
    assert "839.8 kHz" in told
    assert "580.7 kHz" in told
    assert told.index("slowest node") < told.index("simulated")


def test_a_pair_of_poles_stands_on_both_sides_of_the_axis() -> None:
    pair = PoleFacts(-2e5, 5e5, None, "", None, (), f0_hz=5.4e5, q=1.3)
    one = plane_chart(replace(ECHO_PREAMP, poles=(pair,), zeros=()))
    marks = re.findall(r'<use href="#plane-\w+" x="([\d.]+)" y="([\d.]+)"', one)
    (x, y), (other_x, other_y) = [(float(x), float(y)) for x, y in marks]
    assert x == other_x
    axis = 0.5 * (y + other_y)
    origin = float(re.search(r"M ([\d.]+) [\d.]+\s+L \1 [\d.]+", one).group(1))  # type: ignore[union-attr]
    assert math.degrees(math.atan2(abs(y - axis), origin - x)) == pytest.approx(
        math.degrees(math.atan2(5.0, 2.0)), abs=0.5
    )


@pytest.mark.parametrize("name", CHARTS)
def test_where_there_is_nothing_to_show_there_is_no_chart(name: str) -> None:
    empty = replace(ECHO_PREAMP, nodes=(), parts=(), steps=(), curves=None, poles=(), zeros=())
    assert CHARTS[name](empty) == ""


@pytest.mark.parametrize("draw", [time_chart, share_chart, way_chart], ids=["time", "shares", "way"])
def test_a_small_screen_gets_every_number_in_letters_of_the_same_size(draw: Callable[..., str]) -> None:
    small, large = draw(ECHO_PREAMP, narrow=True), draw(ECHO_PREAMP)
    widths = [float(re.search(r'viewBox="0 0 ([\d.]+)', svg).group(1)) for svg in (small, large)]  # type: ignore[union-attr]
    assert widths[0] < 0.5 * widths[1]
    told = " ".join(texts(small))
    values = [text for text in texts(large) if re.search(r"\d (?:kHz|ns|%)", text)]
    assert len(values) >= 4
    assert all(value in told for value in values)


def test_a_phase_that_runs_on_without_end_is_shown_about_the_band_with_few_ticks() -> None:
    """The phase of a line falls with frequency itself: a decade has ten times the turns of the one before."""
    curves = ECHO_PREAMP.curves
    assert curves is not None
    falling = tuple(-180.0 - hz / 10.0 for hz in curves.frequency_hz)
    line = replace(ECHO_PREAMP, curves=replace(curves, simulated_deg=falling, exact_deg=falling))
    drawn = bode_chart(line)
    assert drawn.count("<text") < bode_chart(ECHO_PREAMP).count("<text") + 10
