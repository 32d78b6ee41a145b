"""Hand formulas of a compensated amplifier, each against the exact poles and zeros where it is said to hold."""

from __future__ import annotations

import math

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

from cells import near
from compensated import TwoStages, hertz, network_of, two_stages
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.hand.catalogue import entries
from tauledger.hand.compensation import (
    FORMULAS,
    bridged_resistor_zero_hz,
    dominant_pole_hz,
    follower_zero_hz,
    mirror_pole_hz,
    mirror_zero_hz,
    nulled_zero_hz,
    phase_used_deg,
    right_half_plane_zero_hz,
    second_pole_hz,
    third_pole_hz,
    unity_gain_hz,
    unity_gain_with_roots_hz,
)
from tauledger.network.assemble import Network
from tauledger.network.midband import find_midband
from tauledger.network.poles import find_poles
from tauledger.network.unity import find_unity

FEW = settings(max_examples=25, deadline=None, derandomize=True)


def poles_hz(network: Network) -> list[float]:
    return [hertz(abs(pole.s)) for pole in find_poles(network).poles]


def zeros_hz(network: Network) -> list[float]:
    """Zeros in Hz, positive in the right half plane."""
    return [hertz(zero.s.real) for zero in find_poles(network).zeros]


@FEW
@given(two_stages())
def test_the_split_poles_are_those_of_paper_as_far_as_what_it_leaves_out(one: TwoStages) -> None:
    low, high = poles_hz(network_of(one))
    first = dominant_pole_hz(one.r_1, one.c_1, one.c_c, one.a_2)
    second = second_pole_hz(one.gm_2, one.c_1, one.c_l, one.c_c)
    # what the formulas leave out: the load's own constant of the first, both conductances of the second
    load = one.r_2 * (one.c_l + one.c_c) / (one.r_1 * (one.c_1 + one.c_c * (1.0 + one.a_2)))
    conductances = ((one.c_l + one.c_c) / one.r_1 + (one.c_1 + one.c_c) / one.r_2) / (one.gm_2 * one.c_c)
    squares = 2.0 * low / high
    assert first == near(low * (1.0 + load), rel=squares + 1e-9)
    assert high == near(second * (1.0 + conductances), rel=squares + 1e-9)
    product = 1.0 / (one.r_1 * one.r_2 * (one.c_1 * one.c_l + one.c_c * (one.c_1 + one.c_l)))
    assert (2.0 * math.pi) ** 2 * low * high == near(product, rel=1e-9)


@FEW
@given(two_stages())
def test_the_zero_of_the_right_half_plane_is_exact(one: TwoStages) -> None:
    assert zeros_hz(network_of(one)) == near([right_half_plane_zero_hz(one.gm_2, one.c_c)], rel=1e-9)


@FEW
@given(two_stages(), st.floats(0.1, 3.0).filter(lambda ratio: abs(ratio - 1.0) > 0.05), st.booleans())
def test_a_nulling_resistor_moves_the_zero_through_infinity_into_the_left_half_plane(
    one: TwoStages, ratio: float, at_output: bool
) -> None:
    nulled = replace(one, r_z=ratio / one.gm_2)
    (zero,) = zeros_hz(network_of(nulled, at_output=at_output))
    assert zero == near(nulled_zero_hz(one.gm_2, one.c_c, nulled.r_z), rel=1e-9)
    assert (zero > 0.0) == (ratio < 1.0)


def test_at_one_over_gm_there_is_no_zero() -> None:
    assert nulled_zero_hz(1e-3, 2e-12, 1e3) == math.inf
    assert zeros_hz(network_of(TwoStages(gm_2=2.0**-8, r_z=2.0**8))) == []


@FEW
@given(two_stages(), st.floats(0.5, 2.0))
def test_the_third_pole_is_that_of_r_z_and_c_1_where_c_1_is_small(one: TwoStages, ratio: float) -> None:
    small = replace(one, c_1=0.01 * min(one.c_c, one.c_l), r_z=ratio / one.gm_2)
    found = poles_hz(network_of(small))
    # R1 beside R_z, C_c and C_L in series with C1, and the second pole
    left_out = small.r_z / small.r_1 + small.c_1 * (1.0 / small.c_c + 1.0 / small.c_l) + found[1] / found[2]
    assert found[2] == near(third_pole_hz(small.r_z, small.c_1), rel=2.0 * left_out)


def mirrored(gm: float, c_m: float) -> Network:
    return Network.from_parts(
        [
            voltage_source("VS", "s", "0", 1.0),
            transconductance("G1", ("m", "0"), ("s", "0"), 0.5e-3),
            transconductance("G2", ("0", "out"), ("s", "0"), 0.5e-3),
            transconductance("G3", ("m", "0"), ("m", "0"), gm),
            capacitance("CM", "m", "0", c_m),
            transconductance("G4", ("out", "0"), ("m", "0"), gm),
            resistance("RO", "out", "0", 50e3),
            capacitance("CO", "out", "0", 1e-12),
        ],
        output=Port("out"),
    )


def test_a_mirror_has_its_zero_one_octave_above_its_pole() -> None:
    network = mirrored(0.4e-3, 150e-15)
    assert poles_hz(network)[1] == near(mirror_pole_hz(0.4e-3, 150e-15), rel=1e-9)
    assert zeros_hz(network) == near([mirror_zero_hz(0.4e-3, 150e-15)], rel=1e-9)
    assert mirror_zero_hz(1e-3, 1e-13) == near(-2.0 * mirror_pole_hz(1e-3, 1e-13), rel=1e-15)


def test_a_follower_passes_forward_through_its_c_pi() -> None:
    parts: list[Part] = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("RS", "s", "b", 1e3),
        transconductance("Q1", ("0", "out"), ("b", "out"), 0.04),
        resistance("RP", "b", "out", 2.5e3),
        capacitance("CP", "b", "out", 8e-12),
        resistance("RE", "out", "0", 2e3),
        capacitance("CL", "out", "0", 5e-12),
    ]
    assert zeros_hz(Network.from_parts(parts, output=Port("out"))) == near(
        [follower_zero_hz(0.04, 2.5e3, 8e-12)], rel=1e-9
    )


def test_a_bridged_resistor_passes_forward_through_its_capacitor() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "out", 10e3),
        capacitance("C1", "s", "out", 3e-12),
        conductance("G2", "out", "0", 1e-3),
        capacitance("C2", "out", "0", 1e-12),
    ]
    assert zeros_hz(Network.from_parts(parts, output=Port("out"))) == near(
        [bridged_resistor_zero_hz(10e3, 3e-12)], rel=1e-9
    )


@FEW
@given(two_stages())
def test_unity_gain_and_margin_by_paper_are_exact_but_for_what_the_poles_are_off(one: TwoStages) -> None:
    network = network_of(one)
    exact = find_unity(network, find_midband(network))
    assume(exact is not None)
    assert exact is not None
    low, high = poles_hz(network)
    (zero,) = zeros_hz(network)
    # with the exact poles in the place of paper's, gain-bandwidth in that of gm1/C_c, the formulas are identities
    single = one.gm_1 * one.r_1 * one.a_2 * low
    f_u = unity_gain_with_roots_hz(single, [high], [zero])
    assert f_u is not None
    dominant_left_out = (low / f_u) ** 2
    assert f_u == near(exact.hz, rel=dominant_left_out + 1e-9)
    margin = 180.0 - phase_used_deg(exact.hz, [low, high], [zero])
    assert margin == pytest.approx(exact.phase_margin_deg, abs=1e-6)
    # C1, C_c itself and the load's constant stand beside A2·C_c in the dominant pole
    beside = one.c_1 + one.c_c + one.r_2 * (one.c_l + one.c_c) / one.r_1
    paper = unity_gain_hz(one.gm_1, one.c_c)
    assert paper == near(single * (1.0 + beside / (one.c_c * one.a_2)), rel=2.0 * low / high + 1e-9)


def test_no_unity_gain_where_zeros_hold_the_gain_up() -> None:
    assert unity_gain_with_roots_hz(10e6, [], [5e6]) is None
    assert unity_gain_with_roots_hz(10e6, [], []) == near(10e6, rel=1e-9)
    both = unity_gain_with_roots_hz(10e6, [10e6], [10e6])
    assert both == near(10e6, rel=1e-9)


def test_every_formula_is_listed_with_where_it_holds_and_its_source() -> None:
    listed = {(entry.name, entry.formula, entry.valid, entry.source) for entry in entries()}
    assert {(one.name, one.written, one.valid, one.source) for one in FORMULAS} <= listed
    assert all(one.valid and one.source and one.written for one in FORMULAS)
