"""Looking in: exact on trees of cells, checked everywhere, and honest about where a value comes from."""

from __future__ import annotations

from hypothesis import given, settings

import boards
import boards as networks
from cells import bands_of, bipolar, board, circuit_of, near, trees
from tauledger.devices.parts import Part, resistance, transconductance
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import LookingIn
from tauledger.hand.folded import folded_in_r_pi
from tauledger.hand.looking_in import looking_in, loop_resistance
from tauledger.network.assemble import Network


def into(circuit: EquivalentCircuit, node: str) -> LookingIn:
    return looking_in(circuit, circuit.at[node], node)


def of(network: Network) -> EquivalentCircuit:

    return upper_circuit(bands_of(network), ())


@settings(max_examples=80, derandomize=True, deadline=None)
@given(trees())
def test_on_a_tree_of_cells_the_rules_give_the_exact_resistance(parts: tuple[Part, ...]) -> None:
    circuit = circuit_of(*parts, output="n1")
    for node in circuit.nodes:
        worked = looking_in(circuit, node, node)
        assert worked.source == "rule"
        assert worked.ohm == near(circuit.z(node, node), rel=1e-6)


def test_common_gate_with_r_o_and_its_load() -> None:
    """Sedra and Smith, 8th ed., Ex. 10.6: with r_o = R_L = 20 kohm the simple 1/gm ‖ R_sig (488 ohm) is 48 % low."""
    circuit = of(networks.common_gate())
    assert into(circuit, "e").ohm == near(930.23, rel=1e-4)
    assert into(circuit, "out").ohm == near(19535, rel=1e-4)
    assert into(circuit, "e").source == into(circuit, "out").source == "rule"


def test_cascode_with_finite_r_o() -> None:
    """A MOS cascode, practice values after Sedra and Smith, 8th ed.: 740.7 ohm between the transistors."""
    circuit = of(boards.cascode())
    assert into(circuit, "x").ohm == near(740.74, rel=1e-4)
    assert into(circuit, "out").ohm == near(49877, rel=1e-4)


def test_output_of_an_emitter_follower() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.2.3.1: (r_pi + R_S + r_b)/(beta + 1) = 27.7 ohm, printed 28."""
    circuit = of(networks.emitter_follower())
    worked = into(circuit, "out")
    into_emitter = {r.name: r.ohm for r in worked.resistances}["into common terminal of Q1"]
    assert into_emitter == near(27.72, rel=1e-3)


def test_the_line_reads_as_on_paper() -> None:
    bands, devices = board(
        resistance("RS", "s", "b", 2.2e3),
        resistance("RB1", "b", "0", 82e3),
        resistance("RB2", "b", "0", 22e3),
        bipolar("Q1", ("out", "b", "0"), gm=0.0296, beta=150.0, c_pi=20e-12),
        resistance("RC", "out", "0", 3.3e3),
    )
    worked = into(upper_circuit(bands, devices), "b")
    assert worked.text == "R(b) = RS ‖ RB1 ‖ RB2 ‖ r_π(Q1) = 2.2k ‖ 82k ‖ 22k ‖ 5.07k = 1.41k"
    assert [r.name for r in worked.resistances] == ["RS", "RB1", "RB2", "r_π(Q1)"]


def test_what_carries_less_than_a_thousandth_is_counted_but_not_printed() -> None:
    circuit = circuit_of(resistance("R1", "a", "0", 1e3), resistance("R2", "a", "0", 2e6), output="a")
    worked = into(circuit, "a")
    assert "R2" not in worked.text
    assert worked.ohm == near(circuit.z("a", "a"), rel=1e-12)


def shunt_feedback(r_f: float) -> EquivalentCircuit:
    return circuit_of(
        resistance("RS", "b", "0", 1e3),
        resistance("RF", "c", "b", r_f),
        resistance("RC", "c", "0", 2e3),
        bipolar("Q1", ("c", "b", "0")),
        output="c",
    )


def test_at_the_input_the_feedback_resistor_is_taken_by_miller() -> None:
    """R_F/(1 + gm·(R_C ‖ R_F ‖ r_o)) beside R_S and r_π: exact, for K is driven from the node itself."""
    worked = into(shunt_feedback(10e3), "b")
    load = 1 / (1 / 2e3 + 1 / 10e3 + 1 / 80e3)
    # the resistor carries signal forward too: (1 − K) with K = −(gm − 1/R_F)·load
    seen = 1 / (1 / 1e3 + 0.04 / 150 + (1 + (0.04 - 1e-4) * load) / 10e3)
    assert worked.source == "rule"
    assert worked.rule == "looking in, RF by Miller"
    assert worked.ohm == near(seen, rel=0.005)
    assert "RF/(1 − K)" in worked.text


def test_shunt_feedback_is_one_loop_that_lowers_the_resistance() -> None:
    node = "c"
    circuit = shunt_feedback(10e3)
    worked = into(circuit, node)
    assert worked.source == "loop"
    assert worked.loop_gain is not None
    assert worked.loop_gain > 1.0
    assert worked.ohm * (1.0 + worked.loop_gain) == near(loop_resistance(circuit, node, 0), rel=0.005)
    assert "gm(Q1) = 0" in worked.text


def test_the_resistance_without_one_gm_is_that_of_the_network_built_without_it() -> None:
    dead = circuit_of(
        resistance("RS", "b", "0", 1e3),
        resistance("RF", "c", "b", 10e3),
        resistance("RC", "c", "0", 2e3),
        resistance("rpi", "b", "0", 150 / 0.04),
        resistance("ro", "c", "0", 80e3),
        output="c",
    )
    assert loop_resistance(shunt_feedback(10e3), "c", 0) == near(dead.z("c", "c"), rel=1e-9)


def test_feedback_too_weak_to_matter_is_left_to_the_rule() -> None:
    assert into(shunt_feedback(100e6), "c").source == "rule"


def test_series_feedback_raises_the_resistance_and_has_a_negative_loop_gain() -> None:
    """A follower whose collector drives a second transistor into its emitter: the emitter hardly lets the base down."""
    circuit = circuit_of(
        resistance("RS", "b", "0", 1e6),
        bipolar("Q1", ("c", "b", "e"), r_o=1e9),
        resistance("RC", "c", "0", 5e3),
        resistance("RE", "e", "0", 200.0),
        bipolar("Q2", ("e", "c", "0")),
        output="e",
    )
    worked = into(circuit, "b")
    assert worked.source == "loop"
    assert worked.loop_gain is not None
    assert worked.loop_gain < -0.9
    assert worked.rule_ohm is not None
    assert worked.ohm == circuit.z("b", "b") > 10 * worked.rule_ohm
    assert "raises" in worked.text


def test_a_resistor_across_base_and_emitter_counts_in_r_pi() -> None:
    """r_π 3.75k ‖ 47k, then r_π + (β + 1)·R_E: with r_b = 100 ohm in between within 1 % at base and emitter."""
    circuit = circuit_of(
        resistance("RS", "b", "0", 200e3),
        resistance("RB", "b", "e", 47e3),
        bipolar("Q1", ("0", "b", "e"), r_b=100.0),
        resistance("RE", "e", "0", 2e3),
        output="e",
    )
    for node in ("b", "Q1'b", "e"):
        worked = into(circuit, node)
        assert worked.source == "rule"
        assert worked.ohm == near(circuit.z(node, node), rel=0.01)
        assert "r_π of Q1 with RB across it: 3.75k ‖ 47k = 3.47k" in worked.text


def test_without_r_b_a_resistor_across_base_and_emitter_in_r_pi_is_exact() -> None:
    circuit = circuit_of(
        resistance("RS", "b", "0", 200e3),
        resistance("RB", "b", "e", 5e3),
        bipolar("Q1", ("0", "b", "e")),
        resistance("RE", "e", "0", 2e3),
        output="e",
    )
    assert into(circuit, "b").ohm == near(circuit.z("b", "b"), rel=1e-6)


def test_a_resistor_from_the_base_past_the_emitter_is_not_across_both() -> None:
    circuit = circuit_of(
        resistance("RB", "b", "x", 5e3),
        bipolar("Q1", ("0", "b", "e"), r_b=100.0),
        resistance("R1", "e", "x", 1e3),
        resistance("R2", "x", "0", 1e3),
        output="e",
    )
    assert folded_in_r_pi(circuit) == (circuit, ())


def test_the_branch_form_joins_a_passive_chain_to_ground_and_divides_no_series_resistance() -> None:
    """Bootstrapped from a tap of the emitter resistor: RB ends at the tap, across no transistor."""
    circuit = circuit_of(
        resistance("RS", "b", "0", 200e3),
        resistance("RB", "b", "x", 20e3),
        bipolar("Q1", ("0", "b", "e"), r_b=100.0),
        resistance("R1", "e", "x", 1e3),
        resistance("R2", "x", "0", 1e3),
        resistance("RP", "b", "p", 50e3),
        resistance("RQ", "p", "0", 30e3),
        output="e",
    )
    worked = into(circuit, "b")
    assert worked.source == "branch"
    assert worked.ohm == near(circuit.z("b", "b"), rel=0.01)
    named = {resistance.name: resistance.ohm for resistance in worked.resistances}
    assert named["(RP + RQ)"] == near(80e3)
    assert any(name.startswith("RB/") for name in named)
    assert not any(name.startswith("r_b") for name in named)
    assert into(circuit, "Q1'b").source != "branch"


def test_a_bridge_of_resistors_fits_no_rule_and_says_so() -> None:
    """The way back counts as open; no gm is there to take out, and the branch form has solved ratios."""
    circuit = circuit_of(
        resistance("R1", "a", "l", 1e3),
        resistance("R2", "a", "r", 2e3),
        resistance("R3", "l", "0", 2e3),
        resistance("R4", "r", "0", 1e3),
        resistance("R5", "l", "r", 500.0),
        output="a",
    )
    worked = into(circuit, "a")
    assert worked.source == "branch"
    assert worked.ohm == near(circuit.z("a", "a"), rel=1e-9)
    assert worked.rule_ohm is not None


def test_where_no_form_fits_the_exact_value_stands_and_is_marked() -> None:
    circuit = circuit_of(
        resistance("RS", "b", "0", 10e3),
        resistance("RB", "b", "e", 5e3),
        bipolar("Q1", ("0", "b", "e"), r_b=100.0),
        resistance("RX", "b", "x", 3e3),
        resistance("RY", "x", "e", 3e3),
        resistance("RE", "e", "0", 2e3),
        output="e",
    )
    worked = into(circuit, "e")
    assert worked.source == "solved"
    assert worked.ohm == circuit.z("e", "e")
    assert worked.rule_ohm is not None
    assert "solved" in worked.text


def test_a_grid_of_resistors_ends_the_walk_at_its_budget() -> None:
    size = 5
    parts = [
        resistance(f"R{kind}{i}{j}", f"n{i}{j}", f"n{i + (kind == 'v')}{j + (kind == 'h')}", 1e3 + 10 * i + j)
        for i in range(size)
        for j in range(size)
        for kind in "hv"
        if (i if kind == "v" else j) < size - 1
    ]
    circuit = circuit_of(*parts, resistance("R0", "n44", "0", 1e3), output="n00")
    worked = into(circuit, "n22")
    assert worked.source == "branch"
    assert worked.rule_ohm is None
    assert worked.ohm == circuit.z("n22", "n22")


def test_a_driven_node_ends_a_branch_like_ground() -> None:
    circuit = of(networks.common_source_100k())
    assert [r.name for r in into(circuit, "g").resistances] == ["Rsig", "RG"]
    assert circuit.at["s"] == "0"


def test_a_source_that_inverts_keeps_its_sign() -> None:
    """A source whose control shares a node with its output may have gm < 0: 1/gm from there is negative."""
    circuit = circuit_of(
        resistance("R1", "a", "0", 1e3), transconductance("G1", ("0", "a"), ("a", "0"), 0.4e-3), output="a"
    )
    worked = into(circuit, "a")
    assert worked.source == "rule"
    assert worked.ohm == near(1e3 / (1.0 - 0.4), rel=1e-9)


def test_a_resistor_from_control_to_ground_is_the_source_network_and_no_r_pi() -> None:
    circuit = of(networks.common_source_100k())
    assert circuit.cells[0].r_pi == float("inf")


def test_a_plain_resistor_beside_a_lone_source_is_its_r_o() -> None:
    circuit = circuit_of(
        transconductance("G1", ("d", "x"), ("g", "x"), 2e-3),
        resistance("RO", "d", "x", 50e3),
        resistance("RX", "x", "0", 1e3),
        resistance("RD", "d", "0", 10e3),
        resistance("RG", "g", "0", 10e3),
        output="d",
    )
    assert circuit.cells[0].r_o == near(50e3)
    assert into(circuit, "x").source == "rule"


def test_a_mirror_behind_base_resistances_is_looked_into_by_rule() -> None:
    bands, devices = board(
        resistance("RS", "s", "m", 5e3),
        bipolar("Q1", ("m", "m", "0"), r_b=120.0, r_c=3.0, c_pi=20e-12),
        bipolar("Q2", ("out", "m", "0"), r_b=120.0, c_pi=20e-12),
        resistance("RL", "out", "0", 2e3),
    )
    circuit = upper_circuit(bands, devices)
    worked = into(circuit, "m")
    assert worked.source == "rule"
    assert worked.ohm == near(circuit.z("m", "m"), rel=1e-6)
    assert "diode-connected Q1" in worked.text
