"""The reference of all band edges."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import DIRECT, EVERYTHING, networks
from tauledger.circuit import Port
from tauledger.devices.parts import (
    capacitance,
    inductance,
    line,
    resistance,
    transconductance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import InputError
from tauledger.network.assemble import Network
from tauledger.network.midband import find_midband
from tauledger.network.solve import log_slope, on_axis, response, solve


def slope_at(network: Network, frequency_hz: float) -> float:
    return float(log_slope(network, solve(network, on_axis(frequency_hz)))[0].real)


def test_reference_of_a_direct_coupled_amplifier_is_dc() -> None:
    network = amplifiers.network(resistance("R", "in", "out", 1e3), capacitance("C", "out", "0", 1e-9))
    midband = find_midband(network)
    assert (midband.frequency_hz, midband.from_hz, midband.gain) == (0.0, 0.0, 1.0)
    # |slope| = x²/(1 + x²) = 0.1 at x = 1/3
    assert midband.to_hz == pytest.approx(1.0 / (3.0 * 2.0 * np.pi * 1e-6), rel=1e-3)


def test_bypassed_but_direct_coupled_stage_has_its_reference_above_the_bypass_not_at_dc() -> None:
    network = amplifiers.network(
        transconductance("J", ("out", "s"), ("in", "s"), 5e-3, label="gm"),
        resistance("RS", "s", "0", 1e3),
        capacitance("CS", "s", "0", 100e-6),
        resistance("RD", "out", "0", 2e3),
        capacitance("CL", "out", "0", 100e-12),
    )
    midband = find_midband(network)
    assert abs(response(network, np.zeros(1))[0]) == pytest.approx(10.0 / 6.0)
    assert abs(midband.gain) == pytest.approx(10.0, rel=1e-3)
    assert midband.from_hz is not None
    assert midband.from_hz > 10.0


def test_reference_between_two_edges_is_stationary_to_rounding() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    assert midband.plateau
    assert abs(slope_at(network, midband.frequency_hz)) < 1e-12


def test_extent_is_where_the_slope_reaches_2_db_per_decade() -> None:
    network = amplifiers.coupled_stage()
    midband = find_midband(network)
    assert midband.from_hz is not None
    assert midband.to_hz is not None
    assert slope_at(network, midband.from_hz) == pytest.approx(0.1, abs=1e-3)
    assert slope_at(network, midband.to_hz) == pytest.approx(-0.1, abs=1e-3)


def test_high_pass_has_its_reference_at_the_top_without_upper_limit() -> None:
    network = amplifiers.network(capacitance("C", "in", "out", 1e-6), resistance("R", "out", "0", 1e3))
    midband = find_midband(network)
    assert midband.to_hz == np.inf
    assert abs(midband.gain) == pytest.approx(1.0, rel=1e-6)


def test_of_two_plateaus_the_higher_counts_and_within_3_db_the_wider() -> None:
    def shelf(top: float, until: float) -> Network:
        # gain 1 up to 10 kHz, `top` from there to `until`
        return amplifiers.network(
            transconductance("A", ("a", "0"), ("in", "0"), -1.0, label="gm"),
            resistance("RA", "a", "0", 1.0),
            resistance("R1", "a", "x", top - 1.0),
            capacitance("C1", "a", "x", 1.0 / (2.0 * np.pi * 1e4 * (top - 1.0))),
            resistance("R2", "x", "0", 1.0),
            transconductance("B", ("out", "0"), ("x", "0"), -top, label="gm"),
            resistance("RB", "out", "0", 1.0),
            capacitance("C2", "out", "0", 1.0 / (2.0 * np.pi * until)),
        )

    assert find_midband(shelf(10.0, 1e8)).frequency_hz > 1e5
    assert find_midband(shelf(1.3, 1e8)).frequency_hz == 0.0


def test_a_resonance_is_no_plateau_and_its_peak_is_then_the_reference() -> None:
    network = amplifiers.network(
        resistance("R", "in", "out", 1e4), inductance("L", "out", "0", 1e-6), capacitance("C", "out", "0", 1e-9)
    )
    midband = find_midband(network)
    assert (midband.from_hz, midband.to_hz) == (None, None)
    assert midband.frequency_hz == pytest.approx(1.0 / (2.0 * np.pi * np.sqrt(1e-15)), rel=1e-9)
    assert abs(midband.gain) == pytest.approx(1.0, rel=1e-9)


def test_the_reference_is_never_a_peak_at_the_end_of_the_plateau() -> None:
    # Q = 1 at 1 MHz: 1.25 dB of peaking
    l_h = 1e3 / (2.0 * np.pi * 1e6)
    network = amplifiers.network(
        capacitance("C1", "in", "a", 1e-6),
        resistance("R1", "a", "0", 1e5),
        transconductance("A", ("b", "0"), ("a", "0"), -1.0, label="gm"),
        resistance("RB", "b", "0", 1.0),
        resistance("R", "b", "x", 1e3),
        inductance("L", "x", "out", l_h),
        capacitance("C", "out", "0", 1.0 / (l_h * (2.0 * np.pi * 1e6) ** 2)),
    )
    midband = find_midband(network)
    assert midband.frequency_hz < 1e5
    assert abs(midband.gain) == pytest.approx(1.0, rel=1e-3)


def test_a_frequency_given_outranks_the_plateau_and_keeps_its_extent() -> None:
    network = amplifiers.coupled_stage()
    found, given_hz = find_midband(network), find_midband(network, at_hz=5e3)
    assert (given_hz.frequency_hz, given_hz.from_hz, given_hz.to_hz) == (5e3, found.from_hz, found.to_hz)
    assert find_midband(network, at_hz=1.0).from_hz is None


@pytest.mark.parametrize("at_hz", [-1.0, float("nan"), float("inf"), 0.0])
def test_a_reference_that_cannot_be_is_refused(at_hz: float) -> None:
    with pytest.raises(InputError, match="mid-band cannot be at"):
        find_midband(amplifiers.coupled_stage(), at_hz=at_hz)


def test_an_output_without_signal_is_refused_by_name() -> None:
    network = Network.from_parts(
        [*amplifiers.coupled_stage().parts, voltage_source("VCC", "vcc", "0"), resistance("RV", "vcc", "c", 1e3)],
        output=Port("vcc"),
    )
    with pytest.raises(InputError, match=r"no signal reaches v\(vcc\)"):
        find_midband(network)


def test_a_difference_that_cancels_is_no_signal() -> None:
    network = amplifiers.network(
        resistance("R1", "in", "a", 1e3),
        resistance("R2", "a", "0", 3e3),
        resistance("R3", "in", "b", 1e4),
        resistance("R4", "b", "0", 3e4),
        output="a",
    )
    with pytest.raises(InputError, match="no signal"):
        find_midband(Network.from_parts(network.parts, output=Port("a", "b")))


def test_a_loop_broken_with_a_giant_inductor_and_capacitor_has_its_open_loop_gain_as_reference() -> None:
    network = amplifiers.network(
        capacitance("CB", "in", "m", 1e9),
        inductance("LB", "out", "m", 1e9),
        resistance("RM", "m", "0", 1e6),
        transconductance("A", ("out", "0"), ("m", "0"), 1e-2, label="gm"),
        resistance("RO", "out", "0", 1e5),
        capacitance("CO", "out", "0", 1e-11),
    )
    assert abs(find_midband(network).gain) == pytest.approx(1e3, rel=1e-6)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks(DIRECT))
def test_direct_coupled_amplifiers_without_bypass_have_their_reference_at_dc(network: Network) -> None:
    midband = find_midband(network)
    assert midband.frequency_hz == 0.0
    assert midband.gain == pytest.approx(complex(response(network, np.zeros(1))[0]), rel=1e-12)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks(EVERYTHING))
def test_the_reference_lies_on_its_plateau(network: Network) -> None:
    midband = find_midband(network)
    if midband.from_hz is not None and midband.to_hz is not None:
        assert midband.from_hz <= midband.frequency_hz <= midband.to_hz


def test_what_leaks_past_a_narrow_band_is_no_mid_band() -> None:
    """A band of 2:1 has no plateau; the feed-through far above it is flat, but 60 dB down."""
    network = Network.from_parts(
        [
            voltage_source("VS", "s", "0", 1.0),
            resistance("RS", "s", "a", 1e3),
            capacitance("C1", "a", "b", 8e-9),
            resistance("RB", "b", "0", 9e3),
            transconductance("GM", ("c", "0"), ("b", "0"), 20e-3, "gm"),
            resistance("RC", "c", "0", 5e3),
            capacitance("CL", "c", "0", 10e-9),
            capacitance("CF", "b", "c", 1e-12),
        ],
        output=Port("c"),
    )
    midband = find_midband(network)
    assert not midband.plateau
    assert 1e3 < midband.frequency_hz < 1e4


def test_a_plateau_below_a_zero_that_lies_below_all_poles_is_seen() -> None:
    # 10 kΩ bridged by 1 nF onto 1 Ω: a zero at 15.9 kHz, the pole at 159 MHz
    network = amplifiers.network(
        resistance("R1", "in", "out", 10e3), capacitance("C1", "in", "out", 1e-9), resistance("R2", "out", "0", 1.0)
    )
    assert find_midband(network).from_hz is not None
    chosen = find_midband(network, at_hz=10.0)
    assert chosen.from_hz == 0.0
    assert chosen.to_hz is not None
    assert chosen.to_hz < 15.9e3


def stub_beside(ohm: float) -> Network:
    """A shorted line of 2.5 ns across a divider: resonances of one height at 100 MHz, 300 MHz and so on."""
    return amplifiers.network(
        resistance("RS", "in", "out", ohm),
        line("T1", ("out", "0", "0", "0"), 2.5e-9, 75.0),
        resistance("RL", "out", "0", 300.0),
    )


def test_of_equal_resonances_the_lowest_is_the_reference() -> None:
    for within in (None, (1e6, 1e9)):
        found = find_midband(stub_beside(50.0), within_hz=within)
        assert found.frequency_hz == pytest.approx(100e6, rel=1e-6)
        assert found.maximum


def test_a_maximum_in_the_range_that_is_wanted_goes_before_one_outside() -> None:
    found = find_midband(stub_beside(50.0), within_hz=(200e6, 400e6))
    assert found.frequency_hz == pytest.approx(300e6, rel=1e-6)


def two_bands() -> Network:
    """A low-pass to 1.6 kHz of gain 1/2, and beside it a way of gain 3 from 16 MHz on without end."""
    return amplifiers.network(
        resistance("R1", "in", "a", 1e3),
        resistance("R2", "a", "0", 1e3),
        capacitance("C1", "a", "0", 200e-9),
        voltage_gain("E1", ("b", "0"), ("a", "0"), 1.0),
        capacitance("C2", "in", "c", 10e-12),
        resistance("R3", "c", "0", 1e3),
        voltage_gain("E2", ("out", "b"), ("c", "0"), 3.0),
    )


@pytest.mark.parametrize(("within", "gain", "at_dc"), [((1.0, 100e3), 0.5, True), ((1e6, 1e9), 3.0, False)])
def test_a_plateau_in_the_range_that_is_wanted_goes_before_one_outside(
    within: tuple[float, float], gain: float, at_dc: bool
) -> None:
    found = find_midband(two_bands(), within_hz=within)
    assert abs(found.gain) == pytest.approx(gain, rel=1e-2)
    assert found.reaches_dc is at_dc
    assert found.frequency_hz <= 10.0 * within[1]
