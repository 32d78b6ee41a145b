"""Numbers as written in the margin of a calculation."""

from __future__ import annotations

import math

import pytest

from tauledger.hand.figures import compact, plain


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (2200.0, "2.2k"),
        (82e3, "82k"),
        (5067.0, "5.07k"),
        (1409.0, "1.41k"),
        (999.9, "1k"),
        (4.35e-10, "435p"),
        (0.043, "43m"),
        (-81.5, "−81.5"),
        (3.3e-6, "3.3µ"),
        (2.5e13, "25T"),
        (0.0, "0"),
        (math.inf, "∞"),
        (-math.inf, "−∞"),
        (math.nan, "–"),
    ],
)
def test_three_digits_and_a_prefix(value: float, text: str) -> None:
    assert compact(value) == text


@pytest.mark.parametrize(
    ("value", "text"), [(0.987, "0.987"), (-0.0127, "−0.0127"), (0.6, "0.6"), (121.0, "121"), (4.2e-4, "420µ")]
)
def test_a_ratio_below_one_has_no_prefix(value: float, text: str) -> None:
    assert plain(value) == text
