"""The edge of T by hand, of the loop opened and loaded with what the cut wire led to."""

from __future__ import annotations

import numpy as np
import pytest

from cells import bands_of, bipolar
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, current_source, resistance
from tauledger.hand.feedback import FoundLoop
from tauledger.hand.open_loop import OpenLoop, open_loop
from tauledger.network.assemble import Network
from tauledger.network.loop_shape import loop_grid, loop_shape
from tauledger.network.return_ratio import at_wire, return_ratio
from tauledger.network.solve import on_axis
from tauledger.network.spectrum import pole_frequencies


def pair(*, c_in: float, c_out: float) -> tuple[Network, tuple[Device, ...]]:
    """A common emitter into a follower, 20 kΩ back to the base."""
    items: list[Part | Device] = [
        current_source("IS", "0", "b", 1.0),
        capacitance("CIN", "b", "0", c_in),
        bipolar("Q1", ("c", "b", "0"), r_b=80.0, c_pi=5e-12, c_mu=0.5e-12),
        resistance("RC", "c", "0", 5e3),
        capacitance("CC", "c", "0", c_out),
        bipolar("Q2", ("0", "c", "out"), c_pi=2e-12, c_mu=0.2e-12),
        resistance("RL", "out", "0", 1e3),
        resistance("RF", "out", "b", 20e3),
    ]
    devices = tuple(item for item in items if isinstance(item, Device))
    parts = [part for item in items for part in (item.parts if isinstance(item, Device) else (item,))]
    return Network.from_parts(parts, output=Port("out")), devices


def worked(network: Network, devices: tuple[Device, ...], loop: FoundLoop) -> tuple[OpenLoop | None, float]:
    """The edge of T by hand, and exactly."""
    opening = at_wire(network, "Q1", "b")
    poles = pole_frequencies(network)
    grid = loop_grid(poles / 1e4, poles)
    shape = loop_shape(lambda hz: return_ratio(opening, on_axis(hz)), grid, 0.0)
    assert shape.f_high_hz is not None
    return open_loop(bands_of(network), devices, loop, shape.f_high_hz), shape.f_high_hz


BASE = FoundLoop("Q1", "b", "base", "Q1", ("c", "out"))


@pytest.mark.parametrize(("c_in", "c_out", "slowest"), [(50e-12, 1e-12, "b"), (1e-12, 400e-12, "c")])
def test_with_one_slow_node_the_sum_is_the_edge_of_t(c_in: float, c_out: float, slowest: str) -> None:
    hand, exact = worked(*pair(c_in=c_in, c_out=c_out), BASE)
    assert hand is not None
    assert hand.edge_hz == pytest.approx(exact, rel=0.03)
    assert hand.nodes[0].node == slowest
    total = 1.0 / (2.0 * np.pi * hand.edge_hz)
    assert sum(node.seconds for node in hand.nodes) == pytest.approx(total, rel=0.02)
    for node in hand.nodes:
        assert node.ohm * node.farad == pytest.approx(node.seconds, rel=1e-9, abs=0)


def test_of_two_slow_nodes_the_sum_stays_below_the_edge() -> None:
    """Two real poles alike: the sum of time constants is up to 22 % low, never high."""
    hand, exact = worked(*pair(c_in=10e-12, c_out=100e-12), BASE)
    assert hand is not None
    assert 0.77 * exact < hand.edge_hz < exact


def test_the_load_of_the_cut_counts() -> None:
    """Without r_π of Q1 behind the wire R at the base would be 20 kΩ: the edge lies far higher."""
    network, devices = pair(c_in=50e-12, c_out=1e-12)
    hand, _ = worked(network, devices, BASE)
    assert hand is not None
    assert hand.nodes[0].ohm < 4e3


def test_a_loop_without_a_wire_has_no_hand_table() -> None:
    network, devices = pair(c_in=50e-12, c_out=1e-12)
    assert open_loop(bands_of(network), devices, FoundLoop("E1", "", "", "E1", ()), 1e6) is None
