"""Parts of other value, solved again."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import networks
from tauledger.devices.parts import capacitance, inductance, resistance
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.edges import find_edges
from tauledger.network.first_order import rerun
from tauledger.network.recompute import each_scaled, edge_frequencies, scaled, without
from tauledger.network.shares import find_shares


def test_scaling_nothing_changes_nothing() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    edges, again = find_edges(network, midband), edge_frequencies(scaled(network, {}), midband)
    assert edges.f_high is not None
    assert edges.f_low is not None
    assert (again.f_low, again.f_high) == (edges.f_low.hz, edges.f_high.hz)


def test_ten_per_cent_less_of_the_only_capacitor_moves_the_edge_by_one_ninth() -> None:
    network = amplifiers.network(resistance("R", "in", "out", 1e3), capacitance("C", "out", "0", 1e-9))
    midband = find_midband(network)
    edges = find_edges(network, midband)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    one = each_scaled(network, midband, edges, 0.9)["C"]
    assert one.f_low is None
    assert one.f_high == pytest.approx(edges.f_high.hz / 0.9, rel=1e-12)


@pytest.mark.parametrize("name", ["R9", "q1.c_mu"])
def test_a_name_that_no_part_has_is_an_error(name: str) -> None:
    with pytest.raises(KeyError):
        scaled(amplifiers.coupled_stage(), {name: 0.9})
    with pytest.raises(KeyError):
        without(amplifiers.coupled_stage(), frozenset({name}))


def test_a_part_taken_out_is_a_part_of_no_value() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    gone, naught = without(network, frozenset({"CL"})), scaled(network, {"CL": 0.0})
    assert edge_frequencies(gone, midband).f_high == pytest.approx(edge_frequencies(naught, midband).f_high, rel=1e-9)


@pytest.mark.parametrize(
    "network", [amplifiers.coupled_stage(), amplifiers.choke_fed(), amplifiers.shunt_peaked(), amplifiers.close_edges()]
)
@pytest.mark.parametrize("factor", [0.9, 1.1, 0.3])
def test_all_single_changes_at_once_are_each_of_them_alone(network: Network, factor: float) -> None:
    midband = find_midband(network)
    together = each_scaled(network, midband, find_edges(network, midband), factor)
    assert set(together) == {part.name for part in network.parts if part.kind.endswith(("capacitance", "inductance"))}
    for name, edges in together.items():
        alone = edge_frequencies(scaled(network, {name: factor}), midband)
        assert edges.f_high == pytest.approx(alone.f_high, rel=1e-8)
        assert edges.f_low == pytest.approx(alone.f_low, rel=1e-8)


def test_a_change_so_large_that_the_edge_leaves_the_scan_is_searched_in_full() -> None:
    network = amplifiers.network(resistance("R", "in", "out", 1e3), capacitance("C", "out", "0", 1e-9))
    midband = find_midband(network)
    found = each_scaled(network, midband, find_edges(network, midband), 1e-3)["C"].f_high
    assert found == pytest.approx(1e3 / (2e-6 * 3.141592653589793), rel=1e-9)


@settings(max_examples=10, deadline=None, derandomize=True)
@given(networks())
def test_all_reactive_values_scaled_together_scale_both_edges(network: Network) -> None:
    midband = find_midband(network)
    names = [part.name for part in network.parts if part.kind.endswith(("capacitance", "inductance"))]
    edges = find_edges(network, midband)
    # the reference is stationary but stays where it was: a change of 0.1 % moves it by less than 1e-6
    after = edge_frequencies(scaled(network, dict.fromkeys(names, 1.001)), midband)
    if midband.plateau and edges.f_high is not None and edges.f_high.hz is not None:
        assert after.f_high == pytest.approx(edges.f_high.hz / 1.001, rel=1e-5)


def tuned(q: float) -> Network:
    """A source of 1 kΩ on a circuit tuned to 10 MHz."""
    omega = 2.0 * np.pi * 10e6
    return amplifiers.network(
        resistance("R", "in", "out", 1e3),
        inductance("L", "out", "0", 1e3 / (q * omega)),
        capacitance("C", "out", "0", q / (1e3 * omega)),
    )


@pytest.mark.parametrize("q", [3.0, 30.0, 1000.0])
@pytest.mark.parametrize("name", ["L", "C"])
def test_the_edges_of_a_tuned_circuit_move_with_its_maximum(q: float, name: str) -> None:
    network = tuned(q)
    midband = find_midband(network)
    edges = find_edges(network, midband)
    changed = scaled(network, {name: 0.9})
    anew = edge_frequencies(changed, find_midband(changed))
    exact = rerun(network, midband, edges, {name: 0.9})
    for again in (each_scaled(network, midband, edges, 0.9)[name], edge_frequencies(changed, midband), exact):
        assert again.f_high == pytest.approx(anew.f_high, rel=1e-9)
        assert again.f_low == pytest.approx(anew.f_low, rel=1e-9)
    assert exact.gain == pytest.approx(1.0, rel=1e-9)
    assert anew.f_high is not None
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    share = find_shares(network, midband, edges.f_high.hz, classify(network, midband).class_of).parts[name]
    assert anew.f_high / edges.f_high.hz == pytest.approx(0.9**-share, rel=0.01)
