"""Small networks that several claims about the network room are tried on."""

from __future__ import annotations

from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    inductance,
    resistance,
    transcapacitance,
    transconductance,
    voltage_source,
)
from tauledger.network.assemble import Network

DRIVE = voltage_source("VS", "in", "0", 1.0)


def network(*parts: Part, output: str = "out") -> Network:
    return Network.from_parts([DRIVE, *parts], output=Port(output))


def transistor(owner: str, base: str, collector: str, emitter: str, gm: float = 0.04) -> list[Part]:
    """A transistor with r_pi of 40 × 1/gm, r_b, c_pi, a split c_mu and the transcapacitance of its base charge."""
    inner = f"{owner}'b"
    return [
        resistance(owner, base, inner, 60.0, label="r_b"),
        conductance(owner, inner, emitter, gm / 40.0, label="g_pi"),
        conductance(owner, collector, emitter, gm / 2000.0, label="g_o"),
        transconductance(owner, (collector, emitter), (inner, emitter), gm, label="gm"),
        capacitance(owner, inner, emitter, 20e-12, label="c_pi"),
        capacitance(owner, inner, collector, 1.2e-12, label="c_mu"),
        capacitance(owner, base, collector, 0.8e-12, label="c_bx"),
        transcapacitance(owner, (inner, emitter), (inner, collector), 0.3e-12, label="c_bebc"),
    ]


def coupled_stage(*extra: Part, output: str = "out", emitter: bool = True) -> Network:
    """A common-emitter stage with coupling capacitors and, unless asked otherwise, a bypassed emitter resistor."""
    bypass = [capacitance("CE", "e", "0", 100e-6)] if emitter else []
    return network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "b", 1e-6),
        resistance("RB", "b", "0", 47e3),
        *transistor("Q1", "b", "c", "e"),
        resistance("RE", "e", "0", 470.0),
        *bypass,
        resistance("RC", "c", "0", 2.2e3),
        capacitance("C2", "c", "out", 2.2e-6),
        resistance("RL", "out", "0", 10e3),
        capacitance("CL", "out", "0", 47e-12),
        *extra,
        output=output,
    )


def close_edges(ratio: float = 10.0) -> Network:
    """One section on each side, their frequencies `ratio` apart, separated by an ideal amplifier."""
    return network(
        capacitance("C1", "in", "a", 1e-6),
        resistance("R1", "a", "0", 1e3),
        transconductance("A", ("out", "0"), ("a", "0"), -1e-2, label="gm"),
        resistance("R2", "out", "0", 1e3),
        capacitance("C2", "out", "0", 1e-6 / ratio),
    )


def shunt_peaked() -> Network:
    """A coupled stage whose collector load peaks with 15 µH."""
    return network(
        resistance("RS", "in", "s", 100.0),
        capacitance("C1", "s", "b", 1e-6),
        resistance("RB", "b", "0", 47e3),
        *transistor("Q1", "b", "out", "0"),
        inductance("LP", "out", "x", 15e-6),
        resistance("RC", "x", "0", 1e3),
        capacitance("CL", "out", "0", 47e-12),
    )


def choke_fed() -> Network:
    """A coupled stage with its supply behind 10 mH and 10 µF."""
    return network(
        resistance("RS", "in", "s", 1e3),
        capacitance("C1", "s", "b", 1e-6),
        resistance("RB", "b", "0", 47e3),
        *transistor("Q1", "b", "out", "0"),
        resistance("RC", "out", "v", 2.2e3),
        inductance("LV", "v", "vcc", 10e-3),
        voltage_source("VCC", "vcc", "0"),
        capacitance("CV", "v", "0", 10e-6),
        capacitance("CL", "out", "0", 47e-12),
    )
