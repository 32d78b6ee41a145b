"""Upper band edge: worked examples of textbooks, walked without netlist and engine.

No expectation is computed here. Each number is printed in the source named with it; the tolerance is the precision to
which it is printed, wider only where the source itself approximates, and then the reason stands beside it.
"""

from __future__ import annotations

import math

import pytest

import boards
from tauledger.network.assemble import Network
from tauledger.pipeline import review_network
from tauledger.record import PartRow, Review


def walk(network: Network) -> Review:
    return review_network(network)


def part(review: Review, name: str) -> PartRow:
    return next(row for row in review.parts if row.name == name)


def estimate(review: Review, method: str, edge: str = "f_high") -> float:
    hz = next(row.hz for row in review.estimates if row.edge == edge and row.method == method)
    assert hz is not None
    return hz


def edge_hz(review: Review) -> float:
    assert review.f_high is not None
    assert review.f_high.exact_hz is not None
    return review.f_high.exact_hz


def test_common_emitter_kumar_and_jain_10_7() -> None:
    """Kumar and Jain, Electronic Devices and Circuits, Ex. 10.7: A_V0 -43.8, omega_H 77.05 Mrad/s by time constants."""
    review = walk(boards.common_emitter_1ma())
    assert review.midband.gain_real == pytest.approx(-43.8, rel=2e-3, abs=0)
    assert 2 * math.pi * estimate(review, "sum of time constants") == pytest.approx(77.05e6, rel=2e-4, abs=0)
    assert review.budget.upper is not None
    assert 1 / review.budget.upper.sum_s == pytest.approx(77.05e6, rel=2e-4, abs=0)


def test_common_emitter_kumar_and_jain_10_16() -> None:
    """Kumar and Jain, Ex. 10.16: A_V0 -93.75, f_H 4.38 MHz by time constants."""
    review = walk(boards.common_emitter_600_ohm())
    assert review.midband.gain_real == pytest.approx(-93.75, rel=1e-6, abs=0)
    assert estimate(review, "sum of time constants") == pytest.approx(4.38e6, rel=2e-3, abs=0)


def test_miller_and_dominant_pole_of_a_common_source_ghlm_7_2() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.2.1.2: gain -70.5, 3.9 MHz by Miller, 3.7 MHz by the dominant pole."""
    review = walk(boards.common_source_400_mhz())
    assert review.midband.gain_real == pytest.approx(-70.5, rel=1e-3, abs=0)
    assert review.f_high is not None
    assert review.f_high.hand_hz == pytest.approx(3.9e6, rel=1e-2, abs=0)
    assert edge_hz(review) == pytest.approx(3.7e6, rel=1e-2, abs=0)
    node = next(row for row in review.nodes if row.name == "g")
    assert node.capacitance_f is not None
    assert node.capacitance_f == pytest.approx(5.1e-12 + 35.7e-12, rel=2e-3, abs=0)


def test_two_common_source_stages_ghlm_7_3_3() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.3.3: six time constants (ns), their sum 815 ns, SPICE poles and zeros.

    The printed first pole, 205 kHz, is the -3 dB frequency (205.8 kHz): 815 ns and the two other poles put the pole at
    206.3 kHz.
    """
    review = walk(boards.two_common_source_stages())
    printed = {"M1.c_mu": 320, "M2.c_mu": 315, "M1.c_pi": 50, "M2.c_pi": 100, "Cdb1": 20, "Cdb2": 10}
    assert review.budget.upper is not None
    for name, nanoseconds in printed.items():
        assert part(review, name).time_constant_s == pytest.approx(nanoseconds * 1e-9, rel=1e-9, abs=0), name
    assert review.budget.upper.sum_s == pytest.approx(815e-9, rel=1e-9, abs=0)
    assert review.budget.upper.inverse_pole_sum_s == pytest.approx(815e-9, rel=1e-9, abs=0)
    assert estimate(review, "sum of time constants") == pytest.approx(196e3, rel=5e-3, abs=0)
    assert edge_hz(review) == pytest.approx(205e3, rel=5e-3, abs=0)
    assert sorted(abs(pole.real_hz) for pole in review.poles)[1:] == pytest.approx([4.02e6, 39.98e6], rel=1e-3, abs=0)
    assert sorted(zero.real_hz for zero in review.zeros) == pytest.approx([477e6, 955e6], rel=1e-3, abs=0)


def test_two_common_emitter_stages_kumar_and_jain_10_12() -> None:
    """Kumar and Jain, Ex. 10.12: 2.59 MHz by time constants."""
    review = walk(boards.two_common_emitter_stages())
    assert estimate(review, "sum of time constants") == pytest.approx(2.59e6, rel=2e-3, abs=0)


def test_second_pole_by_b1_over_b2_kumar_and_jain_10_12() -> None:
    """Kumar and Jain, Ex. 10.12: second pole estimated as 28.67 MHz from b1/b2 (the exact one is 26.6 MHz)."""
    review = walk(boards.two_common_emitter_stages())
    second = sorted(review.poles, key=lambda pole: abs(pole.real_hz))[1]
    assert second.hand_hz == pytest.approx(28.67e6, rel=1e-3, abs=0)
    assert abs(second.real_hz) == pytest.approx(26.6e6, rel=1e-3, abs=0)


def test_emitter_follower_never_falls_3_db_ghlm_7_2_3() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.2.3.1: gain 0.986, R_pi0 28 ohm, pole 3.57, zero 3.85 Grad/s."""
    review = walk(boards.emitter_follower())
    assert review.midband.gain_real == pytest.approx(0.986, rel=1e-3, abs=0)
    assert part(review, "Q1.c_pi").resistance_exact_ohm == pytest.approx(28, rel=5e-3, abs=0)
    assert 2 * math.pi * review.poles[0].real_hz == pytest.approx(-3.57e9, rel=5e-3, abs=0)
    assert 2 * math.pi * review.zeros[0].real_hz == pytest.approx(-3.85e9, rel=1e-2, abs=0)
    assert review.f_high is None or review.f_high.exact_hz is None
    assert any(note.note == "levels-off" for note in review.notes)


def test_emitter_follower_with_1_pf_ghlm_7_2_3() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.2.3.1: with C_mu = 1 pF the -3 dB frequency is 725 MHz."""
    review = walk(boards.emitter_follower(c_mu=1e-12))
    assert edge_hz(review) == pytest.approx(725e6, rel=5e-3, abs=0)
    assert estimate(review, "sum of time constants") < 0.5 * edge_hz(review)


def test_common_gate_sedra_and_smith_10_6() -> None:
    """Sedra and Smith 8e, Ex. 10.6: gain 0.95, 263 MHz by time constants."""
    review = walk(boards.common_gate())
    assert review.midband.gain_real == pytest.approx(0.95, rel=5e-3, abs=0)
    assert estimate(review, "sum of time constants") == pytest.approx(263e6, rel=2e-3, abs=0)


def test_source_follower_sedra_and_smith_10_8() -> None:
    """Sedra and Smith 8e, Ex. 10.8: gain 0.8, zero 15.9 GHz, poles 1.99 and 6.7 GHz, f_H 1.9 GHz (root of squares)."""
    review = walk(boards.source_follower())
    assert review.midband.gain_real == pytest.approx(0.8, rel=1e-6, abs=0)
    assert -review.zeros[0].real_hz == pytest.approx(15.9e9, rel=2e-3, abs=0)
    assert sorted(-pole.real_hz for pole in review.poles) == pytest.approx([1.99e9, 6.7e9], rel=6e-3, abs=0)
    assert edge_hz(review) == pytest.approx(1.9e9, rel=2.5e-2, abs=0)


def test_pole_splitting_ghlm_7_3_6() -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.3.6: tau_0 6.4 us and 10 ns, p1 -156 krad/s, p2 -3.20 Grad/s."""
    review = walk(boards.compensated_stage())
    assert part(review, "M1.c_mu").time_constant_s == pytest.approx(6.4e-6, rel=1e-9, abs=0)
    assert part(review, "M1.c_pi").time_constant_s == pytest.approx(1.0e-8, rel=1e-9, abs=0)
    low, high = sorted(-2 * math.pi * pole.real_hz for pole in review.poles)
    assert low == pytest.approx(156e3, rel=1e-3, abs=0)
    assert high == pytest.approx(3.20e9, rel=2e-3, abs=0)


def test_common_emitter_sedra_and_smith_from_memory() -> None:
    """Sedra and Smith 5e-7e, common-emitter example, from memory: A_M -39, R_sig' 1.65 kohm, f_H 754 kHz by Miller."""
    review = walk(boards.common_emitter_8k())
    assert review.midband.gain_real == pytest.approx(-39, rel=1e-2, abs=0)
    assert part(review, "Q1.c_pi").resistance_exact_ohm == pytest.approx(1650, rel=5e-3, abs=0)
    assert review.f_high is not None
    assert review.f_high.hand_hz == pytest.approx(754e3, rel=1e-2, abs=0)


def test_common_source_sedra_and_smith_from_memory() -> None:
    """Sedra and Smith 5e-7e, common-source example, from memory: A_M -7, C_in 4.26 pF, f_H 382 kHz by Miller."""
    review = walk(boards.common_source_100k())
    assert review.midband.gain_real == pytest.approx(-7, rel=2e-3, abs=0)
    node = next(row for row in review.nodes if row.name == "g")
    assert node.capacitance_f == pytest.approx(4.26e-12, rel=2e-3, abs=0)
    assert review.f_high is not None
    assert review.f_high.hand_hz == pytest.approx(382e3, rel=2e-3, abs=0)


def test_of_two_separated_poles_the_lower_one_is_the_band_edge() -> None:
    """Common practice: with poles 40 times apart and no zero near, f_H lies within 0.1 % of the lower pole."""
    review = walk(boards.common_emitter_1ma())
    low, high = sorted(-pole.real_hz for pole in review.poles)
    assert high > 40 * low
    assert edge_hz(review) == pytest.approx(low, rel=1e-3, abs=0)


def test_miller_splits_c_bc_into_gain_times_it_and_about_itself() -> None:
    """Common practice: input side about |A| times C_bc, output side about C_bc, for a gain well above one."""
    review = walk(boards.common_emitter_600_ohm())
    gain = 0.1 * 1.5e3
    terms = {
        (row.name, term.part): term
        for row in review.nodes
        if row.working is not None
        for term in row.working.capacitances
    }
    assert terms["b", "Q1.c_mu"].factor == pytest.approx(gain, rel=1e-2, abs=0)
    assert terms["out", "Q1.c_mu"].factor == pytest.approx(1.0, rel=1e-2, abs=0)
