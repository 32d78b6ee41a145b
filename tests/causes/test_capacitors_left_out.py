"""The other coupling and bypass capacitors left out."""

from __future__ import annotations

import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence, plain_capacitor, roots
from tauledger.causes.capacitors_left_out import other_capacitors_left_out
from tauledger.causes.catalogue import find_causes
from tauledger.causes.evidence import Evidence
from tauledger.hand.combine import combine_lower
from tauledger.hand.steps import lower_steps


def with_edges(*hz: float) -> Evidence:
    """The network of three low edges with other edges by hand."""
    found = evidence(boards.three_low_edges())
    rows = [plain_capacitor(f"C{k}", edge) for k, edge in enumerate(hz, 1)]
    combined = combine_lower(rows, *roots(found.bands.lower))
    steps = lower_steps(rows, combined, full_hz=found.lower.hz)
    return replace(found, capacitors=tuple(rows), lower=replace(found.lower, combined=combined, steps=steps))


def test_two_equal_edges_lie_55_per_cent_above_one() -> None:
    """Closed form: two equal poles have their edge at 1/√(√2 − 1) = 1.5538 times one of them."""
    cause = other_capacitors_left_out(with_edges(100.0, 100.0))
    assert cause is not None
    assert (cause.cause, cause.quantity, cause.where) == ("other-capacitors-left-out", "f_L", "C2")
    assert cause.effect == pytest.approx((2**0.5 - 1) ** -0.5 - 1, rel=1e-6)
    assert cause.says == (
        "C1 alone gives 100 Hz and leaves out C2 at 100 Hz; each capacitor with a pole of its own gives 155 Hz"
    )


def test_its_effect_is_the_step_from_the_highest_alone_to_all_capacitors() -> None:
    found = evidence(boards.three_low_edges())
    steps = {step.step: step.hz for step in found.lower.steps}
    cause = other_capacitors_left_out(found)
    assert cause is not None
    assert cause in find_causes(found)
    assert steps["all-nodes"] is not None
    assert steps["lowest"] is not None
    assert cause.effect == pytest.approx(steps["all-nodes"] / steps["lowest"] - 1)
    assert {number.name: number.value for number in cause.numbers}["highest capacitor alone"] == steps["lowest"]


def test_an_edge_a_decade_below_is_not_worth_telling() -> None:
    """(f2/f1)² of an edge ten times lower adds 1 %."""
    cause = other_capacitors_left_out(with_edges(100.0, 10.0))
    assert cause is not None
    assert 0.0 < cause.effect < 0.02
    assert "other-capacitors-left-out" not in [told.cause for told in find_causes(with_edges(100.0, 10.0))]


def test_one_capacitor_leaves_none_out() -> None:
    assert other_capacitors_left_out(with_edges(100.0)) is None
