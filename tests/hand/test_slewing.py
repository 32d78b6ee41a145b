"""Slew rate from standing currents and the exact network, with ngspice's transient analysis as judge."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.explain import explain
from tauledger.hand.slewing import Slewing, slewing
from tauledger.netlist import read
from tauledger.numbers import solve
from transient_judge import slope

FIXTURES = Path(__file__).parents[2] / "fixtures"

PNP = ".model qp pnp(is=5e-15 bf=150 vaf=60 cje=8p cjc=4p tf=500p)"
NPN = ".model qn npn(is=5e-15 bf=150 vaf=60 cje=8p cjc=4p tf=400p)"
NMOS = ".model mn nmos(level=1 vto=0.7 kp=100u lambda=0.03 tox=20n cgso=0.3n cgdo=0.3n)"
PMOS = ".model mp pmos(level=1 vto=-0.8 kp=40u lambda=0.04 tox=20n cgso=0.3n cgdo=0.3n)"


def judged(path: Path, engine: Engine) -> Slewing:
    numbers = solve(read(path), NO_CHANGE, engine)
    hand = explain(numbers).hand
    assert hand is not None
    high = numbers.edges.f_high
    return slewing(numbers.bands, numbers.devices, hand.nodes, f_high_hz=high.hz if high is not None else None)


def written(folder: Path, *cards: str) -> Path:
    path = folder / "board.cir"
    path.write_text("\n".join(["a board", *cards, ".end", ""]), encoding="utf-8")
    return path


def two_stages(folder: Path, compensation: str) -> Path:
    """Pair with mirror, second stage and follower-less feedback of one: a buffer that slews."""
    return written(
        folder,
        "VDD vdd 0 2.5",
        "VSS vss 0 -2.5",
        "VIN in 0 DC 0 AC 1",
        "IT tail vss DC 20u",
        "M1 x out tail vss mn w=60u l=1u",
        "M2 y in tail vss mn w=60u l=1u",
        "M3 x x vdd vdd mp w=30u l=2u",
        "M4 y x vdd vdd mp w=30u l=2u",
        "M6 out y vdd vdd mp w=600u l=2u",
        "IL out vss DC 200u",
        f"CC y out {compensation}",
        "CL out 0 2p",
        NMOS,
        PMOS,
    )


THROWN = [
    pytest.param(
        "cable_driver.cir", "VIN filter 0 DC 0 AC 1", "PULSE(0 -4 0.1u 1n 1n)", -0.3, -1.3, 0.5e-6, id="follower"
    ),
    pytest.param(
        "mos_gain.cir", "VIN in 0 DC 0 AC 1", "PULSE(-0.1 0.1 0.1u 1n 1n)", 0.5, -0.2, 1e-6, id="second stage"
    ),
    pytest.param(
        "hydrophone.cir", "VP el 0 DC 0 AC 1", "PULSE(0 0.4 1u 1n 1n)", -0.4, -0.9, 4e-6, id="behind a resistor"
    ),
]


@pytest.mark.parametrize(("name", "source", "pulse", "start_v", "end_v", "stop_s"), THROWN)
def test_the_slowest_node_sets_the_slope_in_a_transient_run(
    name: str, source: str, pulse: str, start_v: float, end_v: float, stop_s: float, engine: Engine, tmp_path: Path
) -> None:
    """15 %: the currents are those at rest, the resistors' fall as the output moves."""
    slowest = judged(FIXTURES / name, engine).nodes[0]
    seen = slope(FIXTURES / name, tmp_path, source=source, pulse=pulse, start_v=start_v, end_v=end_v, stop_s=stop_s)
    assert slowest.output_slew_v_per_s == pytest.approx(seen, rel=0.15)


@pytest.mark.parametrize("pulse", ["PULSE(-0.6 0.6 0.2u 1n 1n)", "PULSE(0.6 -0.6 0.2u 1n 1n)"], ids=["up", "down"])
def test_the_tail_current_into_the_compensation_capacitor_is_the_slope_both_ways(
    pulse: str, engine: Engine, tmp_path: Path
) -> None:
    path = two_stages(tmp_path, "2p")
    slowest = judged(path, engine).nodes[0]
    assert (slowest.node, set(slowest.drivers)) == ("y", {"M1", "M2"})
    start, end = (-0.3, 0.3) if pulse.startswith("PULSE(-") else (0.3, -0.3)
    seen = slope(path, tmp_path, source="VIN in 0 DC 0 AC 1", pulse=pulse, start_v=start, end_v=end, stop_s=1e-6)
    assert slowest.output_slew_v_per_s == pytest.approx(seen, rel=0.15)
    assert slowest.output_slew_v_per_s == pytest.approx(20e-6 / 2e-12, rel=0.15)


def test_twice_the_compensation_is_half_the_slew_rate_there(engine: Engine, tmp_path: Path) -> None:
    at_y = [
        next(slew for slew in judged(two_stages(tmp_path, value), engine).nodes if slew.node == "y")
        for value in ("20p", "40p")
    ]
    assert at_y[0].output_slew_v_per_s / at_y[1].output_slew_v_per_s == pytest.approx(2.0, rel=0.03)


def common_emitter(folder: Path, *more: str) -> Path:
    cards = ["VCC vcc 0 12", "VIN in 0 DC 0.7 AC 1", "RS in b 10k", "RC vcc c 4.7k", "Q1 c b 0 qn", "CL c 0 100p"]
    return written(folder, *cards, NPN, PNP, *more, ".print ac v(c)")


def test_a_common_emitter_gives_its_standing_current_to_what_hangs_at_its_collector(
    engine: Engine, tmp_path: Path
) -> None:
    """The capacitance is that of the AC current: CL, and C_mu with the base that moves the other way."""
    numbers = solve(read(common_emitter(tmp_path)), NO_CHANGE, engine)
    (slew,) = judged(common_emitter(tmp_path), engine).nodes
    current = dict(numbers.devices[-1].figures)["i_c"]
    assert slew.current_a == current
    assert 100e-12 < slew.capacitance_f < 110e-12
    assert slew.ratio == pytest.approx(1.0)


def test_a_collector_cuts_off_where_its_signal_current_is_its_standing_current(engine: Engine, tmp_path: Path) -> None:
    """With a resistor alone at the collector that is I_C·R_C‖r_o: what every load line shows."""
    numbers = solve(read(common_emitter(tmp_path)), NO_CHANGE, engine)
    figures = dict(numbers.devices[-1].figures)
    (slew,) = judged(common_emitter(tmp_path), engine).nodes
    load = 1.0 / (1.0 / 4.7e3 + 1.0 / figures["r_o"])
    assert slew.cut_off_v == pytest.approx(figures["i_c"] * load, rel=1e-3)


def test_a_folded_cascode_gives_no_more_than_the_transistor_that_feeds_it(engine: Engine, tmp_path: Path) -> None:
    path = written(
        tmp_path,
        "VDD vdd 0 5",
        "VIN in 0 DC 0.9 AC 1",
        "RS in g 1k",
        "M1 d g 0 0 mn w=10u l=1u",
        "IF vdd d DC 100u",
        "VB b 0 3",
        "M2 out b d vdd mp w=60u l=1u",
        "IL out 0 DC 78u",
        "RL out 0 100k",
        "CL out 0 1p",
        NMOS,
        PMOS,
    )
    numbers = solve(read(path), NO_CHANGE, engine)
    current = {device.name: abs(dict(device.figures)["i_d"]) for device in numbers.devices if device.cell}
    slew = next(slew for slew in judged(path, engine).nodes if slew.node == "out")
    assert current["M1"] < current["M2"]
    assert slew.current_a == current["M1"]


def test_push_pull_followers_are_not_judged(engine: Engine, tmp_path: Path) -> None:
    """Class AB gives more than it stands with; no one current is its limit."""
    path = written(
        tmp_path,
        "VCC vcc 0 10",
        "VEE vee 0 -10",
        "VIN in 0 DC 0 AC 1",
        "RS in m 1k",
        "VA a m 0.65",
        "VB m b 0.65",
        "Q1 vcc a e1 qn",
        "Q2 vee b e2 qp",
        "R1 e1 out 10",
        "R2 e2 out 10",
        "RL out 0 1k",
        "CL out 0 1n",
        NPN,
        PNP,
    )
    found = judged(path, engine)
    assert found.nodes == ()
    assert len(found.not_judged) == 2


def test_what_controlled_sources_and_folded_instances_move_is_named_as_not_judged(
    engine: Engine, tmp_path: Path
) -> None:
    path = written(
        tmp_path,
        "VDD vdd 0 5",
        "VIN in 0 DC 1.1 AC 1",
        "RS in g 1k",
        "G1 0 x g 0 1m",
        "R1 x 0 1k",
        "C1 x 0 1p",
        "M2 out x 0 0 mn w=10u l=1u",
        "R9 vdd out 2k",
        "CL out 0 5p",
        NMOS,
    )
    found = judged(path, engine)
    assert [slew.node for slew in found.nodes] == ["out"]
    assert found.not_judged == ("output of G1, gate of M2 (x)",)


def test_a_current_source_is_a_load_and_no_driver(engine: Engine) -> None:
    """At the folded cascode's output Q2 stands still; only Q1 brings signal."""
    found = {slew.node: slew for slew in judged(FIXTURES / "hydrophone.cir", engine).nodes}
    assert found["c"].drivers == ("Q1",)


def test_capacitance_at_the_cable_counts_to_the_follower_that_feeds_it(engine: Engine) -> None:
    found = judged(FIXTURES / "line_driver.cir", engine).nodes[0]
    assert (found.drivers, found.behind) == (("Q2",), ("out",))
    # 47 pF at 75/(75 + 68) of the follower's own signal, and some of its own
    assert found.capacitance_f == pytest.approx(47e-12 * 75 / 143, rel=0.06)


def test_slew_rate_at_the_output_is_that_at_the_node_times_the_gain_between(engine: Engine) -> None:
    for name in ("mos_gain.cir", "pair.cir", "gain_pair.cir"):
        for slew in judged(FIXTURES / name, engine).nodes:
            at_node = slew.current_a / slew.capacitance_f
            assert slew.output_slew_v_per_s == pytest.approx(at_node / slew.ratio)
            assert math.isfinite(slew.cut_off_v)
