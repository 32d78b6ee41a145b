"""Shares against finite changes of one value with the reference frequency held."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import networks
from tauledger.devices.parts import capacitance
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import classify, find_midband
from tauledger.network.edges import find_edges
from tauledger.network.midband import MidBand
from tauledger.network.recompute import edge_frequencies, scaled
from tauledger.network.shares import Shares, find_shares

STEP = 1e-4
BOARDS = {
    "coupled stage": amplifiers.coupled_stage(),
    "close edges": amplifiers.close_edges(10.0),
    "shunt peaked": amplifiers.shunt_peaked(),
    "choke fed": amplifiers.choke_fed(),
}


def shares_at(network: Network, midband: MidBand, edge: str) -> Shares:
    found = getattr(find_edges(network, midband), edge)
    return find_shares(network, midband, found.hz, classify(network, midband).class_of)


def by_difference(network: Network, midband: MidBand, edge: str, name: str) -> float:
    """−∂ln f/∂ln value by a central difference."""
    up, down = (getattr(edge_frequencies(scaled(network, {name: 1.0 + step}), midband), edge) for step in (STEP, -STEP))
    return float(-np.log(up / down) / np.log((1.0 + STEP) / (1.0 - STEP)))


@pytest.mark.parametrize("edge", ["f_low", "f_high"])
@pytest.mark.parametrize("board", BOARDS)
def test_share_of_every_part_is_what_a_small_change_does(board: str, edge: str) -> None:
    network = BOARDS[board]
    midband = find_midband(network)
    shares = shares_at(network, midband, edge)
    for name, share in shares.parts.items():
        assert share == pytest.approx(by_difference(network, midband, edge, name), abs=1e-6)


def test_close_edges_would_be_wrong_without_the_term_of_the_reference() -> None:
    # f_H/f_L = 10: the coupling capacitor raises f_H when it shrinks, only because the reference sinks
    network = amplifiers.close_edges(10.0)
    shares = shares_at(network, find_midband(network), "f_high")
    assert shares.parts["C1"] == pytest.approx(by_difference(network, find_midband(network), "f_high", "C1"), abs=1e-6)
    assert shares.parts["C1"] > 0.05


def test_an_inductor_has_its_share_and_it_speeds_up_a_peaked_stage() -> None:
    network = amplifiers.shunt_peaked()
    assert shares_at(network, find_midband(network), "f_high").parts["LP"] < -0.1


def test_with_a_reference_off_the_stationary_point_the_defect_is_the_ratio_of_slopes() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network, at_hz=300.0)
    shares = shares_at(network, midband, "f_high")
    assert abs(shares.defect) > 0.01
    assert sum(shares.parts.values()) == pytest.approx(1.0 - shares.defect, abs=1e-9)
    for name in ("C1", "CE", "Q1.c_mu"):
        assert shares.parts[name] == pytest.approx(by_difference(network, midband, "f_high", name), abs=1e-6)


def test_node_rows_add_to_the_shares_of_the_open_capacitors() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    bands, shares = classify(network, midband), shares_at(network, midband, "f_high")
    opens = sum(share for name, share in shares.parts.items() if bands.class_of[name] == "open")
    assert sum(shares.nodes.values()) == pytest.approx(opens, abs=1e-9)


@pytest.mark.parametrize("node", ["b", "Q1'b", "c", "e"])
@pytest.mark.parametrize("edge", ["f_low", "f_high"])
def test_cost_per_farad_is_what_a_real_capacitor_to_ground_does(node: str, edge: str) -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    shares = shares_at(network, midband, edge)
    farad = 1e-15 if edge == "f_high" else 1e-12
    more, less = (
        getattr(edge_frequencies(with_capacitor(network, node, sign * farad), midband), edge) for sign in (1.0, -1.0)
    )
    rounding = 1e-10 * shares.hz / farad
    assert shares.per_farad[node] == pytest.approx((more - less) / (2.0 * farad), rel=1e-5, abs=rounding)


def with_capacitor(network: Network, node: str, farad: float) -> Network:
    return assemble((*network.parts, capacitance("probe", node, "0", farad)), network.port, network.amplitudes)


@settings(max_examples=10, deadline=None, derandomize=True)
@given(networks())
def test_shares_of_random_amplifiers_are_what_small_changes_do(network: Network) -> None:
    midband = find_midband(network)
    shares = shares_at(network, midband, "f_high")
    largest = sorted(shares.parts, key=lambda name: -abs(shares.parts[name]))[:3]
    for name in largest:
        assert shares.parts[name] == pytest.approx(by_difference(network, midband, "f_high", name), abs=2e-5)
