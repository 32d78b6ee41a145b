"""A measured curve beside ngspice: bench data that ngspice made itself, with a stray that is known."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauledger.asked import Asked, MeasuredCurve
from tauledger.circuit import NO_CHANGE, Change, Load, Port
from tauledger.devices.parts import capacitance, resistance, voltage_source
from tauledger.engine.client import Engine
from tauledger.netlist import elaborate, read
from tauledger.network.assemble import Network
from tauledger.pipeline import review, review_network
from tauledger.record import CurveFacts

FIXTURES = Path(__file__).parents[2] / "fixtures"
FREQUENCY = np.geomspace(100.0, 20e6, 41)


def bench(
    engine: Engine, netlist: str, change: Change = NO_CHANGE, *, db: float = 0.0, deg: float = 0.0, drive: str = ""
) -> MeasuredCurve:
    """What a bench would read of a board with a change: ngspice's own response, moved by db and deg."""
    engine.operating_point(elaborate(read(FIXTURES / netlist), change, drive=drive or None))
    h = engine.sweep(FREQUENCY).response
    phase = np.degrees(np.angle(h)) + deg
    gain = 20.0 * np.log10(np.abs(h)) + db
    return MeasuredCurve("bench.csv", tuple(FREQUENCY.tolist()), tuple(gain.tolist()), tuple(phase.tolist()))


def compared(engine: Engine, netlist: str, curve: MeasuredCurve) -> CurveFacts:
    found = review(FIXTURES / netlist, engine=engine, asked=Asked(curve=curve)).curve
    assert found is not None
    return found


def with_stray(plus: str, minus: str, farad: float) -> Change:
    return Change(loads=(Load("C", plus, minus, farad),))


@pytest.mark.parametrize(
    ("netlist", "plus", "minus", "farad", "same_place"),
    [
        ("echo_preamp.cir", "out", "0", 12e-12, {"c", "out"}),
        ("echo_preamp.cir", "b", "0", 47e-12, {"b", "in"}),
        ("echo_preamp.cir", "b", "out", 0.8e-12, {"b", "out"}),
        ("gain_pair.cir", "c1", "0", 9e-12, {"c1"}),
        ("mos_gain.cir", "out", "0", 5e-12, {"out"}),
    ],
)
def test_a_known_stray_is_found_at_its_node_with_its_value(
    engine: Engine, netlist: str, plus: str, minus: str, farad: float, same_place: set[str]
) -> None:
    found = compared(engine, netlist, bench(engine, netlist, with_stray(plus, minus, farad)))
    assert found.explains == "stray"
    best = found.strays[0]
    assert {best.plus, best.minus} <= same_place | {minus}
    assert best.capacitance_f == pytest.approx(farad, rel=0.01, abs=0.0)
    assert best.rerun
    assert found.rms_db is not None
    assert best.rms_db < 0.01 * found.rms_db


def test_a_curve_of_ngspice_itself_finds_nothing(engine: Engine) -> None:
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir"))
    assert found.explains == "nothing to explain"
    assert found.strays == ()
    assert found.leaves == ()
    assert abs(found.largest_db) < 1e-6
    assert {figure.figure for figure in found.figures} == {"f_low", "f_high"}
    for figure in found.figures:
        assert figure.measured_hz == pytest.approx(figure.simulated_hz, rel=1e-4)


def test_level_and_turns_of_the_bench_are_taken_out_and_told(engine: Engine) -> None:
    """A probe of 10:1 and a reversed input are no differences of the circuit."""
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", db=-20.0, deg=540.0))
    assert found.offset_db == pytest.approx(-20.0)
    assert found.offset_deg is not None
    assert abs(found.offset_deg) == pytest.approx(180.0)
    assert found.leaves == ()
    assert found.explains == "nothing to explain"


def test_unity_gain_is_compared_at_the_level_of_the_simulation(engine: Engine) -> None:
    """With a probe of 10:1 the bare curve would cross 0 dB a decade too early."""
    found = compared(engine, "mos_gain.cir", bench(engine, "mos_gain.cir", db=-20.0))
    (unity,) = (figure for figure in found.figures if figure.figure == "f_unity")
    assert unity.simulated_hz is not None
    assert unity.measured_hz == pytest.approx(unity.simulated_hz, rel=1e-3)


def test_more_than_any_stray_explains_nothing(engine: Engine) -> None:
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", with_stray("out", "0", 100e-9)))
    assert all(stray.capacitance_f < 10e-9 for stray in found.strays)


def test_a_wider_band_than_simulated_is_no_stray(engine: Engine) -> None:
    less = Change(elements=(("CL", 1e-12),))
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", less))
    assert found.explains == "no single capacitance"
    assert found.strays == ()


def test_a_difference_below_mid_band_is_told_and_no_stray_is_made_of_it(engine: Engine) -> None:
    aged = Change(elements=(("C2", 2.2e-6),))
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", aged))
    assert [(place.side) for place in found.leaves] == ["below"]
    assert found.explains == "nothing to explain"
    low = next(figure for figure in found.figures if figure.figure == "f_low")
    assert low.simulated_hz is not None
    assert low.measured_hz > 1.8 * low.simulated_hz


def test_where_it_leaves_lies_between_the_last_point_inside_and_the_first_outside(engine: Engine) -> None:
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", with_stray("out", "0", 47e-12)))
    (place,) = found.leaves
    outside = [
        point for point in found.points if abs(point.difference_db) > 1.0 or abs(point.difference_deg or 0) > 5.0
    ]
    inside = [point for point in found.points if point.frequency_hz < outside[0].frequency_hz]
    assert inside[-1].frequency_hz < place.frequency_hz < outside[0].frequency_hz


def test_the_measured_edges_are_those_of_the_board_with_its_stray(engine: Engine) -> None:
    change = with_stray("out", "0", 12e-12)
    found = compared(engine, "echo_preamp.cir", bench(engine, "echo_preamp.cir", change, db=0.6))
    stray = review(FIXTURES / "echo_preamp.cir", engine=engine, change=change)
    assert stray.f_high is not None
    high = next(figure for figure in found.figures if figure.figure == "f_high")
    assert high.measured_hz == pytest.approx(stray.f_high.simulated_hz, rel=2e-3)
    assert found.strays[0].f_high_rerun_hz == pytest.approx(stray.f_high.simulated_hz, rel=1e-3)


def test_the_engine_holds_the_deck_of_the_netlist_again_afterwards(engine: Engine) -> None:
    curve = bench(engine, "echo_preamp.cir", with_stray("out", "0", 12e-12))
    found = review(FIXTURES / "echo_preamp.cir", engine=engine, asked=Asked(curve=curve))
    assert found.curve is not None
    assert found.curve.strays
    again = engine.sweep(np.array([found.curve.points[30].frequency_hz])).response
    assert 20.0 * np.log10(np.abs(again[0])) == pytest.approx(found.curve.points[30].reference_db, abs=1e-9)


def test_a_curve_that_ends_below_mid_band_has_no_stray_and_its_own_level(engine: Engine) -> None:
    whole = bench(engine, "echo_preamp.cir", db=1.5)
    few = MeasuredCurve("bench.csv", whole.frequency_hz[:8], whole.gain_db[:8], None)
    found = compared(engine, "echo_preamp.cir", few)
    assert found.explains == "not sought"
    assert found.rms_db is None
    assert found.level_from_hz == found.level_to_hz == whole.frequency_hz[7]
    assert found.offset_db == pytest.approx(1.5)
    assert found.largest_deg is None


def test_a_network_without_engine_is_set_beside_its_exact_response() -> None:
    def network(farad: float) -> Network:
        parts = [
            voltage_source("VS", "s", "0", 1.0),
            resistance("RS", "s", "a", 1e3),
            resistance("RM", "a", "out", 20e3),
            capacitance("CA", "a", "0", 50e-12),
            capacitance("CO", "out", "0", farad),
        ]
        return Network.from_parts(parts, output=Port("out"))

    plain = review_network(network(15e-12), asked=Asked(curve=None))
    assert plain.curves is not None
    curve = MeasuredCurve("bench.csv", plain.curves.frequency_hz, plain.curves.exact_db or (), None)
    found = review_network(network(10e-12), asked=Asked(curve=curve)).curve
    assert found is not None
    assert found.against == "exact"
    (best, *_) = found.strays
    assert (best.plus, best.minus, best.rerun) == ("out", "0", False)
    assert best.capacitance_f == pytest.approx(5e-12, rel=0.01, abs=0.0)
