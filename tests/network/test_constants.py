"""Open-circuit time constants against textbook formulas and independent algebra."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from msgspec.structs import replace

import amplifiers
from strategies import networks
from tauledger.devices.parts import Part, capacitance, conductance, inductance, resistance, transconductance
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import Bands, classify, find_midband
from tauledger.network.constants import group_delay, inverse, midband_inverse, open_constants
from tauledger.network.reactances import reactances
from tauledger.network.solve import response
from tauledger.network.spectrum import pole_frequencies

R, RL, GM, C_PI, C_MU, CL = 600.0, 2e3, 0.05, 20e-12, 1e-12, 30e-12


def bands_of(network: Network) -> Bands:
    return classify(network, find_midband(network))


def common_emitter(*extra: Part) -> Network:
    return amplifiers.network(
        resistance("RS", "in", "b", R),
        transconductance("Q", ("out", "0"), ("b", "0"), GM, label="gm"),
        capacitance("Q", "b", "0", C_PI, label="c_pi"),
        capacitance("Q", "b", "out", C_MU, label="c_mu"),
        resistance("RL", "out", "0", RL),
        capacitance("CL", "out", "0", CL),
        *extra,
    )


def test_resistances_and_coefficients_of_a_common_emitter_are_the_textbook_s() -> None:
    # Gray, Hurst, Lewis and Meyer, 5th ed., sections 7.2.1 and 7.3.2
    constants = open_constants(bands_of(common_emitter()))
    assert constants.part("Q.c_pi").resistance_ohm == pytest.approx(R)
    assert constants.part("Q.c_mu").resistance_ohm == pytest.approx(R + RL + GM * R * RL)
    assert constants.part("CL").resistance_ohm == pytest.approx(RL)
    assert constants.b1_s == pytest.approx(R * C_PI + (R + RL + GM * R * RL) * C_MU + RL * CL)
    assert constants.b2_s2 == pytest.approx(R * RL * (C_PI * C_MU + C_PI * CL + C_MU * CL))


def test_weight_of_the_bridging_capacitor_holds_the_right_half_plane_zero() -> None:
    # H with C_mu shorted: the output follows the base, loaded by gm and RL, so H^mu·tau_mu/H^0 = −C_mu/gm
    mu = open_constants(bands_of(common_emitter())).part("Q.c_mu")
    assert mu.time_constant_s * (1.0 - mu.weight) == pytest.approx(-C_MU / GM)


def test_bases_and_collectors_add_to_the_node_constants() -> None:
    constants = open_constants(bands_of(common_emitter()))
    # Σ_k C_ik Z_ki with Z_bb = R, Z_ob = −gm·R·RL, Z_oo = RL, Z_bo = 0
    assert constants.node_time_constant_s["b"] == pytest.approx(R * C_PI + C_MU * (R + GM * R * RL))
    assert constants.node_time_constant_s["out"] == pytest.approx(RL * (C_MU + CL))


def test_an_inductor_has_l_over_r_and_the_resistance_that_it_faces() -> None:
    network = amplifiers.network(
        resistance("R1", "in", "a", 700.0), inductance("L", "a", "out", 1e-6), resistance("R2", "out", "0", 300.0)
    )
    row = open_constants(bands_of(network)).part("L")
    assert row.resistance_ohm == pytest.approx(1000.0)
    assert row.time_constant_s == pytest.approx(1e-9)
    # opened, it lets nothing through
    assert row.weight == pytest.approx(1.0)


def test_a_transcapacitance_has_a_transfer_resistance() -> None:
    network = amplifiers.coupled_stage()
    bands = bands_of(network)
    mid = midband_inverse(bands)
    row = open_constants(bands).part("Q1.c_bebc")
    out, minus, control, common = row.nodes
    expected = sum(
        sign * mid.impedance(at, into)
        for at, into, sign in (
            (control, out, 1.0),
            (control, minus, -1.0),
            (common, out, -1.0),
            (common, minus, 1.0),
        )
    )
    assert row.resistance_ohm == pytest.approx(expected, rel=1e-9)


def test_decoupling_is_not_in_the_path_and_leaves_the_weighted_sum_alone() -> None:
    supply: list[Part] = [
        resistance("RV", "vcc", "0", 47.0),
        capacitance("CV", "vcc", "x", 100e-6),
        resistance("RX", "x", "0", 50e-3),
        capacitance("CW", "vcc", "0", 100e-9),
    ]
    parts = [part for part in amplifiers.coupled_stage().parts if part.name != "RC"]
    decoupled = Network.from_parts(
        [*parts, resistance("RC", "c", "vcc", 2.2e3), *supply], output=amplifiers.coupled_stage().port
    )
    plain = open_constants(bands_of(amplifiers.coupled_stage()))
    constants = open_constants(bands_of(decoupled))
    assert not constants.part("CW").in_path
    assert all(part.in_path for part in constants.parts if part.name != "CW")
    assert constants.sum_s - plain.sum_s > 4e-9
    assert constants.weighted_sum_s == pytest.approx(plain.weighted_sum_s, rel=1e-2)


def test_a_node_inverse_gives_impedances_voltages_and_the_crossing_of_the_signal() -> None:
    network = common_emitter(resistance("RX", "side", "out", 100.0))
    mid = inverse(network)
    assert mid.impedance("b", "b") == pytest.approx(R)
    assert mid.impedance("out", "b") == pytest.approx(-GM * R * RL)
    assert mid.impedance("b", "0") == 0.0
    assert mid.across("b", "out") == pytest.approx(R + RL + GM * R * RL)
    assert mid.across("b") == pytest.approx(R)
    assert mid.voltage("out") == pytest.approx(-GM * RL)
    assert mid.voltage("0") == 0.0
    assert mid.gain == pytest.approx(-GM * RL)
    assert mid.crossing("b") == pytest.approx(1.0)
    assert mid.crossing("out") == pytest.approx(1.0)
    assert mid.crossing("in") == 0.0
    assert mid.crossing("0") == 0.0


def test_a_network_that_floats_has_no_inverse() -> None:
    floating = amplifiers.network(capacitance("C1", "in", "out", 1e-9), capacitance("C2", "out", "0", 1e-9))
    with pytest.raises(NetworkError, match="no unique solution"):
        inverse(floating)


def test_delay_of_a_coupling_capacitor_at_mid_band_is_that_of_its_high_pass() -> None:
    network = amplifiers.network(capacitance("C", "in", "out", 1e-6), resistance("R", "out", "0", 1e3))
    hz = 1e3
    w, tau = 2.0 * np.pi * hz, 1e-3
    # H = sτ/(1 + sτ): −dφ/dω = τ/(1 + (ωτ)²)
    assert group_delay(network, hz) == {"C": pytest.approx(tau / (1.0 + (w * tau) ** 2))}


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_delays_of_all_parts_add_to_the_phase_slope(network: Network) -> None:
    midband = find_midband(network)
    hz = midband.frequency_hz or 1e3
    step = 1e-4
    up, down = np.angle(response(network, np.array([hz * (1.0 + step), hz * (1.0 - step)])) / midband.gain)
    slope = -float(up - down) / (2.0 * step * 2.0 * np.pi * hz)
    delays = group_delay(network, hz)
    scale = sum(abs(delay) for delay in delays.values())
    assert sum(delays.values()) == pytest.approx(slope, abs=1e-5 * scale + 1e-11 / hz)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_weight_is_the_gain_lost_when_the_part_is_shorted_or_the_inductor_opened(network: Network) -> None:
    bands = bands_of(network)
    gain = midband_inverse(bands).gain
    for row in open_constants(bands).parts:
        if row.kind == "transcapacitance":
            continue
        open_or_short = 1e-9 / row.resistance_ohm if row.kind == "inductance" else 1e9 / row.resistance_ohm
        other = conductance(row.name, row.nodes[0], row.nodes[1], abs(open_or_short))
        parts = [part for part in bands.upper.parts if part.name != row.name]
        changed = inverse(assemble((*parts, other), bands.upper.port, bands.upper.amplitudes)).gain
        assert row.weight == pytest.approx(1.0 - (changed / gain).real, rel=1e-4, abs=1e-5 * max(1.0, abs(row.weight)))


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_second_coefficient_is_the_sum_of_all_products_of_two_inverse_poles(network: Network) -> None:
    bands = bands_of(network)
    constants = open_constants(bands)
    tau = -1.0 / pole_frequencies(bands.upper)
    b2 = 0.5 * (np.sum(tau) ** 2 - np.sum(tau**2)).real
    assert constants.b2_s2 == pytest.approx(b2, abs=1e-7 * constants.b1_s**2)


@settings(max_examples=15, deadline=None, derandomize=True)
@given(networks())
def test_a_capacitor_split_in_two_keeps_sums_and_the_parts_share_its_constant(network: Network) -> None:
    bands = bands_of(network)
    part = next(part for part in bands.upper.parts if part.label == "c_mu")
    halves = [replace(part, label=f"c_mu{k}", value=share * part.value) for k, share in ((1, 0.3), (2, 0.7))]
    parts = [other for other in network.parts if other.name != part.name]
    original = network.part(part.name)
    split = assemble(
        (*parts, *(replace(half, nodes=original.nodes) for half in halves)), network.port, network.amplitudes
    )
    whole, both = open_constants(bands), open_constants(bands_of(split))
    assert both.sum_s == pytest.approx(whole.sum_s, rel=1e-9)
    assert both.weighted_sum_s == pytest.approx(whole.weighted_sum_s, rel=1e-9, abs=1e-9 * whole.sum_s)
    for half, share in zip(halves, (0.3, 0.7), strict=True):
        assert both.part(half.name).time_constant_s == pytest.approx(
            share * whole.part(part.name).time_constant_s, rel=1e-7
        )


def test_the_rank_one_terms_add_to_the_assembled_matrix() -> None:
    for network in (amplifiers.coupled_stage(), amplifiers.choke_fed(), amplifiers.shunt_peaked()):
        terms = reactances(network)
        assert np.allclose(
            (terms.out * terms.value) @ terms.control.T,
            network.capacitance.dense(network.size),
            rtol=1e-12,
            atol=1e-30,
        )
