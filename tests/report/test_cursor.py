"""The frequency cursor: its places are frequencies of the sweep, and its numbers those of the record there."""

from __future__ import annotations

import json
import math

from msgspec.structs import replace

from report.cursors import FACTORS, WITH_FACTORS
from report.literal import ECHO_PREAMP
from report.markup import hostile, parse
from tauledger.report.cursor import cursor
from tauledger.report.html import to_html
from tauledger.report.wording import number


def test_every_text_is_a_number_of_the_record_at_that_frequency() -> None:
    found = cursor(WITH_FACTORS)
    curves = WITH_FACTORS.curves
    assert found is not None
    assert curves is not None
    assert curves.simulated_db is not None
    written = {number(hz, "Hz"): k for k, hz in enumerate(curves.frequency_hz)}
    place = 1 + 2 * found.curves.index("simulated")
    for texts in found.texts:
        k = written[texts[0]]
        assert texts[place] == f"{curves.simulated_db[k]:.2f} dB".replace("-", "−")
    assert len({texts[0] for texts in found.texts}) == len(found.texts)
    assert list(found.places) == sorted(found.places)
    assert all(0.0 <= place <= 1.0 for place in found.places)


def test_factors_are_told_where_they_are_known_and_not_below() -> None:
    found = cursor(WITH_FACTORS)
    assert found is not None
    known = {number(hz, "Hz"): k for k, hz in enumerate(FACTORS.frequency_hz)}
    curve = FACTORS.curves[0]
    for texts in found.texts:
        if texts[0] in known:
            k = known[texts[0]]
            size = math.hypot(curve.factor_real[k], curve.factor_imag[k])
            assert texts[-2] == number(size, "", 3)
            assert texts[-1].endswith("°")
        else:
            assert texts[-2:] == ("–", "–")
    assert {texts[0] for texts in found.texts} >= set(known)


def test_a_phase_of_too_many_turns_is_not_told() -> None:
    """Between two frequencies of the sweep a line may turn more than half a circle; nobody could count it."""
    curves = WITH_FACTORS.curves
    assert curves is not None
    falling = tuple(-180.0 - hz / 100.0 for hz in curves.frequency_hz)
    found = cursor(replace(WITH_FACTORS, curves=replace(curves, simulated_deg=falling)))
    assert found is not None
    phases = [texts[2 + 2 * found.curves.index("simulated")] for texts in found.texts]
    assert phases[0] != "–"
    assert phases[-1] == "–"


def test_it_begins_next_to_the_upper_edge() -> None:
    found = cursor(WITH_FACTORS)
    assert found is not None
    assert WITH_FACTORS.f_high is not None
    assert WITH_FACTORS.f_high.simulated_hz is not None
    there = next(hz for hz in FACTORS.frequency_hz if number(hz, "Hz") == found.texts[found.start][0])
    assert 0.8 < there / WITH_FACTORS.f_high.simulated_hz < 1.25


def test_without_curves_there_is_no_cursor_and_no_script_for_it() -> None:
    assert cursor(replace(ECHO_PREAMP, curves=None)) is None
    assert "cursor-at" not in to_html(replace(ECHO_PREAMP, curves=None)).decode()


def test_what_the_script_is_given_cannot_end_it() -> None:
    found = cursor(replace(hostile(), miller=FACTORS))
    assert found is not None
    assert "<" not in found.data
    assert json.loads(found.data)["texts"]
    parse(to_html(replace(hostile(), miller=FACTORS)))
