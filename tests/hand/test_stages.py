"""The chain of stages: signal order, roles, and gains that multiply to the whole."""

from __future__ import annotations

import math

import pytest

import boards
from cells import bands_of, bipolar, board, near
from tauledger.circuit import Port
from tauledger.devices.parts import current_source, resistance
from tauledger.hand.stages import stage_rows
from tauledger.network.assemble import Network

CHAINS = [
    boards.cascode,
    boards.two_common_source_stages,
    boards.two_common_emitter_stages,
    boards.emitter_follower,
    boards.common_gate,
    boards.follower_then_common_source_low_edge,
]


@pytest.mark.parametrize("make", CHAINS, ids=lambda make: make.__name__)
def test_the_gains_of_the_chain_multiply_to_the_midband_gain(make: object) -> None:
    assert callable(make)
    network: Network = make()
    bands = bands_of(network)
    rows = stage_rows(bands, ())
    for gains in ([row.gain_hand for row in rows], [row.gain_exact for row in rows]):
        assert math.prod(gain for gain in gains if gain is not None) == near(bands.midband.gain.real, rel=1e-6)
        assert None not in gains


def test_nodes_come_in_signal_order_and_not_in_that_of_the_file() -> None:
    bands, devices = board(
        resistance("RL", "out", "0", 2e3),
        bipolar("Q2", ("out", "m", "0")),
        resistance("R1", "m", "0", 1e3),
        bipolar("Q1", ("m", "b", "0")),
        resistance("RS", "s", "b", 1e3),
    )
    assert [row.node for row in stage_rows(bands, devices)] == ["b", "m", "out"]


def test_a_feedback_resistor_does_not_turn_the_order_round() -> None:
    bands, devices = board(
        resistance("RF", "out", "b", 10e3),
        resistance("RL", "out", "0", 2e3),
        bipolar("Q1", ("out", "b", "0")),
        resistance("RS", "s", "b", 1e3),
    )
    rows = stage_rows(bands, devices)
    assert [row.node for row in rows] == ["b", "out"]
    assert rows[1].role == "common emitter"
    assert rows[1].owner == "Q1"


def test_a_cascode_is_a_common_emitter_into_a_common_base() -> None:
    bands, devices = board(
        resistance("RS", "s", "b", 1e3),
        bipolar("Q1", ("x", "b", "0")),
        bipolar("Q2", ("out", "0", "x")),
        resistance("RL", "out", "0", 2e3),
    )
    rows = stage_rows(bands, devices)
    assert [(row.node, row.role, row.owner) for row in rows] == [
        ("b", "passive", ""),
        ("x", "common emitter", "Q1"),
        ("out", "common base", "Q2"),
    ]


def test_from_a_current_source_the_first_gain_is_in_ohm() -> None:
    network = Network.from_parts(
        [
            current_source("IS", "0", "b", 1.0),
            resistance("RB", "b", "0", 1e3),
            *boards.stage("Q1", "b", "out", "0", 0.04, r_pi=3750.0),
            resistance("RL", "out", "0", 2e3),
        ],
        output=Port("out"),
    )
    first, second = stage_rows(bands_of(network), ())
    assert first.gain_hand == near(1e3 * 3750 / 4750)
    assert second.gain_hand == near(-80.0)


def test_a_stage_driven_directly_has_its_whole_gain_in_the_first_row() -> None:
    network = boards.driven(*[boards.stage("Q1", "s", "out", "0", 0.04)], resistance("RL", "out", "0", 2e3))
    (row,) = stage_rows(bands_of(network), ())
    assert row.gain_hand == near(-80.0)
    assert row.gain_exact == near(-80.0)
