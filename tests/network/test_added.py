"""One capacitance more: the rank-one formula against the network solved in full."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import amplifiers
from strategies import decades, networks
from tauledger.devices.parts import capacitance
from tauledger.network.added import places, response_with
from tauledger.network.assemble import Network, assemble
from tauledger.network.solve import response

FREQUENCY = np.geomspace(10.0, 1e9, 9)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(network=networks(), farad=decades(1e-15, 1e-8), data=st.data())
def test_the_response_with_one_capacitance_more_is_that_of_the_network_built_with_it(
    network: Network, farad: float, data: st.DataObject
) -> None:
    nodes = [*network.unknowns[: network.n_nodes], "0"]
    pair = data.draw(st.permutations(nodes))[:2]
    found = response_with(places(network, [(pair[0], pair[1])], FREQUENCY), np.array([farad]))[:, 0]
    whole = assemble((*network.parts, capacitance("Cadded", pair[0], pair[1], farad)), network.port, network.amplitudes)
    expected = response(whole, FREQUENCY)
    assert found == pytest.approx(expected, rel=1e-7, abs=1e-10 * float(np.abs(network_gain(network)).max()))


def network_gain(network: Network) -> np.ndarray:
    return response(network, FREQUENCY)


def test_every_place_has_a_column_of_its_own() -> None:
    network = amplifiers.coupled_stage()
    pairs = [(node, "0") for node in network.unknowns[: network.n_nodes]]
    together = places(network, pairs, FREQUENCY)
    for k, pair in enumerate(pairs):
        alone = places(network, [pair], FREQUENCY)
        assert together.own[:, k] == pytest.approx(alone.own[:, 0], rel=1e-9)
        assert together.passes[:, k] == pytest.approx(alone.passes[:, 0], rel=1e-9)


def test_no_capacitance_leaves_the_response_as_it_is() -> None:
    network = amplifiers.coupled_stage()
    found = places(network, [("out", "0")], FREQUENCY)
    assert response_with(found, np.zeros(1))[:, 0] == pytest.approx(response(network, FREQUENCY), rel=1e-12)
