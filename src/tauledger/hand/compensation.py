"""Poles and zeros of a compensated amplifier as paper has them: one function per formula, in Hz.

A zero is positive in the right half plane, negative in the left; a pole is given by its size.

Sources: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed. 2009, sec. 7.3.6
and 9.4 (splitting, right-half-plane zero, nulling resistor), 7.3.5 (mirror); Sedra and Smith, "Microelectronic
Circuits", 8th ed. (followers).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from msgspec import Struct

TWO_PI = 2.0 * math.pi
GRAY = "Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed., 2009"
WIDEST = 1e6
CLOSE = 1e-12


class Formula(Struct, frozen=True):
    """One formula as written on paper: its name, where it holds, and who published it."""

    name: str
    written: str
    valid: str
    source: str


DOMINANT_POLE = Formula(
    "dominant pole",
    "1/(2π·R1·(C1 + C_c·(1 + A2)))",
    "R1 and C1 at the input of the compensated stage, A2 its gain; the load's own R2·(C_L + C_c) is left out",
    f"{GRAY}, sec. 7.3.6 and 9.4.2",
)
LOADED_POLE = Formula(
    "dominant pole, load counted",
    "1/(2π·(R1·(C1 + C_c·(1 + A2)) + R2·(C_c + C_L)))",
    "R2 at the output of the stage; where C1 and C_c at the input do not make nearly all of b1",
    f"{GRAY}, sec. 7.3.6 and 9.4.2 (eq. 9.28, from memory)",
)
SECOND_POLE = Formula(
    "second pole",
    "gm2·C_c/(2π·(C1·C_L + C_c·(C1 + C_L)))",
    "A2 far above 1 and the poles far apart; C_c joins input and output of the stage there",
    f"{GRAY}, sec. 9.4.2 (eq. 9.33)",
)
LOADED_SECOND_POLE = Formula(
    "second pole, load counted",
    "b1/(2π·R1·R2·(C1·C_L + C_c·(C1 + C_L)))",
    "b1 = R1·(C1 + C_c·(1 + A2)) + R2·(C_c + C_L); the poles far apart",
    f"{GRAY}, sec. 7.3.6 and 9.4.2 (eq. 9.30, from memory)",
)
RIGHT_HALF_PLANE_ZERO = Formula(
    "zero, right half plane",
    "gm2/(2π·C_c)",
    "nothing in series with C_c; what passes forward through C_c cancels gm2 there",
    f"{GRAY}, sec. 9.4.2 (eq. 9.27)",
)
GATE_DRAIN_ZERO = Formula(
    "zero through C_gd",
    "gm/(2π·C_gd)",
    "a transistor of the signal path with its source at AC ground and nothing in series with C_gd; right half plane",
    f"{GRAY}, sec. 7.2.1",
)
BASE_COLLECTOR_ZERO = Formula(
    "zero through C_μ",
    "gm/(2π·C_μ)",
    "a transistor of the signal path with its emitter at AC ground and nothing in series with C_μ; right half plane",
    f"{GRAY}, sec. 7.2.1",
)
NULLED_ZERO = Formula(
    "zero of the nulling resistor",
    "1/(2π·C_c·(1/gm2 − R_z))",
    "R_z in series with C_c; right half plane below R_z = 1/gm2, none at it, left half plane above",
    f"{GRAY}, sec. 9.4.3",
)
THIRD_POLE = Formula(
    "third pole",
    "1/(2π·R_z·C1)",
    "R_z in series with C_c, and C1 far below C_c and C_L",
    f"{GRAY}, sec. 9.4.3 (from memory)",
)
MIRROR_POLE = Formula(
    "mirror pole",
    "gm/(2π·C_m), C_m = 2·C_gs",
    "C_m all capacitance at the mirror's input; half of the signal passes the mirror",
    f"{GRAY}, sec. 7.3.5",
)
BIPOLAR_MIRROR_POLE = Formula(
    "mirror pole",
    "gm/(2π·C_m), C_m = 2·C_π",
    "C_m all capacitance at the mirror's input; half of the signal passes the mirror; current gain far above 1",
    f"{GRAY}, sec. 7.3.5",
)
MIRROR_ZERO = Formula(
    "mirror zero",
    "2·gm/(2π·C_m)",
    "one octave above the mirror's pole: the other half of the signal goes past it",
    f"{GRAY}, sec. 7.3.5",
)
FOLLOWER_ZERO = Formula(
    "zero of a follower",
    "(gm + 1/r_π)/(2π·C_π)",
    "C_π or C_gs, which passes forward, and nothing in series with it; left half plane",
    f"{GRAY}, sec. 7.2.3",
)
DEGENERATION_ZERO = Formula(
    "zero of a bypassed resistor",
    "1/(2π·R_E·C_E)",
    "C_E beside R_E under a transistor of which the other end is the signal's output; left half plane",
    "common practice",
)
BRIDGED_RESISTOR_ZERO = Formula(
    "zero of a bridged resistor",
    "1/(2π·R·C)",
    "C beside R, both in the signal path; left half plane",
    "common practice",
)
LOAD_POLE = Formula(
    "pole of the load",
    "1/(2π·R_out·C_L)",
    "C_L all capacitance at the output, R_out all resistance there; no node before it nearly as slow",
    f"{GRAY}, sec. 9.4.1 and 6.7 (from memory)",
)
CASCODE_POLE = Formula(
    "pole of a cascode's source",
    "(gm + g_mb)/(2π·C_node)",
    "C_node all capacitance at the source (emitter) of the cascode or folded cascode",
    f"{GRAY}, sec. 7.3.4 and 6.7 (from memory)",
)
UNITY_GAIN_OF_LOAD = Formula(
    "unity gain frequency",
    "gm1/(2π·C_L)",
    "one pole alone below it, that of the load; gm1 is what 1 V of drive sends to the output",
    f"{GRAY}, sec. 9.4.1 and 6.7 (from memory)",
)
UNITY_GAIN_LOADED = Formula(
    "unity gain frequency",
    "gm1·R1·A2/(2π·b1)",
    "b1 = R1·(C1 + C_c·(1 + A2)) + R2·(C_c + C_L): A2 not far above 1 or the load not far below C_c·A2",
    f"{GRAY}, sec. 7.3.6 (from memory)",
)
UNITY_GAIN = Formula(
    "unity gain frequency",
    "gm1/(2π·C_c)",
    "one pole alone below it; gm1 feeds the compensated stage",
    f"{GRAY}, sec. 9.4.2",
)
UNITY_GAIN_WITH_ROOTS = Formula(
    "with further poles and zeros",
    "gm1/(2πf·C_c)·Π√(1 + (f/z)²)/Π√(1 + (f/p)²) = 1",
    "the dominant pole far below; poles and zeros by the formulas above",
    f"{GRAY}, sec. 9.4 (from memory)",
)
PHASE_MARGIN = Formula(
    "phase margin",
    "180° − Σ atan(f/p) − Σ ±atan(f/z)",
    "real poles and zeros by the formulas above; a zero of the right half plane uses phase, one of the left gives it",
    f"{GRAY}, sec. 9.3",
)
FORMULAS: tuple[Formula, ...] = (
    DOMINANT_POLE,
    LOADED_POLE,
    SECOND_POLE,
    LOADED_SECOND_POLE,
    RIGHT_HALF_PLANE_ZERO,
    GATE_DRAIN_ZERO,
    BASE_COLLECTOR_ZERO,
    NULLED_ZERO,
    THIRD_POLE,
    MIRROR_POLE,
    BIPOLAR_MIRROR_POLE,
    MIRROR_ZERO,
    FOLLOWER_ZERO,
    DEGENERATION_ZERO,
    BRIDGED_RESISTOR_ZERO,
    LOAD_POLE,
    CASCODE_POLE,
    UNITY_GAIN_OF_LOAD,
    UNITY_GAIN,
    UNITY_GAIN_LOADED,
    UNITY_GAIN_WITH_ROOTS,
    PHASE_MARGIN,
)


def dominant_pole_hz(r_1: float, c_1: float, c_c: float, a_2: float) -> float:
    """Give 1/(2π·R1·(C1 + C_c·(1 + A2))) in Hz of R1 in ohm and the capacitances in F.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 7.3.6.
    """
    return 1.0 / (TWO_PI * r_1 * (c_1 + c_c * (1.0 + a_2)))


def loaded_pole_hz(r_1: float, c_1: float, c_c: float, a_2: float, r_2: float, c_l: float) -> float:
    """Give 1/(2π·(R1·(C1 + C_c·(1 + A2)) + R2·(C_c + C_L))) in Hz; ohm and F.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 7.3.6 and 9.4.2 (from memory).
    """
    return 1.0 / (TWO_PI * (r_1 * (c_1 + c_c * (1.0 + a_2)) + r_2 * (c_c + c_l)))


def loaded_second_pole_hz(r_1: float, c_1: float, c_c: float, a_2: float, r_2: float, c_l: float) -> float:
    """Give b1/(2π·R1·R2·(C1·C_L + C_c·(C1 + C_L))) in Hz, infinite without C1 and C_L; ohm and F.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 7.3.6 and 9.4.2 (from memory).
    """
    b_2 = r_1 * r_2 * (c_1 * c_l + c_c * (c_1 + c_l))
    return 1.0 / (TWO_PI**2 * loaded_pole_hz(r_1, c_1, c_c, a_2, r_2, c_l) * b_2) if b_2 else math.inf


def load_pole_hz(r_out: float, c_l: float) -> float:
    """Give 1/(2π·R_out·C_L) in Hz; ohm and F. Source: Gray, Hurst, Lewis and Meyer, sec. 9.4.1 (from memory)."""
    return 1.0 / (TWO_PI * r_out * c_l)


def cascode_pole_hz(gm: float, g_mb: float, c_node: float) -> float:
    """Give (gm + g_mb)/(2π·C_node) in Hz; S and F. Source: Gray, Hurst, Lewis and Meyer, sec. 7.3.4 (from memory)."""
    return (gm + g_mb) / (TWO_PI * c_node)


def second_pole_hz(gm_2: float, c_1: float, c_l: float, c_c: float) -> float:
    """Give gm2·C_c/(2π·(C1·C_L + C_c·(C1 + C_L))) in Hz, infinite without C1 and C_L; gm2 in S, the others in F.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 9.4.2, eq. 9.33.
    """
    together = c_1 * c_l + c_c * (c_1 + c_l)
    return gm_2 * c_c / (TWO_PI * together) if together else math.inf


def right_half_plane_zero_hz(gm_2: float, c_c: float) -> float:
    """Give gm2/(2π·C_c) in Hz, positive: right half plane. Source: Gray, Hurst, Lewis and Meyer, sec. 9.4.2."""
    return gm_2 / (TWO_PI * c_c)


def nulled_zero_hz(gm_2: float, c_c: float, r_z: float) -> float:
    """Give 1/(2π·C_c·(1/gm2 − R_z)) in Hz, negative in the left half plane, infinite at R_z = 1/gm2.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 9.4.3.
    """
    left = 1.0 / gm_2 - r_z
    return 1.0 / (TWO_PI * c_c * left) if left else math.inf


def third_pole_hz(r_z: float, c_1: float) -> float:
    """Give 1/(2π·R_z·C1) in Hz. Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 9.4.3 (from memory)."""
    return 1.0 / (TWO_PI * r_z * c_1)


def mirror_pole_hz(gm: float, c_m: float) -> float:
    """Give gm/(2π·C_m) in Hz, C_m in F at the mirror's input. Source: Gray, Hurst, Lewis and Meyer, sec. 7.3.5."""
    return gm / (TWO_PI * c_m)


def mirror_zero_hz(gm: float, c_m: float) -> float:
    """Give −2·gm/(2π·C_m) in Hz: left half plane. Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 7.3.5."""
    return -2.0 * mirror_pole_hz(gm, c_m)


def follower_zero_hz(gm: float, r_pi: float, c_pi: float) -> float:
    """Give −(gm + 1/r_π)/(2π·C_π) in Hz: left half plane; r_π in ohm, infinite for a gate.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 7.2.3.
    """
    return -(gm + 1.0 / r_pi) / (TWO_PI * c_pi)


def bridged_resistor_zero_hz(ohm: float, farad: float) -> float:
    """Give −1/(2π·R·C) in Hz: left half plane; also of a bypassed R_E. Common practice."""
    return -1.0 / (TWO_PI * ohm * farad)


def unity_gain_hz(gm_1: float, c_c: float) -> float:
    """Give gm1/(2π·C_c) in Hz. Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 9.4.2."""
    return gm_1 / (TWO_PI * c_c)


def unity_gain_with_roots_hz(single_hz: float, poles_hz: Sequence[float], zeros_hz: Sequence[float]) -> float | None:
    """Give f in Hz with (single/f)·Π√(1 + (f/z)²)/Π√(1 + (f/p)²) = 1; None where the zeros keep the gain above 1.

    single_hz: the unity gain frequency of the dominant pole alone. Source: Gray et al., sec. 9.4 (from memory).
    """

    def gain(f: float) -> float:
        rise = math.prod(math.hypot(1.0, f / z) for z in zeros_hz)
        return single_hz / f * rise / math.prod(math.hypot(1.0, f / p) for p in poles_hz)

    low, high = single_hz / WIDEST, single_hz
    # the first fall to 1, going up: zeros may lift the gain above what the dominant pole leaves
    while gain(high) >= 1.0:
        low, high = high, 1.25 * high
        if high > WIDEST * single_hz:
            return None
    while high / low - 1.0 > CLOSE:
        middle = math.sqrt(low * high)
        low, high = (middle, high) if gain(middle) >= 1.0 else (low, middle)
    return math.sqrt(low * high)


def phase_used_deg(f: float, poles_hz: Sequence[float], zeros_hz: Sequence[float]) -> float:
    """Give Σ atan(f/p) + Σ ±atan(f/z) in degrees: what real poles and zeros take from 180° at f in Hz.

    Source: Gray, Hurst, Lewis and Meyer, 5th ed., 2009, sec. 9.3.
    """
    used = sum(math.atan(f / p) for p in poles_hz) + sum(math.atan(f / z) for z in zeros_hz)
    return math.degrees(used)
