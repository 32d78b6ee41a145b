"""Miller's factor over frequency: what the page's frequency cursor shows."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauledger.asked import Asked
from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.explain import explain
from tauledger.hand.at_edge import edge_factors, factors_over
from tauledger.netlist import read
from tauledger.pipeline import review, solve

FIXTURES = Path(__file__).parents[2] / "fixtures"
MILLER = Asked(miller=True)


@pytest.mark.parametrize("netlist", ["echo_preamp", "gain_pair", "pair", "mos_gain"])
def test_at_mid_band_it_is_the_factor_of_the_budget_and_it_turns_towards_one(engine: Engine, netlist: str) -> None:
    found = review(FIXTURES / f"{netlist}.cir", engine=engine, asked=MILLER)
    assert found.miller is not None
    assert 2 <= len(found.miller.frequency_hz) <= 60
    assert list(found.miller.frequency_hz) == sorted(set(found.miller.frequency_hz))
    largest = found.miller.curves[0]
    start = complex(largest.factor_real[0], largest.factor_imag[0])
    end = complex(largest.factor_real[-1], largest.factor_imag[-1])
    assert start.real == pytest.approx(largest.factor, rel=0.05)
    assert abs(end) < abs(start)
    rows = {node.name for node in found.nodes}
    assert {curve.row for curve in found.miller.curves} <= rows


def test_its_points_are_points_of_the_sweep_so_that_nothing_is_read_between_them(engine: Engine) -> None:
    found = review(FIXTURES / "cable_driver.cir", engine=engine, asked=MILLER)
    assert found.miller is not None
    assert found.curves is not None
    assert set(found.miller.frequency_hz) <= set(found.curves.frequency_hz)
    assert found.f_high is not None
    assert found.f_high.exact_hz is not None
    assert found.miller.frequency_hz[0] < found.f_high.exact_hz < found.miller.frequency_hz[-1]


def test_it_is_the_factor_at_the_edge_there(engine: Engine) -> None:
    numbers = solve(read(FIXTURES / "echo_preamp.cir"), NO_CHANGE, engine)
    explanation = explain(numbers)
    assert explanation.hand is not None
    hz = np.array([1e5, 7e5, 3e6])
    many = factors_over(numbers.bands, explanation.hand.nodes, hz)
    for k, one in enumerate(hz):
        for place, factor in edge_factors(numbers.bands, explanation.hand.nodes, float(one)).items():
            assert many[place][k] == pytest.approx(factor, rel=1e-12)


def test_a_capacitance_to_ground_behind_a_coil_has_no_factor(engine: Engine) -> None:
    """The coil is a short at mid-band, and the load behind it lies at ground with its other end."""
    found = review(FIXTURES / "cable_driver.cir", engine=engine, asked=MILLER)
    assert found.miller is not None
    assert "CL" not in {curve.part for curve in found.miller.curves}
    terms = {term.part: term for node in found.nodes if node.working for term in node.working.capacitances}
    assert terms["CL"].edge_factor_real is None


def test_it_is_only_worked_out_where_it_was_asked_for(engine: Engine) -> None:
    assert review(FIXTURES / "echo_preamp.cir", engine=engine).miller is None
