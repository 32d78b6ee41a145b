"""Further worked examples of textbooks and published exercises, each with the precision to which it is printed.

No expectation is computed here, but for a formula that the source itself prints.
"""

from __future__ import annotations

import math

import pytest

import boards
from boards import driven, stage
from cells import near
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    current_source,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.pipeline import review_network
from tauledger.record import NodeRow, PartRow, Review

PICO, FEMTO = 1e-12, 1e-15


def walk(*parts: Part | list[Part]) -> Review:
    return review_network(driven(*parts))


def part(review: Review, name: str) -> PartRow:
    return next(row for row in review.parts if row.name == name)


def node(review: Review, name: str) -> NodeRow:
    return next(row for row in review.nodes if row.name == name)


def estimate(review: Review, method: str, edge: str = "f_high") -> float:
    hz = next(row.hz for row in review.estimates if row.edge == edge and row.method == method)
    assert hz is not None
    return hz


def tau(review: Review, name: str) -> float:
    seconds = part(review, name).time_constant_s
    assert seconds is not None
    return seconds


def sizes(review: Review) -> list[float]:
    return sorted(math.hypot(pole.real_hz, pole.imag_hz) for pole in review.poles)


def test_open_circuit_constants_of_a_common_source_sedra_and_smith() -> None:
    """Sedra and Smith, 4th/5th ed., open-circuit example: gain -10.76, 80.7k, 1.16M, 806 krad/s, 128.3 kHz."""
    review = walk(
        resistance("Rsig", "s", "g", 100e3),
        resistance("Rin", "g", "0", 420e3),
        stage("M1", "g", "out", "0", 4e-3, c_pi=PICO, c_mu=PICO),
        resistance("RL", "out", "0", 3.33e3),
    )
    assert review.midband.gain_real == near(-10.76, rel=1e-3)
    assert part(review, "M1.c_pi").resistance_hand_ohm == near(80.7e3, rel=2e-3)
    assert tau(review, "M1.c_mu") == near(1.16e-6, rel=3e-3)
    assert 2 * math.pi * estimate(review, "sum of time constants") == near(806e3, rel=1e-3)
    assert estimate(review, "sum of time constants") == near(128.3e3, rel=1e-3)


def test_input_pole_by_miller_boylestad_and_nashelsky() -> None:
    """Boylestad and Nashelsky, newer editions, high-frequency BJT example (from memory): gain -90, 406 pF, 687.73 kHz.

    The printed gain and capacitance are rounded to two and three figures.
    """
    r_e = 15.76
    review = walk(
        resistance("RS", "s", "b", 1e3),
        resistance("R1", "b", "0", 40e3),
        resistance("R2", "b", "0", 10e3),
        stage("Q1", "b", "out", "0", 1 / r_e, r_pi=100 * r_e, c_pi=36 * PICO, c_mu=4 * PICO),
        capacitance("Cwi", "b", "0", 6 * PICO),
        resistance("RC", "out", "0", 4e3),
        resistance("RL", "out", "0", 2.2e3),
        capacitance("Co", "out", "0", 9 * PICO),
    )
    assert review.stages[-1].gain_hand == near(-90.0, rel=2e-3)
    assert node(review, "b").capacitance_f == near(406e-12, rel=2e-3)
    assert estimate(review, "lowest node alone") == near(687.73e3, rel=3e-3)


def test_miller_and_open_circuit_constants_of_one_stage() -> None:
    """Practice set after Sedra and Smith, 8th ed.: C_in 1.33 pF, 23.9 MHz; R 5k, 225k, 20k; 8.25 ns, 19.3 MHz."""
    parts = (
        resistance("Rsig", "s", "g", 5e3),
        stage("M1", "g", "out", "0", 2e-3, r_o=100e3, c_pi=100 * FEMTO, c_mu=30 * FEMTO),
        resistance("RD", "out", "0", 50e3),
        resistance("RL", "out", "0", 50e3),
    )
    review = walk(*parts, capacitance("CL", "out", "0", 50 * FEMTO))
    assert review.midband.gain_real == near(-40.0)
    assert node(review, "g").capacitance_f == near(1.33e-12)
    assert estimate(review, "lowest node alone") == near(23.9e6, rel=2e-3)
    seen = [part(review, name).resistance_hand_ohm for name in ("M1.c_pi", "M1.c_mu", "CL")]
    assert seen == near([5e3, 225e3, 20e3])
    assert review.budget.upper is not None
    assert review.budget.upper.sum_s == near(8.25e-9)
    assert estimate(review, "sum of time constants") == near(19.3e6, rel=5e-3)


def test_bridged_stage_of_a_qualifying_examination() -> None:
    """Qualifying-exam item: gain -2.5, 41k across the bridge, 125 ns, 8 Mrad/s, p1 8.0077 Mrad/s, zero +5 Grad/s."""
    review = walk(
        resistance("Rs", "s", "a", 15e3),
        resistance("Ra", "a", "0", 3e3),
        stage("M1", "a", "out", "0", 15e-3, c_mu=3 * PICO),
        resistance("RL", "out", "0", 1e3),
        capacitance("CL", "out", "0", 2 * PICO),
    )
    assert review.midband.gain_real == near(-2.5)
    assert part(review, "M1.c_mu").resistance_hand_ohm == near(41e3)
    assert review.budget.upper is not None
    assert review.budget.upper.sum_s == near(125e-9)
    assert 2 * math.pi * sizes(review)[0] == near(8.0077e6, rel=1e-4)
    assert 2 * math.pi * max(zero.real_hz for zero in review.zeros) == near(5e9, rel=5e-3)


def test_integrated_common_source_sedra_and_smith_10_5() -> None:
    """Sedra and Smith, 8th ed., Ex. 10.5: gain -20, 2.8 ns, 56.8 MHz."""
    review = walk(
        resistance("Rsig", "s", "g", 20e3),
        stage("M1", "g", "out", "0", 2e-3, c_pi=20 * FEMTO, c_mu=5 * FEMTO),
        resistance("RL", "out", "0", 10e3),
        capacitance("CL", "out", "0", 25 * FEMTO),
    )
    assert review.midband.gain_real == near(-20.0)
    assert review.budget.upper is not None
    assert review.budget.upper.sum_s == near(2.8e-9)
    assert estimate(review, "sum of time constants") == near(56.8e6, rel=1e-3)


def test_two_common_emitter_stages_kumar_and_jain_10_18() -> None:
    """Kumar and Jain, Ex. 10.18: two coupled common-emitter stages, f_H 2.00 MHz by time constants."""
    review = walk(
        resistance("RS", "s", "b1", 600),
        stage("Q1", "b1", "c1", "0", 0.15, r_pi=1.4e3, c_pi=20 * PICO, c_mu=0.5 * PICO),
        resistance("RC1", "c1", "0", 1.5e3),
        stage("Q2", "c1", "out", "0", 0.05, r_pi=2.8e3, c_pi=25 * PICO, c_mu=0.5 * PICO),
        resistance("RL2", "out", "0", 600),
    )
    assert estimate(review, "sum of time constants") == near(2.00e6, rel=5e-3)


def test_two_field_effect_stages_kumar_and_jain_10_21() -> None:
    """Kumar and Jain, Ex. 10.21: gain 160, f_H 0.34 MHz by time constants (two figures)."""
    capacitances = {"c_pi": 5 * PICO, "c_mu": PICO}
    review = walk(
        resistance("RS", "s", "g1", 5e3),
        stage("M1", "g1", "d1", "0", 1e-3, r_o=40e3, **capacitances),
        resistance("RD1", "d1", "0", 40e3),
        capacitance("Cds1", "d1", "0", PICO),
        stage("M2", "d1", "out", "0", 1e-3, r_o=40e3, **capacitances),
        resistance("RD2", "out", "0", 10e3),
        capacitance("Cds2", "out", "0", PICO),
    )
    assert review.midband.gain_real == near(160.0)
    assert estimate(review, "sum of time constants") == near(0.34e6, rel=1e-2)


def test_follower_driving_a_common_source_kumar_and_jain_10_20b() -> None:
    """Kumar and Jain, Ex. 10.20(b): f_H 12.27 MHz by time constants."""
    review = walk(
        resistance("RS", "s", "g1", 200),
        resistance("RG1", "g1", "0", 50e3),
        transconductance("M1", ("0", "x"), ("g1", "x"), 10e-3, "gm"),
        capacitance("M1", "g1", "x", 5 * PICO, "c_gs"),
        capacitance("M1", "g1", "0", 2 * PICO, "c_gd"),
        resistance("RS1", "x", "0", 250),
        stage("M2", "x", "out", "0", 10e-3, c_pi=5 * PICO, c_mu=2 * PICO),
        resistance("RD2", "out", "0", 5e3),
        resistance("RL", "out", "0", 10e3),
    )
    assert estimate(review, "sum of time constants") == near(12.27e6, rel=1e-3)


def test_high_gain_cascode_carusone_johns_and_martin_4_13() -> None:
    """Carusone, Johns and Martin, 2nd ed., Ex. 4.13: 36 ns at the gate, 25.3 µs at the output, 6.3 kHz.

    The book takes R_out as g_m·r_ds²/2 = 5 Mohm; with the r_ds it leaves out it is 5.05 Mohm.
    """
    review = walk(
        resistance("Rs", "s", "g", 180e3),
        stage("M1", "g", "x", "0", 1e-3, r_o=100e3, c_pi=0.2 * PICO, c_mu=15 * FEMTO),
        stage("M2", "0", "out", "x", 1e-3, r_o=100e3),
        capacitance("Cs2", "x", "0", 0.26 * PICO),
        resistance("RL", "out", "0", 10e6),
        capacitance("Cout", "out", "0", 5.055 * PICO),
    )
    assert tau(review, "M1.c_pi") == near(3.6e-8)
    assert tau(review, "Cout") == near(2.53e-5, rel=1.5e-2)
    assert review.f_high is not None
    assert review.f_high.exact_hz == near(6.3e3, rel=2e-2)


def test_source_follower_with_capacitive_load_carusone_johns_and_martin_4_16() -> None:
    """Carusone, Johns and Martin, 2nd ed., Ex. 4.16: omega_0 4.27 Grad/s, Q 0.554, zero 39 GHz.

    Its g_m is printed to three figures; with it Q is 0.549.
    """
    network = Network.from_parts(
        [
            current_source("IS", "0", "g", 1.0),
            resistance("Rin", "g", "0", 18e3),
            capacitance("Cin", "g", "0", 10.7 * FEMTO),
            transconductance("M1", ("0", "out"), ("g", "out"), 0.735e-3, "gm"),
            capacitance("M1", "g", "out", 3 * FEMTO, "c_gs"),
            conductance("Gs", "out", "0", 0.18e-3),
            capacitance("Cs", "out", "0", 0.2 * PICO),
        ],
        output=Port("out"),
    )
    review = review_network(network)
    (pair,) = review.poles
    assert pair.f0_hz is not None
    assert 2 * math.pi * pair.f0_hz == near(4.27e9, rel=5e-3)
    assert pair.q == near(0.554, rel=1e-2)
    (zero,) = review.zeros
    assert -zero.real_hz == near(39e9, rel=5e-3)


def test_mirror_pole_and_zero_one_octave_apart_ghlm() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., ch. 7: gain 42.86, poles 61.9 MHz and 1.99 GHz, zero 3.98 GHz."""
    network = Network.from_parts(
        [
            voltage_source("VS", "s", "0", 1.0),
            transconductance("G1", ("m", "0"), ("s", "0"), 0.5e-3),
            transconductance("G2", ("0", "out"), ("s", "0"), 0.5e-3),
            conductance("G3", "m", "0", 1e-3),
            capacitance("Cm", "m", "0", 80 * FEMTO),
            transconductance("G4", ("out", "0"), ("m", "0"), 1e-3),
            resistance("ro2", "out", "0", 100e3),
            resistance("ro4", "out", "0", 75e3),
            capacitance("CL", "out", "0", 60 * FEMTO),
        ],
        output=Port("out"),
    )
    review = review_network(network)
    assert review.midband.gain_real == near(42.86, rel=1e-4)
    assert sizes(review) == near([61.9e6, 1.99e9], rel=1e-3)
    (zero,) = review.zeros
    assert -zero.real_hz == near(3.98e9, rel=1e-3)


def test_bypassed_source_kumar_and_jain_10_3() -> None:
    """Kumar and Jain, Ex. 10.3: C_S 18.57 µF for 10 Hz. The zero printed there as 0 is at 1/(2π·R_S·C_S) = 1.43 Hz."""
    review = walk(
        stage("M1", "s", "out", "x", 1e-3),
        resistance("RS", "x", "0", 6e3),
        capacitance("CS", "x", "0", 18.57e-6),
        resistance("RD", "out", "0", 1e3),
    )
    row = part(review, "CS")
    assert row.edge_hz == near(10.0, rel=1e-3)
    assert row.zero_hz == near(1.0 / (2.0 * math.pi * 6e3 * 18.57e-6))


def test_lower_edge_design_eighty_ten_ten_sedra_and_smith() -> None:
    """Sedra and Smith, 5th-7th ed., low-frequency design example (from memory): 7.44k, 72, 13k; 10, 80 and 10 Hz."""
    review = walk(
        resistance("Rsig", "s", "a", 5e3),
        capacitance("CC1", "a", "b", 2.1e-6),
        resistance("RB", "b", "0", 100e3),
        stage("Q1", "b", "c", "e", 0.04, r_pi=2.5e3),
        resistance("RE", "e", "0", 1e9),
        capacitance("CE", "e", "0", 27.6e-6),
        resistance("RC", "c", "0", 8e3),
        capacitance("CC2", "c", "out", 1.2e-6),
        resistance("RL", "out", "0", 5e3),
    )
    seen = [part(review, name).resistance_hand_ohm for name in ("CC1", "CE", "CC2")]
    assert seen == near([7440.0, 72.0, 13e3], rel=5e-3)
    edges = [part(review, name).edge_hz for name in ("CC1", "CE", "CC2")]
    # capacitances are printed rounded up to two and three figures
    assert edges == near([10.0, 80.0, 10.0], rel=3e-2)


def test_three_lower_edges_boylestad_and_nashelsky() -> None:
    """Boylestad and Nashelsky, low-frequency BJT example (from memory): 6.86, 25.68 and 327 Hz."""
    r_e = 15.76
    review = walk(
        resistance("RS", "s", "a", 1e3),
        capacitance("CS", "a", "b", 10e-6),
        resistance("R1", "b", "0", 40e3),
        resistance("R2", "b", "0", 10e3),
        stage("Q1", "b", "c", "e", 1 / r_e, r_pi=100 * r_e),
        resistance("RE", "e", "0", 2e3),
        capacitance("CE", "e", "0", 20e-6),
        resistance("RC", "c", "0", 4e3),
        capacitance("CC", "c", "out", 1e-6),
        resistance("RL", "out", "0", 2.2e3),
    )
    edges = [part(review, name).edge_hz for name in ("CS", "CC", "CE")]
    # the book takes r_e + R_s'/beta in place of (r_pi + R_s')/(beta + 1): one per cent in the third
    assert edges == near([6.86, 25.68, 327.0], rel=1.2e-2)


def test_without_source_resistance_the_output_makes_the_edge_sedra_and_smith() -> None:
    """Sedra and Smith, 8th ed., ch. 10: f_H = 1/[2π·(C_L + C_gd)·R_L'] and f_z = gm/(2π·C_gd) for R_sig = 0."""
    review = walk(
        resistance("Rsig", "s", "g", 1e-3),
        stage("M1", "g", "out", "0", 2e-3, c_pi=PICO, c_mu=0.5 * PICO),
        resistance("RL", "out", "0", 10e3),
        capacitance("CL", "out", "0", PICO),
    )
    assert sizes(review)[0] == near(1.0 / (2.0 * math.pi * 1.5e-12 * 10e3), rel=1e-4)
    assert max(zero.real_hz for zero in review.zeros) == near(2e-3 / (2.0 * math.pi * 0.5e-12), rel=1e-4)


def test_degenerated_common_source_after_razavi() -> None:
    """Razavi, Design of Analog CMOS Integrated Circuits, 2nd ed., ch. 6: (R_G + R_S)/(1 + gm·R_S) across C_gs,
    R_D + R_G·[1 + gm·R_D/(1 + gm·R_S)] across C_gd."""
    r_g, r_s, r_d, gm = 5e3, 500.0, 10e3, 4e-3
    review = walk(
        resistance("RG", "s", "g", r_g),
        stage("M1", "g", "out", "x", gm, c_pi=100 * FEMTO, c_mu=20 * FEMTO),
        resistance("RS", "x", "0", r_s),
        resistance("RD", "out", "0", r_d),
        capacitance("CL", "out", "0", 30 * FEMTO),
    )
    seen = [part(review, name).resistance_hand_ohm for name in ("M1.c_pi", "M1.c_mu", "CL")]
    loop = 1.0 + gm * r_s
    assert seen == near([(r_g + r_s) / loop, r_d + r_g * (1.0 + gm * r_d / loop), r_d])


def test_input_capacitance_of_a_follower_ghlm() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.2.3.1: 10 pF of C_pi act as 0.13 pF at the base."""
    review = review_network(boards.emitter_follower())
    row = node(review, "b")
    assert row.capacitance_f == near(0.13e-12, rel=2.5e-2)


@pytest.mark.parametrize("method", ["sum of time constants", "weighted sum"])
def test_a_single_pole_is_its_own_sum(method: str) -> None:
    """One R and one C: every sum is 1/(2πRC)."""
    review = walk(resistance("R", "s", "out", 1e3), capacitance("C", "out", "0", 1e-9))
    assert estimate(review, method) == near(1e6 / (2.0 * math.pi))
