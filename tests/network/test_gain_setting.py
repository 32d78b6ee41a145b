"""Capacitors that set the mid-band gain: charge amplifiers and capacitive dividers against their own formulas."""

from __future__ import annotations

import math

import numpy as np
import pytest

import amplifiers
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, inductance, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify, find_midband
from tauledger.network.constants import midband_inverse, open_constants
from tauledger.network.edges import find_edges
from tauledger.network.gain_setting import impedance, impedance_above, impedance_below, parts_at
from tauledger.network.identities import check, open_identities
from tauledger.network.lower import short_constants
from tauledger.network.midband import in_changed
from tauledger.network.recompute import scaled
from tauledger.network.shares import find_shares
from tauledger.network.spectrum import pole_frequencies
from tauledger.pipeline import review_network

C_S, C_F, R_F, C_IN = 1e-9, 100e-12, 1e9, 20e-12
A, R_X, C_X = 1e3, 1e6, 100e-12


def charge_amplifier(*extra: Part) -> Network:
    """A capacitive transducer into an amplifier of gain −10⁴ and one pole, C_F ‖ R_F back to its input."""
    return amplifiers.network(
        capacitance("CS", "in", "n", C_S),
        capacitance("CIN", "n", "0", C_IN),
        resistance("RF", "n", "out", R_F),
        capacitance("CF", "n", "out", C_F),
        transconductance("GA", ("x", "0"), ("n", "0"), A / R_X),
        resistance("RX", "x", "0", R_X),
        capacitance("CX", "x", "0", C_X),
        transconductance("GB", ("out", "0"), ("x", "0"), -10.0),
        resistance("RO", "out", "0", 1.0),
        *extra,
    )


def bands_of(network: Network) -> Bands:
    return classify(network, find_midband(network))


def test_source_and_feedback_capacitor_of_a_charge_amplifier_set_its_gain_and_the_stray_one_does_not() -> None:
    bands = bands_of(charge_amplifier())
    assert bands.class_of == {"CS": "gain", "CIN": "open", "CF": "gain", "CX": "open"}
    assert bands.sound


def test_mid_band_gain_of_a_charge_amplifier_is_the_ratio_of_its_capacitors() -> None:
    # −C_S/C_F, less 1/(A·β) for a finite gain A = 10⁴ and β = C_F/(C_F + C_S + C_IN)
    bands = bands_of(charge_amplifier())
    beta = C_F / (C_F + C_S + C_IN)
    expected = -C_S / C_F / (1.0 + 1.0 / (10.0 * A * beta))
    assert bands.midband.gain.real == pytest.approx(expected, rel=1e-4)
    assert midband_inverse(bands).gain == pytest.approx(bands.midband.gain, rel=1e-9)


def test_time_constants_of_a_charge_amplifier_give_the_edge_of_its_loop() -> None:
    # one pole: f_H = (1 + A·β)/(2πR_X·C_X)
    network = charge_amplifier()
    bands = bands_of(network)
    constants = open_constants(bands)
    check(open_identities(constants))
    beta = C_F / (C_F + C_S + C_IN)
    expected = (1.0 + 10.0 * A * beta) / (2.0 * math.pi * R_X * C_X)
    edge = find_edges(network, bands.midband).f_high
    assert edge is not None
    # the output's own 1 Ω lets C_F through: some tenths of a per cent
    assert 1.0 / (2.0 * math.pi * constants.sum_s) == pytest.approx(expected, rel=0.01)
    assert edge.hz == pytest.approx(expected, rel=0.01)


def test_lower_edge_of_a_charge_amplifier_belongs_to_its_feedback() -> None:
    # f_L = 1/(2πR_F·C_F), R_F and C_F both divided by the same loop
    network = charge_amplifier()
    bands = bands_of(network)
    rows = {row.names[0]: row for row in short_constants(bands).parts}
    beta = C_F / (C_F + C_S + C_IN)
    loop = 1.0 + 1.0 / (10.0 * A * beta)
    assert rows["CF"].edge_hz == pytest.approx(1.0 / (2.0 * math.pi * R_F * C_F * loop), rel=0.01)
    low = find_edges(network, bands.midband).f_low
    assert low is not None
    assert sum(row.edge_hz for row in rows.values()) == pytest.approx(low.hz, rel=1e-3)


def test_shares_of_a_charge_amplifier_are_what_a_small_change_does() -> None:
    network = charge_amplifier()
    bands = bands_of(network)
    high = find_edges(network, bands.midband).f_high
    assert high is not None
    assert high.hz is not None
    shares = find_shares(network, bands.midband, high.hz, bands.class_of)
    for name in ("CS", "CF", "CIN", "CX"):
        nudged = (scaled(network, {name: factor}) for factor in (1.001, 0.999))
        up, down = (find_edges(changed, in_changed(changed, bands.midband)).f_high for changed in nudged)
        assert up is not None
        assert up.hz is not None
        assert down is not None
        assert down.hz is not None
        assert shares.parts[name] == pytest.approx(-math.log(up.hz / down.hz) / math.log(1.001 / 0.999), abs=1e-4)


def test_capacitive_divider_keeps_its_capacitors_and_its_gain() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "out", 100e-12),
        capacitance("C2", "out", "0", 200e-12),
        resistance("RG", "out", "0", 1e9),
    )
    bands = bands_of(network)
    assert bands.class_of == {"C1": "gain", "C2": "gain"}
    assert bands.sound
    assert bands.midband.gain.real == pytest.approx(1.0 / 3.0, rel=1e-4)
    constants = open_constants(bands)
    check(open_identities(constants))
    # C1 in series with C2 behind RS; at the other end R_G and the two in parallel
    assert constants.sum_s == pytest.approx(1e3 * 200e-12 / 3.0, rel=1e-4)
    assert sum(row.edge_hz for row in short_constants(bands).parts) == pytest.approx(
        1.0 / (2.0 * math.pi * 1e9 * 300e-12), rel=1e-3
    )


def test_parallel_capacitors_set_the_gain_together() -> None:
    network = charge_amplifier(*(capacitance(f"CF{k}", "n", "out", C_F) for k in range(5)))
    bands = bands_of(network)
    assert {name for name, kind in bands.class_of.items() if kind == "gain"} == {
        "CS",
        "CF",
        *(f"CF{k}" for k in range(5)),
    }


def test_close_band_edges_make_no_capacitor_set_the_gain() -> None:
    assert not bands_of(amplifiers.close_edges(100.0)).gain_setting
    assert not bands_of(amplifiers.coupled_stage()).gain_setting


def test_impedance_splits_into_the_poles_below_and_above_mid_band() -> None:
    bands = bands_of(charge_amplifier())
    network, s = bands.upper, bands.s_mid
    poles = pole_frequencies(network)
    c = network.capacitance.dense(network.size)
    for z, kept in (
        (impedance(network, s), np.ones(len(poles), dtype=bool)),
        (impedance_below(network, s), np.abs(poles) < abs(s)),
        (impedance_above(network, s), np.abs(poles) > abs(s)),
    ):
        expected = complex(np.sum(1.0 / (s - poles[kept])))
        assert complex(np.trace(z @ c)) == pytest.approx(expected, rel=1e-6, abs=0.0)


def test_a_gain_that_an_inductor_sets_beside_a_capacitor_is_not_worked_by_hand() -> None:
    """R·C integrates, gm·L differentiates: flat between 103 kHz and 16 MHz, and nothing is left with L a wire."""
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "b", 113e3),
        capacitance("C1", "b", "0", 13.6e-12),
        transconductance("G1", ("0", "out"), ("b", "0"), 0.2),
        inductance("L1", "out", "0", 10e-6),
        resistance("R2", "out", "0", 1e3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    midband = find_midband(network)
    assert abs(midband.gain) == pytest.approx(0.2 * 10e-6 / (113e3 * 13.6e-12), rel=0.02)
    bands = classify(network, midband)
    assert bands.gain_setting == {"C1"}
    assert bands.class_of["L1"] == "short"
    assert not bands.sound
    assert review_network(network).nodes == ()


def test_a_resonance_at_mid_band_parts_no_poles_and_nothing_is_worked_by_hand() -> None:
    """10 µF and 4.83 µH ring at 22.9 kHz beside a divider of capacitors; two decades higher all is as ever."""
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        capacitance("CS", "s", "out", 1.2e-9),
        capacitance("CW", "out", "0", 900e-12),
        resistance("RW", "out", "0", 2e9),
        resistance("RT", "s", "t", 1e3),
        inductance("LT", "t", "0", 4.83e-6),
        capacitance("CT", "t", "0", 10e-6),
        transconductance("GT", ("x", "0"), ("t", "0"), 1e-3),
        resistance("RX", "x", "0", 1e3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    resonance = 1.0 / (2.0 * math.pi * math.sqrt(4.83e-6 * 10e-6))
    near = find_midband(network, at_hz=1.0003 * resonance)
    assert near.plateau
    assert not parts_at(network, 2j * math.pi * near.frequency_hz)
    bands = classify(network, near)
    assert bands.gain_setting == {"CS", "CW"}
    assert not bands.sound
    assert classify(network, find_midband(network, at_hz=100.0 * resonance)).sound
    assert review_network(network, midband_hz=near.frequency_hz).nodes == ()
