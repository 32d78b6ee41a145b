"""Transistors by keyword calls, and published networks reviewed directly through them."""

from __future__ import annotations

import math

import pytest

import tauledger
from tauledger import Review, bipolar, capacitance, field_effect, resistance, review_elements, voltage_source
from tauledger.errors import InputError


def sum_of_time_constants(review: Review) -> float:
    hz = next(row.hz for row in review.estimates if row.method == "sum of time constants")
    assert hz is not None
    return hz


def test_common_emitter_kumar_and_jain_10_7() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.7: A_V0 -43.8, omega_H 77.05 Mrad/s by time constants."""
    gm, c_mu = 40e-3, 0.5e-12
    review = review_elements(
        voltage_source("VIN", "s", "0", 1.0),
        resistance("RS", "s", "b", 300),
        bipolar(
            "Q1",
            base="b",
            collector="out",
            emitter="0",
            gm=gm,
            r_pi=125 / gm,
            c_pi=gm / (2 * math.pi * 300e6) - c_mu,
            c_mu=c_mu,
        ),
        resistance("RC", "out", "0", 1200),
        output="out",
        title="Ex. 10.7",
    )
    assert review.engine is None
    assert review.midband.gain_real == pytest.approx(-43.8, rel=2e-3)
    assert 2 * math.pi * sum_of_time_constants(review) == pytest.approx(77.05e6, rel=2e-4)
    assert [node.title for node in review.nodes][:1] == ["base of Q1 (b)"]
    assert review.stages[-1].role == "common emitter"
    assert "No simulation" in tauledger.render(review, color=False, unicode=True)


def test_common_source_sedra_and_smith_style() -> None:
    """Practice values in their style: R_sig 5 kohm, g_m 2 mA/V, R_L' 20 kohm, C_gs 100 fF, C_gd 30 fF: 23.9 MHz."""
    review = review_elements(
        voltage_source("VIN", "s", "0", 1.0),
        resistance("RS", "s", "g", 5e3),
        field_effect("M1", gate="g", drain="out", source="0", gm=2e-3, c_gs=100e-15, c_gd=30e-15),
        resistance("RL", "out", "0", 20e3),
        capacitance("CL", "out", "0", 50e-15),
        output="out",
    )
    assert review.f_high is not None
    assert review.f_high.hand_hz == pytest.approx(23.9e6, rel=2e-3)
    assert review.f_high.simulated_hz is None
    assert review.stages[-1].role == "common source"


def test_base_resistance_stands_before_the_capacitances() -> None:
    device = bipolar("Q1", base="b", collector="c", emitter="e", gm=0.04, r_b=50, c_pi=1e-12, c_cs=1e-12)
    at = {part.label: part.nodes for part in device.parts}
    assert at["g_b"] == ("b", "Q1'b")
    assert at["c_pi"] == ("Q1'b", "e")
    assert at["c_sub"] == ("c", "0")
    assert "c_mu" not in at


def test_what_is_joined_is_left_out() -> None:
    device = bipolar("Q1", base="c", collector="c", emitter="0", gm=0.04, r_pi=2.5e3, c_mu=1e-12)
    assert {part.label for part in device.parts} == {"gm", "g_pi"}


@pytest.mark.parametrize(
    ("values", "told"),
    [({"gm": -0.04}, "gm"), ({"gm": 0.04, "r_pi": 0.0}, "r_pi"), ({"gm": 0.04, "c_mu": math.nan}, "c_mu")],
)
def test_a_value_that_is_not_positive_is_refused_by_name(values: dict[str, float], told: str) -> None:
    with pytest.raises(InputError, match=f"Q1: {told} = "):
        bipolar("Q1", base="b", collector="c", emitter="0", **values)
