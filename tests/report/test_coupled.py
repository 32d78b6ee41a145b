"""Closely coupled inductors are a transformer, others are told as coupled; a tuned circuit beside them resonates."""

from __future__ import annotations

from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    inductance,
    mutual_inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.pipeline import review_network
from tauledger.report.terminal import render


def words(*parts: Part) -> str:
    drive = voltage_source("VS", "in", "0", 1.0)
    review = review_network(Network.from_parts([drive, *parts], output=Port("out")))
    return " ".join(render(review, color=False, unicode=True).split())


def test_a_transformer_is_told_by_what_it_does_to_the_band() -> None:
    said = words(
        resistance("RS", "in", "p", 50.0),
        inductance("L1", "p", "0", 1e-3),
        inductance("L2", "out", "0", 4e-3),
        mutual_inductance("K1", "L1", "L2", ("p", "0", "out", "0"), 1.996e-3),
        resistance("RL", "out", "0", 300.0),
        capacitance("CL", "out", "0", 30e-12),
    )
    # 50 Ω ‖ 300 Ω/n² across 0.996 mH; 50 Ω + 300 Ω/n² along 4 µH
    assert "L_m of L1 996 µH 29.95 Ω 4.786 kHz at DC" in said
    assert "L_leak of K1, leakage inductance at node p 124.7 Ω 3.996 µH 32.04 ns" in said
    assert "coupled" not in said


def test_loosely_coupled_inductors_are_coupled_and_do_not_resonate() -> None:
    said = words(
        resistance("RS", "in", "p", 50.0),
        inductance("L1", "p", "0", 1e-3),
        inductance("L2", "out", "0", 4e-3),
        mutual_inductance("K1", "L1", "L2", ("p", "0", "out", "0"), 1.0e-3),
        resistance("RL", "out", "0", 300.0),
        capacitance("CL", "out", "0", 30e-12),
    )
    assert "L1, L2 are coupled" in said
    assert "resonate" not in said
    assert "resonance" not in said


def test_a_tank_resonates() -> None:
    said = words(
        transconductance("G1", ("out", "0"), ("in", "0"), 1e-3),
        resistance("RL", "out", "0", 50e3),
        inductance("LT", "out", "0", 1e-3),
        capacitance("CT", "out", "0", 1e-9),
    )
    assert "LT" in said
    assert "resonance" in said
    assert "coupled" not in said
