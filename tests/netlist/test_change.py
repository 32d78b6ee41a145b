"""A Change alters the circuit as if the netlist had said so; what it names must exist."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauledger.circuit import ADDED, Change, Circuit, Load
from tauledger.errors import InputError
from tauledger.netlist import Netlist, elaborate, place, read

BOARD = """River-level gauge, two-channel preamplifier
.param rload=10k gain=2m
.temp 40
VCC vcc 0 12
VIN echo 0 DC 0 AC 1
RS echo in 600
X1 in mid vcc stage rc=3.9k
X2 mid out vcc stage m=2
G1 0 out mid 0 {gain}
RL out 0 {rload}
CL out 0 100p
I1 0 out 1u
.subckt stage a y sup rc=2.2k
C1 a b 220n
R1 sup b 47k
R2 b 0 12k
R3 sup y {rc}
Q1 y b e nsmall
R4 e 0 1.5k
.model nsmall npn (is=6e-15 bf={rc/10})
.ends
"""


@pytest.fixture
def netlist(tmp_path: Path) -> Netlist:
    path = tmp_path / "board.cir"
    path.write_text(BOARD)
    return read(path)


def value(circuit: Circuit, name: str) -> float:
    return float(circuit.passives.value[circuit.passives.name.index(name)])


def parameter(circuit: Circuit, element: str, name: str) -> float:
    return next(e for e in circuit.elements if e.name == element).parameter(name, float("nan"))


def test_elaboration_is_pure(netlist: Netlist) -> None:
    before = elaborate(netlist)
    elaborate(netlist, Change(temperature_c=85.0, parameters=(("rload", 1.0),), elements=(("X1.R3", 1.0),)))
    again = elaborate(netlist)
    assert (again.nodes, again.elements, again.models, again.drive) == (
        before.nodes,
        before.elements,
        before.models,
        before.drive,
    )
    assert np.array_equal(again.passives.value, before.passives.value)


def test_a_temperature_wins_over_the_netlist(netlist: Netlist) -> None:
    assert elaborate(netlist).temperature_c == 40.0
    assert elaborate(netlist, Change(temperature_c=-40.0)).temperature_c == -40.0


def test_a_parameter_reaches_everything_that_is_made_from_it(netlist: Netlist) -> None:
    circuit = elaborate(netlist, Change(parameters=(("RLOAD", 22e3), ("gain", 5e-3))))
    assert value(circuit, "RL") == 22e3
    assert parameter(circuit, "G1", "gain") == 5e-3


def test_an_element_is_set_by_its_flat_name_before_m_counts(netlist: Netlist) -> None:
    circuit = elaborate(
        netlist,
        Change(elements=(("x2.r3", 1e3), ("CL", 1e-9), ("VCC", 15.0), ("I1", 2e-6), ("G1", 7e-3))),
    )
    assert value(circuit, "X2.R3") == 500.0
    assert value(circuit, "X1.R3") == 3.9e3
    assert value(circuit, "CL") == 1e-9
    assert parameter(circuit, "VCC", "dc") == 15.0
    assert parameter(circuit, "I1", "dc") == 2e-6
    assert parameter(circuit, "G1", "gain") == 7e-3


def test_a_model_parameter_is_set_or_added_in_one_instance(netlist: Netlist) -> None:
    circuit = elaborate(netlist, Change(models=(("X1:nsmall", "BF", 50.0), ("x1:NSMALL", "tf", 1e-9))))
    assert [model.name for model in circuit.models] == ["X1:nsmall", "X2:nsmall"]
    assert circuit.model("X1:nsmall").parameter("bf", 0.0) == 50.0
    assert circuit.model("X1:nsmall").parameter("tf", 0.0) == 1e-9
    assert circuit.model("X2:nsmall").parameter("bf", 0.0) == 220.0
    assert circuit.model("X2:nsmall").parameter("tf", 0.0) == 0.0


def test_loads_are_added_between_nodes_and_stand_on_no_card(netlist: Netlist) -> None:
    circuit = elaborate(netlist, Change(loads=(Load("C", "X1.b", "0", 12e-12), Load("R", "OUT", "gnd", 1e6))))
    assert circuit.passives.name[-2:] == ("C added at X1.b", "R added at out")
    assert circuit.passives.kind[-2:] == "CR"
    assert [circuit.nodes[node] for node in circuit.passives.a[-2:]] == ["X1.b", "out"]
    assert circuit.passives.b[-2:].tolist() == [0, 0]
    assert circuit.passives.card[-1] == ADDED
    with pytest.raises(IndexError):
        place(netlist, ADDED)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (Change(parameters=(("rlod", 1.0),)), "no parameter is called 'rlod'\n  did you mean 'rload'?"),
        (Change(elements=(("X1.R33", 1.0),)), "no element is called 'X1.R33'\n  did you mean 'X1.R3'?"),
        (Change(elements=(("X1.Q1", 1.0),)), "X1.Q1 has no single value that could be set\n  set a parameter"),
        (Change(models=(("nsmall", "bf", 1.0),)), "no model in use is called 'nsmall'\n  did you mean 'X1:nsmall'?"),
        (Change(models=(("X1:nsmall", "bff", 1.0),)), "model X1:nsmall has no parameter 'bff'"),
        (Change(loads=(Load("R", "nowhere", "0", 1e6),)), "no node is called 'nowhere'"),
        (Change(loads=(Load("R", "out", "0", 0.0),)), "a load of 0 is not possible"),
        (Change(loads=(Load("C", "out", "0", float("nan")),)), "load: nan is not a finite number"),
        (Change(temperature_c=-300.0), "-300 °C is no temperature"),
        (Change(temperature_c=float("nan")), "nan °C is no temperature"),
        (Change(parameters=(("rload", float("inf")),)), "rload: inf is not a finite number"),
        (Change(elements=(("RL", 0.0),)), "the value of a resistor must be other than 0, not 0 ohm"),
        (Change(elements=(("CL", -1e-12),)), "the value of a capacitor must be 0 or more, not -1e-12 F"),
        (Change(elements=(("VCC", float("nan")),)), "VCC: nan is not a finite number"),
        (Change(models=(("X1:nsmall", "bf", float("inf")),)), "bf: inf is not a finite number"),
    ],
)
def test_what_a_change_names_must_exist_and_be_possible(netlist: Netlist, change: Change, message: str) -> None:
    with pytest.raises(InputError) as raised:
        elaborate(netlist, change)
    assert message in str(raised.value)
