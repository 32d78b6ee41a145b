"""Transformers, chokes and peaking coils by hand: looking through, lower edge R/L, upper time constant L/R."""

from __future__ import annotations

import math

import pytest

from cells import bipolar
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, inductance, mutual_inductance, resistance, voltage_source
from tauledger.explain import Explanation, explain
from tauledger.hand.estimate import LowerRow
from tauledger.network.assemble import Network
from tauledger.numbers import Numbers, solve_network

TWO_PI = 2.0 * math.pi


def solved(*items: Part | Device, output: str = "out") -> tuple[Numbers, Explanation]:
    devices = tuple(item for item in items if isinstance(item, Device))
    parts = [part for item in items for part in (item.parts if isinstance(item, Device) else (item,))]
    network = Network.from_parts([voltage_source("VS", "in", "0", 1.0), *parts], output=Port(output))
    numbers = solve_network(network, devices=devices)
    return numbers, explain(numbers)


def windings(ends: tuple[str, str, str, str], l1: float, l2: float, k: float = 0.999) -> tuple[Part, ...]:
    a, b, c, d = ends
    return (
        inductance("L1", a, b, l1),
        inductance("L2", c, d, l2),
        mutual_inductance("K1", "L1", "L2", ends, k * math.sqrt(l1 * l2)),
    )


def transformer_input() -> tuple[Numbers, Explanation]:
    """150 Ω through 1 : 2 into a common emitter."""
    return solved(
        resistance("RS", "in", "p", 150.0),
        *windings(("p", "0", "b", "0"), 20e-3, 80e-3),
        resistance("RB", "b", "0", 10e3),
        bipolar("Q1", ("out", "b", "0"), c_pi=20e-12, c_mu=1e-12),
        resistance("RC", "out", "0", 2e3),
        capacitance("CL", "out", "0", 20e-12),
    )


def transformer_output() -> tuple[Numbers, Explanation]:
    """A collector fed through the primary, 600 Ω at the secondary."""
    return solved(
        resistance("RS", "in", "b", 600.0),
        bipolar("Q1", ("c", "b", "0"), c_pi=20e-12, c_mu=1e-12),
        *windings(("vcc", "c", "out", "0"), 200e-3, 50e-3),
        voltage_source("VCC", "vcc", "0"),
        resistance("RL", "out", "0", 600.0),
        capacitance("CL", "out", "0", 100e-12),
    )


def peaked() -> tuple[Numbers, Explanation]:
    """A drain resistor of 1 kΩ with 10 µH in series into 30 pF: m = L/(R²·C) = 1/3."""
    return solved(
        resistance("RS", "in", "b", 50.0),
        bipolar("Q1", ("out", "b", "0"), c_pi=1e-12),
        resistance("RC", "out", "x", 1e3),
        inductance("LP", "x", "0", 10e-6),
        capacitance("CL", "out", "0", 30e-12),
    )


def choke_fed() -> tuple[Numbers, Explanation]:
    """A collector on 100 mH, coupled out to 600 Ω."""
    return solved(
        resistance("RS", "in", "b", 600.0),
        bipolar("Q1", ("c", "b", "0"), c_pi=20e-12, c_mu=1e-12),
        inductance("LC", "c", "0", 100e-3),
        capacitance("C2", "c", "out", 100e-6),
        resistance("RL", "out", "0", 600.0),
    )


BOARDS = {
    "transformer at the input": transformer_input,
    "transformer at the output": transformer_output,
    "peaking coil": peaked,
    "choke": choke_fed,
}


def lower(explained: Explanation) -> dict[str, LowerRow]:
    assert explained.hand is not None
    return {row.parts[0]: row for row in explained.hand.lower}


@pytest.mark.parametrize("name", BOARDS)
def test_every_figure_by_hand_is_within_two_per_cent_of_exact_and_by_rule(name: str) -> None:
    _, explained = BOARDS[name]()
    hand = explained.hand
    assert hand is not None
    for node in hand.nodes:
        for line in node.lines:
            assert line.resistance.source == "rule", line.resistance.text
            assert line.resistance.ohm == pytest.approx(line.resistance_exact_ohm, rel=0.02)
    for coil in hand.inductors:
        assert coil.resistance.source == "rule", coil.resistance.text
        assert coil.time_constant_s == pytest.approx(coil.time_constant_exact_s, rel=0.02, abs=0.0)
    for row in hand.lower:
        assert row.edge_hand_hz == pytest.approx(row.edge_exact_hz, rel=0.02)


@pytest.mark.parametrize("name", BOARDS)
def test_nodes_and_inductors_add_to_minus_the_sum_of_inverse_poles(name: str) -> None:
    _, explained = BOARDS[name]()
    assert explained.hand is not None
    assert explained.open is not None
    total = sum(node.time_constant_exact_s for node in explained.hand.nodes)
    total += sum(coil.time_constant_exact_s for coil in explained.hand.inductors)
    assert total == pytest.approx(explained.open.inverse_pole_sum_s, rel=1e-6, abs=0.0)


def test_looking_through_a_transformer_is_by_the_square_of_the_turns() -> None:
    _, explained = transformer_input()
    assert explained.hand is not None
    base = next(node for node in explained.hand.nodes if node.name == "b")
    n2 = 4.0 / 0.999**2
    r_pi = base.lines[0].resistance.resistances[-1].ohm
    assert base.resistance_hand_ohm == pytest.approx(1.0 / (1.0 / (n2 * 150.0) + 1e-4 + 1.0 / r_pi), rel=1e-6)
    assert "4.01·RS" in base.lines[0].resistance.text


def test_the_magnetising_inductance_makes_the_lower_edge() -> None:
    numbers, explained = transformer_input()
    row = lower(explained)["L1.l_m"]
    assert row.in_path
    assert row.henry == pytest.approx(0.999**2 * 20e-3)
    assert row.edge_hand_hz == pytest.approx(row.resistance.ohm / (TWO_PI * row.henry))
    assert numbers.edges.f_low is not None
    assert row.edge_hand_hz == pytest.approx(numbers.edges.f_low.hz, rel=0.02)


def test_leakage_counts_source_and_load_in_series() -> None:
    _, explained = transformer_input()
    assert explained.hand is not None
    (coil,) = explained.hand.inductors
    base = next(node for node in explained.hand.nodes if node.name == "b")
    # the secondary sees the base network without the source: R_b from 1/R = 1/R_with − 1/(n²·RS)
    n2 = 4.0 / 0.999**2
    beyond = 1.0 / (1.0 / base.resistance_exact_ohm - 1.0 / (n2 * 150.0))
    assert coil.part == "K1.l_leak"
    assert coil.resistance.ohm == pytest.approx(150.0 + beyond / n2, rel=1e-6)


def test_a_coil_that_peaks_counts_l_over_r_and_the_choke_r_over_l() -> None:
    _, explained = peaked()
    assert explained.hand is not None
    (coil,) = explained.hand.inductors
    assert coil.in_path
    assert coil.time_constant_s == pytest.approx(coil.henry / coil.resistance.ohm, rel=1e-9, abs=0)
    numbers, fed = choke_fed()
    row = lower(fed)["LC"]
    assert numbers.edges.f_low is not None
    assert row.title.startswith("LC, choke at ")
    assert row.edge_hand_hz == pytest.approx(numbers.edges.f_low.hz, rel=0.05)


def test_a_choke_that_opens_inside_the_plateau_makes_no_upper_edge() -> None:
    """1 Ω into 10 nF, and beside it 3.3 kΩ with 10 mH: R/L is at 52 kHz, where the gain changes by 3e-4."""
    numbers, explained = solved(
        resistance("RS", "in", "out", 1.0),
        capacitance("CL", "out", "0", 10e-9),
        resistance("RC", "out", "x", 3.3e3),
        inductance("LCH", "x", "0", 10e-3),
    )
    assert explained.hand is not None
    (row,) = explained.hand.inductors
    assert row.time_constant_exact_s == pytest.approx(10e-3 / 3301.0, rel=1e-6, abs=0.0)
    assert not row.in_path
    assert numbers.edges.f_high is not None
    assert explained.hand.hand_f_high_hz == pytest.approx(numbers.edges.f_high.hz, rel=1e-2)
