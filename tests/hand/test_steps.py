"""From paper to the full network: the steps of worked examples, and what is said of them.

The element values are those of the books; where a number below is not printed there, it is computed from these values
by the definition of the step (poles by eigenvalues, checked against an AC run of ngspice).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from by_algebra import capacitor_rows, evidence, plain_capacitor, plain_node, roots, signal_nodes
from tauledger.hand.combine import combine_lower, combine_upper
from tauledger.hand.estimate import StepEstimate
from tauledger.hand.steps import factors, lower_steps, upper_steps
from tauledger.network.assemble import Network

NONE = np.empty(0, dtype=complex)


def above(network: Network) -> dict[str, StepEstimate]:
    return {step.step: step for step in evidence(network).upper.steps}


def below(network: Network) -> dict[str, StepEstimate]:
    return {step.step: step for step in evidence(network).lower.steps}


def hz(steps: dict[str, StepEstimate], *names: str) -> list[float]:
    found = [steps[name].hz for name in names]
    assert None not in found
    return [value for value in found if value is not None]


def test_two_common_source_stages_lose_half_on_the_way() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3: SPICE 205 kHz; paper with one node 361 kHz."""
    steps = above(boards.two_common_source_stages())
    expected = [361.4e3, 255.3e3, 255.4e3, 205.7e3, 205.8e3, 205.8e3, 205.8e3]
    assert list(steps) == ["lowest", "all-nodes", "exact-constants", "two-coefficients", "all-poles", "zeros", "full"]
    assert hz(steps, *steps) == pytest.approx(expected, rel=5e-4)
    assert steps["full"].hz == pytest.approx(205e3, rel=5e-3)
    assert steps["all-nodes"].why == "node g1 takes 360 ns and node out takes 15.2 ns of 815 ns"
    assert "poles split, σ = 0.2" in steps["two-coefficients"].why
    assert steps["all-poles"].why == "third and higher poles: 40.0 MHz"


def test_compensated_stage_falls_by_splitting() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.6: p1 = 156 krad/s where Miller alone gives 161."""
    steps = above(boards.compensated_stage())
    assert hz(steps, "lowest", "full") == pytest.approx([25.63e3, 24.83e3], rel=5e-4)
    assert 2 * math.pi * hz(steps, "two-coefficients")[0] == pytest.approx(156e3, rel=2e-3)


def test_follower_with_one_capacitance_levels_off() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.3.1: pole and zero 8 % apart, no -3 dB frequency."""
    steps = above(boards.emitter_follower())
    assert steps["all-poles"].hz == pytest.approx(570e6, rel=5e-3)
    assert steps["zeros"].hz is None
    assert steps["full"].hz is None
    assert "levels off at -0.71 dB of mid-band: the zero at 618 MHz" in steps["zeros"].why
    assert "one pole in all, at 570 MHz" in steps["two-coefficients"].why
    assert factors(tuple(steps.values()))[-2:] == (None, None)


def test_follower_with_1_pf_is_carried_by_its_zero() -> None:
    """The same section prints 725 MHz with C_mu = 1 pF; poles alone give 417 MHz."""
    steps = above(boards.emitter_follower(c_mu=1e-12))
    assert hz(steps, "lowest", "two-coefficients", "zeros") == pytest.approx([626.8e6, 417.0e6, 722.3e6], rel=5e-4)
    assert steps["full"].hz == pytest.approx(725e6, rel=5e-3)
    assert steps["zeros"].why == "zero at 618 MHz; cancels the -32 % of the other time constants"


def test_common_gate_and_common_sources_of_sedra_and_smith() -> None:
    """Microelectronic Circuits, 8th ed., Ex. 10.6; 7th ed., common-source example (from memory)."""
    gate = above(boards.common_gate())
    assert hz(gate, "lowest", "two-coefficients", "full") == pytest.approx([271.6e6, 267.3e6, 267.3e6], rel=5e-4)
    assert gate["zeros"].why == "there is no zero"
    source = above(boards.common_source_100k())
    assert hz(source, "lowest", "full") == pytest.approx([381.8e3, 379.8e3], rel=5e-4)


def test_three_comparable_low_edges_step_over_the_highest() -> None:
    """1376, 422 and 231 Hz: the highest alone 23 % low, all of them 1524 Hz, exact 1779 Hz (ngspice 1778.6 Hz)."""
    steps = below(boards.three_low_edges())
    expected = [1376, 1524, 1524, 1786, 1779, 1779, 1779]
    assert hz(steps, *steps) == pytest.approx(expected, rel=1e-3)
    assert steps["lowest"].why == "C1 alone: 1.16 kΩ · 100 nF gives 1.38 kHz"
    assert steps["all-nodes"].why == "the other capacitors: C2 at 422 Hz, C3 at 231 Hz"


def test_bypass_zero_pulls_the_lower_edge_down() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.20(a): pole 500.5 Hz, zero 200.2 Hz, edge 412.7 Hz."""
    steps = below(boards.follower_then_common_source_low_edge())
    assert hz(steps, "lowest", "all-poles", "zeros", "full") == pytest.approx([500.5, 500.5, 412.7, 412.7], rel=3e-4)
    assert steps["zeros"].why == "zero at 200 Hz (C3)"


def test_two_capacitors_of_25_hz_have_no_pole_at_25_hz() -> None:
    """Kumar and Jain, Ex. 10.15: designed for 25 Hz each; poles at 0.13 and 49.86 Hz."""
    steps = below(boards.two_equal_low_edges())
    wanted = ("lowest", "all-nodes", "two-coefficients", "full")
    assert hz(steps, *wanted) == pytest.approx([25.0, 38.84, 49.86, 49.86], rel=1e-3)
    assert "poles split, σ = 0.01" in steps["two-coefficients"].why


@pytest.mark.parametrize("board", boards.UPPER, ids=lambda board: board.__name__)
def test_factors_lead_from_the_lowest_node_to_the_full_network(board: boards.Board) -> None:
    steps = evidence(board()).upper.steps
    product = math.prod(factor for factor in factors(steps)[1:] if factor is not None)
    assert steps[0].hz is not None
    assert steps[-1].hz == pytest.approx(steps[0].hz * product)


@pytest.mark.parametrize("board", [*boards.UPPER, *boards.LOWER], ids=lambda board: board.__name__)
def test_no_step_is_called_an_improvement(board: boards.Board) -> None:
    found = evidence(board())
    for step in (*found.upper.steps, *found.lower.steps):
        assert step.why
        assert not any(word in step.why for word in ("improve", "better", "correct", "accura"))


def test_exact_constants_are_worth_a_word_where_they_differ() -> None:
    nodes = [plain_node("a", 10e-9, exact=8e-9), plain_node("b", 2e-9)]
    steps = upper_steps(nodes, combine_upper(nodes, np.array([-1e8, -6e8], dtype=complex), NONE), full_hz=15e6)
    assert steps[2].why == "node a 10.0 ns by hand, 8.00 ns exact"


def test_negative_time_constant_is_left_out_and_said_so() -> None:
    """A capacitor across a non-inverting gain of 2 sees −9 kΩ; its row is no pole."""
    steps = above(boards.gain_of_two())
    assert hz(steps, "full")[0] == pytest.approx(27.56e6, rel=1e-3)
    nodes = [plain_node("a", 10e-9), plain_node("b", -3.6e-9)]
    told = upper_steps(nodes, combine_upper(nodes, np.array([-1.755e8, -1.42e9], dtype=complex), NONE), full_hz=27e6)
    assert told[1].hz == pytest.approx(told[0].hz)
    assert "node b is left out, its time constant is -3.60 ns" in told[1].why


def test_a_row_that_does_not_count_is_in_no_step() -> None:
    network = boards.two_common_source_stages()
    nodes = signal_nodes(network)
    aside = replace(plain_node("aside", 1.0), in_path=False)
    with_it = upper_steps([*nodes, aside], combine_upper([*nodes, aside], *roots(network)), full_hz=205.76e3)
    assert with_it == upper_steps(nodes, combine_upper(nodes, *roots(network)), full_hz=205.76e3)
    lower = boards.three_low_edges()
    rows = capacitor_rows(lower)
    supply = replace(plain_capacitor("CS", 1e6), in_path=False)
    assert lower_steps([*rows, supply], combine_lower([*rows, supply], *roots(lower)), full_hz=1779.0) == lower_steps(
        rows, combine_lower(rows, *roots(lower)), full_hz=1779.0
    )


def test_two_coefficients_are_left_out_where_they_lead_away_and_back() -> None:
    nodes = [plain_node(str(k), 1.0) for k in range(4)]
    steps = upper_steps(nodes, combine_upper(nodes, np.full(4, -1.0 + 0j), NONE), full_hz=0.0692)
    assert "two-coefficients" not in [step.step for step in steps]
    assert "more than two poles count" in next(step.why for step in steps if step.step == "all-poles")


def test_unstable_network_has_no_steps() -> None:
    nodes = [plain_node("a", 1e-9)]
    assert upper_steps(nodes, combine_upper(nodes, np.array([-1e9, 3e9], dtype=complex), NONE), full_hz=1e8) == ()
    calm = combine_upper(nodes, np.array([-1e9], dtype=complex), NONE)
    assert upper_steps(nodes, calm, full_hz=1.6e8, stable=False) == ()
    assert len(upper_steps(nodes, calm, full_hz=1.6e8)) == 7


def test_no_poles_no_steps() -> None:
    assert upper_steps([], combine_upper([], NONE, NONE), full_hz=None) == ()
    assert lower_steps([], combine_lower([], NONE, NONE), full_hz=None) == ()


def test_cancelled_poles_are_named_only_where_the_rows_hold_them() -> None:
    """A supply node's pole is under its zero and its row does not count: nobody misses it."""
    poles = np.array([-2.08e4, -1e7, -1e9], dtype=complex)
    zero = np.array([-2.0801e4 + 0j])
    aside = [plain_node("a", 1e-7), plain_node("b", 1e-9)]
    steps = upper_steps(aside, combine_upper(aside, poles, zero), full_hz=1.59e6)
    assert not any("cancelled" in step.why for step in steps)
    assert steps[3].hz == pytest.approx(1.59e6, rel=1e-2)
    counted = [*aside, plain_node("c", 1 / 2.08e4)]
    steps = upper_steps(counted, combine_upper(counted, poles, zero), full_hz=1.59e6)
    assert any("cancelled by a zero each and left out: the pole at 3.31 kHz" in step.why for step in steps)


def test_pulling_nodes_are_given_with_their_q() -> None:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.16: a source follower with Q = 0.55."""
    steps = above(boards.source_follower_with_load())
    assert "complex pair, Q = 0.55" in steps["two-coefficients"].why


def test_couplings_are_said_to_be_real_only_where_they_move_the_edge() -> None:
    dc_coupled = above(boards.two_common_source_stages())
    assert dc_coupled["full"].why == "nothing on the other side of mid-band moves it"
    nodes = [plain_node("a", 1e-7)]
    steps = upper_steps(nodes, combine_upper(nodes, np.array([-1e7 + 0j]), NONE), full_hz=1.7e6)
    assert steps[-1].why == "coupling capacitors are real: mid-band is not flat"
