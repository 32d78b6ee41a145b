"""How agreement is measured."""

from __future__ import annotations

import numpy as np
import pytest

from tauledger.errors import NetworkError
from tauledger.network.agreement import agreement

HZ = np.array([1.0, 10.0, 100.0])


def test_it_is_the_largest_relative_error_and_its_frequency() -> None:
    sweep = np.array([1.0 + 0j, 2.0, 4.0])
    found = agreement(HZ, sweep * np.array([1.0, 1.0 + 3e-9j, 1.0 - 1e-9]), sweep, 4.0)
    assert (found.at_hz, found.points) == (10.0, 3)
    assert found.max_relative_error == pytest.approx(3e-9, rel=1e-6)


def test_below_a_millionth_of_mid_band_the_error_counts_against_that() -> None:
    sweep = np.array([1.0, 1e-3, 1e-9], dtype=complex)
    found = agreement(HZ, sweep + np.array([0.0, 0.0, 1e-9]), sweep, 1.0)
    assert found.max_relative_error == pytest.approx(1e-3)


@pytest.mark.parametrize("wrong", [np.nan, np.inf])
def test_what_is_not_finite_cannot_agree(wrong: float) -> None:
    good = np.ones(3, dtype=complex)
    with pytest.raises(NetworkError, match="cannot be compared"):
        agreement(HZ, good, np.array([1.0, wrong, 1.0], dtype=complex), 1.0)


def test_nothing_cannot_agree_with_nothing() -> None:
    with pytest.raises(NetworkError, match="cannot be compared"):
        agreement(HZ[:0], np.zeros(0, dtype=complex), np.zeros(0, dtype=complex), 1.0)


def test_what_lies_beyond_the_range_that_counts_is_told_apart() -> None:
    sweep = np.array([1.0 + 0j, 2.0, 4.0])
    wrong = sweep * np.array([1.0, 1.0 + 3e-9j, 1.0 - 1e-5])
    found = agreement(HZ, wrong, sweep, 4.0, within_hz=(0.0, 10.0))
    assert (found.at_hz, found.points, found.beyond_at_hz) == (10.0, 2, 100.0)
    assert found.max_relative_error == pytest.approx(3e-9, rel=1e-6)
    assert found.beyond == pytest.approx(1e-5, rel=1e-6)
    assert agreement(HZ, wrong, sweep, 4.0, within_hz=(1e6, 1e7)) == agreement(HZ, wrong, sweep, 4.0)
