"""The lower edge: what each coupling and bypass capacitor faces, its edge and its zero."""

from __future__ import annotations

import math

import amplifiers
import boards
from cells import bands_of, bipolar, board, near
from tauledger.devices.parts import capacitance, inductance, resistance, transconductance
from tauledger.hand.estimate import LowerRow
from tauledger.hand.lower import lower_rows
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband


def rows(network: Network) -> dict[str, LowerRow]:
    return {row.parts[0]: row for row in lower_rows(bands_of(network), ())}


def test_three_capacitors_of_a_follower_and_a_common_source() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.20(a): 50.2 ms, 150 ms, 0.318 ms; sum 504.72 Hz.

    The zero of the bypass, 1/(2π·150 ohm·5.3 uF), lies at 200.2 Hz.
    """
    found = rows(boards.follower_then_common_source_low_edge())
    tau = {name: row.resistance.ohm * row.farad for name, row in found.items()}
    assert tau == near({"C1": 0.0502, "C2": 0.15, "C3": 0.000318}, rel=1e-9)
    assert sum(row.edge_hand_hz for row in found.values()) == near(504.72, rel=1e-5)
    assert found["C3"].zero_hz == near(200.19, rel=1e-4)
    assert found["C1"].zero_hz == found["C2"].zero_hz == 0.0


def test_two_edges_designed_to_be_equal() -> None:
    """Kumar and Jain, Ex. 10.15: 25 Hz each for C_B and C_E; zero of C_E printed 0.26 Hz."""
    found = rows(boards.two_equal_low_edges())
    assert found["CB"].edge_hand_hz == near(25.0, rel=1e-3)
    assert found["CE"].edge_hand_hz == near(25.0, rel=1e-3)
    assert found["CE"].zero_hz == near(0.26, rel=0.01)


def test_three_comparable_edges() -> None:
    """Scilab textbook companion, book 2882, Ex. 9.6 and 9.8: 1376 Hz and 230.7 Hz; the emitter faces 7.536 ohm.

    The printed 419.6 Hz of the bypass has r_e without the base's source resistance taken exactly; the network 422.4 Hz.
    """
    found = rows(boards.three_low_edges())
    assert found["C1"].edge_hand_hz == near(1376.187, rel=1e-6)
    assert found["C3"].edge_hand_hz == near(230.6593, rel=1e-6)
    assert found["C2"].resistance.ohm == near(7.5361, rel=1e-4)


def test_rules_equal_the_exact_resistance_in_all_worked_examples() -> None:
    for make in (
        boards.follower_then_common_source_low_edge,
        boards.two_equal_low_edges,
        boards.three_low_edges,
    ):
        for row in rows(make()).values():
            assert row.resistance.source == "rule"
            assert row.resistance.ohm == near(row.resistance_exact_ohm, rel=1e-9)
            assert row.edge_hand_hz == near(row.edge_exact_hz, rel=1e-9)


def test_titles_say_what_a_capacitor_is_for() -> None:
    found = rows(boards.three_low_edges())
    assert found["C1"].title == "C1, coupling into input of Q1 (b)"
    assert found["C2"].title == "C2, bypass at common terminal of Q1 (e)"
    assert found["C3"].title == "C3, coupling into output (out)"


def test_parallel_capacitors_are_one_row() -> None:
    network = boards.driven(
        resistance("RS", "s", "a", 1e3),
        capacitance("C1", "a", "out", 1e-6),
        capacitance("C2", "out", "a", 2e-6),
        resistance("RL", "out", "0", 9e3),
    )
    (row,) = lower_rows(bands_of(network), ())
    assert row.parts == ("C1", "C2")
    assert row.farad == near(3e-6)
    assert row.edge_hand_hz == near(1.0 / (2.0 * math.pi * 10e3 * 3e-6))


def test_supply_decoupling_is_a_row_off_the_path() -> None:
    bands, devices = board(
        resistance("RS", "s", "b", 600.0),
        bipolar("Q1", ("out", "b", "e")),
        resistance("RC", "out", "vcc", 3e3),
        resistance("RV", "vcc", "0", 100.0),
        capacitance("CV", "vcc", "0", 100e-6),
        resistance("RE", "e", "0", 1e3),
        capacitance("CE", "e", "0", 100e-6),
    )
    found = {row.parts[0]: row for row in lower_rows(bands, devices)}
    assert not found["CV"].in_path
    assert found["CV"].title == "CV, decoupling at node vcc"
    assert found["CE"].in_path


def test_the_zero_of_a_bypass_is_its_edge_times_the_gain_left_when_open() -> None:
    """With the emitter resistor R_E alone the zero is 1/(2π·R_E·C_E), whatever the rest."""
    bands, devices = board(
        resistance("RS", "s", "b", 600.0),
        bipolar("Q1", ("out", "b", "e"), r_o=1e12),
        resistance("RC", "out", "0", 3e3),
        resistance("RE", "e", "0", 1e3),
        capacitance("CE", "e", "0", 100e-6),
    )
    (row,) = lower_rows(bands, devices)
    assert row.zero_hz == near(1.0 / (2.0 * math.pi * 1e3 * 100e-6), rel=1e-6)


def test_a_capacitor_across_a_supply_makes_no_row() -> None:
    bands, devices = board(
        resistance("RS", "s", "out", 600.0),
        resistance("RL", "out", "0", 600.0),
        capacitance("CX", "s", "0", 1e-6),
        capacitance("CL", "out", "0", 1e-12),
    )
    assert lower_rows(bands, devices) == ()


def test_a_capacitor_without_which_the_gain_rises_is_decoupling() -> None:
    """A supply fed through a choke: open, the collector would have the choke's side as additional load resistance."""
    bands, devices = board(
        resistance("RS", "s", "in", 600.0),
        capacitance("C1", "in", "b", 1e-6),
        resistance("RB", "b", "0", 20e3),
        bipolar("Q1", ("out", "b", "0")),
        resistance("RC", "out", "vcc", 3e3),
        inductance("L1", "vcc", "0", 10.0),
        resistance("RV", "vcc", "0", 20e3),
        capacitance("CV", "vcc", "0", 100e-6),
    )
    found = {row.parts[0]: row for row in lower_rows(bands, devices)}
    assert bands.class_of["L1"] == "open"
    assert found["CV"].zero_hz > found["CV"].edge_exact_hz
    assert not found["CV"].in_path
    assert found["C1"].in_path


def test_a_large_coupling_capacitor_stays_in_the_path() -> None:
    """Its edge is a five-hundredth of the other's, and the signal goes through it all the same."""
    found = rows(boards.follower_then_common_source_low_edge())
    assert found["C2"].edge_hand_hz < 0.003 * found["C3"].edge_hand_hz
    assert found["C2"].in_path


def test_a_capacitor_without_which_a_node_hangs_on_nothing_makes_no_row() -> None:
    """A gate that a servo holds by 1 kH and 1 F: with the capacitor taken out nothing is left at it."""
    network = amplifiers.network(
        resistance("RS", "in", "p", 1e3),
        transconductance("M1", ("0", "out"), ("p", "g"), 1e-3),
        resistance("RD", "out", "0", 1e3),
        capacitance("CD", "out", "0", 1e-6),
        inductance("LS", "out", "g", 1e3),
        capacitance("CS", "g", "0", 1.0),
    )
    bands = classify(network, find_midband(network, at_hz=5.0))
    assert (bands.class_of["LS"], bands.class_of["CS"]) == ("open", "short")
    found = {row.parts[0]: row for row in lower_rows(bands, ())}
    assert "CS" not in found
    assert found["LS"].edge_hand_hz == near(1e3 / (2.0 * math.pi * 1e3), rel=1e-6)
