"""A measured curve in every format: its edges, what differs, what would explain it, and its marks in the chart."""

from __future__ import annotations

import json
import re

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from report.markup import SVG, parse, words
from tauledger.record import CurveFacts, CurveFigure, CurveLeaves, CurvePoint, Review, StrayFacts
from tauledger.report.csv import to_csv
from tauledger.report.curve import differs_text, explains_text, level_text
from tauledger.report.html import to_html
from tauledger.report.json import to_json
from tauledger.report.markdown import to_markdown
from tauledger.report.terminal import render

POINTS = tuple(
    CurvePoint(
        hz, 41.9 - 0.5 * k, -180.0 - 9.0 * k, 41.4 - 0.4 * k, -180.0 - 8.0 * k, -0.1 * k, -1.0 * k, 41.9 - 0.5 * k
    )
    for k, hz in enumerate((8e3, 80e3, 400e3, 1e6))
)
CURVE = CurveFacts(
    file="bench.csv",
    against="simulated",
    offset_db=0.5,
    offset_deg=-0.04,
    level_from_hz=8e3,
    level_to_hz=8e3,
    largest_db=-1.84,
    largest_db_at_hz=1e6,
    largest_deg=-6.2,
    largest_deg_at_hz=400e3,
    figures=(CurveFigure("f_high", 497.2e3, 580.7e3), CurveFigure("f_unity", 41.2e6, None)),
    leaves=(CurveLeaves("above", "phase", 321e3),),
    rms_db=1.093,
    fitted_points=4,
    explains="stray",
    strays=(StrayFacts("out", "0", 12.04e-12, 0.031, 496.1e3, True), StrayFacts("b", "out", 0.07e-12, 0.037)),
    points=POINTS,
)
MEASURED = replace(ECHO_PREAMP, curve=CURVE)


def page(review: Review, *, width: int = 80, unicode: bool = True) -> str:
    return render(review, color=False, unicode=unicode, width=width)


def test_the_terminal_sets_it_beside_the_simulation_and_says_what_explains_it() -> None:
    text = re.sub(r"\s+", " ", page(MEASURED))
    for expected in (
        "f_H 497.2 kHz 580.7 kHz -14 %",
        "f_u 41.20 MHz – –",
        "bench.csv: 4 points, 8.00 kHz to 1.00 MHz; at 8.00 kHz it lies 0.50 dB above ngspice, which is taken out.",
        "Leaves ngspice above 321 kHz (off by 5° in phase); largest difference -1.84 dB at 1.00 MHz and",
        "12.0 pF from out to ground would explain it best: rms difference 1.09 dB → 0.03 dB over 4 points",
        "run in ngspice with it: f_H 496.1 kHz, measured 497.2 kHz",
        "Hardly worse: 70.0 fF between b and out, 0.04 dB.",
    ):
        assert expected in text


def test_without_a_curve_no_format_speaks_of_one() -> None:
    assert "MEASURED" not in page(ECHO_PREAMP)
    assert "measured curve" not in to_markdown(ECHO_PREAMP).decode()
    assert "measured curve" not in to_html(ECHO_PREAMP).decode().split("<main>")[1]


@pytest.mark.parametrize("width", [40, 57, 80])
def test_it_keeps_within_a_narrow_terminal_without_symbols(width: int) -> None:
    text = page(MEASURED, width=width, unicode=False)
    assert text.isascii()
    section = text[text.index("MEASURED") : text.index("WHY PAPER")]
    assert max(len(line) for line in section.splitlines()) <= width


def test_the_chart_marks_the_points_and_says_so_in_words() -> None:
    root = parse(to_html(MEASURED))
    told = [words(text) for text in root.iter(f"{SVG}text")]
    assert told.count("measured") == 2, "in the legend of the wide chart and of the narrow one"
    assert told.count("with 12.0 pF from out to ground") == 2
    assert "Squares: the measured curve" in words(root)


def test_markdown_csv_and_json_have_it_too() -> None:
    assert "### The measured curve" in to_markdown(MEASURED).decode()
    table = to_csv(MEASURED).decode()
    assert "curve.strays,1,capacitance_f,1.204e-11,F\r\n" in table
    assert "curve.points,4,frequency_hz,1000000.0,Hz\r\n" in table
    assert json.loads(to_json(MEASURED))["curve"]["strays"][1]["minus"] == "out"


@pytest.mark.parametrize(
    ("facts", "says"),
    [
        ({"explains": "no single capacitance", "strays": ()}, "No single capacitance explains it: none halves the rms"),
        (
            {"explains": "nothing to explain", "strays": (), "rms_db": 0.02},
            "Nothing to explain: the rms difference is 0.02",
        ),
        ({"explains": "not sought", "strays": (), "rms_db": None}, "Fewer than three points from mid-band up"),
        ({"explains": "not sought", "strays": ()}, "the rebuilt network is not ngspice's"),
    ],
)
def test_what_was_not_found_is_said(facts: dict[str, object], says: str) -> None:
    assert says in explains_text(MEASURED, replace(CURVE, **facts))


def test_a_curve_that_agrees_has_no_largest_difference() -> None:
    same = replace(CURVE, leaves=(), largest_db=1e-4, largest_deg=0.01, offset_db=0.001)
    assert differs_text(same) == "Nowhere off by 1 dB in gain or 5° in phase."
    assert level_text(same).endswith("at mid-band the same as ngspice.")


@pytest.mark.parametrize(
    ("turned", "says"),
    [
        (180.0, "it is inverted, and lies 0.50 dB above ngspice, which is taken out."),
        (-178.0, "it is inverted, and lies 0.50 dB above and 2.0° ahead of ngspice, which is taken out."),
        (179.0, "it is inverted, and lies 0.50 dB above and 1.0° behind ngspice, which is taken out."),
        (90.0, "it lies 0.50 dB above and 90.0° ahead of ngspice, which is taken out."),
    ],
)
def test_an_inverted_probe_is_called_so(turned: float, says: str) -> None:
    assert level_text(replace(CURVE, offset_deg=turned)).endswith(says)
