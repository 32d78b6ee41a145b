"""The classical methods side by side, and which one a network asks for."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import boards
from by_algebra import evidence, plain_capacitor, plain_node, roots, signal_nodes
from tauledger.hand.combine import Combined, combine_lower, combine_upper
from tauledger.hand.estimate import MethodEstimate
from tauledger.hand.methods import methods, none_recommended, recommended, weighted_lower, weighted_upper
from tauledger.network.assemble import Network

NONE = np.empty(0, dtype=complex)


def above(network: Network) -> dict[str, MethodEstimate]:
    found = evidence(network)
    estimates = methods(found.upper.combined, None, upper_hz=found.upper.hz, lower_hz=None)
    return {estimate.method: estimate for estimate in estimates}


def below(network: Network) -> dict[str, MethodEstimate]:
    found = evidence(network)
    estimates = methods(None, found.lower.combined, upper_hz=None, lower_hz=found.lower.hz)
    return {estimate.method: estimate for estimate in estimates}


def chosen(estimates: dict[str, MethodEstimate]) -> list[str]:
    return [estimate.method for estimate in estimates.values() if estimate.recommended]


def of_nodes(taus: list[float], poles: list[complex], zeros: list[complex] | None = None) -> Combined:
    nodes = [plain_node(str(k), tau) for k, tau in enumerate(taus)]
    return combine_upper(nodes, np.array(poles, dtype=complex), np.array(zeros or [], dtype=complex))


@pytest.mark.parametrize(
    ("board", "printed", "precision"),
    [
        # Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.7: omega_H = 77.05 Mrad/s.
        (boards.common_emitter_1ma, 77.05e6 / (2 * math.pi), 2e-4),
        # Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3: 815 ns, 196 kHz.
        (boards.two_common_source_stages, 196e3, 5e-3),
        # Kumar and Jain, Ex. 10.12: 2.59 MHz.
        (boards.two_common_emitter_stages, 2.59e6, 2e-3),
        # Sedra and Smith, Microelectronic Circuits, 8th ed., Ex. 10.6: 263 MHz.
        (boards.common_gate, 263e6, 2e-3),
        # Sedra and Smith style practice values: 31.8 MHz.
        (boards.cascode, 31.8e6, 1e-2),
        # Gray, Hurst, Lewis and Meyer, sec. 7.3.6: 156 krad/s.
        (boards.compensated_stage, 156e3 / (2 * math.pi), 1e-3),
    ],
)
def test_sum_of_time_constants_is_what_the_books_print(board: boards.Board, printed: float, precision: float) -> None:
    assert above(board())["sum of time constants"].hz == pytest.approx(printed, rel=precision)


def test_short_circuit_sum_is_what_the_book_prints() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.20(a): 504.72 Hz."""
    estimates = below(boards.follower_then_common_source_low_edge())
    assert estimates["sum of time constants"].hz == pytest.approx(504.72, rel=1e-5)
    assert estimates["root of sum of squares"].hz == pytest.approx(413, rel=1e-3)
    assert estimates["highest capacitor alone"].hz == pytest.approx(500.49, rel=1e-4)


def test_each_edge_has_its_own_words_and_ends_with_the_exact_one() -> None:
    upper, lower = above(boards.cascode()), below(boards.three_low_edges())
    assert list(upper)[:2] == ["lowest node alone", "all nodes together"]
    assert list(lower)[:2] == ["highest capacitor alone", "all capacitors together"]
    assert list(upper)[2:] == list(lower)[2:]
    assert list(upper)[-1] == "exact"
    assert upper["exact"].hz == pytest.approx(37.28e6, rel=1e-3)
    assert upper["all poles"].hz == pytest.approx(37.28e6, rel=1e-3)


@settings(max_examples=50, derandomize=True)
@given(taus=st.lists(st.floats(1e-9, 1e-6), min_size=1, max_size=5))
def test_sum_of_time_constants_is_never_high_for_real_poles_without_zeros(taus: list[float]) -> None:
    combined = of_nodes(taus, [-1 / tau for tau in taus])
    assert combined.sum_of_constants is not None
    assert combined.all_poles is not None
    assert combined.lowest is not None
    assert combined.root_sum_of_squares is not None
    assert combined.sum_of_constants <= combined.all_poles * (1 + 1e-9)
    assert combined.all_poles <= combined.root_sum_of_squares * (1 + 1e-9)
    assert combined.root_sum_of_squares <= combined.lowest * (1 + 1e-9)


def test_split_poles_ask_for_the_sum() -> None:
    assert chosen(above(boards.compensated_stage())) == ["sum of time constants"]
    combined = evidence(boards.two_common_source_stages()).upper.combined
    assert combined is not None
    assert recommended(combined) == "sum of time constants"


def test_nodes_that_do_not_see_each_other_ask_for_all_of_them() -> None:
    assert chosen(above(boards.cascode())) == ["all nodes together"]


def test_pulling_nodes_ask_for_two_coefficients() -> None:
    assert chosen(above(boards.source_follower_with_load())) == ["two coefficients"]


def test_split_but_close_poles_ask_for_two_coefficients() -> None:
    combined = of_nodes([4.0, 4.0], [-1 / 5, -1 / 1.2])
    assert combined.sigma is not None
    assert combined.sigma < 0.5
    assert combined.coefficients.separation < 10
    assert recommended(combined) == "two coefficients"


def test_one_node_asks_for_its_time_constant() -> None:
    assert recommended(of_nodes([1e-7], [-1e7])) == "sum of time constants"


def test_a_zero_that_moves_the_edge_defeats_every_hand_method() -> None:
    assert chosen(above(boards.emitter_follower(c_mu=1e-12))) == []
    assert chosen(above(boards.weak_stage_with_large_bridge())) == []
    assert chosen(below(boards.follower_then_common_source_low_edge())) == []


def test_a_far_zero_defeats_none() -> None:
    assert len(chosen(above(boards.common_emitter_1ma()))) == 1


def test_no_edge_no_recommendation() -> None:
    estimates = above(boards.emitter_follower())
    assert chosen(estimates) == []
    assert estimates["exact"].hz is None
    assert estimates["sum of time constants"].hz == pytest.approx(570e6, rel=5e-3)


def test_unstable_network_gets_no_recommendation() -> None:
    assert recommended(of_nodes([1.0], [-1.0, 3.0])) is None


def test_recommended_method_stays_within_the_error_measured_for_its_class() -> None:
    """Errors measured over 311 networks: sum -14…0 %, all nodes -3…+14 %, two coefficients -12…0 %."""
    bounds = {
        "sum of time constants": (-0.15, 0.005),
        "all nodes together": (-0.04, 0.15),
        "two coefficients": (-0.13, 0.005),
    }
    for board in boards.UPPER:
        estimates = above(board())
        exact = estimates["exact"].hz
        for name in chosen(estimates):
            hz = estimates[name].hz
            assert hz is not None
            assert exact is not None
            low, high = bounds[name]
            assert low <= hz / exact - 1 <= high, (board.__name__, name)


def test_rows_aside_are_in_no_method() -> None:
    network = boards.cascode()
    nodes = signal_nodes(network)
    combined = combine_upper(nodes, *roots(network))
    assert combined.lowest == pytest.approx(39.89e6, rel=1e-3)
    low = combine_lower([plain_capacitor("C1", 10.0)], np.array([-62.8 + 0j]), np.zeros(1, dtype=complex))
    both = methods(combined, low, upper_hz=37.28e6, lower_hz=10.0)
    assert {estimate.edge for estimate in both} == {"f_high", "f_low"}
    assert methods(None, None, upper_hz=None, lower_hz=None) == ()


def test_the_weighted_sum_of_a_follower_knows_its_zero_and_that_of_decoupling_nothing() -> None:
    """1/(2π·Σ w·R·C): Σ w·R·C is b1 − a1, so a zero at −a1 takes its part back."""
    assert weighted_upper(159.155e-9) == pytest.approx(1e6, rel=1e-5)
    assert weighted_upper(-1e-9) is None
    found = evidence(boards.bypassed_emitter())
    low = [row for row in found.capacitors if row.in_path]
    expected = sum(row.edge_hand_hz - row.zero_hz * row.edge_hand_hz / row.edge_exact_hz for row in low)
    assert weighted_lower(low) == pytest.approx(expected)
    assert weighted_lower([]) is None


def test_no_recommended_method_is_more_than_5_per_cent_worse_than_another_by_hand() -> None:
    """Nor is one that misses by more than 10 %."""
    checked = 0
    for board, of_edge in [(board, above) for board in boards.UPPER] + [(board, below) for board in boards.LOWER]:
        estimates = of_edge(board())
        if not chosen(estimates):
            continue
        exact = estimates["exact"].hz
        assert exact is not None
        miss = {
            name: abs(one.hz / exact - 1)
            for name, one in estimates.items()
            if one.hz is not None and name not in ("all poles", "exact")
        }
        (choice,) = chosen(estimates)
        assert miss[choice] <= 0.10
        assert miss[choice] <= min(miss.values()) + 0.05
        checked += 1
    assert checked > 10


def test_what_the_conditions_recommend_gives_way_where_it_fails() -> None:
    """Two coefficients for a close pair, but a third pole at hand: nothing simple holds, and nothing is recommended."""
    combined = of_nodes([1.0, 0.5, 0.25], [-0.6 + 1.7j, -0.6 - 1.7j, -5.0])
    assert recommended(combined) is not None
    assert (
        chosen({one.method: one for one in methods(combined, None, upper_hz=combined.all_poles, lower_hz=None)}) == []
    )


def why_none(combined: Combined, exact_hz: float | None) -> str:
    estimates = methods(combined, None, upper_hz=exact_hz, lower_hz=None)
    reasons = none_recommended(estimates, combined, None)
    assert bool(reasons) == (not any(row.recommended for row in estimates) and exact_hz is not None)
    return reasons.get("f_high", "")


def test_no_recommendation_carries_its_reason() -> None:
    zero = of_nodes([1e-6, 1e-9], [-1e6, -1e9], [-1.5e6])
    assert zero.with_zeros is None or "a zero near the edge moves it" in why_none(zero, zero.with_zeros)
    near = of_nodes([1e-6, 1e-9], [-1e6, -1e9], [3e6])
    assert why_none(near, near.with_zeros).startswith("a zero near the edge moves it by +")
    unstable = of_nodes([1e-6], [1e6])
    assert why_none(unstable, 1e5) == "a pole lies in the right half plane"


def test_a_method_that_is_right_alone_is_so_by_luck() -> None:
    combined = of_nodes([1e-6, 0.8e-6], [-1e6, -1.25e6])
    assert combined.lowest is not None
    told = why_none(combined, 1.02 * combined.lowest)
    assert "lowest node alone is -2.0 % off by luck" in told


def test_what_keeps_every_method_off_is_named_with_the_nearest() -> None:
    pair = of_nodes([1e-6, 1e-6], [-1e6 + 3e6j, -1e6 - 3e6j])
    assert pair.two_coefficients is not None
    told = why_none(pair, 0.75 * pair.two_coefficients)
    assert told.startswith("the poles are a complex pair (Q = 1.6 from two coefficients)")
    assert told.endswith("% off")


def test_an_edge_far_from_all_poles_and_zeros_is_set_by_what_they_leave_out() -> None:
    """The other edge of a narrow band, for one."""
    single = of_nodes([1e-6], [-1e6])
    told = why_none(single, 0.1 * 1e6 / (2 * math.pi))
    assert told.startswith("what poles and zeros leave out sets the edge, they give +900 %;")


def test_a_recommendation_needs_no_reason() -> None:
    split = of_nodes([1e-6, 0.5e-6], [-0.67e6, -1e9])
    assert why_none(split, split.all_poles) == ""
