"""Feedback that paper may pass over: a loop, and a capacitance whose far end follows; a case and a near miss each."""

from __future__ import annotations

import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence as by_algebra
from cells import bands_of, bipolar
from tauledger.causes.catalogue import find_causes
from tauledger.causes.evidence import Evidence
from tauledger.causes.feedback_ignored import loop_ignored, positive_gain_bridging
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, voltage_source
from tauledger.hand.budget import signal_nodes
from tauledger.network.assemble import Network


def worked(*items: Part | Device) -> Evidence:
    """The evidence of a network with its nodes worked by the hand room, not by algebra."""
    devices = tuple(item for item in items if isinstance(item, Device))
    parts = [voltage_source("VS", "s", "0", 1.0)]
    for item in items:
        parts += item.parts if isinstance(item, Device) else [item]
    network = Network.from_parts(parts, output=Port("out"))
    return replace(by_algebra(network, devices=devices), nodes=signal_nodes(bands_of(network), devices))


def shunt_feedback(r_f: float) -> Evidence:
    return worked(
        resistance("RS", "s", "b", 1e3),
        bipolar("Q1", ("out", "b", "0"), c_pi=20e-12),
        resistance("RF", "out", "b", r_f),
        resistance("RL", "out", "0", 2e3),
        capacitance("CL", "out", "0", 100e-12),
    )


def test_a_loop_that_lowers_the_output_resistance_is_told_with_both_values() -> None:
    """R at the output is R0/(1 + T); with R0 alone its time constant is 1 + T times too long."""
    found = shunt_feedback(10e3)
    cause = loop_ignored(found)
    assert cause is not None
    numbers = {number.name: number.value for number in cause.numbers}
    assert numbers["R by looking in"] > 3.0 * numbers["R with the loop"]
    assert cause.effect < -0.3
    assert "feedback makes R at" in cause.says
    assert cause in find_causes(found)


def test_feedback_too_weak_to_matter_is_no_loop() -> None:
    assert loop_ignored(shunt_feedback(100e6)) is None


def test_without_a_loop_there_is_none_to_ignore() -> None:
    assert loop_ignored(by_algebra(boards.common_source_100k())) is None


def follower(r_e: float, c_l: float = 50e-12) -> Evidence:
    return worked(
        resistance("RS", "s", "b", 5e3),
        bipolar("Q1", ("0", "b", "out"), c_pi=20e-12, c_mu=1e-12),
        resistance("RE", "out", "0", r_e),
        capacitance("CL", "out", "0", c_l),
    )


def test_a_bootstrapped_capacitance_counted_in_full_is_far_too_much() -> None:
    found = follower(1e3)
    cause = positive_gain_bridging(found)
    assert cause is not None
    k = next(number.value for number in cause.numbers if number.name == "K")
    assert k == pytest.approx(0.04 * 1e3 / (1 + 0.04 * 1e3), rel=0.02)
    assert cause.effect < -0.5
    assert "C_π of Q1 leads from" in cause.says
    assert cause in find_causes(found)


def test_a_common_emitter_bridges_with_negative_gain() -> None:
    assert positive_gain_bridging(by_algebra(boards.common_source_100k())) is None


def test_a_far_end_that_hardly_follows_is_left_alone() -> None:
    """R_E of 5 ohm: K = 0.17."""
    assert positive_gain_bridging(follower(5.0)) is None


def test_a_gain_above_one_is_said_to_act_as_negative() -> None:
    """K = 2: −0.4 pF at the input speeds the stage up, and paper with +0.4 pF comes out low."""
    cause = positive_gain_bridging(by_algebra(boards.gain_of_two()))
    assert cause is not None
    assert "(K = 2) and acts as -1 times itself" in cause.says
    assert cause.effect < 0.0
