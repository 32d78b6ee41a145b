"""Measuring aids: looked past in mid-band, edges and tables, and still in the network."""

from __future__ import annotations

import numpy as np
import pytest

import amplifiers
from tauledger.devices.parts import Part, capacitance, inductance, resistance, transconductance, voltage_gain
from tauledger.network.aids import measuring_aids
from tauledger.network.assemble import Network
from tauledger.network.bands import classify
from tauledger.network.edges import find_edges
from tauledger.network.midband import find_midband
from tauledger.network.poles import find_poles
from tauledger.network.solve import response

TWO_PI = 2.0 * np.pi


def inverting(*loop: Part) -> Network:
    """Two stages, -20 and +50, driven at the inverting input through 1 kΩ, and what stands around them."""
    return amplifiers.network(
        resistance("RS", "in", "inn", 1e3),
        capacitance("CI", "inn", "0", 1e-12),
        transconductance("G1", ("x", "0"), ("inn", "0"), 1e-3),
        resistance("R1", "x", "0", 20e3),
        capacitance("C1", "x", "0", 200e-12),
        transconductance("G2", ("0", "out"), ("x", "0"), 5e-3),
        resistance("R2", "out", "0", 10e3),
        capacitance("C2", "out", "0", 1e-12),
        *loop,
    )


def servo(henry: float = 1e9, farad: float = 1e9) -> Network:
    """The same with its loop closed for direct current alone: 1 GH from the output to the input beside 1 GF."""
    return inverting(
        inductance("LBRK", "out", "fb", henry),
        capacitance("CBRK", "fb", "0", farad),
        transconductance("GF", ("inn", "0"), ("fb", "0"), -1e-3),
    )


def test_a_loop_that_is_closed_for_direct_current_alone_has_the_open_loop_s_midband_and_edges() -> None:
    network, alone = servo(), inverting()
    midband, reference = find_midband(network), find_midband(alone)
    assert (midband.aids, midband.from_hz, midband.reaches_dc) == (("LBRK", "CBRK"), 0.0, True)
    assert abs(midband.gain) == pytest.approx(abs(reference.gain), rel=1e-6)
    edges, expected = find_edges(network, midband), find_edges(alone, reference)
    assert edges.f_low is None
    assert edges.f_high is not None
    assert expected.f_high is not None
    assert edges.f_high.hz == pytest.approx(expected.f_high.hz, rel=1e-6)
    assert expected.f_high.hz == pytest.approx(1.0 / (TWO_PI * 20e3 * 200e-12), rel=0.01)


def test_aids_stay_in_the_network() -> None:
    network = servo()
    assert abs(response(network, np.array([1e-13]))[0]) < 0.01 * abs(find_midband(network).gain)


def test_poles_below_the_floor_are_those_of_the_aids() -> None:
    network = servo()
    midband = find_midband(network)
    found, expected = find_poles(network, floor_hz=midband.floor_hz), find_poles(inverting())
    assert [p.s for p in found.poles] == pytest.approx([p.s for p in expected.poles], rel=1e-6)
    assert len(find_poles(network).poles) == len(found.poles) + 2


def test_a_loop_that_an_ideal_output_makes_ring_at_a_nanohertz_is_stable_all_the_same() -> None:
    network = inverting(
        voltage_gain("E1", ("buffered", "0"), ("out", "0"), 1.0),
        inductance("LBRK", "buffered", "fb", 1e6),
        capacitance("CBRK", "fb", "0", 1e3),
        transconductance("GF", ("inn", "0"), ("fb", "0"), -1e-3),
    )
    assert not find_poles(network).stable
    assert find_poles(network, floor_hz=find_midband(network).floor_hz).stable


def test_an_operating_point_that_latches_is_unstable_with_aids_as_well() -> None:
    network = inverting(
        inductance("LBRK", "out", "fb", 1e9),
        capacitance("CBRK", "fb", "0", 1e9),
        transconductance("GF", ("inn", "0"), ("fb", "0"), 1e-3),
    )
    assert not find_poles(network, floor_hz=find_midband(network).floor_hz).stable


def test_aids_are_open_and_short_whatever_stands_beside_them_and_neither_edge_is_theirs() -> None:
    network = inverting(
        inductance("LBRK", "out", "fb", 1e9),
        capacitance("CBRK", "fb", "0", 1e9),
        capacitance("CG", "fb", "0", 1e-12),
        transconductance("GF", ("inn", "0"), ("fb", "0"), 1e-3),
    )
    bands = classify(network, find_midband(network))
    assert bands.sound
    assert (bands.class_of["LBRK"], bands.class_of["CBRK"], bands.class_of["CG"]) == ("open", "short", "open")
    assert {part.name for part in bands.lower.parts}.isdisjoint({"LBRK", "CBRK", "CG"})


def test_a_coupling_capacitor_beside_an_aid_makes_the_lower_edge() -> None:
    # aids: 1 F into 10 kΩ alone; C1 of 1 µF into 48 kΩ and CE belong to the amplifier
    network = amplifiers.coupled_stage(capacitance("CX", "out", "x", 1.0), resistance("RX", "x", "0", 10e3), output="x")
    midband = find_midband(network)
    edges = find_edges(network, midband)
    assert midband.aids == ("CX",)
    assert edges.f_low is not None
    assert edges.f_low.hz is not None
    assert 10.0 < edges.f_low.hz < 1e3
    zeros = [zero.s for zero in find_poles(network, floor_hz=midband.floor_hz).zeros]
    assert zeros.count(0j) == 2


@pytest.mark.parametrize(
    ("network", "aid"),
    [
        (inverting(inductance("LX", "out", "0", 1e3)), True),
        (inverting(inductance("LX", "out", "0", 100.0)), False),
        (inverting(capacitance("CX", "x", "0", 1.0)), False),
        (amplifiers.coupled_stage(inductance("LX", "c", "0", 1e3)), False),
    ],
    ids=["1.6 Hz below 40 kHz", "a filter choke", "1 F that shorts the signal", "0.35 Hz beside coupling capacitors"],
)
def test_value_and_effect_decide(network: Network, *, aid: bool) -> None:
    assert (measuring_aids(network) is not None) == aid


def test_a_netlist_without_huge_parts_has_no_aids() -> None:
    midband = find_midband(amplifiers.coupled_stage())
    assert (midband.aids, midband.floor_hz) == ((), 0.0)
