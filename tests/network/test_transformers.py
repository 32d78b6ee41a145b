"""Two windings drawn out as leakage, magnetising inductance and turns are the same network."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import amplifiers
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, inductance, mutual_inductance, resistance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.bands import classify
from tauledger.network.midband import find_midband
from tauledger.network.solve import response
from tauledger.network.transformers import drawn_out

DRIVE = voltage_source("VS", "in", "0", 1.0)


def coupled(k: float, l1: float, l2: float, *, ends: tuple[str, str, str, str] = ("p", "0", "s", "0")) -> list[Part]:
    a, b, c, d = ends
    return [
        inductance("L1", a, b, l1),
        inductance("L2", c, d, l2),
        mutual_inductance("K1", "L1", "L2", ends, k * (l1 * l2) ** 0.5),
    ]


def line_input(k: float = 0.999, l1: float = 20e-3, l2: float = 80e-3) -> Network:
    """A line transformer 1 : 2 from 150 Ω into 10 kΩ and 200 pF."""
    return amplifiers.network(
        resistance("RS", "in", "p", 150.0),
        *coupled(k, l1, l2),
        resistance("RL", "s", "0", 10e3),
        capacitance("CL", "s", "0", 200e-12),
        output="s",
    )


@settings(max_examples=25, deadline=None, derandomize=True)
@given(
    k=st.floats(0.901, 0.9999),
    negative=st.booleans(),
    l1=st.floats(1e-6, 1e-2),
    ratio=st.floats(0.01, 100.0),
    ends=st.sampled_from([("p", "0", "s", "0"), ("0", "p", "s", "0"), ("p", "q", "s", "0"), ("p", "0", "s", "q")]),
)
def test_the_drawn_out_network_has_the_same_response(
    k: float, negative: bool, l1: float, ratio: float, ends: tuple[str, str, str, str]
) -> None:
    network = Network.from_parts(
        [
            DRIVE,
            resistance("RS", "in", "p", 50.0),
            *coupled(-k if negative else k, l1, l1 * ratio, ends=ends),
            resistance("RQ", "q", "0", 220.0),
            resistance("RL", "s", "0", 1e3),
            capacitance("CL", "s", "q", 1e-9),
        ],
        output=Port("s"),
    )
    drawn = drawn_out(network)
    assert not any(part.kind == "mutual inductance" for part in drawn.parts)
    frequency = np.geomspace(10.0, 1e9, 41)
    expected, found = response(network, frequency), response(drawn, frequency)
    assert np.allclose(found, expected, rtol=1e-6, atol=1e-7 * np.abs(expected).max())


def test_the_three_values_are_those_of_the_textbook() -> None:
    drawn = drawn_out(line_input(k=0.99))
    assert drawn.part("L1.l_m").value == pytest.approx(0.99**2 * 20e-3)
    assert drawn.part("K1.l_leak").value == pytest.approx((1.0 - 0.99**2) * 20e-3)
    assert drawn.part("L2.turns").value == pytest.approx(2.0 / 0.99)


def test_ideal_coupling_leaves_no_leakage() -> None:
    names = {part.name for part in drawn_out(line_input(k=1.0)).parts}
    assert "L1.l_m" in names
    assert "K1.l_leak" not in names


def test_an_untuned_transformer_is_open_across_and_short_along_at_midband() -> None:
    network = drawn_out(line_input())
    bands = classify(network, find_midband(network))
    assert (bands.class_of["L1.l_m"], bands.class_of["K1.l_leak"]) == ("open", "short")
    assert bands.sound


def test_loosely_coupled_tuned_circuits_stay_as_they_are_and_tuned() -> None:
    network = Network.from_parts(
        [
            DRIVE,
            resistance("RS", "in", "p", 50e3),
            *coupled(0.02, 1e-3, 1e-3),
            capacitance("C1", "p", "0", 1e-9),
            capacitance("C2", "s", "0", 1e-9),
            resistance("RL", "s", "0", 50e3),
        ],
        output=Port("s"),
    )
    assert drawn_out(network) is network
    bands = classify(network, find_midband(network))
    assert {bands.class_of[name] for name in ("L1", "L2")} == {"tuned"}


def test_a_winding_coupled_with_two_others_stays_as_it_is() -> None:
    parts = [DRIVE, resistance("RS", "in", "p", 50.0), *coupled(0.99, 1e-3, 1e-3), inductance("L3", "t", "0", 1e-3)]
    parts.append(mutual_inductance("K2", "L1", "L3", ("p", "0", "t", "0"), 0.5e-3))
    parts += [resistance("RL", "s", "0", 1e3), resistance("RT", "t", "0", 1e3)]
    network = Network.from_parts(parts, output=Port("s"))
    assert drawn_out(network) is network
