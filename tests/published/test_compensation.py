"""Compensated stages, mirrors and their phase: worked examples of textbooks and one sweep worked out for this project.

No expectation is computed here. Each number is printed in the source named with it, to the precision to which it is
printed; those of the sweep were computed once, outside of this program, from the two-by-two determinant.
"""

from __future__ import annotations

import math

import pytest

import boards
from cells import near
from tauledger.asked import Asked
from tauledger.circuit import Port
from tauledger.devices.parts import (
    capacitance,
    current_source,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.hand.compensation import (
    dominant_pole_hz,
    mirror_pole_hz,
    mirror_zero_hz,
    phase_used_deg,
    right_half_plane_zero_hz,
    second_pole_hz,
)
from tauledger.network.assemble import Network
from tauledger.pipeline import review_network
from tauledger.record import Review

PICO = 1e-12


def sizes(review: Review) -> list[float]:
    return sorted(-pole.real_hz for pole in review.poles)


def split(c_c: float) -> Network:
    """A current into 100 kohm ‖ 1 pF, gm 3 mA/V, 50 kohm ‖ 5 pF, with C_c between; the example's values."""
    return Network.from_parts(
        [
            current_source("IS", "0", "x", 1.0),
            resistance("R1", "x", "0", 100e3),
            capacitance("C1", "x", "0", 1 * PICO),
            transconductance("G2", ("out", "0"), ("x", "0"), 3e-3),
            resistance("R2", "out", "0", 50e3),
            capacitance("C2", "out", "0", 5 * PICO),
            *([capacitance("CC", "x", "out", c_c)] if c_c else []),
        ],
        output=Port("out"),
    )


# C_c in pF; exact poles in Hz; gm·C/(C1·C2 + C·(C1 + C2)) in Hz; zero gm/C in Hz: five digits each
SWEEP = [
    (0.5, 20095.0, 31512000.0, 29842000.0, 954930000.0),
    (1.0, 10270.0, 44842000.0, 43406000.0, 477460000.0),
    (2.0, 5193.1, 57384000.0, 56172000.0, 238730000.0),
    (5.0, 2091.5, 69208000.0, 68209000.0, 95493000.0),
    (10.0, 1048.1, 74361000.0, 73456000.0, 47746000.0),
    (20.0, 524.66, 77247000.0, 76394000.0, 23873000.0),
]
FIVE_DIGITS = 5e-5


@pytest.mark.parametrize(("picofarad", "first", "second", "second_by_hand", "zero"), SWEEP)
def test_poles_split_as_the_compensation_grows_ghlm_9_27_to_9_34(
    picofarad: float, first: float, second: float, second_by_hand: float, zero: float
) -> None:
    """Formulas of Gray, Hurst, Lewis and Meyer, 5th ed., eqs 9.27 to 9.34, at values of our own."""
    review = review_network(split(picofarad * PICO))
    assert sizes(review) == near([first, second], rel=FIVE_DIGITS)
    assert [one.real_hz for one in review.zeros] == near([zero], rel=FIVE_DIGITS)
    assert second_pole_hz(3e-3, 1 * PICO, 5 * PICO, picofarad * PICO) == near(second_by_hand, rel=FIVE_DIGITS)
    assert right_half_plane_zero_hz(3e-3, picofarad * PICO) == near(zero, rel=FIVE_DIGITS)


def test_without_compensation_both_poles_stand_where_their_nodes_have_them() -> None:
    assert sizes(review_network(split(0.0))) == near([636620.0, 1591500.0], rel=FIVE_DIGITS)


# 1/(gm·R1·R2·C) in Hz, to which the dominant pole comes as C grows
ONE_CONSTANT = [(0.5, 21221.0), (1.0, 10610.0), (2.0, 5305.2), (5.0, 2122.1), (10.0, 1061.0), (20.0, 530.52)]


@pytest.mark.parametrize(("picofarad", "hz"), ONE_CONSTANT)
def test_the_dominant_pole_is_one_over_gm_r1_r2_c_but_for_what_stands_beside_a2(picofarad: float, hz: float) -> None:
    """A2 = 150: C1 and C_c itself beside A2·C_c are 2 % at 0.5 pF and below 1 % from 5 pF on."""
    beside = {0.5: 0.021, 1.0: 0.014, 2.0: 0.011, 5.0: 0.0081, 10.0: 0.0075, 20.0: 0.0071}[picofarad]
    assert dominant_pole_hz(100e3, 1 * PICO, picofarad * PICO, 150.0) == near(hz, rel=beside)


def test_pole_splitting_by_formula_ghlm_7_3_6() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.3.6: p1 -156 krad/s, p2 -3.20 Grad/s exact, 3.0 by eq. 9.33.

    C_f 20 pF and no C_L: eq. 9.33 leaves gm/C_gs. A2 = 30, so that 1/(R1·(C1 + C_f·(1 + A2))) is 160.5 krad/s: R2·C_f,
    3 % of the sum of time constants 6.41 us, is what it leaves out.
    """
    review = review_network(boards.compensated_stage())
    first, second = sizes(review)
    assert 2.0 * math.pi * first == near(156e3, rel=2e-3)
    assert 2.0 * math.pi * second == near(3.20e9, rel=2e-3)
    assert 2.0 * math.pi * second_pole_hz(3e-3, 1 * PICO, 0.0, 20 * PICO) == near(3.0e9, rel=1e-9)
    by_hand = 2.0 * math.pi * dominant_pole_hz(10e3, 1 * PICO, 20 * PICO, 30.0)
    assert by_hand == near(156e3, rel=0.04)
    # f_H by Miller's capacitance alone: 25629 Hz
    assert by_hand / (2.0 * math.pi) == near(25629.0, rel=1e-4)
    (zero,) = review.zeros
    assert zero.real_hz == near(23.873e6, rel=FIVE_DIGITS)


def test_zero_of_the_right_half_plane_near_the_edge() -> None:
    """g_m 0.2 mS and C_gd 10 pF: zero at 3.1831 MHz, poles at 1.2221 MHz and 207.27 MHz (worked for this project)."""
    review = review_network(boards.weak_stage_with_large_bridge())
    assert sizes(review) == near([1222100.0, 207270000.0], rel=FIVE_DIGITS)
    assert right_half_plane_zero_hz(0.2e-3, 10 * PICO) == near(3183100.0, rel=FIVE_DIGITS)
    assert review.zeros[0].real_hz == near(3183100.0, rel=FIVE_DIGITS)


def test_each_stage_has_a_zero_of_the_right_half_plane_ghlm_7_3_3() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.3.3: gm/C_gd of both stages, 3 mA/V and 6 mA/V over 1 pF.

    477 and 955 MHz as zeros of the whole amplifier (worked for this project); paper has each by itself.
    """
    network = boards.two_common_source_stages()
    assert sorted(one.real_hz for one in review_network(network).zeros) == near([477e6, 955e6], rel=1e-3)
    assert right_half_plane_zero_hz(3e-3, 1 * PICO) == near(477e6, rel=1e-3)
    assert right_half_plane_zero_hz(6e-3, 1 * PICO) == near(955e6, rel=1e-3)
    budget = review_network(network, asked=Asked(unity=True)).phase_budget
    assert budget is not None
    by_hand = [row.hand_hz for row in budget.rows if row.kind == "zero"]
    assert by_hand == near([477e6, 955e6], rel=1e-3)


def test_mirror_doublet_uses_at_most_19_degrees_ghlm_7_3_5() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.3.5: pole gm/C, zero 2·gm/C, at most 19.4 degrees of lag (exact 19.47).

    g_m 1 mA/V and 80 fF: pole 1.99 GHz, zero 3.98 GHz. The most is used at √2 times the pole.
    """
    pole, zero = mirror_pole_hz(1e-3, 80e-15), mirror_zero_hz(1e-3, 80e-15)
    assert pole == near(1.99e9, rel=1e-3)
    assert zero == near(-3.98e9, rel=1e-3)
    lags = [phase_used_deg(pole * 10.0 ** (k / 100.0), [pole], [zero]) for k in range(-200, 201)]
    assert max(lags) == pytest.approx(19.4, abs=0.08)
    assert phase_used_deg(1.414 * pole, [pole], [zero]) == pytest.approx(19.47, abs=0.005)


def test_the_mirror_of_a_loaded_pair_is_found_with_its_doublet() -> None:
    """The same mirror in a pair of gain 42.86: paper's doublet beside the exact one in the phase budget."""
    network = Network.from_parts(
        [
            voltage_source("VS", "s", "0", 1.0),
            transconductance("G1", ("m", "0"), ("s", "0"), 0.5e-3),
            transconductance("G2", ("0", "out"), ("s", "0"), 0.5e-3),
            transconductance("G3", ("m", "0"), ("m", "0"), 1e-3),
            capacitance("Cm", "m", "0", 80e-15),
            transconductance("G4", ("out", "0"), ("m", "0"), 1e-3),
            resistance("ro2", "out", "0", 100e3),
            resistance("ro4", "out", "0", 75e3),
            capacitance("CL", "out", "0", 60e-15),
        ],
        output=Port("out"),
    )
    budget = review_network(network).phase_budget
    assert budget is not None
    found = {row.name: row for row in budget.rows}
    assert found["mirror pole"].real_hz == near(-1.99e9, rel=1e-3)
    assert found["mirror pole"].hand_hz == near(1.99e9, rel=1e-3)
    assert found["mirror zero"].real_hz == near(-3.98e9, rel=1e-3)
    assert found["mirror zero"].hand_hz == near(-3.98e9, rel=1e-3)
