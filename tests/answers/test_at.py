"""Gain and phase at a frequency, and peaking: against ngspice on the netlist as written, and against changed cards."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from msgspec.structs import replace

from answers.unity_judge import judge
from tauledger.answers.answer import Subject
from tauledger.answers.at import at_facts
from tauledger.answers.peaking import peak_facts
from tauledger.asked import Asked
from tauledger.circuit import NO_CHANGE, Change, Port
from tauledger.devices.parts import capacitance, resistance, transconductance, voltage_source
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.explain import NOTHING
from tauledger.netlist import read
from tauledger.network.agreement import Agreement
from tauledger.network.assemble import Network
from tauledger.numbers import Numbers, solve
from tauledger.pipeline import review, review_network
from tauledger.record import AtFacts, PeakFacts

FIXTURES = Path(__file__).parents[2] / "fixtures"
FOLLOWER = FIXTURES / "line_follower.cir"


def at(board: str, hz: float, engine: Engine) -> AtFacts:
    (facts,) = review(FIXTURES / board, engine=engine, asked=Asked(at_hz=(hz,))).at
    return facts


@pytest.mark.parametrize(
    ("board", "output", "hz"),
    [
        ("photo_front.cir", "v(out)", 3e8),
        ("tia_pair.cir", "v(out)", 2e7),
        ("opamp_filter.cir", "v(adc)", 3e4),
        ("line_follower.cir", "v(out)", 1e7),
        ("series_shunt.cir", "v(out)", 2e7),
        ("cable_driver.cir", "v(out)", 20.0),
        ("servo_gain.cir", "v(out)", 1e7),
    ],
)
def test_gain_and_phase_are_those_of_ngspice_on_the_netlist_as_written(
    board: str, output: str, hz: float, engine: Engine, tmp_path: Path
) -> None:
    facts = at(board, hz, engine)
    ran = judge(FIXTURES / board, tmp_path, output, hz, 1.01 * hz).output[0]
    assert facts.simulated_db == pytest.approx(20.0 * math.log10(abs(ran)), abs=1e-3)
    assert facts.simulated_deg is not None
    turns = (facts.simulated_deg - math.degrees(np.angle(ran))) / 360.0
    assert turns == pytest.approx(round(turns), abs=1e-5)
    assert facts.exact_db == pytest.approx(facts.simulated_db, abs=1e-6)
    assert facts.exact_deg == pytest.approx(facts.simulated_deg, abs=1e-3)
    assert facts.exact_beyond_deg == pytest.approx(facts.simulated_beyond_deg, abs=1e-3)


def test_the_phase_goes_on_beyond_a_turn() -> None:
    """Five equal poles at ten times their frequency: 5·84.3°, not what is left of it after a turn."""
    parts = [voltage_source("VS", "n0", "0", 1.0)]
    for k in range(5):
        out = f"n{k + 1}"
        parts += [
            transconductance(f"A{k}", ("0", out), (f"n{k}", "0"), 1e-2, label="gm"),
            resistance(f"R{k}", out, "0", 1e3),
            capacitance(f"C{k}", out, "0", 1e-9),
        ]
    pole = 1.0 / (2.0 * math.pi * 1e-6)
    network = Network.from_parts(parts, output=Port("n5"))
    (facts,) = review_network(network, asked=Asked(at_hz=(10.0 * pole,))).at
    assert facts.exact_beyond_deg == pytest.approx(-5.0 * math.degrees(math.atan(10.0)))
    assert (facts.simulated_db, facts.simulated_deg, facts.simulated_beyond_deg) == (None, None, None)


@pytest.mark.parametrize(("name", "value"), [("CF", 4e-15), ("CPD", 1.5e-12), ("CL", 150e-15)])
def test_what_an_element_does_there_is_what_ngspice_says_of_the_changed_card(
    name: str, value: float, engine: Engine
) -> None:
    board, hz, step = "photo_front.cir", 3e8, 0.01
    one = next(element for element in at(board, hz, engine).elements if element.name == name)
    ran = []
    for by in (step, -step):
        change = Change(elements=((name, value * math.exp(by)),))
        ran.append(review(FIXTURES / board, engine=engine, change=change, asked=Asked(at_hz=(hz,))).at[0])
    more, less = ran
    assert more.simulated_db is not None
    assert less.simulated_db is not None
    gain = (more.simulated_db - less.simulated_db) / (20.0 * math.log10(math.e)) / (2.0 * step)
    assert one.gain == pytest.approx(gain, abs=1e-3)
    assert more.simulated_deg is not None
    assert less.simulated_deg is not None
    assert 100.0 * one.phase_deg == pytest.approx((more.simulated_deg - less.simulated_deg) / (2.0 * step), abs=0.05)


@pytest.mark.parametrize("hz", [0.0, 2e12])
def test_nothing_is_looked_at_where_ngspice_has_no_answer(hz: float, engine: Engine) -> None:
    with pytest.raises(InputError, match="no frequency to look at"):
        at("echo_preamp.cir", hz, engine)


def untrusted(numbers: Numbers) -> Numbers:
    return replace(numbers, agreement=Agreement(0.1, 1e3, 100))


def test_a_network_that_is_not_trusted_leaves_the_figures_of_ngspice_alone(engine: Engine) -> None:
    netlist = read(FOLLOWER)
    numbers = solve(netlist, NO_CHANGE, engine)
    whole = at_facts(Subject(numbers, NOTHING, netlist, NO_CHANGE, engine), (3e7,))[0]
    left = at_facts(Subject(untrusted(numbers), NOTHING, netlist, NO_CHANGE, engine), (3e7,))[0]
    assert left.simulated_db == whole.simulated_db
    assert left.simulated_deg == pytest.approx(whole.simulated_deg)
    assert (left.exact_db, left.exact_deg, left.elements) == (None, None, ())
    assert peak_facts(Subject(untrusted(numbers), NOTHING, netlist, NO_CHANGE, engine)) == ()


def peak(engine: Engine, change: Change = NO_CHANGE) -> PeakFacts:
    (facts,) = review(FOLLOWER, engine=engine, change=change, asked=Asked(peaking=True)).peaking
    return facts


def test_the_peak_of_a_follower_into_a_capacitance_is_that_of_ngspice(engine: Engine, tmp_path: Path) -> None:
    facts = peak(engine)
    ran = np.abs(judge(FOLLOWER, tmp_path, "v(out)", 1e3, 1e8).output)
    assert facts.edge == "f_high"
    assert facts.simulated_db == pytest.approx(20.0 * math.log10(ran.max() / ran[0]), abs=1e-3)
    assert facts.exact_db == pytest.approx(facts.simulated_db, abs=1e-5)
    assert facts.exact_at_hz == pytest.approx(facts.simulated_at_hz, rel=1e-3)


def test_what_makes_the_peak_is_what_ngspice_says_of_a_changed_card(engine: Engine) -> None:
    facts = peak(engine)
    one = next(element for element in facts.elements if element.name == "CL")
    step = 0.01
    more, less = (peak(engine, Change(elements=(("CL", 680e-12 * math.exp(by)),))) for by in (step, -step))
    assert more.simulated_db is not None
    assert less.simulated_db is not None
    assert 100.0 * one.peaking_db == pytest.approx((more.simulated_db - less.simulated_db) / (2.0 * step), rel=1e-3)


def test_the_first_two_of_the_peak_were_computed_again(engine: Engine) -> None:
    facts = peak(engine)
    assert [one.rerun_db is not None for one in facts.elements] == [True, True, *[False] * (len(facts.elements) - 2)]
    sizes = [abs(one.peaking_db) for one in facts.elements]
    assert sizes == sorted(sizes, reverse=True)
    for one in facts.elements[:2]:
        assert one.rerun_db is not None
        assert one.rerun_db - facts.exact_db == pytest.approx(-10.0 * one.peaking_db, rel=0.15)


def test_an_amplifier_without_a_peak_has_nothing_to_tell(engine: Engine) -> None:
    assert review(FIXTURES / "echo_preamp.cir", engine=engine, asked=Asked(peaking=True)).peaking == ()
