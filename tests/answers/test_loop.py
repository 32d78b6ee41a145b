"""Loop gain of whole boards: the same as ngspice's double injection, and said only where there is a loop."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from msgspec.structs import replace

from tauledger.answers.double_injection import Cut, cut_into, cut_out_of, injected_ratio
from tauledger.answers.loop_places import named_place, open_network
from tauledger.asked import Asked
from tauledger.circuit import ADDED, NO_CHANGE, Drive, Element, Port
from tauledger.devices.parts import (
    capacitance,
    inductance,
    mutual_inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.netlist import read
from tauledger.network.assemble import Network
from tauledger.network.return_ratio import CONTROLLED, at_source, at_wire, return_ratio
from tauledger.network.solve import on_axis
from tauledger.numbers import Numbers, solve
from tauledger.pipeline import review, review_network
from tauledger.record import LoopFacts, Review

FIXTURES = Path(__file__).parents[2] / "fixtures"
WITHIN = 1e-3
WIDE = np.geomspace(1e2, 1e9, 29)
FOLLOWER = """River-level gauge, follower of the test pad into a long lead
VDD vdd 0 3
VIN in 0 DC 2 AC 1
RS in g 20k
M1 vdd g out 0 nch w=60u l=1u ad=60p as=60p pd=62u ps=62u
IS out 0 80u
RL out 0 100k
CL out 0 47p
.model nch nmos(level=1 vto=0.6 kp=120u gamma=0.5 phi=0.8 lambda=0.05 tox=12n cgso=0.3n cgdo=0.3n
+ cj=0.5m mj=0.45 cjsw=0.3n mjsw=0.3)
.print ac v(out)
.end
"""
AMPLIFIER = """.subckt amp p n o
RIN p n 1meg
G1 0 a p n 1m
RA a 0 100meg
CA a 0 100p
G2 0 b a 0 1m
RB b 0 1k
CB b 0 50p
E1 c 0 b 0 1
RO c o 50
.ends
.ac dec 10 1 10meg
.print ac v(out)
.end
"""
BUFFER = f"""River-level gauge, buffer of the reference
VIN in 0 AC 1
RS in p 1k
XU1 p out out amp
CL out 0 100p
RL out 0 2k
{AMPLIFIER}"""
IN_A_ROW = f"""River-level gauge, two amplifiers in a row
VIN in 0 AC 1
R1 in n1 1k
R2 n1 o1 10k
XU1 0 n1 o1 amp
R3 o1 p2 1k
C3 p2 0 100p
XU2 p2 n2 out amp
R4 n2 0 1k
R5 n2 out 4k
RL out 0 2k
{AMPLIFIER}"""
FOUND = {
    "mos_gain.cir": ("M1.gate", "M6"),
    "tia_pair.cir": ("Q1.base", "Q1"),
    "series_shunt.cir": ("Q1.emitter", "Q2"),
    "photo_front.cir": ("M1.gate", "M1"),
}
NO_LOOP = ("echo_preamp.cir", "echo_cascode.cir", "gain_pair.cir", "pair.cir", "cable_driver.cir", "servo_gain.cir")


def numbers_of(board: str, engine: Engine) -> Numbers:
    return solve(read(FIXTURES / board), NO_CHANGE, engine)


def only(found: Review) -> LoopFacts:
    assert len(found.loops) == 1
    return found.loops[0]


@pytest.mark.parametrize(
    ("board", "wires"),
    [
        ("mos_gain.cir", [("M1", "n"), ("M6", "y"), ("M6", "out")]),
        ("tia_pair.cir", [("Q1", "b1"), ("Q2", "c1"), ("Q2", "out")]),
        ("series_shunt.cir", [("Q1", "e1"), ("Q2", "c1"), ("Q1", "b1")]),
        ("photo_front.cir", [("M1", "g"), ("M4", "d")]),
    ],
)
def test_a_wire_has_the_return_ratio_of_the_double_injection(
    board: str, wires: list[tuple[str, str]], engine: Engine
) -> None:
    numbers = numbers_of(board, engine)
    assert numbers.circuit is not None
    for owner, node in wires:
        simulated = injected_ratio(numbers.circuit, cut_into(numbers.circuit, owner, node), engine, WIDE)
        exact = return_ratio(at_wire(numbers.network, owner, node), on_axis(WIDE))
        assert np.max(np.abs(simulated - exact) / np.maximum(np.abs(exact), 1e-3)) < WITHIN * 1e-2


@pytest.mark.parametrize("source", ["XU1.G1", "XU1.E1", "XU1.E2"])
def test_a_source_of_a_macromodel_has_the_return_ratio_of_the_double_injection(source: str, engine: Engine) -> None:
    numbers = numbers_of("opamp_filter.cir", engine)
    assert numbers.circuit is not None
    network = open_network(numbers)
    parts = [part for part in network.parts if part.owner.partition("'")[0] == source and part.kind in CONTROLLED]
    exact = return_ratio(at_source(network, parts), on_axis(WIDE))
    simulated = injected_ratio(numbers.circuit, cut_out_of(numbers.circuit, source), engine, WIDE)
    assert np.max(np.abs(simulated / exact - 1.0)) < WITHIN * 1e-3


def test_a_follower_with_a_capacitive_load_has_the_return_ratio_that_a_current_beside_it_tells(
    engine: Engine, tmp_path: Path
) -> None:
    """1 A from drain to source with the loop closed makes T/(1 + T) of it flow back: −(gm·v_gs + g_mb·v_bs)."""
    file = tmp_path / "follower.cir"
    file.write_text(FOLLOWER)
    numbers = solve(read(file), NO_CHANGE, engine)
    circuit = numbers.circuit
    assert circuit is not None
    drain, gate, source = (circuit.nodes.index(node) for node in ("vdd", "g", "out"))
    beside = Element("I", "I'loop", (drain, source), "", (("dc", 0.0),), ADDED, 0)
    grown = replace(circuit, elements=(*circuit.elements, beside), drive=(Drive("I'loop", "current", 1.0),))
    voltage = {}
    for node in (gate, source):
        engine.bias(replace(grown, output=Port(circuit.nodes[node])), ())
        voltage[node] = engine.sweep(WIDE).response
    figures = dict(numbers.devices[0].figures)
    back = figures["gm"] * (voltage[gate] - voltage[source]) - figures["g_mb"] * voltage[source]
    simulated = -back / (1.0 + back)
    place = named_place(numbers, "M1")
    exact = return_ratio(place.opening, on_axis(WIDE))
    assert np.max(np.abs(simulated / exact - 1.0)) < WITHIN
    assert place.cut is None


@pytest.mark.parametrize("board", FOUND)
def test_the_loop_is_found_with_margins_of_ngspice(board: str, engine: Engine) -> None:
    facts = only(review(FIXTURES / board, engine=engine))
    assert (facts.loop, facts.closing_source) == (FOUND[board][0], f"gm of {FOUND[board][1]}")
    assert facts.found
    assert facts.crossover_simulated_hz == pytest.approx(facts.crossover_hz, rel=WITHIN)
    assert facts.phase_margin_simulated_deg == pytest.approx(facts.phase_margin_deg, rel=WITHIN)
    assert facts.return_ratio_simulated == pytest.approx(
        abs(complex(facts.return_ratio_real, facts.return_ratio_imag)), rel=WITHIN
    )
    if facts.gain_margin_db is not None:
        assert facts.gain_margin_simulated_db == pytest.approx(facts.gain_margin_db, rel=WITHIN)


@pytest.mark.parametrize("board", FOUND)
def test_closed_loop_by_the_formula_and_by_hand_is_the_gain(board: str, engine: Engine) -> None:
    found = review(FIXTURES / board, engine=engine)
    facts = only(found)
    t = facts.closing_return_ratio
    assert t is not None
    assert facts.ideal_gain is not None
    assert facts.feedthrough is not None
    assert facts.closed_gain == pytest.approx(found.midband.gain_real, rel=WITHIN)
    assert (facts.ideal_gain * t + facts.feedthrough) / (1.0 + t) == pytest.approx(facts.closed_gain, rel=WITHIN)
    assert facts.identity_error is not None
    assert facts.identity_error < 1e-6
    # of the wire that is cut, where the gains round it are worked out; else at the transistor
    own = t if facts.hand_siemens is not None else abs(complex(facts.return_ratio_real, facts.return_ratio_imag))
    assert facts.hand_return_ratio == pytest.approx(own, rel=0.02)
    assert facts.hand_ideal_gain == pytest.approx(facts.ideal_gain, rel=0.05)


@pytest.mark.parametrize("board", NO_LOOP)
def test_no_loop_is_said_where_there_is_none(board: str, engine: Engine) -> None:
    found = review(FIXTURES / board, engine=engine)
    assert found.loops == ()
    assert found.loop_curves == ()


def test_an_operational_amplifier_is_shown_by_itself_and_with_its_noise_gain(engine: Engine) -> None:
    """1.2 MHz and 96 dB are what the macromodel's cards say; R3 and R4 make 1/β = 1.567, R_IN a little more."""
    facts = only(review(FIXTURES / "opamp_filter.cir", engine=engine))
    own = facts.amplifier
    assert own is not None
    assert own.open_loop_gain == pytest.approx(63000.0, rel=1e-6)
    assert own.gain_bandwidth_hz == pytest.approx(1e-3 / (2.0 * np.pi * 132.6e-12), rel=1e-3)
    assert own.second_pole_hz is None
    assert facts.noise_gain == pytest.approx(1.0 + 6.8 / 12.0, rel=0.02)
    assert own.gain_bandwidth_hz is not None
    assert facts.noise_gain is not None
    # the filter's capacitor lifts the noise gain near 8 kHz and makes A∞ fall: no gain-bandwidth over noise gain
    assert facts.noise_gain_edge_hz is None
    assert "the noise gain is not flat" in facts.not_f_high
    estimates = {one.method: one.difference for one in facts.estimates}
    assert abs(estimates["ideal gain alone"] or 1.0) < 0.001
    assert "elements around the amplifier set f_H" in facts.why[0]
    assert facts.return_ratio_simulated == pytest.approx(facts.return_ratio_real, rel=WITHIN)


def reviewed(netlist: str, engine: Engine, folder: Path) -> Review:
    file = folder / "board.cir"
    file.write_text(netlist)
    return review(file, engine=engine)


def test_a_buffer_is_faster_than_paper_says_because_of_its_second_pole(engine: Engine, tmp_path: Path) -> None:
    """1/(2π·1 kΩ·50 pF) = 3.18 MHz is the second pole; the first with a0 = 1e5 makes 1.59 MHz."""
    found = reviewed(BUFFER, engine, tmp_path)
    facts = only(found)
    assert facts.noise_gain == pytest.approx(1.0, rel=2e-3)
    assert facts.amplifier is not None
    assert facts.amplifier.loaded
    assert facts.noise_gain_edge_hz == pytest.approx(1e-3 / (2.0 * np.pi * 100e-12), rel=0.03)
    by_hand, *_ = facts.estimates
    assert by_hand.difference is not None
    assert by_hand.difference < -0.2
    assert "a second pole is near" in facts.why[0]
    whole = {one.method: one.difference for one in facts.estimates}["loop alone"]
    assert whole == pytest.approx(0.0, abs=2e-3)


def test_of_two_amplifiers_in_a_row_each_has_its_own_loop(engine: Engine, tmp_path: Path) -> None:
    first, second = reviewed(IN_A_ROW, engine, tmp_path).loops
    assert (first.loop, second.loop) == ("XU1", "XU2")
    assert first.noise_gain == pytest.approx(11.0, rel=2e-3)
    assert second.noise_gain == pytest.approx(5.0, rel=2e-3)
    for one in (first, second):
        assert one.crossover_simulated_hz == pytest.approx(one.crossover_hz, rel=WITHIN)
        assert one.amplifier is not None
        assert one.amplifier.second_pole_hz == pytest.approx(1.0 / (2.0 * np.pi * 1e3 * 50e-12), rel=1e-6)
        assert one.noise_gain_edge_hz == pytest.approx(1.5915e6 / (one.noise_gain or 1.0), rel=1e-3)
        # f_H of the board is that of neither alone
        assert one.estimates == ()


def test_the_engine_answers_for_the_board_again_afterwards(engine: Engine) -> None:
    board = FIXTURES / "tia_pair.cir"
    first = review(board, engine=engine)
    assert review(board, engine=engine) == first
    at = numbers_of("tia_pair.cir", engine)
    assert at.agreement is not None
    assert at.agreement.max_relative_error < 1e-7


def test_places_are_named_as_the_netlist_names_them(engine: Engine) -> None:
    found = review(FIXTURES / "mos_gain.cir", engine=engine, asked=Asked(loops=("m6", "R4", "CF", "M1.g")))
    assert [(one.loop, one.kind) for one in found.loops] == [
        ("M6", "source"),
        ("R4", "admittance"),
        ("CF", "admittance"),
        ("M1.gate", "wire"),
    ]
    assert not any(one.found for one in found.loops)
    through_m6, _, capacitor, wire = found.loops
    assert through_m6.return_ratio_simulated is None
    assert wire.return_ratio_simulated is not None
    # at DC no current passes a capacitor: all of the gain is there without it
    assert capacitor.ideal_gain is None
    assert capacitor.closed_gain == capacitor.feedthrough
    inside = review(FIXTURES / "opamp_filter.cir", engine=engine, asked=Asked(loops=("XU1", "xu1.e2"))).loops
    assert inside[0].return_ratio_real == pytest.approx(inside[1].return_ratio_real, rel=1e-9)


@pytest.mark.parametrize(
    ("name", "says"),
    [("M99", "no return ratio can be taken there"), ("M1.x", "no such terminal"), ("M2.gate", "no wire leads from 0")],
)
def test_a_place_that_is_none_is_told(name: str, says: str, engine: Engine) -> None:
    with pytest.raises(InputError, match=says):
        review(FIXTURES / "mos_gain.cir", engine=engine, asked=Asked(loops=(name,)))


def test_a_wire_that_an_element_does_not_have_cannot_be_cut(engine: Engine) -> None:
    circuit = numbers_of("mos_gain.cir", engine).circuit
    assert circuit is not None
    with pytest.raises(InputError, match="no wire leads"):
        cut_into(circuit, "M1", "out")
    with pytest.raises(InputError, match="no element with terminals"):
        cut_out_of(circuit, "R4")
    assert cut_into(circuit, "m1", "n") == Cut("m1", circuit.nodes.index("n"), (1,))


def test_positive_feedback_is_called_that() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "b", 1e3),
        transconductance("G1", ("0", "out"), ("b", "0"), 1e-3),
        resistance("R2", "out", "0", 2e3),
        resistance("R3", "out", "b", 10e3),
        capacitance("C1", "out", "0", 1e-9),
    ]
    found = review_network(Network.from_parts(parts, output=Port("out")), asked=Asked(loops=("G1",)))
    facts = only(found)
    assert facts.return_ratio_real == pytest.approx(-1e-3 * 2e3 * 1e3 / 13e3, rel=1e-9)
    assert any("positive feedback" in says for says in facts.says)
    assert facts.return_ratio_simulated is None
    assert review_network(Network.from_parts(parts, output=Port("out"))).loops == ()


def test_a_source_that_nothing_comes_back_to_is_told_to_have_no_loop() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "b", 1e3),
        transconductance("G1", ("0", "out"), ("b", "0"), 1e-3),
        resistance("R2", "out", "0", 2e3),
        capacitance("C1", "out", "0", 1e-9),
    ]
    found = review_network(Network.from_parts(parts, output=Port("out")), asked=Asked(loops=("G1",)))
    facts = only(found)
    assert facts.ideal_gain is None
    assert facts.feedthrough == 0.0
    assert facts.closed_gain == pytest.approx(2.0, rel=1e-12)


def test_an_element_that_alone_holds_a_node_is_no_place_for_a_return_ratio() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "out", 1e3),
        capacitance("C1", "out", "0", 1e-9),
        resistance("R2", "x", "0", 2e3),
        transconductance("G1", ("0", "x"), ("out", "0"), 1e-3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    with pytest.raises(InputError, match="--loop R2: without R2 the network has no solution"):
        review_network(network, asked=Asked(loops=("R2",)))


def test_a_winding_of_a_transformer_is_no_place_for_a_return_ratio() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 50.0),
        inductance("L1", "a", "0", 1e-3),
        inductance("L2", "out", "0", 4e-3),
        mutual_inductance("K1", "L1", "L2", ("a", "0", "out", "0"), 1.98e-3),
        resistance("R2", "out", "0", 200.0),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    with pytest.raises(InputError, match="--loop L2: a winding of a transformer"):
        review_network(network, asked=Asked(loops=("L2",)))
