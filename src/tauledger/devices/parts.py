"""Labelled primitives of the small-signal network: the one currency of everything downstream.

Signs. Conductance, capacitance and inductance stand between nodes (a, b). A transconductance or transcapacitance has
nodes (out_plus, out_minus, control_plus, control_minus) and carries the current value·v(control) resp.
value·dv(control)/dt from out_plus through itself to out_minus, like a SPICE G element. A delayed transconductance
carries value·v(control) as it was `delay_s` before. A voltage gain (SPICE E) has the same four nodes and forces
v(out_plus) - v(out_minus) = value·v(control). A current gain (F) and a transresistance (H) have two nodes and refer
to the voltage source whose branch current i they sense: the first carries value·i, the second forces value·i. A
mutual inductance has the nodes of two inductances, which it refers to; it adds value·di/dt of either to the voltage of
the other. A block has any nodes and carries Σ_j G_ij·v_j + value·Σ_j C_ij·dv_j/dt into itself at its node i. A line has
nodes (near_plus, near_minus, far_plus, far_minus) and the currents into both plus ends as unknowns. A voltage source
forces v(a) - v(b); its branch current flows from a through the source to b. A current source pushes its current from a
through itself to b.
"""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

PartKind = Literal[
    "conductance",
    "capacitance",
    "inductance",
    "transconductance",
    "transcapacitance",
    "voltage source",
    "current source",
    "voltage gain",
    "current gain",
    "transresistance",
    "mutual inductance",
    "delayed transconductance",
    "block",
    "line",
]

Matrix = tuple[tuple[float, ...], ...]

SOURCES = ("voltage source", "current source")
WITH_BRANCH = ("voltage source", "inductance", "voltage gain", "transresistance")


class Part(Struct, frozen=True):
    """One primitive: who it belongs to ("Q1"), what it is there ("c_mu", empty for a plain card), where and how
    much.

    nodes: two names, or four for the controlled kinds. value: S, F, H, S, F; for sources 0; V/V, A/A, ohm, H, S.
    amplitude: complex drive in V or A, of sources only. references: owners of the branches that it senses or couples.
    delay_s: of a delayed transconductance. conductances, capacitances: G in S and C in F of a block, in the order of
    its nodes; its value is 1, and a factor on C. surge_ohm, series_ohm: √(L/C) and the whole R of a line; its value is
    its delay √(L·C) in s, so that L is surge_ohm·value and C value/surge_ohm; surge_ohm is 0 for a line of R and C
    alone, whose value is R·C in s.
    """

    kind: PartKind
    owner: str
    label: str
    nodes: tuple[str, ...]
    value: float
    amplitude: complex = 0.0
    references: tuple[str, ...] = ()
    delay_s: float = 0.0
    conductances: Matrix = ()
    capacitances: Matrix = ()
    surge_ohm: float = 0.0
    series_ohm: float = 0.0

    @property
    def name(self) -> str:
        """The part's own name: "CL" for a card, "Q1.c_mu" inside a device."""
        return f"{self.owner}.{self.label}" if self.label else self.owner


def conductance(owner: str, a: str, b: str, siemens: float, label: str = "") -> Part:
    """A conductance of `siemens` between a and b."""
    return Part("conductance", owner, label, (a, b), siemens)


def resistance(owner: str, a: str, b: str, ohm: float, label: str = "") -> Part:
    """A conductance given by its resistance in ohm."""
    return Part("conductance", owner, label, (a, b), 1.0 / ohm)


def capacitance(owner: str, a: str, b: str, farad: float, label: str = "") -> Part:
    """A capacitance of `farad` between a and b."""
    return Part("capacitance", owner, label, (a, b), farad)


def inductance(owner: str, a: str, b: str, henry: float, label: str = "") -> Part:
    """An inductance of `henry` between a and b; its current is an unknown of the network."""
    return Part("inductance", owner, label, (a, b), henry)


def transconductance(
    owner: str, out: tuple[str, str], control: tuple[str, str], siemens: float, label: str = ""
) -> Part:
    """A current siemens·v(control) from out[0] through the part to out[1]."""
    return Part("transconductance", owner, label, (*out, *control), siemens)


def transcapacitance(owner: str, out: tuple[str, str], control: tuple[str, str], farad: float, label: str = "") -> Part:
    """A current farad·dv(control)/dt from out[0] through the part to out[1]."""
    return Part("transcapacitance", owner, label, (*out, *control), farad)


def delayed_transconductance(
    owner: str, out: tuple[str, str], control: tuple[str, str], siemens: float, delay_s: float, label: str = ""
) -> Part:
    """A current siemens·v(control) of `delay_s` before, from out[0] through the part to out[1]."""
    return Part("delayed transconductance", owner, label, (*out, *control), siemens, delay_s=delay_s)


def voltage_gain(owner: str, out: tuple[str, str], control: tuple[str, str], gain: float, label: str = "") -> Part:
    """A source that forces v(out[0]) - v(out[1]) to gain·v(control), V/V; its current is an unknown of the network."""
    return Part("voltage gain", owner, label, (*out, *control), gain)


def current_gain(owner: str, a: str, b: str, gain: float, sensed: str, label: str = "") -> Part:
    """A current gain·i from a through the part to b, A/A, with i the branch current of the owner `sensed`."""
    return Part("current gain", owner, label, (a, b), gain, references=(sensed,))


def transresistance(owner: str, a: str, b: str, ohm: float, sensed: str, label: str = "") -> Part:
    """A source that forces v(a) - v(b) to ohm·i, with i the branch current of the owner `sensed`."""
    return Part("transresistance", owner, label, (a, b), ohm, references=(sensed,))


def mutual_inductance(owner: str, first: str, second: str, ends: tuple[str, str, str, str], henry: float) -> Part:
    """The coupling of two inductances, both ways: first, second are their owners, ends their four nodes."""
    return Part("mutual inductance", owner, "", ends, henry, references=(first, second))


def block(owner: str, nodes: tuple[str, ...], conductances: Matrix, capacitances: Matrix, label: str = "") -> Part:
    """Matrices G in S and C in F between nodes, inner ones included: what one instance is beside its other parts."""
    return Part("block", owner, label, nodes, 1.0, conductances=conductances, capacitances=capacitances)


def line(
    owner: str, nodes: tuple[str, str, str, str], delay_s: float, surge_ohm: float = 0.0, series_ohm: float = 0.0
) -> Part:
    """A uniform line of the delay √(L·C) and √(L/C) = surge_ohm, R = series_ohm; of R·C = delay_s without surge_ohm."""
    label = "delay" if surge_ohm else "rc"
    return Part("line", owner, label, nodes, delay_s, surge_ohm=surge_ohm, series_ohm=series_ohm)


def voltage_source(owner: str, a: str, b: str, amplitude: complex = 0.0) -> Part:
    """A source that forces v(a) - v(b) to `amplitude` volt; 0 makes it an AC short."""
    return Part("voltage source", owner, "", (a, b), 0.0, amplitude)


def current_source(owner: str, a: str, b: str, amplitude: complex = 0.0) -> Part:
    """A source that pushes `amplitude` ampere from a through itself to b; 0 makes it an AC open."""
    return Part("current source", owner, "", (a, b), 0.0, amplitude)
