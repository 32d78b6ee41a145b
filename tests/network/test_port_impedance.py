"""Impedances that a source and a load see, against closed forms and against each other."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.circuit import Port
from tauledger.devices.parts import (
    capacitance,
    current_source,
    inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.network.port_impedance import (
    across,
    admittance_of,
    input_admittance,
    output_impedance,
    source_port,
)

HZ = np.array([10.0, 1e3, 1e5, 1e7])
S = 2j * np.pi * HZ


def stage() -> Network:
    parts = [
        voltage_source("VIN", "s", "0", 1.0),
        resistance("RS", "s", "b", 600.0),
        resistance("RB", "b", "0", 4e3),
        capacitance("CB", "b", "0", 40e-12),
        transconductance("G1", ("c", "0"), ("b", "0"), 0.04),
        capacitance("CF", "b", "c", 2e-12),
        resistance("RC", "c", "0", 3e3),
        capacitance("CL", "c", "0", 30e-12),
    ]
    return Network.from_parts(parts, output=Port("c"))


def miller() -> tuple[np.ndarray, np.ndarray]:
    """Y into b and Z out of c of `stage`, from two node equations."""
    y_b, y_c = 1 / 4e3 + S * 40e-12, 1 / 3e3 + S * 30e-12
    into = y_b + S * 2e-12 * (y_c + 0.04) / (y_c + S * 2e-12)
    at_b = y_b + 1 / 600.0
    out = y_c + S * 2e-12 * (at_b + 0.04) / (at_b + S * 2e-12)
    return into, 1 / out


def test_a_common_emitter_shows_its_miller_capacitance() -> None:
    network = stage()
    port = source_port(network, network.part("VIN"))
    assert (port.plus, port.minus) == ("b", "0")
    assert port.series is network.part("RS")
    into, _ = miller()
    assert input_admittance(network, port, HZ, series=False) == pytest.approx(into, rel=1e-10, abs=0)
    assert 1 / input_admittance(network, port, HZ, series=True) == pytest.approx(600.0 + 1 / into, rel=1e-10)


def test_the_output_shows_the_source_resistance_through_the_feedback_capacitance() -> None:
    assert output_impedance(stage(), HZ) == pytest.approx(miller()[1], rel=1e-10)


def test_taking_the_load_away_takes_its_admittance_off() -> None:
    network = stage()
    load = across(network, "c", "0")
    assert load == ("RC", "CL")
    alone = output_impedance(network, HZ, without=("CL",))
    assert 1 / alone + admittance_of(network, ("CL",), HZ) == pytest.approx(
        1 / output_impedance(network, HZ), rel=1e-10
    )


@given(st.floats(1.0, 1e6), st.floats(1e-13, 1e-6), st.floats(1e-9, 1e-2), st.floats(1.0, 1e6))
@settings(max_examples=30, deadline=None, derandomize=True)
def test_admittances_of_cards_in_parallel_add(ohm: float, farad: float, henry: float, series: float) -> None:
    cards = [resistance("R1", "a", "0", ohm), capacitance("C1", "a", "0", farad), inductance("L1", "a", "0", henry)]
    drive = [voltage_source("VIN", "s", "0", 1.0), resistance("RS", "s", "a", series)]
    network = Network.from_parts([*drive, *cards], output=Port("a"))
    names = across(network, "a", "0")
    assert set(names) == {"R1", "C1", "L1"}
    y = admittance_of(network, names, HZ)
    port = source_port(network, network.part("VIN"))
    assert input_admittance(network, port, HZ, series=False) == pytest.approx(y, rel=1e-6)
    assert 1 / output_impedance(network, HZ) == pytest.approx(y + 1 / series, rel=1e-6)


@pytest.mark.parametrize("turned", [False, True])
def test_a_current_source_sees_the_same_whichever_way_it_stands(turned: bool) -> None:
    ends = ("a", "0") if turned else ("0", "a")
    network = Network.from_parts(
        [current_source("IIN", *ends, 1e-3), resistance("R1", "a", "0", 50.0), capacitance("C1", "a", "0", 1e-9)],
        output=Port("a"),
    )
    port = source_port(network, network.part("IIN"))
    assert port.series is None
    assert input_admittance(network, port, HZ, series=True) == pytest.approx(1 / 50.0 + S * 1e-9)


def test_a_floating_source_has_its_resistor_at_either_end() -> None:
    for ends, resistor in ((("p", "n"), ("p", "a")), (("n", "p"), ("p", "a"))):
        network = Network.from_parts(
            [
                voltage_source("VIN", *ends, 2.0),
                resistance("RS", *resistor, 100.0),
                resistance("R1", "a", "n", 300.0),
                resistance("R2", "n", "0", 1e3),
            ],
            output=Port("a"),
        )
        port = source_port(network, network.part("VIN"))
        assert {port.plus, port.minus} == {"a", "n"}
        assert input_admittance(network, port, HZ, series=False) == pytest.approx(1 / 300.0)
        assert input_admittance(network, port, HZ, series=True) == pytest.approx(1 / 400.0)


def test_a_differential_output_is_seen_between_its_two_nodes() -> None:
    network = Network.from_parts(
        [
            voltage_source("VIN", "s", "0", 1.0),
            resistance("R1", "s", "p", 100.0),
            resistance("R2", "n", "0", 200.0),
            resistance("RL", "p", "n", 300.0),
        ],
        output=Port("p", "n"),
    )
    assert across(network, "p", "n") == ("RL",)
    assert output_impedance(network, HZ) == pytest.approx(150.0)
    assert output_impedance(network, HZ, without=("RL",)) == pytest.approx(300.0)


def test_a_gate_at_dc_has_an_admittance_of_nothing() -> None:
    network = Network.from_parts(
        [
            voltage_source("VIN", "g", "0", 1.0),
            capacitance("CGS", "g", "0", 1e-12),
            transconductance("M1", ("d", "0"), ("g", "0"), 1e-3),
            resistance("RD", "d", "0", 1e3),
        ],
        output=Port("d"),
    )
    port = source_port(network, network.part("VIN"))
    assert input_admittance(network, port, np.array([0.0]), series=True) == 0.0
