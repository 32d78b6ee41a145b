"""Unity gain and its margins against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from strategies import decades
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_source,
    inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network
from tauledger.network.edges import find_edges
from tauledger.network.follower import is_follower_stable
from tauledger.network.midband import MidBand, find_midband
from tauledger.network.poles import find_poles
from tauledger.network.solve import response
from tauledger.network.unity import Unity, find_unity, is_ratio

R = 1e3


def sections(gain: float, *poles_hz: float) -> list[Part]:
    """Buffered sections of the first order, all gain in the first."""
    parts: list[Part] = [voltage_source("VS", "in", "0", 1.0)]
    node = "in"
    for k, hz in enumerate(poles_hz):
        out = "out" if k == len(poles_hz) - 1 else f"n{k}"
        gm = (gain if k == 0 else 1.0) / R
        parts += [
            transconductance(f"A{k}", ("0", out), (node, "0"), gm, label="gm"),
            resistance(f"R{k}", out, "0", R),
            capacitance(f"C{k}", out, "0", 1.0 / (2.0 * np.pi * hz * R)),
        ]
        node = out
    return parts


def amplifier(gain: float, *poles_hz: float) -> Network:
    return Network.from_parts(sections(gain, *poles_hz), output=Port("out"))


def unity_of(network: Network) -> Unity:
    found = find_unity(network, find_midband(network))
    assert found is not None
    return found


def margin_of(found: Unity) -> float:
    assert found.phase_margin_deg is not None
    return found.phase_margin_deg


def two_poles(gain: float, p1: float, p2: float) -> tuple[float, float]:
    """Give f_u and phase margin of gain/((1 + jf/p1)(1 + jf/p2)): |H| = 1 is a quadratic in f².

    Phase margin 180° − atan(f_u/p1) − atan(f_u/p2): Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog
    Integrated Circuits", 5th ed. 2009, section 9.3.
    """
    total, product = p1**2 + p2**2, (p1 * p2) ** 2
    square = 2.0 * product * (gain**2 - 1.0) / (total + math.sqrt(total**2 + 4.0 * product * (gain**2 - 1.0)))
    hz = math.sqrt(square)
    return hz, 180.0 - math.degrees(math.atan(hz / p1) + math.atan(hz / p2))


@settings(max_examples=25, deadline=None, derandomize=True)
@given(gain=decades(1.5, 1e6), p1=decades(1.0, 1e6), p2=decades(1.0, 1e9), sign=st.sampled_from([1.0, -1.0]))
def test_two_poles_have_the_textbook_margin_whatever_the_sign_of_the_gain(
    gain: float, p1: float, p2: float, sign: float
) -> None:
    found = unity_of(amplifier(sign * gain, p1, p2))
    hz, margin = two_poles(gain, p1, p2)
    assert found.hz == pytest.approx(hz, rel=1e-10)
    assert found.phase_margin_deg == pytest.approx(margin, abs=1e-7)
    assert found.gain_margin_db is None
    assert found.gain_margin_at_hz is None
    assert found.further_hz == ()


def closed(gain: float, *poles_hz: float) -> Network:
    """The same amplifier with all of its output taken from its input: a follower."""
    parts = sections(gain, *poles_hz)
    first = next(k for k, part in enumerate(parts) if part.name == "A0.gm")
    node = parts[first].nodes[1]
    parts[first] = transconductance("A0", ("0", node), ("in", "out"), gain / R, label="gm")
    return Network.from_parts(parts, output=Port("out"))


three_poles = st.tuples(decades(1e2, 1e6), decades(1e3, 1e7), decades(1e3, 1e7))


@settings(max_examples=25, deadline=None, derandomize=True)
@given(gain=decades(3.0, 1e5), poles=three_poles)
def test_closed_as_a_follower_the_gain_at_f_u_is_what_the_margin_says(
    gain: float, poles: tuple[float, float, float]
) -> None:
    """|1/(1 + exp(j·(PM − 180°)))| = 1/(2·sin(PM/2)): 1.31 at 45°, 1 at 60°. Gray and Meyer, section 9.4."""
    found = unity_of(amplifier(gain, *poles))
    at_unity = abs(response(closed(gain, *poles), np.array([found.hz]))[0])
    assert at_unity == pytest.approx(0.5 / abs(math.sin(math.radians(margin_of(found)) / 2.0)), rel=1e-6)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(gain=decades(3.0, 1e5), poles=three_poles)
def test_a_margin_above_zero_is_a_stable_follower(gain: float, poles: tuple[float, float, float]) -> None:
    """Three real poles: the phase falls all the way, so that either margin alone decides (Bode 1945)."""
    found = unity_of(amplifier(gain, *poles))
    assume(abs(margin_of(found)) > 0.1)
    stable = find_poles(closed(gain, *poles)).stable
    assert stable is (margin_of(found) > 0.0)
    assert found.gain_margin_db is not None
    assert stable is (found.gain_margin_db > 0.0)


@pytest.mark.parametrize("gain", [2.0, 8.0, 100.0])
def test_three_equal_poles_turn_by_180_degrees_at_root_three_where_an_eighth_is_left(gain: float) -> None:
    """A loop of three equal poles oscillates from a gain of 8 on: Gray and Meyer, section 9.3 (from memory)."""
    found = unity_of(amplifier(gain, 1e5, 1e5, 1e5))
    assert found.gain_margin_at_hz == pytest.approx(math.sqrt(3.0) * 1e5, rel=1e-9)
    assert found.gain_margin_db == pytest.approx(20.0 * math.log10(8.0 / gain), abs=1e-8)
    assert found.hz == pytest.approx(1e5 * math.sqrt(gain ** (2.0 / 3.0) - 1.0), rel=1e-10)
    assert found.phase_margin_deg == pytest.approx(
        180.0 - 3.0 * math.degrees(math.atan(math.sqrt(gain ** (2.0 / 3.0) - 1.0))), abs=1e-7
    )


def test_the_margins_vanish_together() -> None:
    found = unity_of(amplifier(8.0, 1e5, 1e5, 1e5))
    assert found.phase_margin_deg == pytest.approx(0.0, abs=1e-7)
    assert found.gain_margin_db == pytest.approx(0.0, abs=1e-8)


@settings(max_examples=15, deadline=None, derandomize=True)
@given(c_c=decades(5e-13, 2e-11), c_l=decades(1e-12, 5e-11), gm2=decades(3e-4, 5e-3))
def test_a_zero_in_the_right_half_plane_takes_phase_and_leaves_gain(c_c: float, c_l: float, gm2: float) -> None:
    """A capacitor across an inverting stage: margin = 180° less the angle of each pole and of the zero gm2/C_c."""
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            transconductance("M1", ("0", "y"), ("in", "0"), 4e-4, label="gm"),
            resistance("R1", "y", "0", 5e5),
            capacitance("C1", "y", "0", 3e-13),
            transconductance("M2", ("out", "0"), ("y", "0"), gm2, label="gm"),
            resistance("R2", "out", "0", 8e4),
            capacitance("CC", "y", "out", c_c),
            capacitance("CL", "out", "0", c_l),
        ],
        output=Port("out"),
    )
    found = unity_of(network)
    # denominator 1 + b1 s + b2 s² of the two nodes
    b1 = 5e5 * (3e-13 + c_c) + 8e4 * (c_l + c_c) + gm2 * 5e5 * 8e4 * c_c
    b2 = 5e5 * 8e4 * (3e-13 * c_l + c_c * (3e-13 + c_l))
    s = 2j * math.pi * found.hz
    h = 4e-4 * 5e5 * 8e4 * (gm2 - s * c_c) / (1.0 + b1 * s + b2 * s**2)
    assert abs(h) == pytest.approx(1.0, rel=1e-9)
    small = b1 - math.sqrt(max(b1**2 - 4.0 * b2, 0.0))
    poles = (2.0 / (b1 + math.sqrt(b1**2 - 4.0 * b2)), 2.0 / small)
    angles = sum(math.atan(abs(s) / p) for p in poles) + math.atan(abs(s) * c_c / gm2)
    assert found.phase_margin_deg == pytest.approx(180.0 - math.degrees(angles), abs=1e-5)


def test_a_resonance_that_rises_above_one_again_is_listed() -> None:
    """One pole at 1 kHz, gain 10, then a resonance of Q 50 at 50 kHz, where 0.2 would be left without it."""
    w = 2.0 * math.pi * 50e3
    network = Network.from_parts(
        [
            *sections(10.0, 1e3),
            transconductance("A9", ("0", "x"), ("out", "0"), 1.0, label="gm"),
            resistance("R9", "x", "0", 1.0),
            inductance("L9", "x", "end", 50.0 / w),
            capacitance("C9", "end", "0", 1.0 / (50.0 * w)),
        ],
        output=Port("end"),
    )
    found = unity_of(network)
    assert len(found.further_hz) == 2
    assert found.hz < 50e3 * 0.9
    assert found.further_hz[0] < 50e3 < found.further_hz[1]
    assert np.abs(response(network, np.array([found.hz, *found.further_hz]))) == pytest.approx(1.0)


def test_far_below_the_only_pole_the_search_goes_on_to_where_the_gain_is_one() -> None:
    """A pole at 1 Hz with a gain of ten million: f_u lies four decades beyond the scan of poles and zeros."""
    found = unity_of(amplifier(1e7, 1.0))
    assert found.hz == pytest.approx(1e7, rel=1e-9)
    assert found.phase_margin_deg == pytest.approx(90.0, abs=1e-4)
    assert found.gain_bandwidth_hz == pytest.approx(1e7, rel=1e-9)


def test_slopes_are_those_of_gain_and_phase_there() -> None:
    network = amplifier(300.0, 1e4, 3e6)
    found = unity_of(network)
    step = 1e-6
    h = response(network, found.hz * np.exp([-step, step]))
    assert found.slope == pytest.approx(np.log(abs(h[1]) / abs(h[0])) / (2 * step), rel=1e-6)


def test_the_gain_bandwidth_product_is_that_of_mid_band_and_upper_edge() -> None:
    network = amplifier(300.0, 1e4, 3e6)
    midband = find_midband(network)
    high = find_edges(network, midband).f_high
    assert high is not None
    assert high.hz is not None
    assert unity_of(network).gain_bandwidth_hz == pytest.approx(300.0 * high.hz)


def test_no_unity_gain_where_the_gain_never_exceeds_one_or_never_falls_to_it() -> None:
    low = amplifier(0.9, 1e5)
    assert find_unity(low, find_midband(low)) is None
    shelf = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            transconductance("A", ("0", "out"), ("in", "0"), 1e-2, label="gm"),
            resistance("R", "out", "0", 1e3),
            resistance("R2", "out", "x", 250.0),
            capacitance("C", "x", "0", 1e-9),
        ],
        output=Port("out"),
    )
    assert find_unity(shelf, find_midband(shelf)) is None


def test_only_a_plain_ratio_has_a_unity_gain() -> None:
    """Ohm, siemens and drives of both kinds at once have no 1 that means anything; A/A has."""
    load = [resistance("R", "out", "0", 1e5), capacitance("C", "out", "0", 1e-9)]
    ohms = Network.from_parts([current_source("IS", "0", "out", 1.0), *load], output=Port("out"))
    assert not is_ratio(ohms)
    assert find_unity(ohms, find_midband(ohms)) is None
    mirror = [
        current_source("IS", "0", "in", 1.0),
        resistance("R1", "in", "0", 1e3),
        capacitance("C1", "in", "0", 1e-9),
        transconductance("M", ("0", "x"), ("in", "0"), 5e-3, label="gm"),
        voltage_source("VM", "x", "0"),
    ]
    currents = Network.from_parts(mirror, output=Port("", "0", "current", "VM"))
    assert is_ratio(currents)
    pole = 1.0 / (2.0 * math.pi * 1e-6)
    assert unity_of(currents).hz == pytest.approx(pole * math.sqrt(24.0), rel=1e-10)
    siemens = Network.from_parts(
        [voltage_source("VS", "in", "0", 1.0), *mirror[1:]], output=Port("", "0", "current", "VM")
    )
    assert not is_ratio(siemens)
    both = Network.from_parts(
        [
            voltage_source("VS", "a", "0", 1.0),
            current_source("IS", "0", "out", 1.0),
            *load,
            resistance("RA", "a", "out", 1e3),
        ],
        output=Port("out"),
    )
    assert not is_ratio(both)


def test_margin_counts_from_nominal_polarity_not_from_the_phase_at_the_reference() -> None:
    """A zero at the origin and a pole leave some lead at any reference; the margin at f_u does not know it."""
    parts = [*sections(-100.0, 1e5), capacitance("CIN", "out", "w", 1e-6), resistance("RIN", "w", "0", 1e3)]
    network = Network.from_parts(parts, output=Port("w"))
    margins = []
    for hz in (1e2, 3e2, 3e3):
        gain = complex(response(network, np.array([hz]))[0])
        found = find_unity(network, MidBand(hz, None, None, gain))
        assert found is not None
        margins.append(found.phase_margin_deg)
    assert margins == pytest.approx([margins[0]] * 3, abs=1e-9)


def test_no_margin_where_the_polarity_is_not_clear() -> None:
    """60° from 0° and from 180° at most: a differentiator at 90° has neither sign."""
    parts = [*sections(1e4, 1e3), capacitance("CIN", "out", "w", 1e-9), resistance("RIN", "w", "0", 1.0)]
    network = Network.from_parts(parts, output=Port("out"))
    gain = complex(response(network, np.array([1e4]))[0])
    found = find_unity(network, MidBand(1e4, None, None, gain))
    assert found is not None
    assert (found.phase_margin_deg, found.gain_margin_db) == (None, None)


def conditionally_stable(gain: float) -> Network:
    """Three poles low and two zeros before |H| = 1: gain·(1 + jf/z)²/((1 + jf/p)³)."""
    p, z = 1e3, 3e4
    parts = sections(gain, p, p, p)
    node = "out"
    for k in (4, 5):
        after = f"m{k}"
        # 1 + f/z by a transconductance into R in series with L
        parts += [
            transconductance(f"A{k}", ("0", after), (node, "0"), 1.0 / R, label="gm"),
            resistance(f"R{k}", after, f"l{k}", R),
            inductance(f"L{k}", f"l{k}", "0", R / (2.0 * np.pi * z)),
        ]
        node = after
    return Network.from_parts(parts, output=Port(node))


def test_a_conditionally_stable_loop_has_its_margin_on_the_side_that_is_nearer() -> None:
    network = conditionally_stable(1e6)
    midband = find_midband(network)
    found = find_unity(network, midband)
    assert found is not None
    assert is_follower_stable(network, midband) is True
    assert len(found.half_turns) == 2
    assert all(one.below_db < 0.0 for one in found.half_turns)
    fall = min(-one.below_db for one in found.half_turns)
    assert found.gain_margin_db == pytest.approx(fall)
    for more, stable in ((0.1, True), (-0.1, False)):
        assert is_follower_stable(network, midband, gain=10.0 ** ((-fall + more) / 20.0)) is stable


@pytest.mark.parametrize("gain", [4.0, 7.9, 8.1, 100.0])
def test_the_follower_of_three_equal_poles_is_stable_below_a_gain_of_eight(gain: float) -> None:
    network = amplifier(gain, 1e5, 1e5, 1e5)
    assert is_follower_stable(network, find_midband(network)) is (gain < 8.0)


def test_of_several_crossings_the_worst_margin_counts() -> None:
    """One pole, then a resonance that lifts |H| above 1 again, by 180° later."""
    parts = [
        *sections(100.0, 1e4),
        transconductance("GB", ("0", "b"), ("out", "0"), 1.0),
        resistance("RB", "b", "0", 1.0),
        resistance("RS", "b", "d", 8.0),
        inductance("LS", "d", "w", 2.2e-6),
        capacitance("CS", "w", "0", 1.1e-9),
    ]
    network = Network.from_parts(parts, output=Port("w"))
    midband = find_midband(network)
    found = find_unity(network, midband)
    assert found is not None
    assert len(found.further_hz) == 2
    assert found.margin_at_hz == found.further_hz[-1]
    assert found.phase_margin_deg is not None
    assert found.phase_margin_deg < 0.0
    assert is_follower_stable(network, midband) is False
    assert found.gain_margin_db is not None
    assert found.gain_margin_db < 0.0
