"""What must not depend on units, names or order."""

from __future__ import annotations

import math
import random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

from strategies import decades, networks
from tauledger.circuit import GROUND, Port
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import classify, find_midband
from tauledger.network.constants import open_constants
from tauledger.network.edges import find_edges
from tauledger.network.shares import find_shares

few = settings(max_examples=12, deadline=None, derandomize=True)


def edges_hz(network: Network) -> list[float]:
    """Both edges in Hz, NaN where there is none."""
    edges = find_edges(network, find_midband(network))
    found = [None if edge is None else edge.hz for edge in (edges.f_low, edges.f_high)]
    return [float("nan") if hz is None else hz for hz in found]


def same(hz: list[float]) -> list[float]:
    return pytest.approx(hz, rel=1e-6, nan_ok=True)  # type: ignore[return-value]


def rebuilt(network: Network, change: dict[str, float]) -> Network:
    """Every part's value multiplied by the factor of its kind."""
    parts = tuple(replace(part, value=part.value * change.get(part.kind, 1.0)) for part in network.parts)
    return assemble(parts, network.port, network.amplitudes)


@few
@given(networks(), decades(1e-3, 1e3))
def test_all_reactive_values_times_k_divide_all_frequencies_by_k(network: Network, k: float) -> None:
    scaled = rebuilt(network, {"capacitance": k, "transcapacitance": k, "inductance": k})
    assert edges_hz(scaled) == same([hz / k for hz in edges_hz(network)])


@few
@given(networks(), decades(1e-3, 1e3))
def test_all_impedances_times_k_leave_everything_where_it_is(network: Network, k: float) -> None:
    factors = {"conductance": 1 / k, "transconductance": 1 / k, "capacitance": 1 / k, "transcapacitance": 1 / k}
    scaled = rebuilt(network, {**factors, "inductance": k})
    assert edges_hz(scaled) == same(edges_hz(network))
    one, other = (open_constants(classify(each, find_midband(each))) for each in (network, scaled))
    assert other.sum_s == pytest.approx(one.sum_s, rel=1e-9)
    for row in one.parts:
        assert other.part(row.name).weight == pytest.approx(row.weight, abs=1e-6)


@few
@given(networks(), st.randoms(use_true_random=False))
def test_order_of_parts_and_names_of_nodes_mean_nothing(network: Network, shuffle: random.Random) -> None:
    nodes = list(network.unknowns[: network.n_nodes])
    names = {**dict(zip(nodes, shuffle.sample(nodes, len(nodes)), strict=True)), GROUND: GROUND}
    parts: list[Part] = [replace(part, nodes=tuple(names[node] for node in part.nodes)) for part in network.parts]
    shuffle.shuffle(parts)
    shuffled = Network.from_parts(parts, output=Port(names[network.port.plus], names[network.port.minus]))
    assert edges_hz(shuffled) == same(edges_hz(network))
    midband, other = find_midband(network), find_midband(shuffled)
    hz = edges_hz(network)[1]
    if not math.isnan(hz):
        shares = find_shares(network, midband, hz, classify(network, midband).class_of)
        again = find_shares(shuffled, other, hz, classify(shuffled, other).class_of)
        assert dict(again.parts) == pytest.approx(dict(shares.parts), abs=1e-5)
        assert {names[node]: share for node, share in shares.nodes.items()} == pytest.approx(
            dict(again.nodes), abs=1e-5
        )
