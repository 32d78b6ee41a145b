"""The hand formula that belongs to each pole."""

from __future__ import annotations

import math

import numpy as np
import pytest

import boards
from by_algebra import evidence, roots, signal_nodes
from tauledger.hand.combine import Coefficients, coefficients, visible_roots
from tauledger.hand.poles import HandPole, hand_poles, pair_frequency_and_q
from tauledger.network.assemble import Network


def above(network: Network) -> tuple[HandPole, ...]:
    poles, zeros = roots(network)
    seen = visible_roots(poles, zeros)
    return hand_poles(poles, seen.cancelled, midband_hz=0.0, upper=coefficients(seen.poles), lower=None)


def below(network: Network) -> tuple[HandPole, ...]:
    found = evidence(network)
    assert found.lower.combined is not None
    return hand_poles(
        found.poles,
        found.lower.combined.roots.cancelled,
        midband_hz=found.bands.midband.frequency_hz,
        upper=None,
        lower=found.lower.combined.coefficients,
    )


def hz(pole: HandPole) -> float:
    assert pole.hz is not None
    return pole.hz


def test_second_pole_is_b1_over_b2_kumar_and_jain_10_7() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.7: p2/p1 = b1²/b2 = 49.49; exact 47.5."""
    first, second = above(boards.common_emitter_1ma())
    assert hz(second) / hz(first) == pytest.approx(49.49, rel=2e-4)
    assert second.pole.real / first.pole.real == pytest.approx(47.472, rel=1e-4)
    assert (first.formula, second.formula) == ("1/(2π·b1)", "b1/(2π·b2)")


def test_second_pole_of_two_stages_kumar_and_jain_10_12() -> None:
    """Kumar and Jain, Ex. 10.12: 28.67 MHz; the third pole is beyond two coefficients."""
    _, second, third = above(boards.two_common_emitter_stages())
    assert hz(second) == pytest.approx(28.67e6, rel=1e-3)
    assert (third.hz, third.formula) == (None, "")


def test_pole_splitting_gives_both_poles_ghlm_7_3_6() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.6: p1 = 156 krad/s, p2 = 3.20 Grad/s."""
    first, second = above(boards.compensated_stage())
    assert 2 * math.pi * hz(first) == pytest.approx(156e3, rel=1e-3)
    assert 2 * math.pi * hz(second) == pytest.approx(3.20e9, rel=2e-3)


def test_second_pole_of_a_split_pair_is_not_the_output_nodes_own() -> None:
    """R_L·(C_L + C_f·(1 + 1/A)) alone would be 0.77 MHz where the second pole is at 510 MHz: 660 times away."""
    network = boards.compensated_stage()
    own = next(1 / (2 * math.pi * row.time_constant_s) for row in signal_nodes(network) if row.name == "out")
    second = above(network)[1]
    assert hz(second) == pytest.approx(abs(second.pole) / (2 * math.pi), rel=1e-2)
    assert hz(second) > 500 * own


def test_source_follower_has_a_pair_cjm_4_16() -> None:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.16: omega_0 4.27 Grad/s, Q 0.554 with C_gs dropped from b1."""
    (pair,) = above(boards.source_follower_with_load())
    assert 2 * math.pi * hz(pair) == pytest.approx(4.27e9, rel=5e-3)
    assert pair.q == pytest.approx(0.554, rel=1e-2)
    assert pair.q == pytest.approx(0.54936, rel=1e-4)
    assert pair.pole.imag > 0
    f0, q = pair_frequency_and_q(pair.pole)
    assert hz(pair) == pytest.approx(f0)
    assert pair.q == pytest.approx(q)
    assert pair.formula == "f0 = 1/(2π·√b2), Q = √b2/b1 = 0.549"


def test_close_real_poles_are_roots_of_the_quadratic() -> None:
    """1/b1 and b1/b2 would be 20 % off each at a ratio of 4."""
    poles = np.array([-1.0, -4.0], dtype=complex)
    first, second = hand_poles(poles, poles[:0], midband_hz=0.0, upper=coefficients(poles), lower=None)
    assert 2 * math.pi * hz(first) == pytest.approx(1.0)
    assert 2 * math.pi * hz(second) == pytest.approx(4.0)
    assert first.formula == "root of 1 + b1·s + b2·s²"


def test_three_equal_poles_have_no_second_pole_in_two_coefficients() -> None:
    """b1²/b2 = 3: the quadratic is complex though every pole is real, so only 1/b1 is given."""
    poles = np.full(3, -1.0 + 0j)
    found = hand_poles(poles, poles[:0], midband_hz=0.0, upper=coefficients(poles), lower=None)
    assert coefficients(poles).separation == pytest.approx(3.0)
    assert len(found) == 3
    assert {pole.formula for pole in found} <= {"1/(2π·b1)", ""}


def test_a_cancelled_pole_has_no_formula_and_takes_none_away() -> None:
    poles = np.array([-2e4, -1e7, -1e9], dtype=complex)
    found = hand_poles(poles, poles[:1], midband_hz=0.0, upper=coefficients(poles[1:]), lower=None)
    assert [pole.formula for pole in found] == ["", "1/(2π·b1)", "b1/(2π·b2)"]


def test_low_poles_have_the_same_formulas_turned_round() -> None:
    """Kumar and Jain, Ex. 10.15: both capacitors at 25 Hz, their sum a1 = 49.99 Hz is the pole at 49.86 Hz."""
    second, first = below(boards.two_equal_low_edges())
    assert hz(first) == pytest.approx(49.99, rel=1e-4)
    assert (first.formula, second.formula) == ("a1/2π", "a2/(2π·a1)")
    assert hz(second) == pytest.approx(0.13096, rel=5e-3)


def test_poles_on_both_sides_of_mid_band_get_their_own_coefficients() -> None:
    poles = np.array([-2 * math.pi * 5, -2 * math.pi * 100, -2 * math.pi * 1e6, -2 * math.pi * 5e7], dtype=complex)
    upper, low = coefficients(poles[2:]), coefficients(np.reciprocal(poles[:2]))
    found = hand_poles(poles, poles[:0], midband_hz=1e4, upper=upper, lower=Coefficients(low.b1, low.b2))
    assert [pole.formula for pole in found] == ["a2/(2π·a1)", "a1/2π", "1/(2π·b1)", "b1/(2π·b2)"]
    assert [hz(pole) for pole in found] == pytest.approx([4.76, 105, 0.98e6, 51e6], rel=1e-2)


def test_dominant_pole_before_a_pair_gets_the_sum_alone() -> None:
    poles = np.array([-1.0, -30 + 40j, -30 - 40j], dtype=complex)
    dominant, pair = hand_poles(poles, poles[:0], midband_hz=0.0, upper=coefficients(poles), lower=None)
    assert dominant.formula == "1/(2π·b1)"
    assert (pair.hz, pair.q) == (None, None)


def test_a_pole_at_the_origin_has_no_formula_and_crowds_no_other() -> None:
    poles = np.array([0.0, -2.0, -300.0], dtype=complex)
    pair = coefficients((1.0 / poles[1:]).astype(complex))
    origin, second, first = hand_poles(poles, poles[:0], midband_hz=1e4, upper=None, lower=pair)
    assert (origin.hz, origin.formula) == (None, "")
    assert (first.formula, second.formula) == ("a1/2π", "a2/(2π·a1)")


def test_no_hand_side_no_formulas() -> None:
    poles = np.array([-1.0, -5.0], dtype=complex)
    assert {pole.formula for pole in hand_poles(poles, poles[:0], midband_hz=0.0, upper=None, lower=None)} == {""}


def test_a_formula_that_misses_by_a_fifth_is_given_for_the_dominant_pole_alone_and_says_so() -> None:
    """1/b1 of 1 and 2 ± 2j (in units of 1): b1 = 1.5, a third low; for poles that it cannot hold there is none."""
    poles = np.array([-1.0, -2 + 2j, -2 - 2j], dtype=complex)
    first, pair = hand_poles(poles, poles[:0], midband_hz=0.0, upper=coefficients(poles), lower=None)
    assert 2 * math.pi * hz(first) == pytest.approx(1 / 1.5)
    assert first.formula == "1/(2π·b1), -33 % off"
    assert pair.hz is None


@pytest.mark.parametrize("board", [*boards.UPPER], ids=lambda board: board.__name__)
def test_no_pole_has_a_formula_that_is_nonsense_without_saying_so(board: boards.Board) -> None:
    for told in above(board()):
        if told.hz is not None and not told.formula.endswith("off"):
            assert 2 * math.pi * told.hz == pytest.approx(abs(told.pole), rel=0.2)
