"""Numbers as they are read: a prefix, a unit, no more digits than asked for, and no sign that rounding has made up."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.quantity import decibel_unit, engineering, percent

PREFIXES = {"f": -15, "p": -12, "n": -9, "µ": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9, "T": 12}


@pytest.mark.parametrize(
    ("value", "unit", "digits", "text"),
    [
        (0.00272, "A", 3, "2.72 mA"),
        (2.16e-12, "F", 4, "2.160 pF"),
        (100e-6, "F", 4, "100.0 µF"),
        (436.1, "Ω", 3, "436 Ω"),
        (999.96, "Hz", 4, "1.000 kHz"),
        (0.0, "Hz", 4, "0 Hz"),
        (-1.309e-3, "A", 3, "-1.31 mA"),
        (math.inf, "Hz", 4, "∞"),
        (-math.inf, "Hz", 4, "-∞"),
        (math.nan, "Hz", 4, "–"),
    ],
)
def test_engineering_notation(value: float, unit: str, digits: int, text: str) -> None:
    assert engineering(value, unit, digits) == text


@pytest.mark.parametrize(("value", "text"), [(50e-12, "50 pF"), (4.7e-6, "4.7 µF"), (100e-9, "100 nF")])
def test_a_nominal_value_has_no_zeros_that_nobody_wrote(value: float, text: str) -> None:
    assert engineering(value, "F", zeros=False) == text


@settings(derandomize=True, max_examples=100)
@given(st.floats(1e-14, 1e14), st.integers(2, 6))
def test_the_text_is_the_value_to_its_digits(value: float, digits: int) -> None:
    number, _, unit = engineering(value, "Hz", digits).partition(" ")
    power = PREFIXES[unit.removesuffix("Hz")]
    assert float(f"{number}e{power}") == pytest.approx(value, rel=0.5001 * 10.0 ** (1 - digits))
    assert 1.0 <= float(number) < 1000.0


@pytest.mark.parametrize(
    ("fraction", "text"),
    [(0.42, "+42 %"), (-0.3179, "-32 %"), (0.0312, "+3.1 %"), (0.0029, "+0.29 %"), (1.94, "+194 %"), (0.0, "+0.0 %")],
)
def test_a_change_in_per_cent(fraction: float, text: str) -> None:
    assert percent(fraction) == text


@pytest.mark.parametrize(("unit", "level"), [("V/V", "dB"), ("A/A", "dB"), ("", "dB"), ("Ω", "dBΩ"), ("S", "dBS")])
def test_a_level_in_decibel_says_what_one_of_it_is(unit: str, level: str) -> None:
    assert decibel_unit(unit) == level
