"""Poles and zeros by shift-and-invert against closed forms and against the QZ algorithm."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from scipy.linalg import eig

import amplifiers
from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_gain,
    inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.solve import Complex, Real, on_axis, response
from tauledger.network.spectrum import frequency_grid, in_order, natural_frequencies, pole_frequencies, zero_frequencies

ACCURACY = 1e-6
"""QZ itself loses up to 1e-7 on poles twelve decades apart."""


def by_qz(g: Complex | Real, c: Complex | Real) -> Complex:
    """Eigenvalues of the pencil by QZ, the capacitances scaled so that both matrices are of one size."""
    scale = float(np.exp(np.mean(np.log(np.abs(c[c != 0.0]))))) / float(np.exp(np.mean(np.log(np.abs(g[g != 0.0])))))
    alpha, beta = eig(-g, c / scale, right=False, homogeneous_eigvals=True)
    finite = np.abs(beta) > 1e-300
    s = np.asarray(alpha[finite] / beta[finite] / scale, dtype=np.complex128)
    return s[np.abs(s) < 2.0 * np.pi * 1e15]


def all_found(expected: Complex, found: Complex) -> bool:
    return all(float(np.min(np.abs(found - s))) <= ACCURACY * abs(s) for s in expected)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(networks())
def test_poles_of_the_upper_network_are_those_of_the_qz_algorithm(network: Network) -> None:
    upper = classify(network, find_midband(network)).upper
    found = pole_frequencies(upper)
    expected = by_qz(upper.conductance.dense(upper.size), upper.capacitance.dense(upper.size))
    assert len(found) == len(expected)
    assert all_found(found, expected)
    assert all_found(expected, found)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(networks())
def test_poles_and_zeros_rebuild_the_response_of_the_whole_network(network: Network) -> None:
    poles = pole_frequencies(network)
    zeros = zero_frequencies(network, poles)
    s = on_axis(np.geomspace(float(np.abs(poles).min()), float(np.abs(poles).max()), 25) / (2.0 * np.pi))
    factors = [s - zero for zero in zeros] + [1.0 / (s - pole) for pole in poles]
    built = np.exp(np.sum([np.log(factor) for factor in factors], axis=0))
    exact = response(network, s.imag / (2.0 * np.pi))
    ratio = exact / built
    assert np.allclose(ratio, ratio[0], rtol=1e-5)


def ladder(n: int) -> Network:
    """n equal RC sections; its poles are known in closed form."""
    parts: list[Part] = []
    node = "in"
    for k in range(n):
        out = "out" if k == n - 1 else f"n{k}"
        parts += [resistance(f"R{k}", node, out, 1e3), capacitance(f"C{k}", out, "0", 1e-9)]
        node = out
    return amplifiers.network(*parts)


@pytest.mark.parametrize("n", [1, 2, 5, 20])
def test_poles_of_a_uniform_ladder(n: int) -> None:
    k = np.arange(1, n + 1)
    expected = -4.0 * np.sin((2 * k - 1) * np.pi / (2 * (2 * n + 1))) ** 2 / 1e-6
    assert np.sort(pole_frequencies(ladder(n)).real)[::-1] == pytest.approx(np.sort(expected)[::-1], rel=1e-10)
    assert len(zero_frequencies(ladder(n), pole_frequencies(ladder(n)))) == 0


def test_poles_twenty_decades_apart_are_all_found() -> None:
    parts: list[Part] = []
    node = "in"
    expected = [10.0**decade for decade in range(-9, 12, 4)]
    for k, rad_s in enumerate(expected):
        out = "out" if k == len(expected) - 1 else f"n{k}"
        parts += [
            transconductance(f"A{k}", (out, "0"), (node, "0"), -1e-3, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"C{k}", out, "0", 1e-3 / rad_s),
        ]
        node = out
    assert -pole_frequencies(amplifiers.network(*parts)).real == pytest.approx(expected, rel=1e-9)


def test_zeros_of_coupling_capacitors_lie_exactly_at_the_origin() -> None:
    network = amplifiers.coupled_stage()
    zeros = zero_frequencies(network, pole_frequencies(network))
    assert np.sum(zeros == 0.0) == 2
    bypass = zeros[2]
    # 1/(R_E·C_E) of the bypass alone, but for what passes by way of r_o
    assert bypass.real == pytest.approx(-1.0 / (470.0 * 100e-6), rel=1e-3)


def test_many_coupling_capacitors_put_as_many_zeros_at_the_origin() -> None:
    parts: list[Part] = []
    node = "in"
    for k in range(8):
        out = "out" if k == 7 else f"n{k}"
        parts += [
            capacitance(f"C{k}", node, f"b{k}", 1e-6 * (k + 1)),
            resistance(f"RB{k}", f"b{k}", "0", 1e4),
            transconductance(f"A{k}", (out, "0"), (f"b{k}", "0"), -1e-3, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"CL{k}", out, "0", 1e-11),
        ]
        node = out
    network = amplifiers.network(*parts)
    zeros = zero_frequencies(network, pole_frequencies(network))
    assert zeros.tolist() == [0.0] * 8


def test_a_section_beside_the_path_has_its_pole_and_its_zero_in_one_place() -> None:
    network = amplifiers.network(
        resistance("R", "in", "out", 1e3),
        capacitance("C", "out", "0", 1e-9),
        resistance("RX", "in", "x", 1e3),
        capacitance("CX", "x", "0", 1e-8),
    )
    poles = pole_frequencies(network)
    assert poles == pytest.approx([-1e5, -1e6])
    assert zero_frequencies(network, poles) == pytest.approx([-1e5])


def test_the_zero_of_a_bridging_capacitor_lies_to_the_right() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "b", 600.0),
        transconductance("Q", ("out", "0"), ("b", "0"), 0.05, label="gm"),
        capacitance("Q", "b", "0", 20e-12, label="c_pi"),
        capacitance("Q", "b", "out", 1e-12, label="c_mu"),
        resistance("RL", "out", "0", 2e3),
    )
    assert zero_frequencies(network, pole_frequencies(network)) == pytest.approx([0.05 / 1e-12], rel=1e-9)


def test_a_node_without_a_path_for_direct_current_gives_a_pole_at_the_origin() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3), capacitance("C1", "s", "out", 1e-9), capacitance("C2", "out", "0", 2e-9)
    )
    poles = pole_frequencies(network)
    assert poles[0] == 0.0
    assert poles[1] == pytest.approx(-1.0 / (1e3 * 2e-9 / 3.0), rel=1e-9)


def test_inductors_and_capacitors_ring_at_their_frequency() -> None:
    network = amplifiers.network(
        resistance("R", "in", "x", 10.0), inductance("L", "x", "out", 1e-6), capacitance("C", "out", "0", 1e-9)
    )
    low, high = pole_frequencies(network)
    assert (low.imag < 0.0, high.imag > 0.0) == (True, True)
    assert abs(high) == pytest.approx(1.0 / np.sqrt(1e-15), rel=1e-12)
    assert high.real == pytest.approx(-10.0 / 2e-6, rel=1e-9)


def test_a_network_of_resistors_has_neither() -> None:
    network = amplifiers.network(resistance("R1", "in", "out", 1e3), resistance("R2", "out", "0", 1e3))
    assert len(pole_frequencies(network)) == 0
    assert len(zero_frequencies(network, pole_frequencies(network))) == 0


def test_pairs_are_ordered_below_the_axis_first_whatever_the_solver_s_order() -> None:
    pair = np.array([-1.0 + 5.0j, -1.0 - 5.0j])
    jittered = pair * np.array([1.0 + 1e-15, 1.0])
    for s in (pair, pair[::-1], jittered, jittered[::-1]):
        ordered = in_order(np.concatenate([[-9.0 + 0j], s, [-2.0 + 0j]]))
        assert np.sign(ordered.imag).tolist() == [0.0, -1.0, 1.0, 0.0]


def test_the_grid_is_closer_around_a_resonance_and_nowhere_wider_than_asked() -> None:
    roots = np.array([-1.0 + 2e6j * np.pi, -1.0 - 2e6j * np.pi])
    grid = frequency_grid(1.0, 1e9, 60, roots)
    assert np.all(np.diff(np.log10(grid)) <= 1.0 / 60.0 + 1e-12)
    assert np.min(np.abs(grid - 1e6)) < 1.0


def test_a_shift_at_which_rounding_leaves_nothing_of_g_is_taken_elsewhere() -> None:
    g, c = np.eye(2), np.array([[1.0, -1.0], [-1.0, 1.0]])
    with pytest.raises(np.linalg.LinAlgError):
        np.linalg.inv(g + 2.0**60 * c)
    assert len(natural_frequencies(g, c, 2.0**55, 2.0**65)) == 0
    assert natural_frequencies(g, c, 0.1, 10.0) == pytest.approx([-0.5], rel=1e-9)


def test_zeros_at_the_origin_are_no_more_than_unknowns_where_rounding_alone_arrives_there() -> None:
    """A servo of its own hangs at the output: far below its pole nothing but rounding is left of H."""
    parts = [
        voltage_source("VIN", "in", "0", 1.0),
        voltage_source("VS", "in", "n3"),
        resistance("R2", "n3", "0", 1.0 / 0.002374890151952392),
        current_gain("F3", "n2", "0", -15.7, "VS"),
        transconductance("G6", ("n4", "0"), ("n2", "0"), 0.33456583436622833),
        voltage_source("VS9", "n4", "n6"),
        resistance("R10", "n6", "0", 1.0 / 0.026111319932162574),
        inductance("L17", "n7", "n8", 8666.81171769875),
        capacitance("C18", "n8", "0", 306403.75626359106),
        voltage_source("VO19", "n7", "n9"),
        resistance("R20", "n9", "0", 1.0 / 0.009493847768096432),
        capacitance("XC1", "n9", "n2", 1.578873105317868e-13),
    ]
    network = Network.from_parts(parts, output=Port("n7"))
    poles = pole_frequencies(network)
    assert len(zero_frequencies(network, poles)) <= len(poles)
