"""What was reviewed: engine and netlist, drive and output, devices at their operating point, what was set."""

from __future__ import annotations

from msgspec import Struct


class EngineFacts(Struct, frozen=True):
    """Which engine answered."""

    name: str
    version: str


class NetlistFacts(Struct, frozen=True):
    """The netlist: path as typed, title, SHA-256 of all files read in order, and what was read past, by word and
    count.

    passed: the same card by card, "board.cir:12: .ac dec 10 1 1meg".
    """

    path: str
    title: str
    sha256: str
    read_past: str = ""
    passed: tuple[str, ...] = ()


class DriveFacts(Struct, frozen=True):
    """One driven source; resistance_ohm is the single resistor in series with it, None where there is no such
    one."""

    source: str
    kind: str
    amplitude_real: float
    amplitude_imag: float
    resistance_ohm: float | None = None


class LoadFacts(Struct, frozen=True):
    """One passive from the output straight to ground: its name, kind (R, C, L) and value."""

    name: str
    kind: str
    value: float


class OutputFacts(Struct, frozen=True):
    """Where the response is taken. kind: voltage or current; plus and minus are nodes, through the source of a
    current."""

    plus: str
    minus: str
    kind: str
    through: str = ""
    load: tuple[LoadFacts, ...] = ()


class Figure(Struct, frozen=True):
    """One figure of a device's operating point: trade symbol (i_c, v_ce, gm, r_pi, r_o, c_pi, c_mu, f_t), value,
    unit."""

    symbol: str
    value: float
    unit: str


class DeviceFacts(Struct, frozen=True):
    """One device at its operating point. c_mu_with_bx: c_mu is C_μ and C_bx together, which the model keeps apart."""

    name: str
    kind: str
    region: str
    figures: tuple[Figure, ...]
    c_mu_with_bx: bool = False


class SourceLine(Struct, frozen=True):
    """A line of the netlist that the review refers to."""

    file: str
    line: int
    text: str


class SetValue(Struct, frozen=True):
    """One value that was set from outside of the netlist: a parameter, an element, or a parameter of a model."""

    name: str
    value: float


class AddedPart(Struct, frozen=True):
    """A resistance (R, ohm) or capacitance (C, farad) added from a node to ground, as of a probe."""

    node: str
    kind: str
    value: float


class MovedFigure(Struct, frozen=True):
    """One figure of the headline as the netlist gives it and as it is with what was set; None where there is none."""

    figure: str
    unit: str
    before: float | None
    after: float | None
