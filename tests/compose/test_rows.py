"""The tables of the review."""

from __future__ import annotations

from msgspec.structs import replace

import amplifiers
from tauledger.compose.rows import part_rows
from tauledger.explain import explain
from tauledger.numbers import solve_network


def test_a_coupling_capacitor_with_a_share_of_f_low_is_in_the_signal_path_whatever_its_weight() -> None:
    numbers = solve_network(amplifiers.coupled_stage())
    explained = explain(numbers)
    assert explained.short is not None
    assert explained.shares_low is not None
    no_weight = replace(explained.short, parts=tuple(replace(row, in_path=False) for row in explained.short.parts))
    rows = {row.name: row for row in part_rows(numbers, replace(explained, short=no_weight)) if row.klass == "short"}
    large = {name for name in rows if abs(explained.shares_low.parts[name]) >= 0.02}
    assert large
    assert {name for name, row in rows.items() if row.in_path} == large
