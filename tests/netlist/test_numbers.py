"""Numbers: suffixes, units, and what is no number."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.netlist.numbers import read_formula_number, read_number

# SPICE's suffixes: exponents of ten.
POWERS = {"t": 12, "g": 9, "meg": 6, "k": 3, "": 0, "m": -3, "u": -6, "µ": -6, "μ": -6, "n": -9, "p": -12, "f": -15}
# Unit words that begin with no suffix letter or stand behind one.
UNITS = ["", "ohm", "Ohms", "V", "Hz", "H", "s", "Ω"]

mantissas = st.decimals(min_value=-9999, max_value=9999, places=4, allow_nan=False).map(lambda d: f"{d:f}")


@settings(derandomize=True, max_examples=200)
@given(mantissas, st.sampled_from(sorted(POWERS)), st.sampled_from(UNITS), st.booleans())
def test_a_suffix_moves_the_exponent_and_a_unit_is_read_past(
    mantissa: str, suffix: str, unit: str, upper: bool
) -> None:
    text = mantissa + (suffix.upper() if upper and suffix.isascii() else suffix) + unit
    decimal = read_number(text)
    assert decimal is not None
    assert decimal.tail == ""
    assert decimal.value == float(f"{mantissa}e{POWERS[suffix]}")


@settings(derandomize=True, max_examples=200)
@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_written_in_full_comes_back_exactly(value: float) -> None:
    decimal = read_number(repr(value))
    assert decimal is not None
    assert decimal.value == value


@settings(derandomize=True, max_examples=300)
@given(st.text(max_size=12))
def test_any_text_is_a_number_or_none(text: str) -> None:
    decimal = read_number(text)
    assert decimal is None or not math.isnan(decimal.value)


@pytest.mark.parametrize(
    ("text", "value"),
    [("1e3k", 1e6), ("10M", 0.01), ("10meg", 1e7), ("10MEGohm", 1e7), ("1mil", 25.4e-6), ("1F", 1e-15), ("1a", 1.0)]
    + [("1d3", 1e3), (".5u", 0.5e-6), ("5.", 5.0), ("+5", 5.0), ("1.e-3", 1e-3), ("100%", 100.0), ("2.2K", 2200.0)],
)
def test_spice_forms(text: str, value: float) -> None:
    decimal = read_number(text)
    assert decimal is not None
    assert (decimal.value, decimal.tail) == (value, "")


@pytest.mark.parametrize(
    ("text", "tail"), [("4k7", "7"), ("1.5.2", ".2"), ("1e+", "+"), ("1_000", "_000"), ("2n2F", "2F")]
)
def test_what_stands_behind_the_unit_is_kept_for_the_message(text: str, tail: str) -> None:
    decimal = read_number(text)
    assert decimal is not None
    assert decimal.tail == tail


@pytest.mark.parametrize("text", ["", "k", "-", "+", ".", "e3", "++5", "--5", "in", "{5}", "nan", "inf"])
def test_no_number(text: str) -> None:
    assert read_number(text) is None


def test_a_number_in_a_formula_knows_no_mil_and_no_exponent_letter_d() -> None:
    assert read_formula_number("1mil") == 1e-3
    assert read_formula_number("1meg") == 1e6
    assert read_formula_number("1d") == 1.0


def test_an_exponent_of_thousands_of_digits_is_no_trap() -> None:
    decimal = read_number("1e" + "9" * 10_000)
    assert decimal is not None
    assert decimal.tail
