"""Signal nodes, capacitor rows and evidence of a small network by plain dense algebra.

Independent of hand/nodes and of every looking-in rule: resistances are entries of the inverse, Miller gains
K = Z_ji/Z_ii. Every node counts, none is folded into another.
"""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np
from msgspec.structs import replace

from tauledger.causes.evidence import EdgeEvidence, Evidence
from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, resistance, voltage_source
from tauledger.hand.combine import combine_lower, combine_upper
from tauledger.hand.estimate import InnerLine, LookingIn, LowerRow, MillerTerm, SignalNode
from tauledger.hand.lower import nearest_zero_owner
from tauledger.hand.methods import methods
from tauledger.hand.steps import lower_steps, upper_steps
from tauledger.network.assemble import Network, incidence
from tauledger.network.bands import Bands, classify, find_midband
from tauledger.network.edges import find_edges
from tauledger.network.midband import frequency_range
from tauledger.network.shares import find_shares
from tauledger.network.solve import log_slope, on_axis, response, solve
from tauledger.network.spectrum import pole_frequencies, zero_frequencies


def signal_nodes(upper: Network) -> tuple[SignalNode, ...]:
    """One row per node of the upper network that carries capacitance and is not driven."""
    z = np.linalg.inv(upper.conductance.dense(upper.size))
    exact = np.einsum("ij,ji->i", upper.capacitance.dense(upper.size), z)
    rows = []
    for node in upper.unknowns[: upper.n_nodes]:
        i = upper.index(node)
        assert i is not None
        terms = [_miller(upper, z, part, node) for part in upper.parts if _touches(part, node)]
        if not terms or abs(z[i, i]) < 1e-9:
            continue
        resistance, capacitance = float(z[i, i]), math.fsum(term.farad * term.factor for term in terms)
        rows.append(_row(upper, node, resistance, capacitance, float(exact[i]), terms))
    return tuple(rows)


def capacitor_rows(lower: Network) -> tuple[LowerRow, ...]:
    """One row per capacitor of the lower network, its resistance with the others shorted and inductors open."""
    rows = []
    for part in lower.parts:
        if part.kind != "capacitance":
            continue
        others = [
            voltage_source(f"short {other.name}", other.nodes[0], other.nodes[1])
            if other.kind == "capacitance"
            else other
            for other in lower.parts
            if other is not part and other.kind != "inductance"
        ]
        shorted = Network.from_parts([*others, replace(part, value=0.0)], output=lower.port)
        g = shorted.conductance.dense(shorted.size)
        across = incidence(shorted, part.nodes[0], part.nodes[1])
        ohm = float(across @ np.linalg.solve(g, across))
        hz = 1 / (2 * math.pi * ohm * part.value)
        opened = abs(response(shorted, np.zeros(1))[0])
        closed = abs(response(_with_short(shorted, part), np.zeros(1))[0])
        rows.append(
            LowerRow((part.name,), part.name, part.value, _looking_in(ohm), ohm, hz, hz, hz * opened / closed, True)
        )
    return tuple(rows)


def evidence(
    network: Network, *, devices: tuple[Device, ...] = (), stepped: bool = False, at_hz: float | None = None
) -> Evidence:
    """Walk a network to the evidence that causes and notes look at; band edges from a fine scan of the response."""
    bands = classify(network, find_midband(network, at_hz=at_hz))
    poles = pole_frequencies(network)
    zeros = zero_frequencies(network, poles)
    nodes: tuple[SignalNode, ...] = ()
    capacitors: tuple[LowerRow, ...] = ()
    upper, lower = (EdgeEvidence(edge, *_edge(bands, edge == "f_high"), None, ()) for edge in ("f_high", "f_low"))
    if bands.midband.plateau and bands.sound:
        nodes, capacitors = signal_nodes(bands.upper), capacitor_rows(bands.lower)
        above, below = combine_upper(nodes, *roots(bands.upper)), combine_lower(capacitors, *roots(bands.lower))
        upper = replace(upper, combined=above, steps=upper_steps(nodes, above, full_hz=upper.hz))
        lower = replace(
            lower,
            combined=below,
            steps=lower_steps(
                capacitors, below, full_hz=lower.hz, zero_owner=nearest_zero_owner(bands, capacitors, below)
            ),
        )
    edges = find_edges(network, bands.midband)
    upper, lower = replace(upper, found=edges.f_high), replace(lower, found=edges.f_low)
    upper, lower = (
        edge
        if edge.found is None or edge.found.hz is None
        else replace(edge, shares=find_shares(network, bands.midband, edge.found.hz, bands.class_of).parts)
        for edge in (upper, lower)
    )
    found = methods(upper.combined, lower.combined, upper_hz=upper.hz, lower_hz=lower.hz)
    upper, lower = (
        replace(edge, recommended=next((m for m in found if m.edge == edge.edge and m.recommended), None))
        for edge in (upper, lower)
    )
    return Evidence(bands, poles, zeros, devices, nodes, capacitors, upper, lower, stepped)


def roots(network: Network) -> tuple[np.ndarray, np.ndarray]:
    """Poles and zeros in rad/s."""
    poles = pole_frequencies(network)
    return poles, zero_frequencies(network, poles)


def plain_node(name: str, seconds: float, *, exact: float | None = None, role: str = "node") -> SignalNode:
    """A signal node of 1 kohm with the given time constants."""
    return SignalNode(
        name=name,
        title=f"node {name}",
        role=role,
        owner="",
        members=(name,),
        crossing=1.0,
        moment=0.0,
        in_path=True,
        lines=(),
        resistance_hand_ohm=1e3,
        resistance_exact_ohm=1e3,
        capacitance_f=seconds / 1e3,
        time_constant_s=seconds,
        time_constant_exact_s=seconds if exact is None else exact,
    )


def plain_capacitor(name: str, hz: float, *, exact: float | None = None, zero_hz: float = 0.0) -> LowerRow:
    """A coupling capacitor of 1 µF with the given edge."""
    ohm = 1 / (2 * math.pi * hz * 1e-6)
    return LowerRow((name,), name, 1e-6, _looking_in(ohm), ohm, hz, hz if exact is None else exact, zero_hz, True)


def _row(upper: Network, node: str, ohm: float, farad: float, exact: float, terms: Iterable[MillerTerm]) -> SignalNode:
    tau = ohm * farad
    line = InnerLine(node, node, _looking_in(ohm), ohm, tuple(terms), farad, tau, exact)
    role = "output" if node in (upper.port.plus, upper.port.minus) else "node"
    return replace(
        plain_node(node, tau, exact=exact, role=role),
        lines=(line,),
        resistance_hand_ohm=ohm,
        resistance_exact_ohm=ohm,
        capacitance_f=farad,
    )


def _miller(upper: Network, z: np.ndarray, part: Part, node: str) -> MillerTerm:
    other = part.nodes[0] if part.nodes[1] == node else part.nodes[1]
    i, j = upper.index(node), upper.index(other)
    if j is None or abs(z[j, j]) < 1e-9:
        return MillerTerm(part.name, part.value, 1.0, 0.0)
    out, back = float(z[j, i] / z[i, i]), float(z[i, j] / z[j, j])
    return MillerTerm(part.name, part.value, 1 - 1 / back if back <= -1 else 1 - out, out)


def _touches(part: Part, node: str) -> bool:
    return part.kind == "capacitance" and node in part.nodes and node != GROUND


def _with_short(network: Network, part: Part) -> Network:
    return Network.from_parts(
        [*network.parts, resistance("short", part.nodes[0], part.nodes[1], 1e-9)], output=network.port
    )


def _looking_in(ohm: float) -> LookingIn:
    return LookingIn(ohm, "solved", "", (), "solved")


def _edge(bands: Bands, upwards: bool) -> tuple[float | None, float | None]:
    network, poles = bands.network, pole_frequencies(bands.network)
    reach = frequency_range(poles, zero_frequencies(network, poles))
    assert reach is not None
    start = max(bands.midband.frequency_hz, reach[0])
    stop = reach[1] if upwards else reach[0]
    for count in (2000, 200, 200, 200, 200):
        grid = np.geomspace(start, stop, count)
        below = np.flatnonzero(np.abs(response(network, grid)) <= abs(bands.midband.gain) / math.sqrt(2))
        if len(below) == 0:
            return None, None
        start, stop = float(grid[max(int(below[0]) - 1, 0)]), float(grid[below[0]])
    return stop, float(log_slope(network, solve(network, on_axis(np.array([stop])))).real[0])
