"""Two-stage amplifiers with a compensated second stage, part by part, for tests of hand side and answers."""

from __future__ import annotations

import math

from hypothesis import strategies as st
from msgspec import Struct

from strategies import decades
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network


class TwoStages(Struct, frozen=True):
    """gm1 into R1 ‖ C1, gm2 with C_c across it (through R_z) into R2 ‖ C_L; S, ohm, F."""

    gm_1: float = 0.2e-3
    r_1: float = 100e3
    c_1: float = 1e-12
    gm_2: float = 3e-3
    r_2: float = 50e3
    c_l: float = 5e-12
    c_c: float = 2e-12
    r_z: float = 0.0

    @property
    def a_2(self) -> float:
        return self.gm_2 * self.r_2


def parts_of(one: TwoStages, *, at_output: bool = False) -> list[Part]:
    """The parts, 1 V in front; at_output: R_z stands at the output's side of C_c."""
    ends = ("x", "out") if not at_output else ("out", "x")
    across = [capacitance("K7", *(ends if one.r_z else ("x", "out")), one.c_c)]
    if one.r_z:
        across = [resistance("K8", ends[0], "m", one.r_z), capacitance("K7", "m", ends[1], one.c_c)]
    return [
        voltage_source("K1", "s", "0", 1.0),
        resistance("K0", "s", "g", 50.0),
        transconductance("K2", ("x", "0"), ("g", "0"), one.gm_1),
        resistance("K3", "x", "0", one.r_1),
        *([capacitance("K4", "x", "0", one.c_1)] if one.c_1 else []),
        transconductance("K5", ("out", "0"), ("x", "0"), one.gm_2),
        resistance("K6", "out", "0", one.r_2),
        *across,
        *([capacitance("K9", "out", "0", one.c_l)] if one.c_l else []),
    ]


def network_of(one: TwoStages, *more: Part, at_output: bool = False) -> Network:
    """The network with v(out)."""
    return Network.from_parts([*parts_of(one, at_output=at_output), *more], output=Port("out"))


@st.composite
def two_stages(draw: st.DrawFn) -> TwoStages:
    """Splitting as paper has it: A2 of 50 and more, C_c not far below C1 and C_L."""
    gm_2, c_c = draw(decades(3e-4, 3e-2)), draw(decades(1e-12, 2e-11))
    return TwoStages(
        gm_1=draw(decades(5e-5, 1e-3)),
        r_1=draw(decades(5e4, 2e6)),
        c_1=c_c * draw(st.floats(0.1, 1.0)),
        gm_2=gm_2,
        r_2=draw(st.floats(50.0, 500.0)) / gm_2,
        c_l=c_c * draw(st.floats(0.3, 5.0)),
        c_c=c_c,
    )


def hertz(rad_s: float) -> float:
    return rad_s / (2.0 * math.pi)
