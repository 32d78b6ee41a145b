"""Band edges against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import decades, networks
from tauledger.devices.parts import capacitance, conductance, inductance, resistance, transconductance
from tauledger.network.assemble import Network
from tauledger.network.edges import HALF_POWER, Edge, Edges, find_edges
from tauledger.network.midband import find_midband
from tauledger.network.solve import response


def edges_of(network: Network, at_hz: float | None = None) -> Edges:
    return find_edges(network, find_midband(network, at_hz=at_hz))


def upper(network: Network) -> Edge:
    edge = edges_of(network).f_high
    assert edge is not None
    return edge


def low_pass(*poles_hz: float) -> Network:
    """Buffered sections of the first order."""
    parts = []
    node = "in"
    for k, hz in enumerate(poles_hz):
        out = "out" if k == len(poles_hz) - 1 else f"n{k}"
        parts += [
            transconductance(f"A{k}", (out, "0"), (node, "0"), -1e-3, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"C{k}", out, "0", 1.0 / (2.0 * np.pi * hz * 1e3)),
        ]
        node = out
    return amplifiers.network(*parts)


def resonant(q: float, f0_hz: float = 1e6, r: float = 1e3) -> Network:
    """R–L–C low-pass of the second order with this Q."""
    w = 2.0 * np.pi * f0_hz
    return amplifiers.network(
        resistance("R", "in", "x", r),
        inductance("L", "x", "out", q * r / w),
        capacitance("C", "out", "0", 1 / (q * r * w)),
    )


@settings(max_examples=15, deadline=None, derandomize=True)
@given(decades(1e-2, 1e9))
def test_one_pole_has_its_edge_there_with_half_the_slope_and_45_degrees(hz: float) -> None:
    edge = upper(low_pass(hz))
    assert edge.hz == pytest.approx(hz, rel=1e-12)
    assert edge.slope == pytest.approx(-0.5, rel=1e-9)
    assert edge.phase_deg == pytest.approx(-45.0, rel=1e-9)
    assert (edge.peaking_db, edge.peaking_at_hz, edge.further_hz, edge.settles_at) == (0.0, None, (), None)


@pytest.mark.parametrize("n", [2, 3, 4])
def test_n_equal_poles_have_their_edge_at_the_root_of_the_nth_root_of_two_less_one(n: int) -> None:
    edge = upper(low_pass(*[1e5] * n))
    assert edge.hz == pytest.approx(1e5 * math.sqrt(2.0 ** (1.0 / n) - 1.0), rel=1e-11)


@pytest.mark.parametrize("q", [0.5, 1 / math.sqrt(2.0), 1.0, 3.0, 60.0])
def test_second_order_edge_peaking_and_phase_are_those_of_the_textbook(q: float) -> None:
    edge = upper(resonant(q))
    u = 1.0 - 1.0 / (2.0 * q * q)
    assert edge.hz == pytest.approx(1e6 * math.sqrt(u + math.sqrt(u * u + 1.0)), rel=1e-11)
    if q > 0.75:
        assert edge.peaking_db == pytest.approx(20 * math.log10(q / math.sqrt(1 - 1 / (4 * q * q))), rel=1e-9)
        assert edge.peaking_at_hz == pytest.approx(1e6 * math.sqrt(u), rel=1e-6)
    x = math.sqrt(u + math.sqrt(u * u + 1.0))
    assert edge.phase_deg == pytest.approx(-math.degrees(math.atan2(x / q, 1.0 - x * x)), abs=1e-6)


def test_phase_goes_on_beyond_half_a_turn() -> None:
    # six poles: −3 dB long before, so the reference is taken high enough that the edge comes late
    six = low_pass(*[1e5] * 6)
    edge = upper(six)
    assert edge.phase_deg == pytest.approx(-6.0 * math.degrees(math.atan(math.sqrt(2.0 ** (1 / 6) - 1.0))), rel=1e-9)
    far = find_edges(resonant(200.0), find_midband(resonant(200.0), at_hz=0.0)).f_high
    assert far is not None
    assert far.phase_deg == pytest.approx(-180.0, abs=1.0)


def test_an_inverting_amplifier_counts_its_phase_from_mid_band() -> None:
    edges = edges_of(amplifiers.coupled_stage())
    assert edges.f_high is not None
    assert edges.f_low is not None
    assert edges.f_high.phase_deg == pytest.approx(-46.0, abs=4.0)
    assert edges.f_low.phase_deg == pytest.approx(45.0, abs=4.0)


def test_a_direct_coupled_amplifier_has_no_lower_edge() -> None:
    assert edges_of(low_pass(1e5)).f_low is None
    assert edges_of(low_pass(1e5), at_hz=1e3).f_low is None


def test_a_network_of_resistors_has_no_edge_at_all() -> None:
    edges = edges_of(amplifiers.network(resistance("R1", "in", "out", 1e3), resistance("R2", "out", "0", 1e3)))
    assert (edges.f_low, edges.f_high) == (None, None)


def test_a_follower_with_c_pi_alone_levels_off_before_3_db() -> None:
    # Gray, Hurst, Lewis and Meyer, 5th ed., section 7.2.3: 1 mA, β 100, 50 Ω + 150 Ω, 2 kΩ, 10 pF
    gm = 1e-3 / 26e-3
    edge = upper(
        amplifiers.network(
            resistance("RS", "in", "b", 200.0),
            conductance("Q", "b", "out", gm / 100.0, label="g_pi"),
            capacitance("Q", "b", "out", 10e-12, label="c_pi"),
            transconductance("Q", ("0", "out"), ("b", "out"), gm, label="gm"),
            resistance("RL", "out", "0", 2e3),
        )
    )
    assert edge.hz is None
    assert edge.slope is None
    # far above, C_pi is a wire: RL/(RL + RS), against the gain of 0.98633 at DC
    assert edge.settles_at == pytest.approx(2000.0 / 2200.0 / 0.986328125, rel=1e-5)


def test_a_shelf_beyond_the_edge_is_told_with_its_level() -> None:
    edge = upper(
        amplifiers.network(
            resistance("R", "in", "out", 9e3), capacitance("C", "out", "x", 1e-9), resistance("RX", "x", "0", 1e3)
        )
    )
    assert edge.hz is not None
    assert edge.settles_at == pytest.approx(0.1, rel=1e-5)


def test_a_shallow_slope_is_told_with_its_1_and_6_db_frequencies() -> None:
    # a shelf that settles just under −3 dB
    top = 1.0 / HALF_POWER
    edge = upper(
        amplifiers.network(
            resistance("R", "in", "out", (top - 0.999) * 1e3),
            capacitance("C", "out", "x", 1e-9),
            resistance("RX", "x", "0", 1e3),
        )
    )
    assert edge.slope is not None
    assert edge.shallow
    assert edge.minus_1_db_hz is not None
    assert edge.hz is not None
    assert edge.minus_1_db_hz < edge.hz
    assert edge.minus_6_db_hz is None


def test_a_later_return_above_3_db_is_told() -> None:
    # a notch at 1 MHz in a line that is flat on both sides
    w = 2.0 * np.pi * 1e6
    network = amplifiers.network(
        resistance("R", "in", "out", 1e3),
        inductance("L", "out", "x", 1e3 / w),
        capacitance("C", "x", "y", 1.0 / (1e3 * w)),
        resistance("RX", "y", "0", 10.0),
    )
    midband = find_midband(network, at_hz=1e3)
    edges = find_edges(network, midband)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    assert len(edges.f_high.further_hz) == 1
    assert edges.f_high.hz * edges.f_high.further_hz[0] == pytest.approx(1e12, rel=1e-3)


def test_a_peak_between_two_points_of_the_scan_is_found() -> None:
    edge = find_edges(resonant(2e4), find_midband(resonant(2e4), at_hz=0.0)).f_high
    assert edge is not None
    assert edge.peaking_db == pytest.approx(20.0 * math.log10(2e4), rel=1e-6)


def test_close_edges_lie_where_the_quadratic_puts_them() -> None:
    network = amplifiers.close_edges(10.0)
    edges = edges_of(network)
    assert edges.f_low is not None
    assert edges.f_high is not None
    # symmetric band-pass: f_low·f_high = f1·f2 and f_high − f_low = f1 + f2
    f1, f2 = 1.0 / (2e-3 * np.pi), 10.0 / (2e-3 * np.pi)
    assert edges.f_low.hz is not None
    assert edges.f_high.hz is not None
    assert edges.f_low.hz * edges.f_high.hz == pytest.approx(f1 * f2, rel=1e-9)
    assert edges.f_high.hz - edges.f_low.hz == pytest.approx(f1 + f2, rel=1e-9)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_at_every_edge_the_gain_is_3_db_down(network: Network) -> None:
    midband = find_midband(network)
    edges = find_edges(network, midband)
    for edge in (edges.f_low, edges.f_high):
        for hz in () if edge is None or edge.hz is None else (edge.hz, *edge.further_hz):
            assert abs(response(network, np.array([hz]))[0]) == pytest.approx(HALF_POWER * abs(midband.gain), rel=1e-7)
