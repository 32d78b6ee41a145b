"""The budget: rows per signal node, exact constants that add to the trace, hand resistances across every part."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings

import boards
import strategies
from cells import bands_of, bipolar, board, near
from tauledger.devices.family import Device
from tauledger.devices.parts import capacitance, inductance, resistance, transcapacitance, voltage_source
from tauledger.hand.budget import part_resistances, signal_nodes
from tauledger.network.assemble import Network, incidence
from tauledger.network.bands import Bands

Board = tuple[Bands, tuple[Device, ...]]

SERIES = {"r_b": 120.0, "r_c": 3.0, "r_e": 0.4, "c_pi": 20e-12, "c_mu": 1e-12, "c_bx": 2e-12}


def decoupled_stage() -> Board:
    return board(
        resistance("R6", "supply", "vcc", 100.0),
        voltage_source("VCC", "supply", "0"),
        capacitance("C6", "vcc", "esr", 47e-6),
        resistance("R7", "esr", "0", 0.6),
        capacitance("C7", "vcc", "0", 100e-9),
        resistance("RS", "s", "in", 600.0),
        capacitance("C1", "in", "b", 220e-9),
        resistance("R1", "vcc", "b", 47e3),
        resistance("R2", "b", "0", 12e3),
        resistance("R3", "vcc", "c", 3.9e3),
        resistance("R4", "e", "0", 1.5e3),
        capacitance("C2", "e", "0", 4.7e-6),
        bipolar("Q1", ("c", "b", "e"), **SERIES),
        capacitance("C3", "c", "out", 100e-9),
        resistance("RL", "out", "0", 10e3),
        capacitance("CL", "out", "0", 100e-12),
    )


def cascode() -> Board:
    return board(
        resistance("RS", "s", "in", 600.0),
        capacitance("C1", "in", "b1", 1e-6),
        resistance("R1", "b1", "0", 16e3),
        bipolar("Q1", ("c1", "b1", "0"), **SERIES),
        bipolar("Q2", ("out", "b2", "c1"), **SERIES),
        resistance("R2", "b2", "0", 10e3),
        capacitance("C4", "b2", "0", 10e-6),
        resistance("RC", "out", "0", 3.3e3),
    )


def trace(bands: Bands) -> float:
    upper = bands.upper
    nodes = slice(0, upper.n_nodes)
    z = np.linalg.inv(upper.conductance.dense(upper.size))
    return float(np.trace((upper.capacitance.dense(upper.size) @ z)[nodes, nodes]))


@pytest.mark.parametrize("make", [decoupled_stage, cascode], ids=lambda make: make.__name__)
def test_exact_constants_of_all_rows_add_to_the_trace(make: object) -> None:
    assert callable(make)
    bands, devices = make()
    rows = signal_nodes(bands, devices)
    assert sum(row.time_constant_exact_s for row in rows) == near(trace(bands), rel=1e-12)


def test_a_transcapacitance_is_in_the_exact_constant_and_not_in_the_hand_one() -> None:
    parts = (
        resistance("RS", "s", "b", 1e3),
        bipolar("Q1", ("out", "b", "0"), c_pi=20e-12, c_mu=1e-12),
        resistance("RC", "out", "0", 2e3),
    )
    extra = transcapacitance("Q1", ("b", "0"), ("b", "out"), 0.3e-12, "cexbc")
    without, with_it = board(*parts), board(*parts, extra)
    plain, extended = signal_nodes(*without), signal_nodes(*with_it)
    assert [row.time_constant_s for row in plain] == [row.time_constant_s for row in extended]
    assert sum(row.time_constant_exact_s for row in extended) == near(trace(with_it[0]), rel=1e-12)
    assert sum(row.time_constant_exact_s for row in extended) > 1.05 * sum(row.time_constant_exact_s for row in plain)


def test_hand_and_exact_constants_differ_by_the_textbook_output_side_alone() -> None:
    rows = signal_nodes(bands_of(boards.two_common_source_stages()), ())
    for row in rows:
        extra = sum(
            line.resistance.ohm * term.farad * (term.factor - 1.0)
            for line in row.lines
            for term in line.capacitances
            if term.text.startswith("1 + 1/|A|")
        )
        assert row.time_constant_s - extra == near(row.time_constant_exact_s, rel=1e-9)


def test_six_time_constants_of_two_common_source_stages() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed., sec. 7.3.3: 320, 315, 50, 100, 20 and 10 ns, together 815 ns."""
    bands = bands_of(boards.two_common_source_stages())
    across = part_resistances(bands, ())
    tau = {name: across[name].ohm * bands.network.part(name).value for name in across}
    printed = {"M1.c_mu": 320, "M2.c_mu": 315, "M1.c_pi": 50, "M2.c_pi": 100, "Cdb1": 20, "Cdb2": 10}
    assert tau == near({name: 1e-9 * ns for name, ns in printed.items()}, rel=1e-9)
    assert all(seen.source == "rule" for seen in across.values())


def test_resistance_across_the_feedback_capacitance_of_a_common_emitter() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.16: R' + R_L + gm·R'·R_L = 58 125 ohm."""
    across = part_resistances(bands_of(boards.common_emitter_600_ohm()), ())
    assert across["Q1.c_mu"].ohm == near(58125.0, rel=1e-9)


def test_constants_of_a_cascode_with_finite_r_o() -> None:
    """Practice values after Sedra and Smith, 8th ed.: tau_out printed 3.992 ns (3.990 computed), sum 4.98 ns."""
    bands = bands_of(boards.cascode())
    rows = {row.name: row for row in signal_nodes(bands, ())}
    assert rows["out"].time_constant_s == near(3.990e-9, rel=1e-3)
    assert sum(row.time_constant_exact_s for row in rows.values()) == near(4.9735e-9, rel=1e-4)


def test_inner_nodes_fold_into_the_row_of_their_terminal() -> None:
    rows = {row.name: row for row in signal_nodes(*decoupled_stage())}
    base = rows["b"]
    assert set(base.members) == {"in", "b", "Q1'b"}
    assert {line.node for line in base.lines} == {"b", "base of Q1, inside"}
    assert base.time_constant_s == near(sum(line.time_constant_s for line in base.lines))
    inside = next(line for line in base.lines if "inside" in line.node)
    outside = next(line for line in base.lines if "inside" not in line.node)
    assert inside.resistance.ohm > outside.resistance.ohm + 50.0


def test_the_dominant_line_stands_first_and_r_times_c_is_the_constant() -> None:
    for row in signal_nodes(*decoupled_stage()):
        taus = [abs(line.time_constant_s) for line in row.lines]
        assert taus == sorted(taus, reverse=True)
        assert row.resistance_hand_ohm == row.lines[0].resistance.ohm
        assert row.resistance_hand_ohm * row.capacitance_f == near(row.time_constant_s)


def test_a_base_behind_r_b_has_its_own_row_where_the_terminal_is_at_ac_ground() -> None:
    rows = {row.name: row for row in signal_nodes(*cascode())}
    assert "b2" not in rows
    inside = rows["b2 (inside Q2)"]
    assert inside.title == "base of Q2, inside (b2)"
    assert inside.resistance_exact_ohm == near(120.0, rel=0.02)
    assert rows["emitter (inside Q1)"].title == "emitter of Q1, inside"


def test_names_are_unique_and_no_inner_name_shows() -> None:
    for make in (decoupled_stage, cascode):
        rows = signal_nodes(*make())
        assert len({row.name for row in rows}) == len(rows)
        for row in rows:
            for text in (row.name, row.title, *(line.resistance.text for line in row.lines)):
                assert "Q1'" not in text
                assert "Q2'" not in text


def test_supply_decoupling_is_listed_off_the_path() -> None:
    rows = {row.name: row for row in signal_nodes(*decoupled_stage())}
    assert not rows["vcc"].in_path
    assert rows["vcc"].time_constant_s == near(0.596 * 100e-9, rel=0.01)
    assert rows["b"].in_path
    assert rows["out"].in_path


def test_the_driven_node_and_the_supply_are_no_rows() -> None:
    names = {row.name for row in signal_nodes(*decoupled_stage())}
    assert names.isdisjoint({"s", "supply", "0"})


def test_a_second_output_that_nobody_listens_to_is_off_the_path() -> None:
    """Both collectors of a pair have the same time constant; only the one that is the output counts."""
    rows = {
        row.name: row
        for row in signal_nodes(
            *board(
                resistance("RS", "s", "b1", 1e3),
                bipolar("Q1", ("left", "b1", "t"), c_pi=20e-12),
                bipolar("Q2", ("right", "b2", "t"), c_pi=20e-12),
                resistance("RB", "b2", "0", 1e3),
                resistance("RT", "t", "0", 5e3),
                resistance("RL", "left", "0", 3e3),
                resistance("RR", "right", "0", 3e3),
                capacitance("CL", "left", "0", 50e-12),
                capacitance("CR", "right", "0", 50e-12),
                output="right",
            )
        )
    }
    assert rows["left"].time_constant_s == near(rows["right"].time_constant_s, rel=0.02)
    assert not rows["left"].in_path
    assert rows["right"].in_path


def test_a_node_with_little_signal_stays_where_its_moment_is_large() -> None:
    """The base resistance of an emitter-coupled pair's second transistor: 1 % of the signal, a third of b1 − a1."""
    rows = {
        row.name: row
        for row in signal_nodes(
            *board(
                resistance("RS", "s", "b1", 1e3),
                bipolar("Q1", ("0", "b1", "t"), r_b=100.0, c_pi=20e-12, c_mu=1e-12),
                bipolar("Q2", ("out", "b2", "t"), r_b=100.0, c_pi=20e-12, c_mu=1e-12),
                resistance("RB", "b2", "0", 10e3),
                capacitance("CB", "b2", "0", 10e-6),
                resistance("RT", "t", "0", 5e3),
                resistance("RC", "out", "0", 3e3),
            )
        )
    }
    second = rows["b2 (inside Q2)"]
    assert abs(second.crossing) < 0.05
    assert second.moment > 0.25
    assert second.in_path


def test_an_inductor_that_is_short_at_midband_joins_its_ends() -> None:
    rows = signal_nodes(
        *board(
            resistance("RS", "s", "a", 50.0),
            inductance("L1", "a", "out", 200e-9),
            resistance("RL", "out", "0", 1e3),
            capacitance("CL", "out", "0", 150e-12),
        )
    )
    assert [row.members for row in rows] == [("a", "out")]
    assert rows[0].time_constant_s == near(150e-12 * 50e3 / 1.05e3)


def test_a_capacitance_with_both_ends_in_one_node_faces_nothing() -> None:
    bands, devices = board(
        resistance("RS", "s", "a", 50.0),
        inductance("L1", "a", "out", 200e-9),
        capacitance("CX", "a", "out", 1e-12),
        resistance("RL", "out", "0", 1e3),
    )
    assert part_resistances(bands, devices)["CX"].ohm == 0.0
    assert signal_nodes(bands, devices)[0].time_constant_s == 0.0


@settings(max_examples=30, derandomize=True, deadline=None, suppress_health_check=[HealthCheck.filter_too_much])
@given(strategies.networks())
def test_on_random_amplifiers_hand_is_within_a_per_cent_or_marked_and_the_trace_holds(network: Network) -> None:
    bands = bands_of(network)
    assume(bands.sound)
    rows = signal_nodes(bands, ())
    assert sum(row.time_constant_exact_s for row in rows) == near(trace(bands), rel=1e-9)
    for row in rows:
        for line in row.lines:
            worked = line.resistance
            assert worked.ohm == near(line.resistance_exact_ohm, rel=0.01)
            assert (worked.source == "rule") == (worked.rule_ohm is None)
            assert (worked.source == "loop") == (worked.loop_gain is not None)
    for name, worked in part_resistances(bands, ()).items():
        a, b = (bands.merged[node] for node in network.part(name).nodes)
        d = incidence(bands.upper, a, b)
        exact = d @ np.linalg.inv(bands.upper.conductance.dense(bands.upper.size)) @ d
        assert worked.ohm == pytest.approx(exact, rel=0.01, abs=1e-9)
