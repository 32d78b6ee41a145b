"""Loops around an amplifier are found, local feedback is none, and T0 and A∞ by hand are those of the network."""

from __future__ import annotations

import math

import pytest

from cells import bands_of, bipolar
from role_boards import ROLE_BOARDS
from tauledger.circuit import NO_CHANGE, Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, current_source, resistance, voltage_gain, voltage_source
from tauledger.engine.client import Engine
from tauledger.explain import explain
from tauledger.hand.budget import signal_nodes
from tauledger.hand.catalogue import entries
from tauledger.hand.feedback import FoundLoop, HandLoop, find_loop, hand_loop
from tauledger.hand.ideal_gain import IdealGain, ideal_gain
from tauledger.hand.stages import stage_rows
from tauledger.netlist.reader import read
from tauledger.network.assemble import Network
from tauledger.network.return_ratio import at_source, return_ratio
from tauledger.network.solve import on_axis
from tauledger.numbers import solve

LOAD = capacitance("CL", "out", "0", 1e-11)
VOLTAGE = [voltage_source("VS", "s", "0", 1.0), resistance("RS", "s", "b", 1e3)]
CURRENT: list[Part | Device] = [current_source("IS", "0", "b", 1.0)]


class Worked:
    """An amplifier of parts and transistors, with the loop that is found, and T0 and A∞ by hand."""

    def __init__(self, *items: Part | Device) -> None:
        self.devices = tuple(item for item in items if isinstance(item, Device))
        parts = [part for item in items for part in (item.parts if isinstance(item, Device) else (item,))]
        self.network = Network.from_parts(parts, output=Port("out"))
        self.bands = bands_of(self.network)
        self.stages = stage_rows(self.bands, self.devices)
        nodes = signal_nodes(self.bands, self.devices)
        self.loop: FoundLoop | None = find_loop(self.network, self.devices, nodes, self.stages, 0.0)

    def t0(self) -> tuple[HandLoop | None, float]:
        assert self.loop is not None
        worked = hand_loop(self.bands, self.devices, self.loop.device)
        parts = [self.network.part(f"{self.loop.device}.gm")]
        return worked, complex(return_ratio(at_source(self.network, parts), on_axis(0.0))[0]).real

    def ideal(self) -> IdealGain | None:
        assert self.loop is not None
        return ideal_gain(self.bands, self.devices, self.stages, self.loop)


def series_shunt(*, r_f: float = 10e3) -> Worked:
    return Worked(
        voltage_source("VS", "s", "0", 1.0),
        resistance("RS", "s", "b", 100.0),
        bipolar("Q1", ("c", "b", "e"), r_b=80.0),
        resistance("RC", "c", "0", 5e3),
        resistance("RE", "e", "0", 470.0),
        bipolar("Q2", ("out", "c", "0")),
        resistance("RL", "out", "0", 2e3),
        resistance("RF", "out", "e", r_f),
        LOAD,
    )


def transimpedance() -> Worked:
    return Worked(
        *CURRENT,
        bipolar("Q1", ("c", "b", "0"), r_b=80.0),
        resistance("RC", "c", "0", 5e3),
        bipolar("Q2", ("0", "c", "out")),
        resistance("RL", "out", "0", 1e3),
        resistance("RF", "out", "b", 20e3),
        LOAD,
    )


def test_a_series_shunt_pair_is_cut_at_the_emitter_where_the_feedback_arrives() -> None:
    loop = series_shunt().loop
    assert loop is not None
    assert (loop.owner, loop.node, loop.word, loop.device) == ("Q1", "e", "emitter", "Q2")
    assert loop.path == ("c", "out")


def test_a_transimpedance_pair_is_cut_at_the_base() -> None:
    loop = transimpedance().loop
    assert loop is not None
    assert (loop.owner, loop.node, loop.word, loop.device) == ("Q1", "b", "base", "Q1")


@pytest.mark.parametrize("make", [series_shunt, transimpedance], ids=lambda make: make.__name__)
def test_t0_by_hand_is_the_return_ratio(make: type[Worked]) -> None:
    hand, exact = make().t0()
    assert hand is not None
    assert hand.exact_t0 == pytest.approx(exact, rel=1e-9)
    assert hand.t0 == pytest.approx(exact, rel=0.02)
    product = -hand.siemens * math.prod(stage.hand for stage in hand.stages)
    assert hand.t0 == pytest.approx(product, rel=1e-12)


def test_the_ideal_gain_of_series_feedback_is_that_of_its_divider() -> None:
    found = series_shunt().ideal()
    assert found is not None
    assert found.text.endswith("(1 + RF/RE)") or found.text == "1 + RF/RE"
    assert found.value == pytest.approx(1.0 + 10e3 / 470.0, rel=0.02)


def test_the_ideal_gain_of_shunt_feedback_is_its_resistor() -> None:
    found = transimpedance().ideal()
    assert found is not None
    assert found.text == "-RF"
    assert found.value == pytest.approx(-20e3)


def test_behind_a_resistance_the_ideal_gain_is_their_ratio() -> None:
    worked = Worked(
        voltage_source("VS", "s", "0", 1.0),
        resistance("RS", "s", "a", 1e3),
        resistance("R1", "a", "b", 1e3),
        bipolar("Q1", ("c", "b", "0")),
        resistance("RC", "c", "0", 5e3),
        bipolar("Q2", ("0", "c", "out")),
        resistance("RL", "out", "0", 1e3),
        resistance("RF", "out", "b", 20e3),
        LOAD,
    )
    found = worked.ideal()
    assert found is not None
    assert found.text == "-RF/(RS + R1)"
    assert found.value == pytest.approx(-10.0)


NONE: dict[str, list[Part | Device]] = {
    "emitter resistor": [
        *VOLTAGE,
        bipolar("Q1", ("out", "b", "e"), r_b=100.0, r_e=0.5),
        resistance("RE", "e", "0", 1e3),
        resistance("RC", "out", "0", 5e3),
        LOAD,
    ],
    "emitter resistors of two stages": [
        *VOLTAGE,
        bipolar("Q1", ("c", "b", "e")),
        resistance("RE", "e", "0", 500.0),
        resistance("RC", "c", "0", 5e3),
        bipolar("Q2", ("out", "c", "f")),
        resistance("RF", "f", "0", 500.0),
        resistance("RL", "out", "0", 5e3),
        LOAD,
    ],
    "follower": [*VOLTAGE, bipolar("Q1", ("0", "b", "out")), resistance("RE", "out", "0", 1e3), LOAD],
    "cascode on a high load": [
        *VOLTAGE,
        bipolar("Q1", ("m", "b", "0")),
        bipolar("Q2", ("out", "0", "m")),
        resistance("RC", "out", "0", 5e6),
        LOAD,
    ],
    "feedback too weak to be a loop": [
        *VOLTAGE,
        bipolar("Q1", ("out", "b", "0")),
        resistance("RC", "out", "0", 500.0),
        resistance("RF", "out", "b", 10e6),
        LOAD,
    ],
    "bootstrap": [
        *VOLTAGE,
        bipolar("Q1", ("0", "b", "out")),
        resistance("RE", "out", "0", 1e3),
        resistance("RB", "b", "x", 10e3),
        resistance("RX", "x", "0", 20e3),
        resistance("RY", "x", "out", 10.0),
        LOAD,
    ],
}


@pytest.mark.parametrize("name", NONE)
def test_local_feedback_is_no_loop_around_the_amplifier(name: str) -> None:
    assert Worked(*NONE[name]).loop is None


def test_without_its_feedback_resistor_there_is_no_loop() -> None:
    assert series_shunt(r_f=1e12).loop is None


def test_of_two_loops_none_is_said_to_be_the_one() -> None:
    """Shunt feedback around each of two stages."""
    stage: list[Part | Device] = [
        bipolar("Q1", ("c", "b", "0")),
        resistance("RC", "c", "0", 5e3),
        resistance("RF1", "c", "b", 20e3),
        resistance("R2", "c", "d", 5e3),
        bipolar("Q2", ("out", "d", "0")),
        resistance("RL", "out", "0", 5e3),
        resistance("RF2", "out", "d", 20e3),
    ]
    assert Worked(*VOLTAGE, *stage, LOAD).loop is None
    assert Worked(*VOLTAGE, *stage[:3], LOAD, resistance("RO", "c", "out", 1.0)).loop is not None


def test_a_controlled_voltage_source_alone_is_an_amplifier() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "n", 1e3),
        resistance("R2", "n", "out", 10e3),
        voltage_gain("E1", ("x", "0"), ("0", "n"), 1e5),
        resistance("RO", "x", "out", 50.0),
    ]
    found = Worked(*parts, LOAD).loop
    assert found == FoundLoop("E1", "", "", "E1", ())
    without = [part for part in parts if part.name != "R2"]
    assert Worked(*without, LOAD).loop is None


@pytest.mark.parametrize("role", ROLE_BOARDS)
def test_of_the_boards_of_one_role_only_shunt_feedback_has_a_loop(
    role: str, engine: Engine, tmp_path_factory: pytest.TempPathFactory
) -> None:
    file = tmp_path_factory.mktemp("role") / "board.cir"
    file.write_text(ROLE_BOARDS[role].netlist)
    numbers = solve(read(file), NO_CHANGE, engine)
    hand = explain(numbers).hand
    assert hand is not None
    loop = find_loop(numbers.network, numbers.devices, hand.nodes, hand.stages, numbers.midband.frequency_hz)
    assert (loop is not None) == (role == "shunt feedback")


def test_the_methods_of_global_feedback_are_listed() -> None:
    listed = [entry.name for entry in entries() if entry.group == "global feedback"]
    assert {"return ratio", "asymptotic gain", "closed-loop band edge", "noise gain", "double injection"} <= {*listed}
