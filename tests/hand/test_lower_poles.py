"""Poles of the lower edge beyond the second: one capacitor each, those of the higher poles open."""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import amplifiers
import boards
from tauledger.devices.parts import Part, capacitance, inductance, resistance, transconductance
from tauledger.explain import explain
from tauledger.hand.poles import HandPole
from tauledger.network.assemble import Network
from tauledger.numbers import solve_network

TWO_PI = 2.0 * math.pi


def below(network: Network) -> list[HandPole]:
    """Poles below mid-band that the output sees, the highest first."""
    numbers = solve_network(network)
    edge = TWO_PI * numbers.midband.frequency_hz
    cancelled = {pole.s for pole in numbers.poles.poles if pole.cancelled}
    told = [p for p in explain(numbers).hand_poles if abs(p.pole) < edge and p.pole not in cancelled]
    return sorted(told, key=lambda p: -abs(p.pole))


def separate(edges_hz: list[float]) -> Network:
    """Coupling sections behind ideal amplifiers, each with an edge of its own: none loads another."""
    parts: list[Part] = []
    node = "in"
    for k, hz in enumerate(edges_hz, start=1):
        end = "out" if k == len(edges_hz) else f"n{k}"
        parts += [
            capacitance(f"C{k}", node, f"g{k}", 1.0 / (TWO_PI * hz * 10e3)),
            resistance(f"R{k}", f"g{k}", "0", 10e3),
            transconductance(f"G{k}", ("0", end), (f"g{k}", "0"), 1e-3),
            resistance(f"L{k}", end, "0", 2e3),
        ]
        node = end
    parts.append(capacitance("CL", "out", "0", 1e-10))
    return amplifiers.network(*parts)


@settings(max_examples=5, deadline=None, derandomize=True)
@given(st.lists(st.floats(12.0, 30.0), min_size=2, max_size=3))
def test_sections_that_do_not_load_each_other_have_exact_formulas(ratios: list[float]) -> None:
    edges = [3e3]
    for ratio in ratios:
        edges.append(edges[-1] / ratio)
    found = below(separate(edges))
    assert len(found) == len(edges)
    for pole in found[:2]:
        assert pole.formula
        assert pole.hz == pytest.approx(abs(pole.pole) / TWO_PI, rel=0.2)
    for k, pole in enumerate(found[2:], start=3):
        assert f"1/(2π·R·C{k}), R with C1 and C2" in pole.formula
        assert pole.hz == pytest.approx(abs(pole.pole) / TWO_PI, rel=1e-6)


@pytest.mark.parametrize("make", [boards.three_low_edges, boards.follower_then_common_source_low_edge])
def test_a_formula_that_is_given_lies_within_twenty_per_cent(make: Callable[[], Network]) -> None:
    """Scilab textbook companion, book 2882, Ex. 9.6 and 9.8; Kumar and Jain, Ex. 10.20(a)."""
    found = below(make())
    assert len(found) == 3
    for pole in found:
        assert pole.hz is None or pole.hz == pytest.approx(abs(pole.pole) / TWO_PI, rel=0.2)
    assert sum(bool(pole.formula) for pole in found) >= 2


def test_the_capacitor_of_a_lower_pole_faces_what_the_opened_ones_leave() -> None:
    """C1 into R1 ‖ (R2 behind C2): above C2's pole R1 alone stands there, so that pole of C1 is seen with C2 open."""
    network = amplifiers.network(
        resistance("RS", "in", "s", 100.0),
        capacitance("CA", "s", "a", 100e-6),
        resistance("RA", "a", "0", 10e3),
        capacitance("CB", "a", "b", 0.1e-6),
        resistance("RB", "b", "0", 1e3),
        transconductance("G1", ("0", "x"), ("b", "0"), 1e-3),
        resistance("RX", "x", "0", 1e3),
        capacitance("CC", "x", "out", 1e-6),
        resistance("RO", "out", "0", 30e3),
        capacitance("CL", "out", "0", 1e-10),
    )
    found = below(network)
    last = found[-1]
    assert last.formula == "1/(2π·R·CA), R with CB and CC open"
    # 1/(2π·(100 Ω + 10 kΩ)·100 µF)
    assert last.hz == pytest.approx(1.0 / (TWO_PI * 10.1e3 * 100e-6), rel=1e-6)
    assert last.hz == pytest.approx(abs(last.pole) / TWO_PI, rel=0.02)


def test_a_choke_below_the_first_pole_counts_r_over_l() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "b", 100.0),
        transconductance("G1", ("c", "0"), ("b", "0"), 0.04),
        resistance("RO", "c", "0", 1e3),
        inductance("LC", "c", "0", 10.0),
        capacitance("C2", "c", "y", 0.1e-6),
        resistance("RY", "y", "0", 1e3),
        transconductance("G2", ("0", "z"), ("y", "0"), 1e-3),
        resistance("RZ", "z", "0", 1e3),
        capacitance("C3", "z", "out", 1e-6),
        resistance("RL", "out", "0", 1e3),
        capacitance("CL", "out", "0", 1e-10),
    )
    found = below(network)
    assert found[-1].formula.startswith("R/(2π·LC)")
    assert found[-1].hz == pytest.approx(abs(found[-1].pole) / TWO_PI, rel=0.05)
