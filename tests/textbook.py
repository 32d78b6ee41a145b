"""The small-signal networks of published worked examples, with the element values as printed.

Every function names its source. Values that the source derives (gm from a bias current, C_pi from f_T) are derived here in
the same way from the same data, so that nothing is rounded twice.
"""

from __future__ import annotations

import math

from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network

KILO, MEGA = 1e3, 1e6
MILLI, MICRO, NANO, PICO, FEMTO = 1e-3, 1e-6, 1e-9, 1e-12, 1e-15


def transistor(
    owner: str,
    terminals: tuple[str, str, str],
    gm: float,
    *,
    c_pi: float = 0.0,
    c_mu: float = 0.0,
    r_pi: float = math.inf,
    r_o: float = math.inf,
) -> list[Part]:
    """A hybrid-pi between (control, output, common); parts without value are left out."""
    control, output, common = terminals
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


def network(*parts: Part | list[Part], output: str = "out") -> Network:
    """Put a 1 V source "VS" at node "s" in front of the parts and take v(output)."""
    flat = [part for item in parts for part in (item if isinstance(item, list) else [item])]
    return Network.from_parts([voltage_source("VS", "s", "0", 1.0), *flat], output=Port(output))


def common_emitter_1ma() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.7: I_C 1 mA, V_T 25 mV, beta 125, f_T 300 MHz."""
    gm = 1 * MILLI / (25 * MILLI)
    c_mu = 0.5 * PICO
    c_pi = gm / (2 * math.pi * 300 * MEGA) - c_mu
    return network(
        resistance("RS", "s", "b", 300),
        transistor("Q1", ("b", "out", "0"), gm, r_pi=125 / gm, c_pi=c_pi, c_mu=c_mu),
        resistance("RC", "out", "0", 1.2 * KILO),
    )


def common_emitter_600_ohm() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.16."""
    return network(
        resistance("RS", "s", "b", 600),
        transistor("Q1", ("b", "out", "0"), 0.1, r_pi=1 * KILO, c_pi=19.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC", "out", "0", 1.5 * KILO),
    )


def common_source_400_mhz() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.1.2 example: g_m 14.1 mA/V, C_gs 5.1 pF, C_gd 0.5 pF."""
    return network(
        resistance("RS", "s", "g", 1 * KILO),
        transistor("M1", ("g", "out", "0"), 14.1 * MILLI, c_pi=5.1 * PICO, c_mu=0.5 * PICO),
        resistance("RL", "out", "0", 5 * KILO),
    )


def two_common_source_stages() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.3 example, Figs 7.27 and 7.28."""
    return network(
        resistance("RS", "s", "g1", 10 * KILO),
        transistor("M1", ("g1", "d1", "0"), 3 * MILLI, c_pi=5 * PICO, c_mu=1 * PICO),
        resistance("RL1", "d1", "0", 10 * KILO),
        capacitance("Cdb1", "d1", "0", 2 * PICO),
        transistor("M2", ("d1", "out", "0"), 6 * MILLI, c_pi=10 * PICO, c_mu=1 * PICO),
        resistance("RL2", "out", "0", 5 * KILO),
        capacitance("Cdb2", "out", "0", 2 * PICO),
    )


def two_common_emitter_stages() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.12."""
    return network(
        resistance("RS", "s", "b1", 600),
        transistor("Q1", ("b1", "c1", "0"), 0.1, r_pi=1.2 * KILO, c_pi=24.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC1", "c1", "0", 1.5 * KILO),
        transistor("Q2", ("c1", "out", "0"), 0.05, r_pi=2.4 * KILO, c_pi=19.5 * PICO, c_mu=0.5 * PICO),
        resistance("RC2", "out", "0", 600),
    )


def emitter_follower(c_mu: float = 0.0) -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.3.1 example, Fig. 7.15: 1 mA, V_T 26 mV, beta 100, C_pi 10 pF."""
    gm = 1 * MILLI / (26 * MILLI)
    parts: list[Part | list[Part]] = [
        resistance("RS", "s", "i", 50),
        resistance("Rb", "i", "b", 150),
        transistor("Q1", ("b", "0", "out"), gm, r_pi=100 / gm, c_pi=10 * PICO),
        resistance("RL", "out", "0", 2 * KILO),
    ]
    if c_mu:
        parts.append(capacitance("Q1", "b", "0", c_mu, "c_mu"))
    return network(*parts)


def common_gate() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 8th ed., Ex. 10.6 (r_o = R_L = R_sig = 20 kohm, C_gd + C_L = 30 fF)."""
    return network(
        resistance("Rsig", "s", "e", 20 * KILO),
        transistor("M1", ("0", "out", "e"), 2 * MILLI, r_o=20 * KILO, c_pi=20 * FEMTO),
        resistance("RL", "out", "0", 20 * KILO),
        capacitance("CL", "out", "0", 30 * FEMTO),
    )


def source_follower() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 8th ed., Ex. 10.8 (R_sig 10 kohm, R_L' 2 kohm, C_L 15 fF)."""
    return network(
        resistance("Rsig", "s", "g", 10 * KILO),
        transistor("M1", ("g", "0", "out"), 2 * MILLI, c_pi=20 * FEMTO, c_mu=5 * FEMTO),
        resistance("RL", "out", "0", 2 * KILO),
        capacitance("CL", "out", "0", 15 * FEMTO),
    )


def compensated_stage() -> Network:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.3.6 example, Fig. 7.35: C_f 20 pF around g_m 3 mA/V."""
    return network(
        resistance("RS", "s", "g", 10 * KILO),
        transistor("M1", ("g", "out", "0"), 3 * MILLI, c_pi=1 * PICO),
        capacitance("Cf", "g", "out", 20 * PICO),
        resistance("RL", "out", "0", 10 * KILO),
    )


def follower_then_common_source_low_edge() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.20(a): three coupling and bypass capacitors."""
    return network(
        resistance("RS", "s", "a", 200),
        capacitance("C1", "a", "g1", 1 * MICRO),
        resistance("RG1", "g1", "0", 50 * KILO),
        transistor("M1", ("g1", "0", "s1"), 10 * MILLI),
        resistance("RS1", "s1", "0", 250),
        transistor("M2", ("s1", "d2", "s2"), 10 * MILLI),
        resistance("RS2", "s2", "0", 150),
        capacitance("C3", "s2", "0", 5.3 * MICRO),
        resistance("RD2", "d2", "0", 5 * KILO),
        capacitance("C2", "d2", "out", 10 * MICRO),
        resistance("RL", "out", "0", 10 * KILO),
    )


def two_equal_low_edges() -> Network:
    """Kumar and Jain, Electronic Devices and Circuits (PHI), Ex. 10.15: 25 Hz for the coupling and 25 Hz for the bypass."""
    return network(
        resistance("Rs", "s", "a", 600),
        capacitance("CB", "a", "b", 3.98 * MICRO),
        transistor("Q1", ("b", "out", "e"), 0.1, r_pi=1 * KILO),
        resistance("RE", "e", "0", 1.5 * KILO),
        capacitance("CE", "e", "0", 406.11 * MICRO),
        resistance("RC", "out", "0", 1 * KILO),
    )


def three_low_edges() -> Network:
    """Scilab textbook companion, book 2882, Ex. 9.6 and 9.8: beta 150, r_e 4 ohm, three comparable lower edges."""
    r_pi = 150 * 4.0
    return network(
        resistance("Rs", "s", "a", 600),
        capacitance("C1", "a", "b", 0.1 * MICRO),
        resistance("R1", "b", "0", 33 * KILO),
        resistance("R2", "b", "0", 10 * KILO),
        transistor("Q1", ("b", "c", "e"), 150 / r_pi, r_pi=r_pi),
        resistance("RE", "e", "0", 470),
        capacitance("C2", "e", "0", 50 * MICRO),
        resistance("RC", "c", "0", 2.2 * KILO),
        capacitance("C3", "c", "out", 0.1 * MICRO),
        resistance("RL", "out", "0", 4.7 * KILO),
    )


def common_emitter_8k() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 5th-7th ed., common-emitter high-frequency example (from memory)."""
    return network(
        resistance("Rsig", "s", "i", 5 * KILO),
        resistance("RB", "i", "0", 100 * KILO),
        resistance("rx", "i", "b", 50),
        transistor("Q1", ("b", "out", "0"), 40 * MILLI, r_pi=2.5 * KILO, c_pi=7 * PICO, c_mu=1 * PICO),
        resistance("RL", "out", "0", 3 * KILO),
    )


def common_source_100k() -> Network:
    """Sedra and Smith, Microelectronic Circuits, 5th-7th ed., common-source high-frequency example (from memory)."""
    return network(
        resistance("Rsig", "s", "g", 100 * KILO),
        resistance("RG", "g", "0", 4.7 * MEGA),
        transistor("M1", ("g", "out", "0"), 1 * MILLI, r_o=150 * KILO, c_pi=1 * PICO, c_mu=0.4 * PICO),
        resistance("RD", "out", "0", 15 * KILO),
        resistance("RL", "out", "0", 15 * KILO),
    )
