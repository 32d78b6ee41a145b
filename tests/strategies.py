"""Hypothesis strategies that several rooms share: random stable R-C-L-gm amplifiers with one to three stages."""

from __future__ import annotations

import numpy as np
from hypothesis import strategies as st
from msgspec import Struct

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
from tauledger.network.spectrum import pole_frequencies


def decades(low: float, high: float) -> st.SearchStrategy[float]:
    """Values evenly spread in the logarithm, to two digits so that failing examples read well."""
    return st.floats(np.log10(low), np.log10(high)).map(lambda exponent: float(f"{10.0**exponent:.1e}"))


class Kind(Struct, frozen=True):
    """What a random amplifier may have."""

    coupled: bool = True
    inductors: bool = True
    transcapacitances: bool = True
    feedback: bool = True


EVERYTHING = Kind()
DIRECT = Kind(coupled=False, inductors=False)


@st.composite
def networks(draw: st.DrawFn, kind: Kind = EVERYTHING) -> Network:
    """A stable amplifier: a driven source resistance, then stages with r_pi, r_o, c_pi, c_mu and their loads."""
    return draw(_amplifiers(kind).filter(is_stable))


def is_stable(network: Network) -> bool:
    """Whether all poles lie to the left of the axis, none of them ringing more than a Q of 20."""
    poles = pole_frequencies(network)
    return bool(len(poles)) and bool(np.all(poles.real < -0.025 * np.abs(poles)))


@st.composite
def _amplifiers(draw: st.DrawFn, kind: Kind) -> Network:
    parts: list[Part] = [voltage_source("VS", "in", "0", 1.0), resistance("RS", "in", "n0", draw(decades(50.0, 2e4)))]
    node = "n0"
    for k in range(1, draw(st.integers(1, 3)) + 1):
        parts += draw(_stages(k, node, kind))
        node = f"c{k}"
    parts.append(capacitance("CL", node, "0", draw(decades(2e-12, 2e-10))))
    if kind.inductors and draw(st.booleans()):
        parts += [
            inductance("LW", node, "out", draw(decades(1e-8, 3e-6))),
            resistance("RL", "out", "0", draw(decades(50.0, 1e4))),
        ]
        node = "out"
    if kind.feedback and draw(st.booleans()):
        parts.append(resistance("RF", node, "n0", draw(decades(1e5, 1e7))))
    return Network.from_parts(parts, output=Port(node))


@st.composite
def _stages(draw: st.DrawFn, k: int, node: str, kind: Kind) -> list[Part]:
    base, out, common = f"b{k}", f"c{k}", f"e{k}"
    owner = f"Q{k}"
    gm = draw(decades(1e-3, 0.1))
    parts = []
    if kind.coupled and draw(st.booleans()):
        parts.append(capacitance(f"CC{k}", node, base, draw(decades(1e-6, 1e-4))))
        parts.append(resistance(f"RB{k}", base, "0", draw(decades(1e4, 1e5))))
    else:
        parts.append(resistance(f"RX{k}", node, base, draw(decades(10.0, 1e3))))
    grounded = draw(st.booleans())
    if grounded:
        common = "0"
    else:
        parts.append(resistance(f"RE{k}", common, "0", draw(decades(10.0, 1e3))))
        if kind.coupled and draw(st.booleans()):
            parts.append(capacitance(f"CE{k}", common, "0", draw(decades(1e-5, 1e-3))))
    parts += [
        transconductance(owner, (out, common), (base, common), gm, label="gm"),
        conductance(owner, base, common, gm / draw(st.integers(50, 300)), label="g_pi"),
        conductance(owner, out, common, gm / draw(st.integers(500, 5000)), label="g_o"),
        capacitance(owner, base, common, draw(decades(3e-12, 1e-10)), label="c_pi"),
        capacitance(owner, base, out, draw(decades(3e-13, 5e-12)), label="c_mu"),
        resistance(f"RC{k}", out, "0", draw(decades(200.0, 1e4))),
    ]
    if kind.transcapacitances and draw(st.booleans()):
        charge = draw(decades(1e-13, 1e-12))
        parts.append(transcapacitance(owner, (base, common), (base, out), charge, label="c_bebc"))
    return parts
