"""The output node left out, or another one."""

from __future__ import annotations

import pytest

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import find_causes
from tauledger.causes.output_left_out import other_node_left_out, output_left_out

FF = 1e-15


def loaded(c_l: float) -> boards.Board:
    """Sedra and Smith style practice values: R_sig 5 kohm, g_m 2 mA/V, R_L' 20 kohm, C_gs 100 fF, C_gd 30 fF."""
    return lambda: boards.common_source(5e3, 2e-3, 20e3, 100 * FF, 30 * FF, c_l)


def test_a_heavy_load_is_what_the_input_node_alone_leaves_out() -> None:
    found = evidence(loaded(300 * FF)())
    cause = output_left_out(found)
    assert cause is not None
    assert (cause.cause, cause.quantity, cause.where) == ("output-left-out", "f_H", "node out")
    assert cause.says == (
        "node g alone gives 23.9 MHz and leaves out the output node, node out, which takes 6.62 ns of 13.3 ns; "
        "each node with a pole of its own gives 15.4 MHz"
    )
    assert cause.instead == "add the time constant of every node: their sum gives 12.0 MHz"
    assert other_node_left_out(found) is None


def test_effect_is_all_nodes_over_the_lowest_alone() -> None:
    """Miller alone 23.9 MHz, printed in the same exercise; with 50 fF of load the second node takes 5 % off."""
    found = evidence(loaded(50 * FF)())
    steps = {step.step: step.hz for step in found.upper.steps}
    cause = output_left_out(found)
    assert cause is not None
    assert steps["lowest"] == pytest.approx(23.9e6, rel=2e-3)
    assert steps["all-nodes"] is not None
    assert steps["lowest"] is not None
    assert cause.effect == pytest.approx(steps["all-nodes"] / steps["lowest"] - 1)
    assert {number.name: number.value for number in cause.numbers}["lowest node alone"] == steps["lowest"]


def test_without_a_load_the_output_takes_too_little_to_tell() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.1.2: C_gd at the output is 0.4 % of f_H."""
    network = boards.common_source(1e3, 14.1e-3, 5e3, 5.1e-12, 0.5e-12)
    cause = output_left_out(evidence(network))
    assert cause is not None
    assert abs(cause.effect) < 0.02
    assert "output-left-out" not in [told.cause for told in find_causes(evidence(network))]


def test_an_inner_node_is_not_called_the_output() -> None:
    """Gray, Hurst, Lewis and Meyer, sec. 7.3.3: beside the node between the stages it is the first gate that counts."""
    found = evidence(boards.two_common_source_stages())
    assert output_left_out(found) is None
    cause = other_node_left_out(found)
    assert cause is not None
    assert (cause.cause, cause.where) == ("other-node-left-out", "node g1")
    assert cause.effect == pytest.approx(255.3 / 361.4 - 1, abs=1e-3)


def test_one_node_leaves_none_out() -> None:
    found = evidence(boards.bypassed_source_without_coupling())
    assert output_left_out(found) is None
    assert other_node_left_out(found) is None
