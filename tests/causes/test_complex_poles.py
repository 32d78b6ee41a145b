"""The poles nearest mid-band are complex."""

from __future__ import annotations

import pytest

import boards
from by_algebra import evidence
from tauledger.causes.complex_poles import complex_poles_above, complex_poles_below
from tauledger.devices.parts import capacitance, inductance, resistance
from tauledger.network.assemble import Network


def test_source_follower_into_a_capacitance_has_a_pair() -> None:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.16: omega_0 4.27 Grad/s, Q 0.554 (C_gs dropped from b1)."""
    found = evidence(boards.source_follower_with_load())
    cause = complex_poles_above(found)
    assert cause is not None
    numbers = {number.name: number.value for number in cause.numbers}
    assert numbers["f0"] == pytest.approx(4.27e9 / 6.283185, rel=5e-3)
    assert numbers["Q"] == pytest.approx(0.5494, rel=1e-3)
    steps = {step.step: step.hz or 0.0 for step in found.upper.steps}
    assert cause.effect == pytest.approx(steps["two-coefficients"] / steps["exact-constants"] - 1)
    assert cause.instead.endswith("501 MHz")


def test_a_slower_input_node_makes_the_same_poles_real() -> None:
    """Twenty times the capacitance at the gate of the same follower: Q falls below 0.5."""
    network = boards.source_follower_with_load()
    slow = Network.from_parts([*network.parts, capacitance("Cx", "g", "0", 200e-15)], output=network.port)
    found = evidence(slow)
    assert found.upper.combined is not None
    assert (found.upper.combined.coefficients.q or 1.0) < 0.5
    assert complex_poles_above(found) is None


def coupled_through(henry: float) -> Network:
    """Coupling capacitor of 1 µF into a choke beside 1 kohm: 1/(2π·√(LC)) with Q = R·√(C/L)."""
    return boards.driven(
        resistance("RS", "s", "a", 1.0),
        capacitance("CC", "a", "out", 1e-6),
        inductance("L1", "out", "0", henry),
        resistance("RL", "out", "0", 1e3),
    )


def test_a_choke_and_its_coupling_capacitor_peak_at_the_lower_edge() -> None:
    cause = complex_poles_below(evidence(coupled_through(4.0)))
    assert cause is not None
    assert cause.quantity == "f_L"
    numbers = {number.name: number.value for number in cause.numbers}
    assert numbers["f0"] == pytest.approx(1 / (2 * 3.141592653589793 * (4.0 * 1e-6) ** 0.5), rel=2e-3)
    assert numbers["Q"] == pytest.approx(0.5, rel=2e-2)


def test_a_large_choke_leaves_two_real_poles() -> None:
    assert complex_poles_below(evidence(coupled_through(40.0))) is None
