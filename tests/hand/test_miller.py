"""Miller's split: signed gains from the node itself, the textbook's output side, and what is solved."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings

import boards
from cells import bands_of, bipolar, board, circuit_of, near, trees
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, transconductance
from tauledger.hand.budget import part_resistances, signal_nodes
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.estimate import MillerTerm, SignalNode
from tauledger.hand.miller import hand_gain
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands


def row(network: Network | tuple[Bands, tuple[Device, ...]], name: str) -> SignalNode:
    bands, devices = network if isinstance(network, tuple) else (bands_of(network), ())
    return next(node for node in signal_nodes(bands, devices) if node.name == name)


def term(node: SignalNode, part: str) -> MillerTerm:
    return next(term for line in node.lines for term in line.capacitances if term.part == part)


@settings(max_examples=60, derandomize=True, deadline=None)
@given(trees())
def test_on_a_tree_the_gain_by_hand_is_exact_between_neighbours(parts: tuple[Part, ...]) -> None:
    circuit = circuit_of(*parts, output="n1")
    for resistor in circuit.resistors:
        if "0" not in (resistor.a, resistor.b):
            gain = hand_gain(circuit, resistor.a, resistor.b)
            assert gain.value == pytest.approx(circuit.gain(resistor.a, resistor.b), rel=1e-6, abs=1e-9)
    for cell in circuit.cells:
        if "0" not in (cell.control, cell.output) and cell.control != cell.output:
            gain = hand_gain(circuit, cell.control, cell.output)
            assert gain.source == "rule"
            assert gain.value == pytest.approx(circuit.gain(cell.control, cell.output), rel=1e-6, abs=1e-9)


def test_input_capacitance_of_a_common_source_is_c_times_one_plus_a() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.2.1.2: Miller capacitance 35.7 pF from 0.5 pF and a gain of 70.5.

    Without the 1 it would be 35.25 pF, 1.4 % less.
    """
    miller = term(row(boards.common_source_400_mhz(), "g"), "M1.c_mu")
    assert miller.farad * miller.factor == near(35.75e-12, rel=1e-3)
    assert miller.text == "K = −gm·RL = −14.1m·5k = −70.5"


def test_the_gain_is_that_of_the_bridged_nodes_and_has_the_load_and_r_o_in_it() -> None:
    """Sedra and Smith, common-source example, from memory: C_in 4.26 pF; with the overall gain it would be 4.2 pF."""
    node = row(boards.common_source_100k(), "g")
    assert node.capacitance_f == near(4.26e-12, rel=1e-3)
    assert term(node, "M1.c_mu").text == "K = −gm·(RD ‖ RL ‖ r_o) = −1m·7.14k = −7.14"


def test_the_output_side_of_an_inverting_stage_has_one_plus_one_over_a() -> None:
    miller = term(row(boards.common_source_100k(), "out"), "M1.c_mu")
    assert miller.factor == near(1.0 + 7.0 / 50.0, rel=1e-6)
    assert miller.text.startswith("1 + 1/|A|")


def test_below_a_gain_of_one_the_output_side_keeps_one_minus_k() -> None:
    """C·(1 − 1/K) would be 1 + 5 = 6 times the capacitance at a gain of −0.2."""
    network = boards.driven(
        resistance("RS", "s", "g", 1e3),
        boards.stage("M1", "g", "out", "0", 0.2e-3, c_pi=10e-12, c_mu=1e-12),
        resistance("RL", "out", "0", 1e3),
        capacitance("CL", "out", "0", 10e-12),
    )
    assert term(row(network, "out"), "M1.c_mu").factor == near(1.0)
    assert term(row(network, "g"), "M1.c_mu").factor == near(1.2)


def test_a_follower_bootstraps_its_base_capacitance() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.2.3.1, second example: 10 pF acts as 0.13 pF (0.128 computed)."""
    miller = term(row(boards.emitter_follower(), "b"), "Q1.c_pi")
    assert miller.farad * miller.factor == near(0.1283e-12, rel=0.01)
    assert miller.gain.real > 0.98


def test_zero_value_constant_of_the_follower_comes_out_of_both_sides() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.2.3.1: R_pi0 printed 28 ohm, 27.93 computed; 10 pF."""
    bands = bands_of(boards.emitter_follower())
    assert part_resistances(bands, ())["Q1.c_pi"].ohm == near(27.93, rel=1e-3)
    assert sum(node.time_constant_s for node in signal_nodes(bands, ())) == near(279.3e-12, rel=1e-3)


def test_a_positive_gain_above_one_makes_the_capacitance_negative_and_keeps_the_sign() -> None:
    """A non-inverting stage of gain 2, bridged by 0.4 pF: −0.4 pF at the input, R across it −9 kohm (algebra)."""
    network = boards.gain_of_two()
    bands = bands_of(network)
    bridge = next(part for part in network.parts if part.kind == "capacitance" and part.value == 0.4e-12)
    across = part_resistances(bands, ())[bridge.name]
    assert across.ohm == near(-9e3, rel=1e-9)
    assert across.source == "rule"
    negative = [t for node in signal_nodes(bands, ()) for line in node.lines for t in line.capacitances if t.factor < 0]
    assert [t.part for t in negative] == [bridge.name]
    assert negative[0].factor == near(-1.0)
    assert negative[0].gain.real == near(2.0)


def test_at_the_base_of_a_common_base_stage_the_gain_is_driven_from_the_base_itself() -> None:
    """The two signal voltages would give thousands: the base hardly moves while the collector does."""
    stage = board(
        resistance("RS", "s", "in", 500.0),
        capacitance("C1", "in", "e", 10e-6),
        resistance("RE", "e", "0", 1e3),
        bipolar("Q1", ("out", "b", "e"), r_b=100.0, c_pi=20e-12, c_mu=1e-12),
        resistance("RB", "b", "0", 10e3),
        capacitance("CB", "b", "0", 100e-6),
        resistance("RC", "out", "0", 3e3),
    )
    node = row(stage, "b (inside Q1)")
    circuit = upper_circuit(*stage)
    base, collector = node.members[0], circuit.at["out"]
    by_signal = 1.0 - (circuit.voltage[circuit.row[collector]] / circuit.voltage[circuit.row[base]]).real
    assert abs(by_signal) > 200.0
    assert 1.0 < term(node, "Q1.c_mu").factor < 10.0
    assert 1.0 - term(node, "Q1.c_mu").gain.real == term(node, "Q1.c_mu").factor


def test_a_pair_driven_on_one_side_keeps_all_of_its_miller_capacitance() -> None:
    """Seen from the second base itself the gain is the full one, though the signal there is only a tenth of it."""
    stage = board(
        resistance("RS", "s", "b1", 1e3),
        bipolar("Q1", ("0", "b1", "t"), c_pi=20e-12, c_mu=1e-12),
        bipolar("Q2", ("out", "b2", "t"), c_pi=20e-12, c_mu=1e-12),
        resistance("RB", "b2", "0", 1e3),
        resistance("RT", "t", "0", 5e3),
        resistance("RC", "out", "0", 3e3),
    )
    circuit = upper_circuit(*stage)
    factor = term(row(stage, "b2"), "Q2.c_mu").factor
    assert factor == near(1.0 - circuit.gain("b2", "out"), rel=0.01)
    assert factor > 40.0


def test_the_tolerance_is_on_one_minus_k() -> None:
    """A loop moves K of this follower by 0.3 %, and 1 − K by 30 %: by hand is not good enough for what is left of C."""
    circuit = circuit_of(
        resistance("RS", "b", "0", 100e3),
        resistance("RB", "b", "x", 20e3),
        resistance("RX", "x", "e", 100.0),
        bipolar("Q1", ("c", "b", "e")),
        resistance("RC", "c", "0", 2e3),
        transconductance("G1", ("0", "e"), ("0", "c"), 0.1e-3),
        resistance("RE", "e", "0", 2e3),
        output="e",
    )
    gain = hand_gain(circuit, "b", "e")
    by_hand = 0.9859
    assert abs(by_hand / circuit.gain("b", "e") - 1.0) < 0.004
    assert gain.source == "solved"
    assert gain.value == circuit.gain("b", "e")
    assert "solved; by hand K = Q1 from base to emitter = 0.986" in gain.text


def test_degeneration_divides_the_gain_and_is_written_so() -> None:
    """Razavi, Design of Analog CMOS Integrated Circuits, 2nd ed., ch. 6: R_gd = R_D + R_G·[1 + gm·R_D/(1 + gm·R_S)].

    R_G 5 kohm, R_S 500 ohm, R_D 10 kohm, gm 4 mA/V: 81 667 ohm; R_gs = (R_S + R_G)/(1 + gm·R_S) = 1833.3 ohm.
    """
    bands = bands_of(
        boards.driven(
            resistance("RG", "s", "g", 5e3),
            boards.stage("M1", "g", "out", "x", 4e-3, c_pi=100e-15, c_mu=20e-15),
            resistance("RS", "x", "0", 500.0),
            resistance("RD", "out", "0", 10e3),
            capacitance("CL", "out", "0", 30e-15),
        )
    )
    across = part_resistances(bands, ())
    assert across["M1.c_mu"].ohm == near(81666.67, rel=1e-6)
    assert across["M1.c_pi"].ohm == near(1833.333, rel=1e-6)
    gate = next(node for node in signal_nodes(bands, ()) if node.name == "g")
    assert term(gate, "M1.c_mu").text.startswith("K = −gm·R_C/(1 + gm·R_E) = −4m·10k/(1 + 4m·500)")


def test_the_other_end_at_ground_counts_once() -> None:
    miller = term(row(boards.common_source_400_mhz(), "g"), "M1.c_pi")
    assert (miller.factor, miller.gain, miller.text) == (1.0, 0j, "")


def test_to_a_driven_node_counts_once_and_the_far_end_has_no_row() -> None:
    network = boards.driven(
        boards.stage("M1", "s", "out", "0", 2e-3, c_pi=1e-12, c_mu=0.5e-12),
        resistance("RL", "out", "0", 10e3),
    )
    nodes = signal_nodes(bands_of(network), ())
    assert [node.name for node in nodes] == ["out"]
    assert term(nodes[0], "M1.c_mu").factor == 1.0


def test_no_gain_is_infinite_where_a_stage_has_no_load_of_its_own() -> None:
    circuit = circuit_of(
        resistance("RS", "g", "0", 1e3),
        transconductance("G1", ("d", "0"), ("g", "0"), 1e-3),
        resistance("RD", "d", "e", 1e3),
        resistance("RE", "e", "0", 1e3),
        output="d",
    )
    assert math.isclose(hand_gain(circuit, "g", "d").value, -2.0, rel_tol=1e-9)


def test_the_base_of_a_follower_inside_a_loop_keeps_one_minus_k() -> None:
    """Driven from its emitter the loop gives −10 at the base, but the base's own K is 0.97: C·0.03, never C·1.1."""
    bands, devices = board(
        resistance("RS", "s", "b", 100e3),
        bipolar("Q1", ("c", "b", "0"), c_mu=0.1e-12),
        resistance("RC", "c", "0", 1.5e3),
        bipolar("Q2", ("0", "c", "out"), c_pi=1e-12),
        resistance("RE", "out", "0", 1e3),
        resistance("RF", "out", "b", 10e3),
    )
    miller = term(row((bands, devices), "c"), "Q2.c_pi")
    assert miller.exact_factor < 0.1
    assert miller.factor == near(miller.exact_factor, rel=0.02)
