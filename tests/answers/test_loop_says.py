"""What is said of loops whose T is not one pole from DC on: angles, sign, reasons, one frequency on both sides."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauledger.asked import Asked
from tauledger.engine.client import Engine
from tauledger.pipeline import review
from tauledger.record import LoopFacts, Review
from tauledger.report.terminal import render

AMPLIFIER = """.subckt amp p n o
RIN p n 2meg
G1 0 x p n 1m
R1 x 0 {ohm}
C1 x 0 159.155p
E1 w 0 x 0 1
RO w o 75
.ends
.ac dec 10 1 10meg
.print ac v(out)
.end
"""
COUPLED = f"""River-level gauge, inverting amplifier behind a coupling capacitor
VIN s 0 AC 1
CI s a 1u
RI a n 10k
XU1 0 n out amp
RF out n 100k
RL out 0 2k
{AMPLIFIER.format(ohm="100meg")}"""
INTEGRATOR = f"""River-level gauge, integrator of the echo energy
VIN s 0 AC 1
RI s n 10k
XU1 0 n out amp
CF out n 10n
RD out n 10meg
RL out 0 2k
{AMPLIFIER.format(ohm="10meg")}"""
OVER_A_LINE = f"""River-level gauge, amplifier that senses at the end of its lead
VIN p 0 AC 1
XU1 p n out amp
TL out 0 far 0 z0=50 td=100n
RT far 0 50
R2 far n 9k
R1 n 0 1k
{AMPLIFIER.format(ohm="10meg")}"""
LOW_IMPEDANCE_INPUT = """River-level gauge, amplifier whose inverting input takes a current
.subckt fast p n o
E1 b 0 p 0 1
VS b b2 0
RN b2 n 50
F1 0 z VS 1
RZ z 0 500k
CZ z 0 2p
E2 w 0 z 0 1
RO w o 20
.ends
VIN s 0 AC 1
RS s p 50
XU1 p n out fast
RF out n 750
RG n 0 750
RL out 0 150
.ac dec 10 1k 1g
.print ac v(out)
.end
"""
FOLLOWED = """River-level gauge, two transistors and a follower in one loop
VCC vcc 0 12
VIN s 0 DC 1 AC 1
RS s b 1k
Q1 c1 b e qn
RC1 vcc c1 10k
Q2 c2 c1 vcc qp
RC2 c2 0 4.7k
Q3 vcc c2 out qn
RL out 0 1k
RF out e 1.8k
RE e 0 200
.model qn npn(is=2e-15 bf=150 rb=100 cje=3p cjc=2p tf=300p)
.model qp pnp(is=2e-15 bf=100 rb=100 cje=3p cjc=2p tf=500p)
.ac dec 10 1k 100meg
.print ac v(out)
.end
"""

IN_SERIES = """River-level gauge, three transistors with feedback from emitter to emitter
VCC vcc 0 12
VIN s 0 DC 0.9 AC 1
RS s b1 50
Q1 c1 b1 e1 qn
RC1 vcc c1 9k
RE1 e1 0 100
Q2 c2 c1 0 qn
RC2 vcc c2 5k
Q3 out c2 e3 qn
RC3 vcc out 600
RE2 e3 0 100
RF e3 e1 640
.model qn npn(is=2e-15 bf=150 rb=100 cje=1p cjc=0.5p tf=300p)
.ac dec 10 1k 1g
.print ac v(out)
.end
"""


def reviewed(netlist: str, engine: Engine, folder: Path, *loops: str) -> Review:
    file = folder / "board.cir"
    file.write_text(netlist)
    return review(file, engine=engine, asked=Asked(loops=loops))


def only(found: Review) -> LoopFacts:
    assert len(found.loops) == 1
    return found.loops[0]


def methods(facts: LoopFacts) -> dict[str, float | None]:
    return {one.method: one.difference for one in facts.estimates}


def test_a_loop_that_lags_a_quarter_turn_at_mid_band_is_negative_feedback(engine: Engine, tmp_path: Path) -> None:
    """Mid-band lies above the amplifier's 10 Hz: T = −j·74, with a real part that has either sign."""
    facts = only(reviewed(COUPLED, engine, tmp_path))
    t = complex(facts.return_ratio_real, facts.return_ratio_imag)
    assert np.degrees(np.angle(t)) == pytest.approx(-90.0, abs=1.0)
    assert facts.return_ratio_simulated == pytest.approx(abs(t), rel=1e-6)
    assert facts.return_ratio_simulated_deg == pytest.approx(np.degrees(np.angle(t)), abs=1e-4)
    assert not any("positive" in one for one in facts.says)
    assert not facts.flat
    assert facts.open_edge_hz is None
    assert "edge of T times 1 + T" not in methods(facts)
    # RO and the load leave 2000/2075 of it
    assert [one for one in facts.why if "leaves 96 %" in one] == list(facts.why)


def test_where_t_rises_the_simulated_one_stands_at_dc_too(engine: Engine, tmp_path: Path) -> None:
    """T = 1e4·β: 9.6 at DC, about 1e4 above 1.6 Hz, where 10 nF bridges 10 MΩ."""
    found = reviewed(INTEGRATOR, engine, tmp_path)
    facts = only(found)
    assert facts.at_hz == 0.0
    assert facts.return_ratio_real == pytest.approx(9.58, rel=1e-3)
    assert facts.return_ratio_simulated == pytest.approx(facts.return_ratio_real, rel=1e-4)
    assert facts.open_edge_hz is None
    assert any("not flat" in one for one in facts.says)
    assert facts.noise_gain_edge_hz is None
    assert "gain-bandwidth over noise gain" not in methods(facts)
    assert facts.why == ("elements around the amplifier set f_H: with T → ∞ the gain would fall there by itself",)


def test_an_amplifier_that_is_closed_already_gets_no_section_on_unity_gain_unasked(
    engine: Engine, tmp_path: Path
) -> None:
    found = reviewed(INTEGRATOR, engine, tmp_path)
    assert found.midband.from_hz == 0.0
    assert found.midband.gain_db > 20.0
    assert found.f_unity is None or not found.f_unity.elements


def test_a_line_in_the_loop_is_no_second_pole(engine: Engine, tmp_path: Path) -> None:
    """100 ns at |T| = 1 near 100 kHz are 3.6°, all that T lags beyond one pole."""
    facts = only(reviewed(OVER_A_LINE, engine, tmp_path))
    assert facts.crossover_hz is not None
    assert facts.phase_margin_deg == pytest.approx(90.0 - 360.0 * 100e-9 * facts.crossover_hz, abs=1.5)
    told = " ".join(facts.why)
    assert "second pole" not in told
    assert "a line delays it" in told


def test_feedback_to_a_low_impedance_input_is_found_at_the_current_that_comes_back(
    engine: Engine, tmp_path: Path
) -> None:
    facts = only(reviewed(LOW_IMPEDANCE_INPUT, engine, tmp_path))
    assert (facts.found, facts.where) == (True, "source F1 of XU1")
    # 500 kΩ·(1 − what the load takes) over RF·(1 + r/(RF∥RG)) with r 50 Ω
    assert facts.return_ratio_real == pytest.approx(507.8, rel=1e-3)
    assert facts.return_ratio_simulated == pytest.approx(facts.return_ratio_real, rel=1e-6)


def test_a_wire_is_cut_in_the_direction_of_the_signal(engine: Engine, tmp_path: Path) -> None:
    """The follower's emitter gives the signal and its base takes it: the same T; from outside in it is another one."""
    into, out_of = reviewed(FOLLOWED, engine, tmp_path, "Q3.base", "Q3.emitter").loops
    assert out_of.where == "wire out of the emitter of Q3 (out)"
    assert into.where.startswith("wire into the base of Q3")
    assert out_of.return_ratio_real == pytest.approx(into.return_ratio_real, rel=0.02)
    assert out_of.return_ratio_real > 1.0
    for one in (into, out_of):
        assert one.return_ratio_simulated == pytest.approx(one.return_ratio_real, rel=1e-4)
        assert one.crossover_simulated_hz == pytest.approx(one.crossover_hz, rel=1e-3)


def test_a_wire_by_which_nothing_comes_back_has_no_loop_and_no_band_edge(engine: Engine, tmp_path: Path) -> None:
    open_loop = FOLLOWED.replace("RF out e 1.8k\n", "RF out 0 1.8k\n").replace("cjc=2p", "cjc=0")
    facts = only(reviewed(open_loop, engine, tmp_path, "Q3.emitter"))
    assert abs(facts.return_ratio_real) < 1e-9
    assert facts.says == ("no loop through this wire: nothing comes back but rounding",)
    assert facts.estimates == ()


def test_t0_by_hand_and_the_edge_are_those_of_the_wire_that_is_cut(engine: Engine, tmp_path: Path) -> None:
    """RE2 alone makes a loop through Q3 beside the one around all three: T at its gm is not T of the wire."""
    found = reviewed(IN_SERIES, engine, tmp_path)
    facts = only(found)
    assert (facts.kind, facts.loop) == ("wire", "Q1.emitter")
    t, closing = facts.return_ratio_real, facts.closing_return_ratio
    assert closing is not None
    assert abs(closing / t - 1.0) > 0.3
    assert facts.hand_return_ratio == pytest.approx(t, rel=0.06)
    assert facts.hand_open_edge_hz is not None
    assert facts.open_edge_hz is not None
    by_hand = next(one for one in facts.estimates if one.method == "by hand, edge of T times 1 + T")
    assert by_hand.hz == pytest.approx(facts.open_edge_hz * (1.0 + t), rel=0.15)
    page = " ".join(render(found, color=False, unicode=True).split())
    assert "T0 = gm of" not in page
