"""Numbers in words: ratios stand in full as long as a reader takes them in at a glance."""

from __future__ import annotations

import pytest

from tauledger.report.wording import number


@pytest.mark.parametrize(
    ("value", "told"),
    [(23818.6, "23820 V/V"), (-23818.6, "-23820 V/V"), (1187.3, "1187 V/V"), (0.89615, "0.8962 V/V"), (1.0, "1 V/V")],
)
def test_a_large_gain_is_no_power_of_ten(value: float, told: str) -> None:
    assert number(value, "V/V") == told
