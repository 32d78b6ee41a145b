"""Half circuits: mirror images that carry one signal are counted once."""

from __future__ import annotations

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence, plain_node
from tauledger.hand.combine import combine_upper
from tauledger.hand.estimate import SignalNode
from tauledger.hand.halves import counted
from tauledger.hand.steps import upper_steps

NONE = np.empty(0, dtype=complex)


def node(name: str, seconds: float, crossing: float) -> SignalNode:
    return replace(plain_node(name, seconds), crossing=crossing)


BALANCED = (
    node("bp", 17e-9, 0.495),
    node("bn", 17e-9, 0.495),
    node("outp", 62e-9, 0.387),
    node("outn", 62e-9 * (1 + 1e-12), 0.387),
)


def test_a_balanced_pair_is_one_half_circuit() -> None:
    found = counted(BALANCED)
    assert found.parts == 2
    assert [row.name for row in found.rows] == ["outp", "bp"]


def test_equal_stages_in_a_row_are_all_counted() -> None:
    found = counted([node("a", 1e-9, 1.0), node("b", 1e-9, 1.0)])
    assert (found.parts, len(found.rows)) == (1, 2)


def test_a_pair_driven_on_one_side_is_not_mirrored() -> None:
    """Only the outputs are alike; the driven base carries all of the signal."""
    found = counted([node("bp", 17e-9, 1.0), node("outp", 62e-9, 0.5), node("outn", 62.1e-9, 0.5)])
    assert (found.parts, len(found.rows)) == (1, 3)


def test_a_node_of_the_middle_is_kept_beside_the_halves() -> None:
    found = counted([*BALANCED, node("load", 5e-9, 1.0)])
    assert [row.name for row in found.rows] == ["outp", "bp", "load"]


def test_rows_that_do_not_count_are_left_out() -> None:
    assert counted([replace(plain_node("tail", 1.0), in_path=False)]).rows == ()


def test_both_halves_would_count_every_time_constant_twice() -> None:
    """Differential poles −1/63 ns and −1/4 ns, common-mode ones under their zeros."""
    differential = np.array([-1 / 75e-9, -1 / 3e-9], dtype=complex)
    common = np.array([-1 / 70e-9, -1 / 1e-9], dtype=complex)
    combined = combine_upper(BALANCED, np.concatenate([differential, common]), common)
    assert combined.sum_of_constants == pytest.approx(1 / (2 * np.pi * 79e-9))
    assert combined.seen == pytest.approx(78 / 79, rel=1e-3)
    assert not combined.hidden
    steps = upper_steps(BALANCED, combined, full_hz=2.1e6)
    assert steps[1].why == "node bp takes 17.0 ns of 79.0 ns in each half"


def test_poles_that_the_output_does_not_see_are_named_as_the_reason() -> None:
    """Not mirrored, so all rows count; half of their time constants belong to a pole under a zero."""
    nodes = [plain_node("a", 60e-9), plain_node("b", 50e-9)]
    poles = np.array([-1 / 60e-9, -1 / 50e-9], dtype=complex)
    combined = combine_upper(nodes, poles, poles[1:])
    assert combined.hidden
    assert combined.seen == pytest.approx(60 / 110)
    steps = {step.step: step.why for step in upper_steps(nodes, combined, full_hz=2.65e6)}
    assert steps["two-coefficients"] == (
        "the output does not see all poles; cancelled by a zero each and left out: the pole at 3.18 MHz; "
        "cancels the -30 % of the other time constants"
    )


def test_worked_examples_are_no_half_circuits() -> None:
    for board in boards.UPPER:
        assert counted(evidence(board()).nodes).parts == 1
