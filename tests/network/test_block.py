"""A block of matrices is the parts that it was made of: response, sums, shares and poles do not change."""

from __future__ import annotations

import numpy as np
import pytest

import amplifiers
from tauledger.devices.parts import Part, block
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify, find_midband
from tauledger.network.constants import group_delay, open_constants
from tauledger.network.edges import find_edges
from tauledger.network.identities import check, open_identities, response_identities, share_identities
from tauledger.network.lower import short_constants
from tauledger.network.poles import find_poles
from tauledger.network.recompute import each_scaled, edge_frequencies, scaled
from tauledger.network.shares import find_shares
from tauledger.network.solve import response

NODES = ("c", "b", "e", "Q1'1")


def as_block(network: Network, owner: str) -> Network:
    """Put all parts of one owner into a block whose inner node stands at 3 times the voltage that it had."""
    inside = [part for part in network.parts if part.owner == owner]
    renamed = {f"{owner}'b": f"{owner}'1"}
    g, c = np.zeros((4, 4)), np.zeros((4, 4))
    for part in inside:
        nodes = [renamed.get(node, node) for node in part.nodes]
        place = [np.array([float(node == name) for name in NODES]) for node in nodes]
        out, control = place[0] - place[1], place[-2] - place[-1]
        target = c if part.kind in ("capacitance", "transcapacitance") else g
        target += part.value * np.outer(out, control)
    stretch = np.diag([1.0, 1.0, 1.0, 3.0])
    g, c = g @ stretch, c @ stretch
    g_rows, c_rows = (tuple(tuple(float(v) for v in row) for row in matrix) for matrix in (g, c))
    kept: list[Part] = [part for part in network.parts if part.owner != owner]
    return Network.from_parts([*kept, block(owner, NODES, g_rows, c_rows, "inside")], output=network.port)


@pytest.fixture(scope="module")
def networks() -> tuple[Network, Network]:
    plain = amplifiers.coupled_stage()
    return plain, as_block(plain, "Q1")


def bands_of(network: Network) -> Bands:
    return classify(network, find_midband(network))


def test_response_is_that_of_the_parts(networks: tuple[Network, Network]) -> None:
    frequency = np.geomspace(1.0, 1e10, 40)
    plain, blocked = (response(network, frequency) for network in networks)
    # a bypass of 100 µF is 10⁶ S at the upper end: rounding
    assert np.max(np.abs(blocked / plain - 1.0)) < 1e-10


def test_sums_are_those_of_the_parts_and_the_identities_hold(networks: tuple[Network, Network]) -> None:
    plain, blocked = (open_constants(bands_of(network)) for network in networks)
    assert blocked.sum_s == pytest.approx(plain.sum_s, rel=1e-9)
    assert blocked.weighted_sum_s == pytest.approx(plain.weighted_sum_s, rel=1e-9)
    check((*open_identities(blocked), *response_identities(networks[1], find_midband(networks[1]))))
    inside = sum(row.time_constant_s for row in plain.parts if row.name.startswith("Q1."))
    assert blocked.part("Q1.inside").time_constant_s == pytest.approx(inside, rel=1e-9)
    assert sum(1 for row in blocked.parts if row.name == "Q1.inside") == 1


def test_lower_edge_does_not_see_the_charges_inside(networks: tuple[Network, Network]) -> None:
    plain, blocked = (short_constants(bands_of(network)) for network in networks)
    assert blocked.sum_hz == pytest.approx(plain.sum_hz, rel=1e-9)
    assert blocked.pole_sum_hz == pytest.approx(plain.pole_sum_hz, rel=1e-6)


def test_shares_delays_and_poles_belong_to_the_block_as_a_whole(networks: tuple[Network, Network]) -> None:
    plain, blocked = networks
    edge = find_edges(plain, find_midband(plain)).f_high
    assert edge is not None
    assert edge.hz is not None
    shares = [find_shares(n, find_midband(n), edge.hz, bands_of(n).class_of) for n in networks]
    inside = sum(share for name, share in shares[0].parts.items() if name.startswith("Q1."))
    assert shares[1].parts["Q1.inside"] == pytest.approx(inside, rel=1e-9)
    check(share_identities(shares[1]))
    delay = sum(value for name, value in group_delay(plain, 1e5).items() if name.startswith("Q1."))
    assert group_delay(blocked, 1e5)["Q1.inside"] == pytest.approx(delay, rel=1e-9)
    for ours, theirs in zip(find_poles(blocked).poles, find_poles(plain).poles, strict=True):
        assert ours.s == pytest.approx(theirs.s, rel=1e-6)
        owned = sum(share for name, share in theirs.owners.items() if name.startswith("Q1."))
        assert ours.owners["Q1.inside"] == pytest.approx(owned, rel=1e-6, abs=1e-9)


def test_ten_per_cent_less_of_a_block_is_ten_per_cent_less_of_all_its_charges(
    networks: tuple[Network, Network],
) -> None:
    plain, blocked = networks
    midband = find_midband(plain)
    charges = {part.name: 0.9 for part in plain.parts if part.name.startswith("Q1.c")}
    expected = edge_frequencies(scaled(plain, charges), midband)
    found = each_scaled(blocked, find_midband(blocked), find_edges(blocked, find_midband(blocked)), 0.9)["Q1.inside"]
    assert found.f_high == pytest.approx(expected.f_high, rel=1e-6)
    assert found.f_low == pytest.approx(expected.f_low, rel=1e-6)
