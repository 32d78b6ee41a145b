"""The usual topologies: the role of every stage in signal order, what stands around it, and its gain by hand."""

from __future__ import annotations

from collections.abc import Mapping

import pytest
from msgspec.structs import replace

from cells import bands_of, bipolar, board, near
from tauledger.circuit import Port
from tauledger.devices.family import Device, Terminal, Transconductor
from tauledger.devices.parts import Part, conductance, resistance, transconductance, voltage_source
from tauledger.hand.budget import signal_nodes
from tauledger.hand.estimate import StageRow
from tauledger.hand.stages import stage_rows
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands

Board = tuple[Bands, tuple[Device, ...]]


def mos(name: str, nodes: tuple[str, str, str], gm: float = 5e-3, r_o: float = 40e3, g_mb: float = 0.0) -> Device:
    """A field-effect transistor at (drain, gate, source), its body at AC ground."""
    d, g, s = nodes
    parts = [transconductance(name, (d, s), (g, s), gm, "gm"), conductance(name, d, s, 1 / r_o, "g_o")]
    if g_mb:
        parts.append(transconductance(name, (d, s), ("0", s), g_mb, "gmb"))
    return Device(
        name=name,
        kind="nmos",
        region="saturation",
        figures=(),
        terminals=(Terminal("drain", d, d), Terminal("gate", g, g), Terminal("source", s, s)),
        cell=Transconductor(name, g, s, d, gm, None, r_o, "0", g_mb),
        parts=tuple(part for part in parts if part.nodes[0] != part.nodes[1]),
    )


def q(name: str, *nodes: str, gm: float = 0.04, r_b: float = 100.0) -> Device:
    """A bipolar transistor at collector, base, emitter."""
    c, b, e = nodes
    return bipolar(name, (c, b, e), gm=gm, r_b=r_b)


def pnp(name: str, *nodes: str, gm: float = 0.04) -> Device:
    """The same with the other polarity."""
    return replace(q(name, *nodes, gm=gm), kind="pnp")


def r(name: str, a: str, b: str, ohm: float) -> Part:
    return resistance(name, a, b, ohm)


SOURCE = r("RS", "s", "b", 1e3)
LOAD = r("RL", "out", "0", 2e3)
TAIL = r("RT", "t", "0", 5e3)

TOPOLOGIES: Mapping[str, Board] = {
    "common emitter": board(SOURCE, q("Q1", "out", "b", "0"), LOAD),
    "common base": board(r("RS", "s", "e", 50), q("Q1", "out", "0", "e", r_b=0.0), r("RE", "e", "0", 1e3), LOAD),
    "common collector": board(SOURCE, q("Q1", "0", "b", "out"), LOAD),
    "degenerated": board(SOURCE, q("Q1", "out", "b", "e"), r("RE", "e", "0", 100), LOAD),
    "common source": board(SOURCE, mos("M1", ("out", "b", "0")), LOAD),
    "common gate": board(r("RS", "s", "e", 50), mos("M1", ("out", "0", "e")), r("RE", "e", "0", 1e3), LOAD),
    "common drain": board(SOURCE, mos("M1", ("0", "b", "out"), g_mb=1e-3), LOAD),
    "cascode": board(SOURCE, q("Q1", "x", "b", "0"), q("Q2", "out", "0", "x"), LOAD),
    "folded cascode": board(SOURCE, q("Q1", "x", "b", "0"), r("RI", "x", "0", 20e3), q("Q2", "out", "0", "x"), LOAD),
    "Darlington": board(SOURCE, q("Q1", "out", "b", "m", gm=0.4e-3), q("Q2", "out", "m", "0"), LOAD),
    "Darlington follower": board(SOURCE, q("Q1", "0", "b", "m", gm=0.4e-3), q("Q2", "0", "m", "out"), LOAD),
    "complementary pair": board(
        SOURCE, q("Q1", "m", "b", "out", gm=1e-3), r("RB", "m", "0", 2e3), q("Q2", "out", "m", "0"), LOAD
    ),
    "pair, far collector": board(SOURCE, q("Q1", "0", "b", "t"), q("Q2", "out", "0", "t"), TAIL, LOAD),
    "pair, near collector": board(SOURCE, q("Q1", "out", "b", "t"), q("Q2", "0", "0", "t"), TAIL, LOAD),
    "pair with mirror load": board(
        SOURCE,
        q("Q1", "m", "b", "t"),
        q("Q2", "out", "0", "t"),
        TAIL,
        q("Q3", "m", "m", "0"),
        q("Q4", "out", "m", "0"),
        r("RL", "out", "0", 50e3),
    ),
    "mirror": board(r("RS", "s", "m", 10e3), q("Q1", "m", "m", "0"), q("Q2", "out", "m", "0"), LOAD),
    "active load": board(SOURCE, q("Q1", "out", "b", "0"), q("Q2", "out", "v", "0"), r("RV", "v", "0", 100), LOAD),
    "diode-connected load": board(SOURCE, q("Q1", "out", "b", "0"), q("Q2", "out", "out", "0", gm=0.01), LOAD),
    "class-B followers at rest": board(
        SOURCE, q("Q1", "0", "b", "out", gm=0.02), pnp("Q2", "0", "b", "out", gm=0.02), r("RL", "out", "0", 100)
    ),
    "class-AB followers behind emitter resistors": board(
        SOURCE,
        q("Q1", "0", "b", "e1", gm=0.2),
        pnp("Q2", "0", "b", "e2", gm=0.03),
        r("RE1", "e1", "out", 4.7),
        r("RE2", "e2", "out", 4.7),
        r("RL", "out", "0", 500),
    ),
    "two npn followers in parallel": board(
        SOURCE, q("Q1", "0", "b", "out", gm=0.02), q("Q2", "0", "b", "out", gm=0.02), r("RL", "out", "0", 100)
    ),
    "bootstrapped bias": board(SOURCE, q("Q1", "0", "b", "out"), r("RB", "b", "out", 100e3), LOAD),
    "shunt feedback": board(SOURCE, q("Q1", "out", "b", "0"), r("RF", "out", "b", 10e3), LOAD),
    "series feedback": board(
        SOURCE,
        q("Q1", "m", "b", "e"),
        r("RC", "m", "0", 5e3),
        q("Q2", "out", "m", "0"),
        r("RF", "out", "e", 1e3),
        r("RE", "e", "0", 100),
        LOAD,
    ),
    "feedback pair": board(
        SOURCE,
        q("Q1", "m", "b", "0"),
        r("RC", "m", "0", 5e3),
        q("Q2", "out", "m", "e"),
        r("RE", "e", "0", 500),
        r("RF", "e", "b", 10e3),
        LOAD,
    ),
}

FOLLOWER = "emitter follower (common collector)"
EXPECTED: Mapping[str, list[tuple[str, str, tuple[str, ...]]]] = {
    "common emitter": [("out", "common emitter", ())],
    "common base": [("out", "common base", ())],
    "common collector": [("out", FOLLOWER, ())],
    "degenerated": [("out", "common emitter, degenerated", ())],
    "common source": [("out", "common source", ())],
    "common gate": [("out", "common gate", ())],
    "common drain": [("out", "source follower (common drain)", ())],
    "cascode": [("x", "common emitter", ()), ("out", "common base", ())],
    "folded cascode": [("x", "common emitter", ()), ("out", "common base", ())],
    "Darlington": [("m", FOLLOWER, ()), ("out", "common emitter", ("Darlington with Q1",))],
    "Darlington follower": [("m", FOLLOWER, ()), ("out", FOLLOWER, ("Darlington with Q1",))],
    "complementary pair": [("out", FOLLOWER, ("complementary pair with Q1",))],
    "pair, far collector": [("t", FOLLOWER, ()), ("out", "common base", ("emitter-coupled pair with Q1",))],
    "pair, near collector": [("out", "common emitter, degenerated", ("emitter-coupled pair with Q2",))],
    "pair with mirror load": [("out", "common base", ("emitter-coupled pair with Q1", "mirror load Q4"))],
    "mirror": [("out", "current mirror output", ())],
    "active load": [("out", "common emitter", ("active load Q2",))],
    "diode-connected load": [("out", "common emitter", ("diode load Q2",))],
    "class-B followers at rest": [("out", FOLLOWER, ("push-pull with Q2",))],
    "class-AB followers behind emitter resistors": [("e1", FOLLOWER, ("push-pull with Q2",)), ("out", "passive", ())],
    "two npn followers in parallel": [("out", FOLLOWER, ())],
    "bootstrapped bias": [("out", FOLLOWER, ("feedback to b through RB",))],
    "shunt feedback": [("out", "common emitter", ("feedback to b through RF",))],
    "series feedback": [
        ("m", "common emitter, degenerated", ()),
        ("out", "common emitter", ("feedback to the emitter of Q1 through RF",)),
    ],
    "feedback pair": [
        ("m", "common emitter", ()),
        ("out", "common emitter, degenerated", ("feedback to the base of Q1 through RF",)),
    ],
}


def stages(name: str) -> list[StageRow]:
    return list(stage_rows(*TOPOLOGIES[name]))


@pytest.mark.parametrize("name", TOPOLOGIES)
def test_roles_come_in_signal_order(name: str) -> None:
    first, *others = stages(name)
    assert (first.role, first.owner) == ("passive", "")
    assert [(row.node, row.role, row.around) for row in others] == EXPECTED[name]


@pytest.mark.parametrize("name", TOPOLOGIES)
def test_gains_by_hand_are_within_two_per_cent_or_say_why_not(name: str) -> None:
    for row in stages(name):
        assert row.gain_hand is not None
        assert row.gain_exact is not None
        off = abs(row.gain_hand / row.gain_exact - 1.0)
        assert bool(row.why) == (off > 0.02), row


@pytest.mark.parametrize("name", TOPOLOGIES)
def test_resistances_by_hand_are_within_two_per_cent_or_marked(name: str) -> None:
    for row in signal_nodes(*TOPOLOGIES[name]):
        for line in row.lines:
            assert line.resistance.ohm == near(line.resistance_exact_ohm, rel=0.02), (name, line.node)
            if line.resistance.source != "rule":
                assert line.resistance.rule_ohm is not None or "solved" in line.resistance.text


def test_a_second_way_into_a_node_is_named_as_the_reason() -> None:
    """The first transistor of a Darlington feeds the collector too; series feedback carries signal forward."""
    assert stages("Darlington")[-1].why == "Q1 brings signal to out as well, past m"
    assert stages("series feedback")[-1].why == "RF brings signal to out as well, past m"


def test_a_bias_resistor_that_follows_is_said_to_be_bootstrapped() -> None:
    assert "RB (bootstrapped)" in stages("bootstrapped bias")[0].elements
    assert not any("bootstrapped" in name for name in stages("common collector")[0].elements)


def test_a_transistors_own_emitter_resistance_is_no_degeneration() -> None:
    """r_e of 2 ohm and gm of 40 mS: the inner emitter moves by 8 %, the netlist's emitter is at ground."""
    made = board(SOURCE, bipolar("Q1", ("out", "b", "0"), r_e=2.0), LOAD)
    assert stage_rows(*made)[-1].role == "common emitter"
    made = board(SOURCE, bipolar("Q1", ("out", "b", "e"), r_e=2.0), r("RE", "e", "0", 2.0), LOAD)
    assert stage_rows(*made)[-1].role == "common emitter, degenerated"


def test_bootstrapping_is_seen_through_the_emitters_own_resistance() -> None:
    made = board(SOURCE, bipolar("Q1", ("0", "b", "out"), r_b=100.0, r_e=1.0), r("RB", "b", "out", 100e3), LOAD)
    assert "RB (bootstrapped)" in stage_rows(*made)[0].elements


def test_series_resistances_of_a_device_are_listed_as_the_device() -> None:
    made = board(SOURCE, bipolar("Q1", ("out", "b", "0"), r_b=100.0, r_c=3.0), LOAD)
    assert stage_rows(*made)[-1].elements == ("RL", "Q1")


def test_two_drives_in_opposite_phase_count_as_their_difference() -> None:
    """A pair with mirror load is not balanced: the one node that all signal crosses is the output."""
    devices = (q("Q1", "m", "bp", "t"), q("Q2", "out", "bn", "t"), q("Q3", "m", "m", "0"), q("Q4", "out", "m", "0"))
    parts = [voltage_source("VP", "sp", "0", 0.5), voltage_source("VN", "sn", "0", -0.5), TAIL]
    parts += [r("RP", "sp", "bp", 1e3), r("RN", "sn", "bn", 1e3), r("RL", "out", "0", 50e3)]
    parts += [part for device in devices for part in device.parts]
    bands = bands_of(Network.from_parts(parts, output=Port("out")))
    (only,) = stage_rows(bands, devices)
    assert (only.node, only.gain_hand) == ("out", None)
    assert only.gain_exact == near(bands.midband.gain.real)
    assert "mirror load Q4" in only.around
