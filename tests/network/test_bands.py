"""Short, open or tuned at mid-band, and the networks that follow from it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify, find_midband, midband_network
from tauledger.network.solve import response
from tauledger.network.spectrum import pole_frequencies


def bands_of(network: Network, at_hz: float | None = None) -> Bands:
    return classify(network, find_midband(network, at_hz=at_hz))


def test_couplings_and_bypass_are_short_and_a_device_s_capacitances_open() -> None:
    bands = bands_of(amplifiers.coupled_stage())
    shorts = {name for name, what in bands.class_of.items() if what == "short"}
    assert shorts == {"C1", "C2", "CE"}
    assert bands.sound
    assert bands.class_of["Q1.c_bebc"] == "open"
    assert all(bands.ratio[name] > 0.99 for name in shorts)
    assert all(bands.ratio[name] < 0.05 for name in bands.ratio.keys() - shorts)


def test_everything_reactive_is_at_rest_where_mid_band_is_dc() -> None:
    network = amplifiers.network(
        resistance("R", "in", "a", 1e3), inductance("L", "a", "out", 1e-6), capacitance("C", "out", "0", 1e-12)
    )
    bands = bands_of(network)
    assert dict(bands.class_of) == {"L": "short", "C": "open"}
    assert bands.sound


# the limit of s·Z is taken a finite 10⁴ times above the poles: 1e-4


def test_ratio_of_a_lone_capacitor_is_x_over_the_root_of_one_plus_x_squared() -> None:
    network = amplifiers.network(capacitance("C", "in", "out", 1e-6), resistance("R", "out", "0", 1e3))
    x = 0.5
    bands = bands_of(network, at_hz=x / (2.0 * np.pi * 1e-3))
    assert bands.ratio["C"] == pytest.approx(x / np.sqrt(1.0 + x * x), rel=2e-4)


def test_ratio_of_a_lone_inductor_is_the_same_with_x_as_omega_l_over_r() -> None:
    network = amplifiers.network(resistance("R", "in", "out", 1e3), inductance("L", "out", "0", 1e-3))
    x = 2.0
    bands = bands_of(network, at_hz=x * 1e6 / (2.0 * np.pi))
    assert bands.ratio["L"] == pytest.approx(x / np.sqrt(1.0 + x * x), rel=2e-4)
    assert bands.class_of["L"] == "open"


def test_capacitors_in_parallel_are_short_together_however_small_one_is() -> None:
    network = amplifiers.coupled_stage(capacitance("CE2", "e", "0", 100e-6), capacitance("CE3", "e", "0", 100e-9))
    bands = bands_of(network)
    assert bands.class_of["CE"] == bands.class_of["CE2"] == bands.class_of["CE3"] == "short"


def test_a_bridging_capacitor_is_not_taken_for_a_short_because_others_lie_in_series_beside_it() -> None:
    bands = bands_of(amplifiers.coupled_stage())
    constant = 2.0 * np.pi * bands.midband.frequency_hz * 1.2e-12
    # impedance across it: about r + R_L + gm·r·R_L, well below 200 kΩ
    assert bands.ratio["Q1.c_mu"] < constant * 200e3


def test_couplers_in_series_between_which_nothing_conducts_are_both_short() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "x", 10e-9),
        capacitance("C2", "x", "out", 10e-9),
        resistance("RL", "out", "0", 10e6),
        capacitance("CL", "out", "0", 1e-12),
    )
    bands = bands_of(network)
    assert dict(bands.class_of) == {"C1": "short", "C2": "short", "CL": "open"}
    assert bands.sound


def test_supply_choke_is_open_and_its_capacitor_short() -> None:
    bands = bands_of(amplifiers.choke_fed())
    assert bands.class_of["LV"] == "open"
    assert bands.class_of["CV"] == "short"
    assert bands.sound
    assert "LV" not in {part.name for part in bands.upper.parts}
    assert "LV" in {part.name for part in bands.lower.parts}


def test_choke_as_the_only_collector_load_is_open_and_small_wire_inductance_short() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "b", 1e-6),
        resistance("RB", "b", "0", 47e3),
        *amplifiers.transistor("Q1", "b", "c", "0"),
        inductance("LC", "c", "0", 10e-3),
        inductance("LW", "c", "out", 200e-9),
        resistance("RL", "out", "0", 1e3),
    )
    bands = bands_of(network)
    assert (bands.class_of["LC"], bands.class_of["LW"]) == ("open", "short")
    assert bands.sound


def test_many_small_capacitors_that_only_together_are_a_short_are_found_by_the_gain() -> None:
    decoupling: list[Part] = []
    for k in range(20):
        decoupling += [capacitance(f"CD{k}", "v", f"d{k}", 10e-9), resistance(f"RD{k}", f"d{k}", "0", 50e-3)]
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "b", 1e-6),
        resistance("RB", "b", "0", 100e3),
        conductance("Q1", "b", "0", 1e-3, label="g_pi"),
        transconductance("Q1", ("out", "0"), ("b", "0"), 0.04, label="gm"),
        resistance("RC", "out", "v", 2e3),
        resistance("RV", "v", "0", 1e3),
        capacitance("CL", "out", "0", 200e-12),
        *decoupling,
    )
    bands = bands_of(network)
    assert len(bands.repaired) == 1
    assert bands.repaired[0].startswith("CD")
    assert bands.sound


def test_a_tank_is_tuned_and_gives_no_hand_numbers() -> None:
    network = amplifiers.network(
        resistance("R", "in", "out", 1e4), inductance("L", "out", "0", 1e-6), capacitance("C", "out", "0", 1e-9)
    )
    bands = bands_of(network)
    assert dict(bands.class_of) == {"L": "tuned", "C": "tuned"}
    assert not bands.sound


def test_compensation_inside_a_closed_loop_is_open_far_above_its_open_loop_pole() -> None:
    network = amplifiers.network(
        capacitance("CC", "in", "a", 10e-6),
        resistance("R1", "a", "m", 1e3),
        resistance("RF", "m", "out", 10e3),
        transconductance("A", ("o", "0"), ("m", "0"), 1e-3, label="gm"),
        resistance("RO", "o", "0", 1e8),
        capacitance("CO", "o", "0", 160e-12),
        transconductance("B", ("out", "0"), ("o", "0"), -10.0, label="gm"),
        resistance("RB", "out", "0", 0.1),
    )
    bands = bands_of(network)
    open_loop_pole_hz = 1.0 / (2.0 * np.pi * 1e8 * 160e-12)
    assert bands.midband.frequency_hz > 10.0 * open_loop_pole_hz
    assert bands.class_of["CO"] == "open"
    assert bands.sound


def test_a_capacitor_across_a_voltage_source_does_nothing_and_joins_nothing() -> None:
    network = amplifiers.coupled_stage(voltage_source("VCC", "vcc", "0"), capacitance("CV", "vcc", "0", 100e-6))
    bands = bands_of(network)
    assert (bands.class_of["CV"], bands.ratio["CV"]) == ("open", 0.0)
    assert bands.merged["vcc"] == "vcc"


def test_merged_nodes_go_to_ground_before_the_output_before_the_first() -> None:
    bands = bands_of(amplifiers.coupled_stage())
    assert bands.merged["e"] == "0"
    assert bands.merged["c"] == "out"
    assert bands.merged["b"] == "s"
    assert bands.merged["0"] == "0"


def test_an_output_inside_a_merged_group_keeps_the_output() -> None:
    inside = bands_of(amplifiers.coupled_stage(output="c"))
    assert inside.merged["out"] == "c"
    assert inside.upper.port == Port("c")
    assert abs(response(inside.upper, np.zeros(1))[0]) == pytest.approx(abs(inside.midband.gain), rel=0.02)


def test_a_driven_node_behind_a_coupling_keeps_its_drive() -> None:
    network = amplifiers.network(
        capacitance("C1", "in", "out", 1e-6), resistance("R", "out", "0", 1e3), capacitance("C2", "out", "0", 1e-12)
    )
    bands = bands_of(network, at_hz=1e6)
    assert bands.merged["in"] == bands.merged["out"] == "out"
    assert response(bands.upper, np.zeros(1))[0] == pytest.approx(1.0)


def test_an_ideal_drive_behind_a_coupling_does_not_make_the_device_s_capacitances_short() -> None:
    network = amplifiers.network(
        capacitance("C1", "in", "b", 1e-6),
        resistance("RB", "b", "0", 47e3),
        capacitance("Q1", "b", "e", 20e-12, label="c_pi"),
        capacitance("Q1", "b", "out", 2e-12, label="c_mu"),
        conductance("Q1", "b", "e", 1e-3, label="g_pi"),
        transconductance("Q1", ("out", "e"), ("b", "e"), 0.04, label="gm"),
        resistance("RE", "e", "0", 470.0),
        capacitance("CE", "e", "0", 100e-6),
        resistance("RC", "out", "0", 2e3),
        capacitance("CL", "out", "0", 47e-12),
    )
    bands = bands_of(network)
    assert {name for name, what in bands.class_of.items() if what == "short"} == {"C1", "CE"}
    assert bands.ratio["Q1.c_pi"] < 1e-3
    assert bands.sound


def test_a_bypass_to_ground_and_one_to_the_supply_are_both_short() -> None:
    network = amplifiers.coupled_stage(voltage_source("VCC", "vcc", "0"), capacitance("CE2", "e", "vcc", 10e-6))
    bands = bands_of(network)
    assert (bands.class_of["CE"], bands.class_of["CE2"]) == ("short", "short")
    assert bands.sound


def test_drive_amplitudes_given_apart_survive_merging() -> None:
    parts = [part for part in amplifiers.coupled_stage().parts if part.name != "VS"]
    network = Network.from_parts([voltage_source("VS", "in", "0"), *parts], output=Port("out"), drive={"vs": 2.0j})
    reference = bands_of(amplifiers.coupled_stage())
    bands = bands_of(network)
    assert bands.midband.gain == pytest.approx(2.0j * reference.midband.gain, rel=1e-9)
    for one, other in ((bands.upper, reference.upper), (bands.lower, reference.lower)):
        assert response(one, np.array([1e3]))[0] == pytest.approx(2.0j * response(other, np.array([1e3]))[0], rel=1e-9)


def test_a_current_output_through_an_ammeter_keeps_its_branch() -> None:
    parts = [part for part in amplifiers.coupled_stage().parts if part.name != "RL"]
    ammeter = [voltage_source("VA", "out", "m"), resistance("RL", "m", "0", 10e3)]
    network = Network.from_parts([*parts, *ammeter], output=Port("", kind="current", through="va"))
    bands = bands_of(network)
    assert bands.sound
    assert abs(bands.midband.gain) == pytest.approx(abs(find_midband(amplifiers.coupled_stage()).gain) / 10e3, rel=1e-6)


def test_a_divider_of_capacitors_keeps_them_in_its_mid_band_network() -> None:
    network = amplifiers.network(
        resistance("RS", "in", "s", 1e3), capacitance("C1", "s", "out", 100e-12), capacitance("C2", "out", "0", 2e-10)
    )
    bands = bands_of(network)
    assert bands.class_of == {"C1": "gain", "C2": "gain"}
    assert bands.sound


@settings(max_examples=25, deadline=None, derandomize=True)
@given(networks())
def test_upper_network_at_dc_and_lower_network_at_infinity_are_both_the_mid_band_network(network: Network) -> None:
    bands = bands_of(network)
    gain = response(midband_network(network, bands.class_of), np.zeros(1))[0]
    assert response(bands.upper, np.zeros(1))[0] == pytest.approx(gain, rel=1e-9)
    poles = pole_frequencies(bands.lower)
    far = 1e6 * float(np.abs(poles).max(initial=1.0)) / (2.0 * np.pi)
    assert response(bands.lower, np.array([far]))[0] == pytest.approx(gain, rel=1e-5)
    if bands.sound:
        assert abs(gain) == pytest.approx(abs(bands.midband.gain), rel=0.02)


def test_an_inductor_in_series_with_an_open_capacitor_is_a_short() -> None:
    """A probe's lead: what its current could be beyond all poles is set by the capacitor alone."""
    network = Network.from_parts(
        [
            *amplifiers.coupled_stage().parts,
            inductance("LP", "out", "tip", 100e-9),
            capacitance("CP", "tip", "0", 10e-12),
        ],
        output=Port("out"),
    )
    bands = classify(network, find_midband(network))
    assert (bands.class_of["LP"], bands.class_of["CP"]) == ("short", "open")


def test_what_rounding_leaves_far_beyond_all_poles_decides_nothing() -> None:
    """287 µF with nothing behind them leave exactly nothing of 17 MΩ at 10⁴ times the highest pole."""
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        capacitance("C1", "a", "0", 1e-12),
        transconductance("G1", ("0", "x"), ("a", "0"), 0.0658),
        resistance("R2", "x", "0", 1.0 / 5.919102031122334e-08),
        capacitance("C2", "x", "out", 0.00028659791627819853),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    bands = classify(network, find_midband(network))
    assert bands.class_of["C1"] == "open"
    assert bands.sound
