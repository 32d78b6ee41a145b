"""Short-circuit time constants and the zeros that each capacitor makes alone."""

from __future__ import annotations

import numpy as np
import pytest

import amplifiers
from tauledger.devices.parts import capacitance, inductance, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify, find_midband
from tauledger.network.lower import ShortConstant, ShortConstants, short_constants
from tauledger.network.spectrum import pole_frequencies


def bands_of(network: Network) -> Bands:
    return classify(network, find_midband(network))


def row(constants: ShortConstants, name: str) -> ShortConstant:
    return next(part for part in constants.parts if name in part.names)


def source_stage(*bypass: float) -> Network:
    """A field-effect stage with the given bypass capacitors across 1 kΩ, input and output coupled."""
    return amplifiers.network(
        capacitance("C1", "in", "g", 100e-9),
        resistance("RG", "g", "0", 1e6),
        transconductance("J", ("d", "s"), ("g", "s"), 5e-3, label="gm"),
        resistance("RS", "s", "0", 1e3),
        *(capacitance(f"CS{k}", "s", "0", farad) for k, farad in enumerate(bypass)),
        resistance("RD", "d", "0", 2e3),
        capacitance("C2", "d", "out", 1e-6),
        resistance("RL", "out", "0", 10e3),
        capacitance("CL", "out", "0", 100e-12),
    )


def test_a_bypass_sees_the_source_resistor_beside_one_over_gm_and_makes_its_zero_with_the_resistor() -> None:
    constants = short_constants(bands_of(source_stage(100e-6)))
    bypass = row(constants, "CS0")
    assert bypass.resistance_ohm == pytest.approx(1.0 / (1e-3 + 5e-3))
    assert bypass.zero_hz == pytest.approx(1.0 / (2.0 * np.pi * 1e3 * 100e-6))
    assert bypass.weight == pytest.approx(1.0 - 1.0 / 6.0)


def test_a_coupling_sees_both_sides_in_series_and_makes_its_zero_at_the_origin() -> None:
    coupling = row(short_constants(bands_of(source_stage(100e-6))), "C2")
    assert coupling.resistance_ohm == pytest.approx(12e3)
    assert coupling.edge_hz == pytest.approx(1.0 / (2.0 * np.pi * 12e3 * 1e-6))
    assert coupling.zero_hz == 0.0
    assert coupling.weight == pytest.approx(1.0)


def test_capacitors_in_parallel_are_one_row() -> None:
    one, two = short_constants(bands_of(source_stage(100e-6))), short_constants(bands_of(source_stage(60e-6, 40e-6)))
    both = row(two, "CS1")
    assert both.names == ("CS0", "CS1")
    assert both.value == pytest.approx(100e-6)
    assert both.edge_hz == pytest.approx(row(one, "CS0").edge_hz)
    assert two.sum_hz == pytest.approx(one.sum_hz)
    assert two.sum_hz == pytest.approx(two.pole_sum_hz, rel=1e-9)


def test_a_bypass_to_ground_and_one_to_the_supply_are_one_row() -> None:
    network = source_stage(60e-6)
    split = Network.from_parts(
        [*network.parts, voltage_source("VDD", "vdd", "0"), capacitance("CS1", "s", "vdd", 40e-6)], output=network.port
    )
    constants = short_constants(bands_of(split))
    assert row(constants, "CS1").names == ("CS0", "CS1")
    assert constants.sum_hz == pytest.approx(short_constants(bands_of(source_stage(100e-6))).sum_hz)


def test_decoupling_of_the_supply_is_not_in_the_path() -> None:
    parts = [part for part in source_stage(100e-6).parts if part.name != "RD"]
    supply = [
        resistance("RD", "d", "v", 2e3),
        resistance("RV", "v", "0", 20.0),
        capacitance("CV", "v", "x", 220e-6),
        resistance("RX", "x", "0", 0.1),
    ]
    constants = short_constants(bands_of(Network.from_parts([*parts, *supply], output=source_stage().port)))
    assert not row(constants, "CV").in_path
    assert row(constants, "CV").zero_hz == pytest.approx(row(constants, "CV").edge_hz, rel=0.02)
    assert all(part.in_path for part in constants.parts if "CV" not in part.names)


def test_a_choke_counts_with_r_over_l() -> None:
    constants = short_constants(bands_of(amplifiers.choke_fed()))
    choke, shunt = row(constants, "LV"), row(constants, "CV")
    # behind the capacitor, a wire at mid-band, the choke faces nothing: it makes no edge of its own
    assert (choke.resistance_ohm, choke.edge_hz) == (0.0, 0.0)
    assert shunt.edge_hz > 0.0
    assert constants.sum_hz == pytest.approx(constants.pole_sum_hz, rel=1e-9)


def test_a_choke_across_the_load_makes_an_edge_with_its_zero_at_the_origin() -> None:
    network = amplifiers.network(
        resistance("R", "in", "out", 1e3), inductance("L", "out", "0", 10e-3), capacitance("C", "out", "0", 10e-12)
    )
    choke = row(short_constants(bands_of(network)), "L")
    assert choke.edge_hz == pytest.approx(1e3 / (2.0 * np.pi * 10e-3))
    assert choke.zero_hz == 0.0
    assert choke.weight == pytest.approx(1.0)


def test_a_loop_of_capacitors_leaves_both_sums_open() -> None:
    network = amplifiers.network(
        resistance("R", "in", "a", 1e3),
        capacitance("C1", "a", "b", 1e-6),
        capacitance("C2", "b", "out", 1e-6),
        capacitance("C3", "a", "out", 1e-6),
        resistance("RB", "b", "0", 1e5),
        resistance("RL", "out", "0", 1e4),
        capacitance("CL", "out", "0", 10e-12),
    )
    constants = short_constants(bands_of(network))
    assert (constants.sum_hz, constants.pole_sum_hz) == (None, None)
    assert row(constants, "C3").resistance_ohm == 0.0


def test_without_shorts_the_lower_network_is_resistive() -> None:
    network = amplifiers.network(resistance("R", "in", "out", 1e3), capacitance("C", "out", "0", 1e-9))
    constants = short_constants(bands_of(network))
    assert constants.parts == ()
    assert (constants.sum_hz, constants.pole_sum_hz) == (0.0, 0.0)


def test_strong_interaction_keeps_the_sum_though_no_edge_is_a_pole() -> None:
    bands = bands_of(amplifiers.coupled_stage())
    constants = short_constants(bands)
    poles = np.abs(pole_frequencies(bands.lower)) / (2.0 * np.pi)
    assert constants.sum_hz == pytest.approx(float(np.sum(poles)), rel=1e-9)
    assert max(part.edge_hz for part in constants.parts) != pytest.approx(float(poles.max()), rel=0.01)
