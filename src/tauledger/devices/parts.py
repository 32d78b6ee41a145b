"""Labelled primitives of the small-signal network: the one currency of everything downstream.

Signs. Conductance, capacitance and inductance stand between nodes (a, b). A transconductance or transcapacitance
has
nodes (out_plus, out_minus, control_plus, control_minus) and carries the current value·v(control) resp.
value·dv(control)/dt
from out_plus through itself to out_minus, like a SPICE G element. A voltage source forces v(a) - v(b); its branch
current flows from a through the source to b. A current source pushes its current from a through itself to b.
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
]


class Part(Struct, frozen=True):
    """One primitive: who it belongs to ("Q1"), what it is there ("c_mu", empty for a plain card), where and how
    much.

    nodes: two names, or four for the controlled kinds. value: S, F, H, S, F; for sources 0.
    amplitude: complex drive in V or A, of sources only.
    """

    kind: PartKind
    owner: str
    label: str
    nodes: tuple[str, ...]
    value: float
    amplitude: complex = 0.0

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


def voltage_source(owner: str, a: str, b: str, amplitude: complex = 0.0) -> Part:
    """A source that forces v(a) - v(b) to `amplitude` volt; 0 makes it an AC short."""
    return Part("voltage source", owner, "", (a, b), 0.0, amplitude)


def current_source(owner: str, a: str, b: str, amplitude: complex = 0.0) -> Part:
    """A source that pushes `amplitude` ampere from a through itself to b; 0 makes it an AC open."""
    return Part("current source", owner, "", (a, b), 0.0, amplitude)
