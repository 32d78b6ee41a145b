"""What the trade calls a node, and what a transistor does there."""

from __future__ import annotations

from pathlib import Path

import pytest

from cells import bipolar, board
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, transconductance, voltage_source
from tauledger.engine.client import Engine
from tauledger.hand.budget import signal_nodes
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.roles import role_of
from tauledger.network.bands import Bands
from tauledger.pipeline import review

RC, RL = resistance("RC", "c", "0", 3e3), resistance("RL", "out", "0", 10e3)
COUPLING = capacitance("C3", "c", "out", 10e-6)
RS = resistance("RS", "s", "b", 600.0)


def titles(*items: Part | Device, output: str | Port = "out") -> dict[str, str]:
    return {row.name: row.title for row in signal_nodes(*board(*items, output=output))}


def roles(stage: tuple[Bands, tuple[Device, ...]]) -> dict[str, str]:
    circuit = upper_circuit(*stage)
    return {cell.owner: role_of(circuit, cell) for cell in circuit.cells}


@pytest.mark.parametrize(
    ("nodes", "role"),
    [
        (("out", "s", "0"), "common emitter"),
        (("out", "s", "e"), "common emitter, degenerated"),
        (("0", "s", "out"), "emitter follower (common collector)"),
        (("out", "0", "s"), "common base"),
    ],
)
def test_a_terminal_that_the_source_drives_directly_has_the_signal(nodes: tuple[str, str, str], role: str) -> None:
    rest = [resistance("RE", "e", "0", 1e3)] if "e" in nodes else []
    assert roles(board(bipolar("Q1", nodes), RL, *rest, output="out")) == {"Q1": role}


def test_a_base_and_a_collector_that_is_the_output() -> None:
    assert titles(RS, bipolar("Q1", ("c", "b", "0")), RC, COUPLING, RL) == {
        "b": "base of Q1 (b)",
        "out": "collector of Q1, output (out)",
    }


def test_a_collector_that_drives_the_next_base() -> None:
    found = titles(
        RS,
        bipolar("Q1", ("c", "b", "0")),
        RC,
        bipolar("Q2", ("out", "c", "0")),
        RL,
    )
    assert found["c"] == "collector of Q1, base of Q2 (c)"


def test_two_emitters_at_one_node_are_named_together() -> None:
    found = titles(
        RS,
        bipolar("Q1", ("0", "b", "t")),
        bipolar("Q2", ("out", "0", "t")),
        resistance("RT", "t", "0", 5e3),
        RL,
    )
    assert found["t"] == "emitters of Q1, Q2 (t)"


def test_a_node_without_device_is_a_node() -> None:
    assert titles(resistance("R1", "s", "x", 1e3), resistance("R2", "x", "out", 1e3), RL) == {
        "x": "node x",
        "out": "output (out)",
    }


def test_joined_nodes_take_the_name_with_the_device_terminals() -> None:
    found = titles(
        resistance("RS", "s", "in", 600.0),
        capacitance("C1", "in", "b", 10e-6),
        resistance("RB", "b", "0", 10e3),
        bipolar("Q1", ("out", "b", "0")),
        RL,
    )
    assert found["b"] == "base of Q1 (b)"


def test_both_sides_of_a_differential_output_have_their_sign() -> None:
    found = titles(
        voltage_source("VN", "n", "0", -1.0),
        resistance("RSP", "s", "bp", 300.0),
        resistance("RSN", "n", "bn", 300.0),
        bipolar("QP", ("outp", "bp", "t")),
        bipolar("QN", ("outn", "bn", "t")),
        resistance("RT", "t", "0", 5e3),
        resistance("RP", "outp", "0", 3e3),
        resistance("RN", "outn", "0", 3e3),
        output=Port("outp", "outn"),
    )
    assert found["outp"] == "collector of QP, output + (outp)"
    assert found["outn"] == "collector of QN, output − (outn)"


def test_a_lone_source_has_an_input_and_an_output() -> None:
    found = titles(RS, transconductance("G1", ("out", "0"), ("b", "0"), 1e-3), RL)
    assert found == {"b": "input of G1 (b)", "out": "output of G1, output (out)"}


EMITTER = resistance("RE", "e", "0", 1e3)


@pytest.mark.parametrize(
    ("role", "items", "output"),
    [
        ("common emitter", (RS, bipolar("Q1", ("c", "b", "0")), RC), "c"),
        ("common emitter", (RS, bipolar("Q1", ("c", "b", "e")), RC, EMITTER, capacitance("CE", "e", "0", 1e-3)), "c"),
        ("common emitter, degenerated", (RS, bipolar("Q1", ("c", "b", "e")), RC, EMITTER), "c"),
        ("emitter follower (common collector)", (RS, bipolar("Q1", ("0", "b", "e")), EMITTER), "e"),
        ("emitter follower (common collector)", (RS, bipolar("Q1", ("c", "b", "e")), RC, EMITTER), "e"),
        ("common base", (resistance("RS", "s", "e", 600.0), bipolar("Q1", ("c", "0", "e")), RC), "c"),
        ("diode-connected", (RS, bipolar("Q1", ("b", "b", "0"))), "b"),
        ("diode-connected", (RS, bipolar("Q1", ("b", "b", "0"), r_b=100.0, r_c=3.0)), "b"),
        (
            "without signal",
            (
                RS,
                resistance("RB", "b", "0", 1e3),
                bipolar("Q1", ("b", "x", "0"), r_o=1e9),
                resistance("RX", "x", "0", 1e3),
            ),
            "b",
        ),
    ],
)
def test_what_a_transistor_does(role: str, items: tuple[Part | Device, ...], output: str) -> None:
    assert roles(board(*items, output=output))["Q1"] == role


def test_an_emitter_coupled_pair_is_a_follower_into_a_common_base() -> None:
    pair = board(
        RS,
        bipolar("Q1", ("0", "b", "t")),
        bipolar("Q2", ("out", "0", "t")),
        resistance("RT", "t", "0", 5e3),
        RL,
    )
    assert roles(pair) == {"Q1": "emitter follower (common collector)", "Q2": "common base"}


def test_a_pair_driven_from_both_sides_is_two_common_emitters() -> None:
    pair = board(
        voltage_source("VN", "n", "0", -1.0),
        resistance("RSP", "s", "bp", 300.0),
        resistance("RSN", "n", "bn", 300.0),
        bipolar("QP", ("outp", "bp", "t")),
        bipolar("QN", ("outn", "bn", "t")),
        resistance("RT", "t", "0", 5e3),
        resistance("RP", "outp", "0", 3e3),
        resistance("RN", "outn", "0", 3e3),
        output=Port("outp", "outn"),
    )
    assert roles(pair) == {"QP": "common emitter", "QN": "common emitter"}


def test_a_mirror_has_its_diode_and_its_output() -> None:
    mirror = board(
        resistance("RS", "s", "m", 5e3),
        bipolar("Q1", ("m", "m", "0"), r_b=120.0),
        bipolar("Q2", ("out", "m", "0"), r_b=120.0),
        RL,
    )
    assert roles(mirror) == {"Q1": "diode-connected", "Q2": "current mirror output"}


def test_a_card_with_two_controls_is_two_sources_of_one_owner(engine: Engine, tmp_path: Path) -> None:
    """`G1 0 g POLY(2) …`: each control makes a transconductance, and either may be a cell."""
    path = tmp_path / "two.cir"
    path.write_text(
        "two controls\nV1 a 0 ac 1\nRa a x 1k\nRb x y 2k\nRy y 0 3k\nG1 0 g POLY(2) x 0 y 0 0 1m 2m\n"
        "Rg g out 1k\nCL out 0 1n\nRL out 0 1k\n.end\n"
    )
    assert {row.name for row in review(path, engine=engine).nodes} >= {"x", "y", "g", "out"}


def test_a_substrate_that_floats_has_no_signal_and_no_row(engine: Engine, tmp_path: Path) -> None:
    path = tmp_path / "floating.cir"
    path.write_text(
        "floating substrate\nV1 vp 0 5\nVin in 0 ac 1\nRin in i 1k\nCi i b 1u\nRb vp b 300k\nQ1 c b 0 fl qg\n"
        "Rc vp c 1k\n.model qg npn is=1e-15 bf=100 cje=1p cjc=1p tf=1n cjs=2p\n.print ac v(c)\n.end\n"
    )
    assert "c" in {row.name for row in review(path, engine=engine).nodes}
