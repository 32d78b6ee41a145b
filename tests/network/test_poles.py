"""Owners of poles, pairs and cancellation."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, inductance, resistance, transconductance
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.poles import cancelled_pairs, find_poles, pole_owners
from tauledger.network.recompute import scaled
from tauledger.network.spectrum import pole_frequencies


def test_each_buffered_section_owns_its_pole() -> None:
    parts: list[Part] = []
    for k, (node, out) in enumerate((("in", "m"), ("m", "out"))):
        parts += [
            transconductance(f"A{k}", (out, "0"), (node, "0"), -1e-3, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"C{k}", out, "0", 10.0 ** -(9 + k)),
        ]
    low, high = find_poles(amplifiers.network(*parts)).poles
    assert low.owners == {"C0": pytest.approx(1.0), "C1": pytest.approx(0.0)}
    assert high.owners == {"C0": pytest.approx(0.0), "C1": pytest.approx(1.0)}


def test_a_pair_is_one_pole_with_f0_and_q_and_both_parts_own_half_of_it() -> None:
    network = amplifiers.network(
        resistance("R", "in", "x", 10.0), inductance("L", "x", "out", 1e-6), capacitance("C", "out", "0", 1e-9)
    )
    (pole,) = find_poles(network).poles
    assert pole.s.imag > 0.0
    assert pole.f0_hz == pytest.approx(1.0 / (2.0 * np.pi * np.sqrt(1e-15)))
    assert pole.q == pytest.approx(np.sqrt(1e-6 / 1e-9) / 10.0)
    # d ln|p|: f0 goes with the root of LC, and Q changes nothing of |p|
    assert pole.owners == {"L": pytest.approx(0.5), "C": pytest.approx(0.5)}


def test_a_multiple_pole_has_no_owner() -> None:
    parts: list[Part] = []
    for k, (node, out) in enumerate((("in", "m"), ("m", "out"))):
        parts += [
            transconductance(f"A{k}", (out, "0"), (node, "0"), -1e-3, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"C{k}", out, "0", 1e-9),
        ]
    for pole in find_poles(amplifiers.network(*parts)).poles:
        assert pole.s.real == pytest.approx(-1e6, rel=1e-6)
        assert pole.owners == {}


@settings(max_examples=15, deadline=None, derandomize=True)
@given(networks())
def test_owners_of_the_lowest_poles_are_what_a_small_change_does(network: Network) -> None:
    upper = classify(network, find_midband(network)).upper
    pole = find_poles(upper).poles[0]
    assert sum(pole.owners.values()) == pytest.approx(1.0, abs=1e-9)
    for name in sorted(pole.owners, key=lambda name: -abs(pole.owners[name]))[:2]:
        up, down = (nearest(pole_frequencies(scaled(upper, {name: factor})), pole.s) for factor in (1.001, 0.999))
        expected = -float(np.log(abs(up) / abs(down)) / np.log(1.001 / 0.999))
        assert pole.owners[name] == pytest.approx(expected, abs=1e-3)


def nearest(roots: np.ndarray[tuple[int], np.dtype[np.complex128]], s: complex) -> complex:
    return complex(roots[np.argmin(np.abs(roots - s))])


def test_a_supply_s_pole_and_zero_cancel_and_the_edges_do_not() -> None:
    parts = [part for part in amplifiers.coupled_stage().parts if part.name != "RC"]
    network = Network.from_parts(
        [
            *parts,
            resistance("RC", "c", "v", 2.2e3),
            resistance("RV", "v", "0", 22.0),
            capacitance("CV", "v", "0", 100e-6),
        ],
        output=amplifiers.coupled_stage().port,
    )
    found = find_poles(network)
    cancelled = [pole for pole in found.poles if pole.cancelled]
    supply = max(found.poles, key=lambda pole: pole.owners["CV"])
    assert supply.owners["CV"] == pytest.approx(1.0, abs=0.02)
    assert supply.cancelled
    assert sum(zero.cancelled for zero in found.zeros) == len(cancelled)
    sets_the_lower_edge = max((pole for pole in found.poles if abs(pole.s) < 1e4), key=lambda pole: abs(pole.s))
    assert not sets_the_lower_edge.cancelled


@pytest.mark.parametrize(
    ("pole", "zero", "gone"),
    [
        (-100.0, -101.0, True),
        (-100.0, -103.0, False),
        (0.0, 0.0, True),
        (0.0, -1e-9, False),
        # within 2 % of |p|, but on a resonance of Q = 50 the response still shows it
        (-1.0 + 100.0j, -1.0 + 101.0j, False),
        (-1.0 + 100.0j, -1.0 + 100.01j, True),
    ],
)
def test_a_pair_cancels_only_where_the_response_shows_nothing_of_it(pole: complex, zero: complex, gone: bool) -> None:
    poles, zeros = cancelled_pairs(np.array([pole], dtype=complex), np.array([zero], dtype=complex))
    assert (bool(poles[0]), bool(zeros[0])) == (gone, gone)


def test_one_zero_cancels_one_pole_only() -> None:
    poles, zeros = cancelled_pairs(np.array([-100.0 + 0j, -100.1 + 0j]), np.array([-100.05 + 0j]))
    assert (int(poles.sum()), int(zeros.sum())) == (1, 1)


def test_an_amplifier_that_oscillates_is_told_as_unstable() -> None:
    regenerative = amplifiers.network(
        resistance("R", "in", "out", 1e3),
        transconductance("A", ("out", "0"), ("out", "0"), -2e-3, label="gm"),
        capacitance("C", "out", "0", 1e-9),
    )
    assert not find_poles(regenerative).stable
    assert find_poles(amplifiers.coupled_stage()).stable


def test_a_pivot_that_rounding_makes_zero_beside_a_pole_takes_no_owner_away() -> None:
    """At 2 GHz a coupling capacitor of 59 µF is 10⁶ S, and leaves exactly nothing of what holds its far end."""
    parts: list[Part] = [
        resistance("R1", "in", "n1", 1.0 / 0.0001095290251916758),
        resistance("R2", "n1", "n2", 1.0 / 1.0799136069114471e-05),
        transconductance("M6", ("n3", "n4"), ("n2", "n4"), 0.012),
        capacitance("C8", "n3", "0", 3.52e-12),
        capacitance("C11", "n7", "0", 1e-4),
        transconductance("M12", ("0", "n6"), ("n5", "n6"), 0.0222),
        capacitance("C12", "n5", "n6", 8.99e-12),
        resistance("R13", "n6", "0", 1.0 / 0.002688172043010753),
        capacitance("C14", "n6", "0", 1.88e-13),
        capacitance("C15", "n6", "n8", 5.89e-05),
        resistance("R16", "n8", "0", 1.0 / 7.3529411764705884e-06),
        capacitance("C19", "n9", "n10", 4.47e-05),
        resistance("R20", "n10", "0", 1.0 / 0.0014492753623188406),
    ]
    network = Network.from_parts(parts, output=Port("n10"))
    poles = pole_frequencies(network)
    low, high = pole_owners(network, poles)[-2:]
    assert low["C15"] == pytest.approx(1.0, abs=1e-6)
    assert high["C12"] + high["C14"] == pytest.approx(1.0, abs=1e-6)
