"""What would help: free elements first, and the first three computed again."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Change, Port
from tauledger.compose.helps import helps
from tauledger.devices.parts import inductance, mutual_inductance, resistance, voltage_source
from tauledger.engine.client import Engine
from tauledger.network.assemble import Network
from tauledger.numbers import solve_network
from tauledger.pipeline import review
from tauledger.record import Help, Review
from tauledger.report.terminal import render

FIXTURES = Path(__file__).parents[2] / "fixtures"


@pytest.fixture(scope="module")
def preamp(engine: Engine) -> Review:
    return review(FIXTURES / "echo_preamp.cir", engine=engine)


def rank(one: Help) -> int:
    return 0 if one.free else 1 if one.moves_bias else 2


def test_free_cards_come_first_then_what_moves_the_bias_then_the_inside_of_devices(preamp: Review) -> None:
    assert [rank(one) for one in preamp.helps] == sorted(rank(one) for one in preamp.helps)
    by_name = {one.name: one for one in preamp.helps}
    assert by_name["CL"].free
    assert by_name["RS"].free
    assert by_name["R3"].moves_bias
    assert by_name["Q1.gm"].moves_bias
    assert not by_name["Q1.c_mu"].free


def test_the_first_three_are_computed_again_and_agree_to_second_order(preamp: Review) -> None:
    assert preamp.f_high is not None
    assert preamp.f_high.exact_hz is not None
    assert [one.gain_rerun is not None for one in preamp.helps] == [True] * 3 + [False] * (len(preamp.helps) - 3)
    for one in preamp.helps[:3]:
        assert one.f_high is not None
        assert one.f_high_rerun_hz is not None
        assert one.f_high_rerun_hz / preamp.f_high.exact_hz - 1 == pytest.approx(one.f_high, abs=0.01)
        assert one.gain_rerun == pytest.approx(one.gain, abs=0.005)


def test_ngspice_gives_the_same_with_ten_per_cent_less(preamp: Review, engine: Engine) -> None:
    """The card itself changed in the netlist: CL and RS leave the operating point alone."""
    for one in preamp.helps[:3]:
        changed = review(
            FIXTURES / "echo_preamp.cir", engine=engine, change=Change(elements=((one.name, 0.9 * one.value),))
        )
        assert changed.f_high is not None
        assert changed.f_high.simulated_hz == pytest.approx(one.f_high_rerun_hz, rel=1e-4)


def test_the_terminal_shows_it_on_request_and_says_what_was_recomputed(preamp: Review) -> None:
    plain = render(preamp, color=False, unicode=True)
    assert "WHAT WOULD HELP" not in plain
    shown = render(preamp, color=False, unicode=True, verbose=True)
    table = shown[shown.index("WHAT WOULD HELP") :].split("\n\n")[0]
    assert table.count("recomputed") == 3
    assert "operating point held" in table
    assert max(map(len, table.splitlines())) <= 80


def test_the_inductances_of_a_transformer_are_free_to_choose() -> None:
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            resistance("RS", "in", "p", 150.0),
            inductance("L1", "p", "0", 20e-3),
            inductance("L2", "out", "0", 80e-3),
            mutual_inductance("K1", "L1", "L2", ("p", "0", "out", "0"), 0.999 * 40e-3),
            resistance("RL", "out", "0", 600.0),
        ],
        output=Port("out"),
    )
    found = {one.name: one for one in helps(solve_network(network))}
    assert found["L1.l_m"].free
    # f_L = R/(2π·L_m), f_H = R/(2π·L_leak): 10 % less of either raises its edge by 10 %
    assert found["L1.l_m"].f_low == pytest.approx(0.1, rel=0.01)
    assert found["K1.l_leak"].f_high == pytest.approx(0.1, rel=0.01)
