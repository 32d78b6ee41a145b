"""What all field-effect transistors have in common: terminals, hand model, region, and figures in the trade's symbols.

The engine's readings have the polarity taken out, and refer to the inner nodes; where v_ds is negative the device works
in reverse, and its controlled sources stand with drain and source exchanged.
"""

from __future__ import annotations

import math

from msgspec import Struct

from tauledger.circuit import Circuit, Element
from tauledger.devices.family import Terminal, Transconductor, inner_node
from tauledger.devices.parts import Part, conductance, transconductance
from tauledger.solution import Bias

# Less current than this drives nothing on a board: below threshold the device is off, not in weak inversion.
OFF_AMPERE = 1e-10


class Ends(Struct, frozen=True):
    """The nodes of one transistor: outer drain, gate, source, body; inner drain and source, and the two as they act.

    acting_drain, acting_source: the inner ones, exchanged where the device works in reverse.
    """

    drain: str
    gate: str
    source: str
    body: str | None
    inner_drain: str
    inner_source: str
    reversed: bool

    @property
    def acting_drain(self) -> str:
        """The inner node at which the channel's current enters."""
        return self.inner_source if self.reversed else self.inner_drain

    @property
    def acting_source(self) -> str:
        """The inner node to which the controls refer."""
        return self.inner_drain if self.reversed else self.inner_source

    def terminals(self) -> tuple[Terminal, ...]:
        """Give the terminals in card order."""
        found = [
            Terminal("drain", self.drain, self.inner_drain),
            Terminal("gate", self.gate, self.gate),
            Terminal("source", self.source, self.inner_source),
        ]
        return (*found, Terminal("body", self.body, self.body)) if self.body is not None else tuple(found)


def ends_of(circuit: Circuit, element: Element, g_drain: float, g_source: float, *, in_reverse: bool) -> Ends:
    """Give the nodes of a transistor; g_drain, g_source: its series conductances in S, 0 where there is none."""
    nodes = [circuit.nodes[node] for node in element.nodes]
    drain, gate, source = nodes[:3]
    return Ends(
        drain=drain,
        gate=gate,
        source=source,
        body=nodes[3] if len(nodes) > 3 else None,
        inner_drain=inner_node(element.name, "d") if g_drain else drain,
        inner_source=inner_node(element.name, "s") if g_source else source,
        reversed=in_reverse,
    )


def channel(name: str, ends: Ends, gm: float, g_o: float, g_mb: float) -> tuple[Part, ...]:
    """Give gm, g_mb and g_o of the channel."""
    out = (ends.acting_drain, ends.acting_source)
    parts = [
        transconductance(name, out, (ends.gate, ends.acting_source), gm, "gm"),
        conductance(name, *out, g_o, "g_o"),
    ]
    if ends.body is not None:
        parts.append(transconductance(name, out, (ends.body, ends.acting_source), g_mb, "g_mb"))
    return tuple(parts)


def series(name: str, ends: Ends, g_drain: float, g_source: float) -> tuple[Part, ...]:
    """Give the series conductances of drain and source."""
    return (
        conductance(name, ends.drain, ends.inner_drain, g_drain, "g_drain"),
        conductance(name, ends.source, ends.inner_source, g_source, "g_source"),
    )


def cell_of(name: str, ends: Ends, gm: float, g_o: float, g_mb: float) -> Transconductor | None:
    """Give the hand model: no r_π, the body as second control; None where the device does not act."""
    if gm == 0.0:
        return None
    return Transconductor(
        owner=name,
        control=ends.gate,
        common=ends.acting_source,
        output=ends.acting_drain,
        gm=gm,
        r_o=1.0 / g_o if g_o > 0.0 else None,
        body=ends.body if g_mb else None,
        g_mb=g_mb,
    )


def kept(parts: tuple[Part, ...]) -> tuple[Part, ...]:
    """Leave out parts without value, and those whose ends, or whose control's ends, are one node."""
    return tuple(
        part
        for part in parts
        if part.value != 0.0
        and part.nodes[0] != part.nodes[1]
        and not (len(part.nodes) == 4 and part.nodes[2] == part.nodes[3])
    )


def mos_region(v_gs: float, v_ds: float, threshold: float, saturation: float, ampere: float) -> str:
    """Name the region in whole words; voltages in V with the polarity taken out, of the device as it acts.

    threshold: v_gs at which strong inversion begins. saturation: v_ds above which the channel is pinched off.
    """
    reverse = v_ds < 0.0
    v_gs = v_gs - v_ds if reverse else v_gs
    if v_gs <= threshold:
        return "weak inversion" if abs(ampere) > OFF_AMPERE else "off"
    word = "triode" if abs(v_ds) < saturation else "saturation"
    return f"{word}, reversed" if reverse else word


def figures(
    bias: Bias,
    element: Element,
    ampere: float,
    *,
    gm: float,
    g_mb: float | None,
    g_o: float,
    charges: dict[str, float],
    gate_charge: float,
) -> tuple[tuple[str, float], ...]:
    """List the figures of the operating point in the order of a table.

    ampere: into the drain. charges: capacitances in F by symbol, in order. gate_charge: all that gm must charge, F.
    v_ds and v_gs carry the signs of the terminals; infinite ones are left out.
    """
    drain, gate, source = (float(bias.voltages[node]) for node in element.nodes[:3])
    found: list[tuple[str, float | None]] = [
        ("i_d", ampere),
        ("v_ds", drain - source),
        ("v_gs", gate - source),
        ("gm", gm),
        ("g_mb", g_mb),
        ("r_o", 1.0 / g_o if g_o > 0.0 else None),
        *charges.items(),
        ("f_t", gm / (2.0 * math.pi * gate_charge) if gm > 0.0 and gate_charge > 0.0 else None),
        ("gm/I", gm / abs(ampere) if ampere else None),
    ]
    return tuple((symbol, value) for symbol, value in found if value is not None)


def is_p(kind: str) -> bool:
    """Say whether a model type is that of a p-channel device."""
    return kind.startswith("p")
