"""Small circuits for the hand room: transistors with series resistances, and random trees of cells."""

from __future__ import annotations

import pytest
from hypothesis import strategies as st

from tauledger.circuit import Port
from tauledger.devices.family import Device, Terminal, Transconductor, inner_node
from tauledger.devices.parts import Part, capacitance, conductance, resistance, transconductance, voltage_source
from tauledger.hand.equivalent import EquivalentCircuit, equivalent_circuit
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify, find_midband


def bipolar(
    name: str,
    nodes: tuple[str, str, str],
    *,
    gm: float = 0.04,
    beta: float = 150.0,
    r_o: float = 80e3,
    r_b: float = 0.0,
    r_c: float = 0.0,
    r_e: float = 0.0,
    c_pi: float = 0.0,
    c_mu: float = 0.0,
    c_bx: float = 0.0,
) -> Device:
    """A bipolar transistor at (collector, base, emitter) with inner nodes behind the series resistances it has."""
    c, b, e = nodes
    bi, ci, ei = (inner_node(name, t) if r else outer for t, outer, r in (("b", b, r_b), ("c", c, r_c), ("e", e, r_e)))
    series = [(b, bi, r_b, "g_b"), (c, ci, r_c, "g_c"), (e, ei, r_e, "g_e")]
    parts: list[Part] = [conductance(name, outer, inner, 1 / r, label) for outer, inner, r, label in series if r]
    parts += [
        transconductance(name, (ci, ei), (bi, ei), gm, "gm"),
        conductance(name, bi, ei, gm / beta, "g_pi"),
        conductance(name, ci, ei, 1 / r_o, "g_o"),
    ]
    charges = [(bi, ei, c_pi, "c_pi"), (bi, ci, c_mu, "c_mu"), (b, ci, c_bx, "c_bx")]
    parts += [capacitance(name, one, two, farad, label) for one, two, farad, label in charges if farad]
    return Device(
        name=name,
        kind="npn",
        region="active",
        figures=(),
        terminals=(Terminal("collector", c, ci), Terminal("base", b, bi), Terminal("emitter", e, ei)),
        cell=Transconductor(name, bi, ei, ci, gm, beta / gm, r_o),
        parts=tuple(part for part in parts if part.nodes[0] != part.nodes[1]),
    )


def board(*items: Part | Device, output: str | Port = "out") -> tuple[Bands, tuple[Device, ...]]:
    """Put a 1 V source "VS" at node "s" in front of parts and devices, find mid-band, and class the capacitors."""
    devices = tuple(item for item in items if isinstance(item, Device))
    parts = [voltage_source("VS", "s", "0", 1.0)]
    for item in items:
        parts += item.parts if isinstance(item, Device) else [item]
    port = output if isinstance(output, Port) else Port(output)
    return bands_of(Network.from_parts(parts, output=port)), devices


def bands_of(network: Network) -> Bands:
    """Find mid-band and class the capacitors of a network."""
    return classify(network, find_midband(network, at_hz=None))


def circuit_of(*items: Part | Device, output: str = "out") -> EquivalentCircuit:
    """Draw resistors and cells alone, without any capacitor, as a hand circuit."""
    devices = tuple(item for item in items if isinstance(item, Device))
    parts = [part for item in items for part in (item.parts if isinstance(item, Device) else (item,))]
    network = Network.from_parts(parts, output=Port(output))
    identity = {node: node for node in ("0", *network.unknowns[: network.n_nodes])}
    return equivalent_circuit(network, identity, devices, network)


ohms = st.floats(50.0, 5e5)


@st.composite
def trees(draw: st.DrawFn) -> tuple[Part, ...]:
    """A tree of resistors and cells: no path but through ground leads back to where it came from."""
    parts: list[Part] = []
    count = 0

    def node() -> str:
        nonlocal count
        count += 1
        return f"n{count}"

    def grow(at: str, depth: int) -> None:
        parts.append(resistance(f"R{len(parts)}", at, "0", draw(ohms)))
        for kind in draw(st.lists(st.sampled_from(["resistor", "cell"]), max_size=2)) if depth else []:
            if kind == "resistor":
                far = node()
                parts.append(resistance(f"R{len(parts)}", at, far, draw(ohms)))
                grow(far, depth - 1)
            else:
                cell(at, depth)

    def cell(at: str, depth: int) -> None:
        name = f"Q{len(parts)}"
        here = draw(st.integers(0, 2))
        ends = [at if k == here else "0" if draw(st.integers(0, 3)) == 0 else node() for k in range(3)]
        shape = draw(st.sampled_from(["plain", "plain", "diode", "no drive"]))
        if shape != "plain":
            ends[0] = ends[2] if shape == "diode" else ends[1]
        control, common, output = ends
        gm = draw(st.floats(1e-4, 0.2))
        parts.append(transconductance(name, (output, common), (control, common), gm, "gm"))
        if draw(st.booleans()):
            parts.append(resistance(name, control, common, draw(st.floats(20.0, 400.0)) / gm, "g_pi"))
        elif draw(st.booleans()):
            parts.append(transconductance(name, (output, common), ("0", common), 0.2 * gm, "gmb"))
        if draw(st.booleans()):
            parts.append(resistance(name, output, common, draw(st.floats(20.0, 2000.0)) / gm, "g_o"))
        for end in dict.fromkeys(ends):
            if end not in (at, "0"):
                grow(end, depth - 1)

    start = node()
    cell(start, draw(st.integers(1, 3)))
    grow(start, 2)
    return tuple(part for part in parts if len(set(part.nodes[:2])) == 2 and len(set(part.nodes[2:])) != 1)


def near(expected: object, rel: float = 1e-6) -> object:
    """Compare within a relative tolerance alone: pytest's own 1e-12 beside it would swallow picofarads."""
    return pytest.approx(expected, rel=rel, abs=0.0)
