"""Small-signal networks of worked examples and of our own, for tests of the hand side and of causes.

Every function names its source. Values that a source derives (gm from a bias current, C_pi from f_T) are derived the
same way.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    current_source,
    inductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network

Board = Callable[[], Network]

K, M = 1e3, 1e6
MILLI, MICRO, NANO, PICO, FEMTO = 1e-3, 1e-6, 1e-9, 1e-12, 1e-15


def stage(
    owner: str,
    control: str,
    output: str,
    common: str,
    gm: float,
    *,
    c_pi: float = 0.0,
    c_mu: float = 0.0,
    r_pi: float = math.inf,
    r_o: float = math.inf,
) -> list[Part]:
    """A hybrid-pi; what has no value is left out."""
    parts = [transconductance(owner, (output, common), (control, common), gm, "gm")]
    if math.isfinite(r_pi):
        parts.append(resistance(owner, control, common, r_pi, "g_pi"))
    if math.isfinite(r_o):
        parts.append(resistance(owner, output, common, r_o, "g_o"))
    if c_pi:
        parts.append(capacitance(owner, control, common, c_pi, "c_pi"))
    if c_mu:
        parts.append(capacitance(owner, control, output, c_mu, "c_mu"))
    return parts


def driven(*parts: Part | list[Part]) -> Network:
    """Put 1 V at node "s" in front of the parts and take v(out)."""
    flat = [part for item in parts for part in (item if isinstance(item, list) else [item])]
    return Network.from_parts([voltage_source("VS", "s", "0", 1.0), *flat], output=Port("out"))


def common_source(
    source: float,
    gm: float,
    load: float,
    c_gs: float,
    c_gd: float,
    c_l: float = 0.0,
    *,
    extra: tuple[Part, ...] = (),
) -> Network:
    """R_S into the gate, C_gs, C_gd, R_L beside C_L."""
    return driven(
        resistance("RS", "s", "g", source),
        stage("M1", "g", "out", "0", gm, c_pi=c_gs, c_mu=c_gd),
        resistance("RL", "out", "0", load),
        [capacitance("CL", "out", "0", c_l)] if c_l else [],
        *extra,
    )


def common_emitter_1ma() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.7: I_C 1 mA, V_T 25 mV, beta 125, f_T 300 MHz."""
    gm = 1 * MILLI / (25 * MILLI)
    c_mu = 0.5 * PICO
    return driven(
        resistance("RS", "s", "b", 300),
        stage("Q1", "b", "out", "0", gm, r_pi=125 / gm, c_pi=gm / (2 * math.pi * 300 * M) - c_mu, c_mu=c_mu),
        resistance("RC", "out", "0", 1.2 * K),
    )


def common_emitter_600_ohm() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.16."""
    return driven(
        resistance("RS", "s", "b", 600),
        stage("Q1", "b", "out", "0", 0.1, r_pi=1 * K, c_pi=19.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC", "out", "0", 1.5 * K),
    )


def common_emitter_8k() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 5th-7th ed., common-emitter example (from memory)."""
    return driven(
        resistance("Rsig", "s", "i", 5 * K),
        resistance("RB", "i", "0", 100 * K),
        resistance("rx", "i", "b", 50),
        stage("Q1", "b", "out", "0", 40 * MILLI, r_pi=2.5 * K, c_pi=7 * PICO, c_mu=1 * PICO),
        resistance("RL", "out", "0", 3 * K),
    )


def common_source_400_mhz() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.1.2 example: g_m 14.1 mA/V, C_gs 5.1 pF, C_gd 0.5 pF."""
    return common_source(1 * K, 14.1 * MILLI, 5 * K, 5.1 * PICO, 0.5 * PICO)


def source_follower() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 8th ed., Ex. 10.8: R_sig 10 kohm, R_L' 2 kohm, C_L 15 fF."""
    return driven(
        resistance("Rsig", "s", "g", 10 * K),
        stage("M1", "g", "0", "out", 2 * MILLI, c_pi=20 * FEMTO),
        capacitance("Cgd", "g", "0", 5 * FEMTO),
        resistance("RL", "out", "0", 2 * K),
        capacitance("CL", "out", "0", 15 * FEMTO),
    )


def two_common_source_stages() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3 example, Figs 7.27 and 7.28."""
    return driven(
        resistance("RS", "s", "g1", 10 * K),
        stage("M1", "g1", "d1", "0", 3 * MILLI, c_pi=5 * PICO, c_mu=1 * PICO),
        resistance("RL1", "d1", "0", 10 * K),
        capacitance("Cdb1", "d1", "0", 2 * PICO),
        stage("M2", "d1", "out", "0", 6 * MILLI, c_pi=10 * PICO, c_mu=1 * PICO),
        resistance("RL2", "out", "0", 5 * K),
        capacitance("Cdb2", "out", "0", 2 * PICO),
    )


def two_common_emitter_stages() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.12."""
    return driven(
        resistance("RS", "s", "b1", 600),
        stage("Q1", "b1", "c1", "0", 0.1, r_pi=1.2 * K, c_pi=24.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC1", "c1", "0", 1.5 * K),
        stage("Q2", "c1", "out", "0", 0.05, r_pi=2.4 * K, c_pi=19.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC2", "out", "0", 600),
    )


def emitter_follower(c_mu: float = 0.0) -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.3.1 example: 1 mA, V_T 26 mV, beta 100, C_pi 10 pF."""
    gm = 1 / 26
    return driven(
        resistance("RS", "s", "i", 50),
        resistance("Rb", "i", "b", 150),
        stage("Q1", "b", "0", "out", gm, r_pi=100 / gm, c_pi=10 * PICO, c_mu=c_mu),
        resistance("RL", "out", "0", 2 * K),
    )


def common_gate() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 8th ed., Ex. 10.6: r_o, R_L, R_sig 20 kohm, C_gd + C_L 30 fF."""
    return driven(
        resistance("Rsig", "s", "e", 20 * K),
        stage("M1", "0", "out", "e", 2 * MILLI, r_o=20 * K, c_pi=20 * FEMTO),
        resistance("RL", "out", "0", 20 * K),
        capacitance("CL", "out", "0", 30 * FEMTO),
    )


def cascode() -> Network:
    """A MOS cascode, values of common practice: r_o 100 kohm, g_m 2 mS, R_L 50 kohm, R_sig 5 kohm."""
    return driven(
        resistance("Rsig", "s", "g", 5 * K),
        stage("M1", "g", "x", "0", 2 * MILLI, r_o=100 * K, c_pi=100 * FEMTO, c_mu=30 * FEMTO),
        capacitance("Cx", "x", "0", 120 * FEMTO),
        stage("M2", "0", "out", "x", 2 * MILLI, r_o=100 * K),
        resistance("RL", "out", "0", 50 * K),
        capacitance("Cout", "out", "0", 80 * FEMTO),
    )


def cascode_with_high_load() -> Network:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.13: R_L = g_m·r_ds² = 10 Mohm, so the output falls first."""
    return driven(
        resistance("Rs", "s", "g", 180 * K),
        stage("M1", "g", "x", "0", 1 * MILLI, r_o=100 * K, c_pi=0.2 * PICO, c_mu=15 * FEMTO),
        capacitance("Cs2", "x", "0", 0.26 * PICO),
        stage("M2", "0", "out", "x", 1 * MILLI, r_o=100 * K),
        resistance("RL", "out", "0", 10 * M),
        capacitance("Cout", "out", "0", 5.055 * PICO),
    )


def source_follower_with_load() -> Network:
    """Carusone, Johns and Martin, 2nd ed. (2012), Ex. 4.16: R_in 18 kohm, G_s 0.18 mS, C_s 0.2 pF."""
    return Network.from_parts(
        [
            current_source("IS", "0", "g", 1.0),
            resistance("Rin", "g", "0", 18 * K),
            capacitance("Cin", "g", "0", 10.7 * FEMTO),
            *stage("M1", "g", "0", "out", 0.735 * MILLI, c_pi=3 * FEMTO),
            conductance("Gs1", "out", "0", 0.18 * MILLI),
            capacitance("Cs", "out", "0", 0.2 * PICO),
        ],
        output=Port("out"),
    )


def compensated_stage() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.6 example, Fig. 7.35: C_f 20 pF around g_m 3 mA/V."""
    return common_source(10 * K, 3 * MILLI, 10 * K, 1 * PICO, 20 * PICO)


def common_source_100k() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 5th-7th ed., common-source example (from memory)."""
    return driven(
        resistance("Rsig", "s", "g", 100 * K),
        resistance("RG", "g", "0", 4.7 * M),
        stage("M1", "g", "out", "0", 1 * MILLI, r_o=150 * K, c_pi=1 * PICO, c_mu=0.4 * PICO),
        resistance("RD", "out", "0", 15 * K),
        resistance("RL", "out", "0", 15 * K),
    )


def output_pole_first() -> Network:
    """Our own: 100 kohm into 20 pF of load; the output falls at 159 kHz, Miller puts the gate's pole at 579 kHz."""
    return common_source(100 * K, 1 * MILLI, 50 * K, 0.2 * PICO, 50 * FEMTO, 20 * PICO)


def weak_stage_with_large_bridge() -> Network:
    """Our own: g_m 0.2 mS and C_gd 10 pF put a right-half-plane zero at 3.2 MHz, 2.6 times above the pole."""
    return common_source(1 * K, 0.2 * MILLI, 10 * K, 1 * PICO, 10 * PICO)


def gain_of_two() -> Network:
    """Our own: 0.4 pF bridging a non-inverting gain of 2 sees −9 kohm."""
    return driven(
        resistance("RS", "s", "a", 10 * K),
        capacitance("Cp", "a", "0", 1 * PICO),
        capacitance("Cf", "a", "out", 0.4 * PICO),
        transconductance("G1", ("0", "out"), ("a", "0"), 2 * MILLI),
        resistance("RL", "out", "0", 1 * K),
    )


def follower_then_common_source_low_edge() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.20(a): three coupling and bypass capacitors."""
    return driven(
        resistance("RS", "s", "a", 200),
        capacitance("C1", "a", "g1", 1 * MICRO),
        resistance("RG1", "g1", "0", 50 * K),
        stage("M1", "g1", "0", "s1", 10 * MILLI),
        resistance("RS1", "s1", "0", 250),
        stage("M2", "s1", "d2", "s2", 10 * MILLI),
        resistance("RS2", "s2", "0", 150),
        capacitance("C3", "s2", "0", 5.3 * MICRO),
        resistance("RD2", "d2", "0", 5 * K),
        capacitance("C2", "d2", "out", 10 * MICRO),
        resistance("RL", "out", "0", 10 * K),
    )


def bypassed_emitter(
    coupling: float = 3.98 * MICRO, emitter: float = 1.5 * K, bypass: float = 406.11 * MICRO
) -> Network:
    """R_s 600 ohm, r_pi 1 kohm, beta 100: coupling into the base, R_E beside its bypass."""
    return driven(
        resistance("Rs", "s", "a", 600),
        capacitance("CB", "a", "b", coupling),
        stage("Q1", "b", "out", "e", 0.1, r_pi=1 * K),
        resistance("RE", "e", "0", emitter),
        capacitance("CE", "e", "0", bypass),
        resistance("RC", "out", "0", 1 * K),
    )


def two_equal_low_edges() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.15: coupling and bypass at 25 Hz each."""
    return bypassed_emitter()


def three_low_edges() -> Network:
    """Scilab textbook companion, book 2882, Ex. 9.6 and 9.8: beta 150, r_e 4 ohm; edges of 1376, 422 and 231 Hz."""
    return driven(
        resistance("Rs", "s", "a", 600),
        capacitance("C1", "a", "b", 0.1 * MICRO),
        resistance("R1", "b", "0", 33 * K),
        resistance("R2", "b", "0", 10 * K),
        stage("Q1", "b", "c", "e", 150 / 600, r_pi=600),
        resistance("RE", "e", "0", 470),
        capacitance("C2", "e", "0", 50 * MICRO),
        resistance("RC", "c", "0", 2.2 * K),
        capacitance("C3", "c", "out", 0.1 * MICRO),
        resistance("RL", "out", "0", 4.7 * K),
    )


def bypassed_source_without_coupling() -> Network:
    """Our own: coupled to DC; the bypass alone lifts the gain from 5.6 to 11, pole and zero one octave apart."""
    return driven(
        stage("M1", "s", "out", "q", 2 * MILLI),
        resistance("RS", "q", "0", 500),
        capacitance("CS", "q", "0", 100 * MICRO),
        resistance("RD", "out", "0", 5.6 * K),
        capacitance("CL", "out", "0", 100 * PICO),
    )


def coupled_stage(ratio: float) -> Network:
    """Our own: R-C coupling into a buffer, R-C to ground behind it; f_H / f_L of the two sections is `ratio`."""
    return driven(
        capacitance("CC", "s", "a", 1 / (2 * math.pi * 1e3 * 1e3)),
        resistance("RG", "a", "0", 1 * K),
        transconductance("G1", ("0", "out"), ("a", "0"), 1 * MILLI),
        resistance("RL", "out", "0", 1 * K),
        capacitance("CL", "out", "0", 1 / (2 * math.pi * 1e3 * 1e3 * ratio)),
    )


def tuned_load() -> Network:
    """Our own: a tank of 10 µH and 253 pF (3.16 MHz, Q about 25) at the drain."""
    return driven(
        resistance("RS", "s", "g", 50),
        capacitance("CG", "g", "0", 1 * PICO),
        stage("M1", "g", "out", "0", 5 * MILLI),
        inductance("L1", "out", "0", 10 * MICRO),
        capacitance("CT", "out", "0", 253 * PICO),
        resistance("RL", "out", "0", 5 * K),
    )


UPPER: tuple[Board, ...] = (
    common_emitter_1ma,
    two_common_source_stages,
    two_common_emitter_stages,
    common_gate,
    cascode,
    cascode_with_high_load,
    source_follower_with_load,
    compensated_stage,
    common_source_100k,
    output_pole_first,
    weak_stage_with_large_bridge,
)
LOWER: tuple[Board, ...] = (follower_then_common_source_low_edge, two_equal_low_edges, three_low_edges)
