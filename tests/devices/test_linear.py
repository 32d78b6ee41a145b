"""Resistors, capacitors, inductors, sources and the controlled source: signs and values as the engine has them."""

from __future__ import annotations

import numpy as np
import pytest

from agreement import worst_of
from circuits import board, changed
from tauledger.circuit import Circuit, Model, Port
from tauledger.devices.catalogue import linearise, observations
from tauledger.devices.controlled import cell_of
from tauledger.devices.parts import conductance, transconductance
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.network.assemble import Network
from tauledger.network.solve import response

CIRCUITS = {
    "ladder": board(
        *("VIN in 0 0", "RS in a 50", "L1 a out 200n", "C1 out 0 150p", "RL out 0 10k"), drive={"VIN": 1.0}
    ),
    "current into a node": board(*("IIN 0 out 0", "R1 out 0 1k", "C1 out 0 1n"), drive={"IIN": 1.0}),
    "current, three of them": board(*("IIN 0 out 0 m=3", "R1 out 0 1k", "C1 out 0 1n"), drive={"IIN": 1.0}),
    "controlled source": board(
        *("VIN in 0 0", "R1 in a 1k", "C1 a 0 1n", "G1 out 0 a 0 20m", "RL out 0 1k", "C2 out a 5p"), drive={"VIN": 1.0}
    ),
    "controlled source, twofold": board(
        *("VIN in 0 0", "R1 in a 1k", "G1 0 out in a 20m m=2", "C1 a 0 1n", "RL out 0 1k"), drive={"VIN": 1.0}
    ),
    "two sources in quadrature": board(
        *("V1 a 0 0", "V2 0 b 0", "R1 a out 1k", "C2 b out 1n"), drive={"v1": 1.0, "V2": 0.5j}
    ),
    "current through a source": board(
        *("VIN in 0 0", "R1 in a 1k", "VM a b 0", "C1 b 0 1n"),
        drive={"VIN": 1.0},
        output=Port("a", "b", "current", "VM"),
    ),
    "current through an inductor": board(
        *("VIN in 0 0", "R1 in a 1k", "L1 a 0 1m"), drive={"VIN": 1.0}, output=Port("a", "0", "current", "l1")
    ),
}

SHEET = Model("rsheet", "r", 1, (("rsh", 100.0), ("tc1", 2e-3), ("tc2", 1e-5), ("narrow", 1e-7), ("tnom", 30.0)), 0, 0)
EXPONENT = Model("rexp", "res", 1, (("rsh", 100.0), ("tce", 0.4)), 0, 0)
PLATE = Model("cplate", "c", 1, (("cj", 1e-4), ("cjsw", 1e-10), ("tc1", 2e-2)), 0, 0)
COIL = Model("lcoil", "l", 1, (("tc1", 1e-2), ("tc2", 1e-4)), 0, 0)
PASSIVE_MODELS = (SHEET, EXPONENT, PLATE, COIL)

RESISTORS = [
    *("1k tc1=1e-2", "1k tc1=1e-2 tc2=1e-3 temp=80", "1k tce=0.5", "1k tce=0.5 tc1=1e-2 dtemp=20", "1k m=3 tc1=1e-3"),
    *("1k ac=250", "1k ac=250 tc1=1e-2 m=2", "rsheet l=1e-5 w=2e-6", "rsheet l=1e-5 w=2e-6 tc1=0 scale=2 m=2"),
    *(
        "1k rsheet",
        "1k rsheet tc2=0 dtemp=15",
        "rexp l=1e-5 w=2e-6",
        "rexp l=1e-5 w=2e-6 tc1=1e-2",
        "1k tc1=1e-3 temp=-20",
    ),
]
CAPACITORS = [
    "1n tc1=1e-2",
    "1n tc1=1e-2 tc2=1e-4 dtemp=9 m=3",
    "cplate l=1e-5 w=2e-6",
    "1n cplate m=2",
    "1n m=2 temp=90 tc1=1e-3",
]
INDUCTORS = ["1m tc1=1e-2", "1m tc1=1e-2 tc2=1e-4 dtemp=9 m=3", "1m lcoil", "1m lcoil m=2 temp=-10", "1m nt=10"]
PASSIVES = [*(("R", c) for c in RESISTORS), *(("C", c) for c in CAPACITORS), *(("L", c) for c in INDUCTORS)]

CONTROLLED = {
    "voltage gain": ("E1 x 0 a 0 -7",),
    "voltage gain between live nodes": ("E1 x a in 0 3", "RX a 0 3k"),
    "current gain": ("VM a s 0", "RM s 0 1k", "F1 x 0 VM 40", "RX x 0 100"),
    "current gain, twofold": ("VM a s 0", "RM s 0 1k", "F1 x 0 vm 40 m=2", "RX x 0 100"),
    "transresistance": ("VM a s 0", "RM s 0 1k", "H1 x 0 VM -5k"),
    "square law": ("G1 x 0 POLY a 0 : 0 1m 2m 3m", "RX x 0 1k"),
    "square law, twofold": ("G1 x 0 POLY a 0 : 0 1m 2m 3m m=2", "RX x 0 1k"),
    "multiplier": ("E1 x 0 POLY a 0 in 0 : 0.1 0.2 0.3 0.4 0.5 0.6 0.7 0.8 0.9 1",),
    "three controls": ("E1 x in POLY a 0 in 0 0 a : 0.1 0.2 0.3 0.4 0.5 0.6 0.7 0.8 0.9 1",),
    "one control twice": ("G1 0 x POLY a 0 a 0 : 0 1m 2m 3m 4m 5m", "RX x 0 1k"),
    "currents multiplied": (
        *("VM a s 0", "RM s 0 1k", "VN in t 0", "RN t 0 2k"),
        *("F1 0 x POLY VM VN : 0 1 2 100 300 400", "RX x 0 1k"),
    ),
    "transresistance of two currents": (
        *("VM a s 0", "RM s 0 1k", "VN in t 0", "RN t 0 2k"),
        *("H1 x 0 POLY VN vm : 1 10 20 1k 3k 4k",),
    ),
    "constant alone": ("E1 y 0 POLY a 0 : 5", "RX y x 1k", "RY x a 1k"),
}

COUPLED = {
    "transformer": ("L1 a 0 1m", "L2 x 0 4m", "K1 L1 L2 0.98"),
    "turned": ("L1 a 0 1m", "L2 0 x 4m", "K1 l1 l2 0.5"),
    "negative": ("L1 a 0 1m", "L2 x 0 4m", "K1 L1 L2 -0.7"),
    "with m and temperature": ("L1 a 0 1m tc1=1e-2 m=2", "L2 x 0 4m", "K1 L1 L2 0.6"),
    "three windings": (
        *("L1 a 0 1m", "L2 x 0 4m", "L3 y 0 2m", "RY y 0 500"),
        *("K12 L1 L2 0.9", "K13 L1 L3 0.8", "K23 L2 L3 0.85"),
    ),
}


def solved(circuit: Circuit, engine: Engine) -> Network:
    """Rebuild the network at the operating point the engine finds."""
    return Network.from_parts(
        linearise(circuit, engine.bias(circuit, observations(circuit))).parts, output=circuit.output
    )


@pytest.mark.parametrize("name", CIRCUITS)
def test_linear_networks_agree_with_the_engine_to_rounding(name: str, engine: Engine) -> None:
    """To 1e-11 up to 1 GHz; at 100 GHz the engine's own inductor current is 7e-11 off 1/(R + jωL), ours is not."""
    network = solved(CIRCUITS[name], engine)
    for stop_hz, tolerance in ((1e9, 1e-11), (1e11, 1e-10)):
        sweep = engine.sweep(decades(1.0, stop_hz, 4))
        assert np.allclose(response(network, sweep.frequency_hz), sweep.response, rtol=tolerance, atol=0.0)


def disagreement(circuit: Circuit, engine: Engine) -> float:
    """Largest relative difference between the rebuilt network and the engine's sweep up to 1 GHz."""
    network = solved(circuit, engine)
    sweep = engine.sweep(decades(1.0, 1e9, 4))
    return float(np.max(np.abs(response(network, sweep.frequency_hz) / sweep.response - 1.0)))


def passive_stage(letter: str, card: str) -> Circuit:
    other = "CX out 0 1n" if letter == "R" else "RX out 0 1k"
    cards = ("VIN in 0 0", other, f"{letter}1 in out {card}")
    return board(*cards, models=PASSIVE_MODELS, drive={"VIN": 1.0}, temperature_c=50.0)


def controlled_stage(name: str) -> Circuit:
    cards = ("VIN in 0 1.5", "RS in a 1k", "CA a 0 1n", *CONTROLLED[name], "RL x out 50", "CL out 0 10p")
    return board(*cards, drive={"VIN": 1.0})


def coupled_stage(name: str) -> Circuit:
    cards = ("VIN in 0 0", "RS in a 50", *COUPLED[name], "RL x out 50", "RX out 0 300", "CL out 0 10p")
    return board(*cards, drive={"VIN": 1.0}, temperature_c=40.0)


@pytest.mark.parametrize(("letter", "card"), PASSIVES)
def test_passives_with_models_and_temperature_agree(letter: str, card: str, engine: Engine) -> None:
    assert disagreement(passive_stage(letter, card), engine) < 1e-11


@pytest.mark.parametrize("name", CONTROLLED)
def test_controlled_sources_agree(name: str, engine: Engine) -> None:
    assert disagreement(controlled_stage(name), engine) < 1e-11


@pytest.mark.parametrize("name", COUPLED)
def test_coupled_inductors_agree(name: str, engine: Engine) -> None:
    assert disagreement(coupled_stage(name), engine) < 1e-10


def test_current_through_controlled_sources_is_an_output(engine: Engine) -> None:
    for card, through in (("E1 out 0 a 0 3", "E1"), ("E1 out 0 POLY a 0 : 0 3", "E1"), ("H1 out 0 VM 3k", "H1")):
        cards = ("VIN in 0 1.5", "RS in a 1k", "VM a s 0", "RM s 0 1k", card, "RL out 0 50")
        port = Port("out", "0", "current", through)
        assert disagreement(board(*cards, drive={"VIN": 1.0}, output=port), engine) < 1e-11


SWITCH = Model("sw1", "sw", 1, (("vt", 1.0), ("vh", 0.1), ("ron", 10.0), ("roff", 1e5)), 0, 0)
RELAY = Model("sw2", "csw", 1, (("it", 1e-3), ("ih", 1e-4), ("ron", 10.0), ("roff", 1e5)), 0, 0)


@pytest.mark.parametrize(
    ("switch", "control", "region"),
    [
        ("S1 in out c 0 sw1", 2.0, "on"),
        ("S1 in out c 0 sw1", 0.5, "off"),
        ("S1 in out c 0 sw1 on", 1.05, "on"),
        ("S1 in out c 0 sw1", 1.05, "off"),
        ("W1 in out VC sw2", -3.0, "on"),
        ("W1 in out VC sw2", 0.5, "off"),
    ],
)
def test_a_switch_is_off_in_the_sweep_and_says_so_where_it_is_on(
    switch: str, control: float, region: str, engine: Engine
) -> None:
    cards = (f"VC c 0 {control}", "RC c 0 1k", "VIN in 0 1", switch, "RL out 0 1k", "CL out 0 1n")
    circuit = board(*cards, models=(SWITCH, RELAY), drive={"VIN": 1.0})
    assert disagreement(circuit, engine) < 1e-11
    bias = engine.operating_point(circuit)
    device = linearise(circuit, bias).devices[0]
    assert device.region == region
    assert bool(device.remarks) == (region == "on")
    # the operating point itself tells whether the engine has it on
    assert (bias.voltages[circuit.nodes.index("out")] > 0.5) == (region == "on")


def test_a_switch_without_roff_has_the_engines_own(engine: Engine) -> None:
    model = changed(Model("sw1", "sw", 1, (("vt", 1.0),), 0, 0))
    cards = ("VC c 0 0", "VIN in 0 1", "S1 in out c 0 sw1", "RL out 0 1g")
    assert disagreement(board(*cards, models=(model,), drive={"VIN": 1.0}), engine) < 1e-9


@pytest.mark.parametrize(
    ("out", "control", "cell"),
    [
        (("c", "e"), ("b", "e"), ("b", "e", "c", 2.0)),
        (("e", "c"), ("b", "e"), ("b", "e", "c", -2.0)),
        (("c", "e"), ("e", "b"), ("b", "e", "c", -2.0)),
        (("e", "c"), ("e", "b"), ("b", "e", "c", 2.0)),
        (("c", "0"), ("b", "0"), ("b", "0", "c", 2.0)),
        (("c", "e"), ("b", "x"), None),
        (("c", "e"), ("c", "e"), None),
        (("c", "e"), ("e", "c"), None),
    ],
)
def test_a_controlled_source_whose_control_shares_a_node_with_its_output_is_a_cell(
    out: tuple[str, str], control: tuple[str, str], cell: tuple[str, str, str, float] | None
) -> None:
    found = cell_of(transconductance("G1", out, control, 2.0))
    assert (found and (found.control, found.common, found.output, found.gm)) == cell


def test_a_conductance_is_no_cell() -> None:
    assert cell_of(conductance("R1", "a", "b", 1.0)) is None


FAMILIES = {
    "R, C, L with model, coefficients, m, ac=": [passive_stage(letter, card) for letter, card in PASSIVES],
    "E, F, G, H, POLY": [controlled_stage(name) for name in CONTROLLED],
    "coupled inductors": [coupled_stage(name) for name in COUPLED],
}


def test_worst_agreement_is_what_the_developers_page_keeps(
    engine: Engine, pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    assert worst_of(FAMILIES, engine, pytestconfig, capsys) < 1e-9
