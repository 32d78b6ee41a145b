"""Hand tables of a charge amplifier, whose mid-band gain is set by capacitors."""

from __future__ import annotations

import math

import pytest

import amplifiers
from tauledger.devices.parts import capacitance, resistance, transconductance
from tauledger.network.assemble import Network
from tauledger.pipeline import review_network
from tauledger.record import Review
from tauledger.report.terminal import render

A = 1e4


def charge_amplifier() -> Network:
    return amplifiers.network(
        capacitance("CS", "in", "n", 1e-9),
        resistance("RF", "n", "out", 1e9),
        capacitance("CF", "n", "out", 100e-12),
        transconductance("GA", ("x", "0"), ("n", "0"), 1e-3),
        resistance("RX", "x", "0", 1e6),
        capacitance("CX", "x", "0", 100e-12),
        transconductance("GB", ("out", "0"), ("x", "0"), -10.0),
        resistance("RO", "out", "0", 1.0),
    )


@pytest.fixture(scope="module")
def found() -> Review:
    return review_network(charge_amplifier())


def test_upper_edge_by_hand_is_the_loop_s(found: Review) -> None:
    # f_H = (1 + A·β)/(2πR_X·C_X) with β = C_F/(C_F + C_S)
    assert found.f_high is not None
    expected = (1.0 + A / 11.0) / (2.0 * math.pi * 1e6 * 100e-12)
    assert found.f_high.hand_hz == pytest.approx(expected, rel=0.01)
    assert found.f_high.exact_hz == pytest.approx(expected, rel=0.01)


def test_lower_edge_by_hand_belongs_to_the_feedback_capacitor(found: Review) -> None:
    assert found.f_low is not None
    assert found.f_low.hand_hz == pytest.approx(1.0 / (2.0 * math.pi * 1e9 * 100e-12), rel=0.01)
    row = next(part for part in found.parts if part.name == "CF")
    assert row.klass == "gain"
    assert row.edge_hz == pytest.approx(found.f_low.exact_hz, rel=0.01)
    assert row.resistance_exact_ohm == pytest.approx(1e9, rel=0.01)


def test_node_rows_add_to_the_poles_above_mid_band(found: Review) -> None:
    assert found.budget.upper is not None
    exact = math.fsum(node.time_constant_exact_s or 0.0 for node in found.nodes)
    assert exact == pytest.approx(found.budget.upper.inverse_pole_sum_s, rel=1e-6)


def test_page_says_which_capacitors_set_the_gain(found: Review) -> None:
    assert "CS, CF set the mid-band gain" in " ".join(render(found, color=False, unicode=True).split())
