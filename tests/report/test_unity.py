"""Unity gain, gain and phase at a frequency and peaking in every format; nothing where nothing was asked."""

from __future__ import annotations

import csv
import io
import math
import re

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import (
    AtElement,
    AtFacts,
    Curves,
    MidbandFacts,
    PeakElement,
    PeakFacts,
    Review,
    UnityElement,
    UnityFacts,
    UnityNode,
)
from tauledger.report.charts.bode import bode_chart
from tauledger.report.csv import to_csv
from tauledger.report.document import document
from tauledger.report.html import to_html
from tauledger.report.markdown import to_markdown
from tauledger.report.terminal import render
from tauledger.report.unity import signed

CC = UnityElement(
    name="CC",
    owner="CC",
    nodes=("b", "out"),
    value=2.2e-12,
    unit="F",
    free=True,
    moves_bias=False,
    f_unity=0.634,
    phase_margin_deg=0.19,
    gain_margin_db=0.0156,
    gain_bandwidth=0.985,
    f_unity_rerun_hz=11.9e6,
    phase_margin_rerun_deg=22.6,
)
GM = replace(
    CC,
    name="Q1.gm",
    owner="Q1",
    value=105e-3,
    unit="S",
    free=False,
    moves_bias=True,
    f_unity=-0.42,
    f_unity_rerun_hz=None,
    phase_margin_rerun_deg=None,
)
UNITY = UnityFacts(
    simulated_hz=11.6e6,
    exact_hz=11.6e6,
    hand_hz=15.9e6,
    difference=0.371,
    slope=-1.4,
    phase_margin_deg=24.5,
    phase_margin_exact_deg=24.5,
    gain_margin_db=8.04,
    gain_margin_exact_db=8.04,
    gain_margin_at_hz=40.9e6,
    gain_margin_exact_at_hz=40.9e6,
    gain_bandwidth_hz=15.2e6,
    gain_bandwidth_exact_hz=15.2e6,
    elements=(CC, GM),
    nodes=(UnityNode("b", "base of Q1 (b)", -2e18, -4.8e12, 9.63e6, 19.7),),
)
AT = AtFacts(
    10e6, 3.125, -250.5, -70.5, 3.125, -250.5, -70.5, (AtElement("CL", "CL", ("out", "0"), 5e-12, "F", -0.4, 0.12),)
)
PEAK = PeakFacts(
    "f_high", 3.63, 10.6e6, 3.63, 10.6e6, (PeakElement("CL", "CL", ("out", "0"), 5e-12, "F", 0.05, rerun_db=3.1),)
)
AMPLIFIER = replace(
    ECHO_PREAMP,
    f_low=None,
    midband=MidbandFacts(0.0, 0.0, 9e4, -117.0, 0.0, 41.4, "V/V"),
    f_unity=UNITY,
    at=(AT,),
    peaking=(PEAK,),
)


def page(review: Review, *, verbose: bool = False) -> str:
    return render(review, color=False, unicode=True, verbose=verbose)


def one_pole() -> Curves:
    """A gain of 117 with one pole at 100 kHz, from 10 Hz to 1 GHz."""
    hz = tuple(10.0 ** (1.0 + k / 10.0) for k in range(81))
    db = tuple(41.4 - 10.0 * math.log10(1.0 + (f / 1e5) ** 2) for f in hz)
    deg = tuple(180.0 - math.degrees(math.atan(f / 1e5)) for f in hz)
    return Curves(hz, db, deg, db, deg, None, None)


def test_the_terminal_has_the_three_sources_and_what_sets_them_within_80_columns() -> None:
    text = page(AMPLIFIER)
    assert max(map(len, text.splitlines())) <= 80
    assert re.search(r"f_u +11\.60 MHz +11\.60 MHz +15\.90 MHz \(\+37 %\)", text)
    assert re.search(r"phase margin +24\.5° +24\.5°", text)
    assert re.search(r"gain margin +8\.04 dB +8\.04 dB", text)
    assert re.search(r"-180° reached at +40\.90 MHz", text)
    assert re.search(r"CC +2\.2 pF +\+6\.3 % +-1\.9° +-0\.16 dB", text)
    assert re.search(r"recomputed +\+2\.6 % +-1\.9°", text)
    assert re.search(r"gm of Q1§ +105 mS +-4\.2 %", text)
    assert re.search(r"base of Q1 \(b\) +-17 % +-4\.8°", text)


def test_the_terminal_has_gain_and_phase_where_asked_and_the_peak() -> None:
    text = page(AMPLIFIER)
    assert re.search(r"10\.00 MHz +simulated +3\.125 dB +-250\.5° +-70\.5°", text)
    assert re.search(r"CL +5 pF +\+4\.0 % +-1\.2°", text)
    assert re.search(r"above mid-band +3\.63 dB +3\.63 dB", text)
    assert re.search(r"recomputed +-0\.53 dB", text)


@pytest.mark.parametrize("verbose", [False, True])
def test_nothing_of_it_stands_where_nothing_was_asked(verbose: bool) -> None:
    """f_u alone, as every review of a gain above 1 has it in JSON, opens no section."""
    quiet = replace(ECHO_PREAMP, f_unity=replace(UNITY, elements=(), nodes=()))
    assert page(quiet, verbose=verbose) == page(ECHO_PREAMP, verbose=verbose)
    assert to_markdown(quiet) == to_markdown(ECHO_PREAMP)
    assert bode_chart(quiet) == bode_chart(ECHO_PREAMP)


def test_no_margin_left_and_no_gain_margin_are_said_in_words() -> None:
    unstable = replace(UNITY, phase_margin_deg=-3.0, phase_margin_exact_deg=-3.0)
    assert "closed around with a gain of 1 it is unstable" in page(replace(AMPLIFIER, f_unity=unstable))
    (said,) = [one.answer for one in document(replace(AMPLIFIER, f_unity=unstable)).answers if "stable" in one.question]
    assert said.startswith("No: the phase is 3.0° beyond half a turn at 11.60 MHz")
    never = replace(UNITY, gain_margin_db=None, gain_margin_exact_db=None)
    text = page(replace(AMPLIFIER, f_unity=never))
    assert "the phase never reaches -180° beyond mid-band" in text
    assert "-180° reached at" not in text


def test_further_crossings_of_one_are_told() -> None:
    text = page(replace(AMPLIFIER, f_unity=replace(UNITY, further_hz=(48e6, 52e6))))
    assert "is 1 again at 48.00 MHz, 52.00 MHz" in " ".join(text.split())


def test_exact_figures_stand_alone_where_nothing_was_simulated() -> None:
    alone = replace(
        UNITY,
        simulated_hz=None,
        phase_margin_deg=None,
        gain_margin_db=None,
        gain_margin_at_hz=None,
        gain_bandwidth_hz=None,
    )
    text = page(replace(AMPLIFIER, f_unity=alone))
    assert re.search(r"f_u +– +11\.60 MHz", text)
    figure = next(one for one in document(replace(AMPLIFIER, f_unity=alone)).figures if one.label == "Unity gain f_u")
    assert (figure.value, figure.beside) == ("11.60 MHz", "phase margin 24.5°, gain margin 8.04 dB")


def test_the_document_has_its_sections_and_a_key_figure_in_place_of_the_lower_edge() -> None:
    found = document(AMPLIFIER)
    titles = [section.title for section in found.sections]
    assert {"Unity gain", "Gain and phase at a frequency", "Peaking"} <= set(titles)
    assert [figure.label for figure in found.figures][1] == "Unity gain f_u"
    assert len(found.figures) == len(document(ECHO_PREAMP).figures)


def test_markdown_and_html_carry_the_tables() -> None:
    text = to_markdown(AMPLIFIER).decode()
    assert "| CC | 2.2 pF | +6.3 % | -1.9° | -0.16 dB |" in text
    assert "| base of Q1 (b) | -17 % | -4.8° |" in text
    assert "| 10.00 MHz | simulated | 3.125 dB | -250.5° | -70.5° |" in text
    shown = to_html(AMPLIFIER).decode()
    assert "f<sub>u</sub>" in shown
    assert "Who sets" in shown
    assert "Peaking towards" in shown


def test_csv_calls_things_as_json_does() -> None:
    rows = list(csv.reader(io.StringIO(to_csv(AMPLIFIER).decode(), newline="")))
    assert ["f_unity", "", "simulated_hz", "11600000.0", "Hz"] in rows
    assert ["f_unity.elements", "CC", "phase_margin_rerun_deg", "22.6", "degree"] in rows
    assert ["f_unity.nodes", "b", "per_farad", "-2e+18", "Hz/F"] in rows
    assert ["peaking.elements", "f_high/CL", "rerun_db", "3.1", "dB"] in rows
    assert ["at.elements", "1/CL", "gain", "-0.4", ""] in rows


@pytest.mark.parametrize("narrow", [False, True])
def test_the_frequency_response_marks_f_u_and_the_margin(narrow: bool) -> None:
    drawn = bode_chart(replace(AMPLIFIER, curves=one_pole()), narrow=narrow)
    assert "f_u 11.60 MHz" in drawn
    assert "margin 24.5°" in drawn
    assert "f_u" not in bode_chart(ECHO_PREAMP, narrow=narrow)


def test_changes_keep_two_digits_and_a_zero_has_no_sign() -> None:
    assert [signed(value, "°") for value in (-1.94, 0.163, -12.34, 0.001, -0.999)] == [
        "-1.9°",
        "+0.16°",
        "-12.3°",
        "0.00°",
        "-1.0°",
    ]
