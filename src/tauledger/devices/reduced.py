"""A fitted instance as textbook elements and a remainder: what paper has a name for, and one line for the rest.

The elements are those of the terminals at rest, Y(s) = G₀ + s·C₀ + …: the hybrid-π of a bipolar transistor, g_μ =
−G_bc, g_π = −G_be, gm = G_cb − G_bc, C_μ = −C_bc, C_π = −C_be; of a field-effect transistor gm = G_dg, g_mb = G_db,
C_gs = −C_gs of the charge matrix and so on. The remainder (a block) is the fit less these elements, so that both
together are the instance exactly: transit times, charge that is not reciprocal (C_cb ≠ C_bc), and series resistances
that `extrinsic` left inside are in it. All this is told apart between the instance's own terminals; only then `placed`
puts it at the circuit's nodes, where two of them may be one: g_o of a transistor whose body is tied to its source is
still g_o.

Sources: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed., 2009, section 1.4
(hybrid-π); Tsividis and McAndrew, "Operation and Modeling of the MOS Transistor", 3rd ed., 2011, chapters 6 and 7
(intrinsic charge matrix and its reduction to capacitances).
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping

import numpy as np
from msgspec.structs import replace

from tauledger.devices.family import inner_node
from tauledger.devices.fit import Fit, Real
from tauledger.devices.parts import Part, block, capacitance, conductance, transconductance

REMAINDER = "inside"
# Below this part of the largest entry an element is rounding, and stays in the remainder.
NEGLIGIBLE = 1e-12


def hybrid_pi(owner: str, nodes: tuple[str, ...], fit: Fit, ends: tuple[str, str, str, str | None]) -> tuple[Part, ...]:
    """Give a bipolar transistor's elements between its terminals; ends: collector, base, emitter, substrate.

    nodes: the terminals' names in the order of the fit, all different.
    """
    c, b, e, s = ends
    g, cap = _entry(nodes, fit.at_rest()[0]), _entry(nodes, fit.at_rest()[1])
    gm = g(c, b) - g(b, c)
    found = [
        transconductance(owner, (c, e), (b, e), gm, "gm"),
        conductance(owner, b, e, -g(b, e), "g_pi"),
        conductance(owner, b, c, -g(b, c), "g_mu"),
        conductance(owner, c, e, -g(c, e) - gm, "g_o"),
        capacitance(owner, b, e, -cap(b, e), "c_pi"),
        capacitance(owner, b, c, -cap(b, c), "c_mu"),
    ]
    if s is not None:
        found.append(capacitance(owner, c, s, -cap(s, c), "c_sub"))
    return _kept(found, fit)


def quasi_static(
    owner: str, nodes: tuple[str, ...], fit: Fit, ends: tuple[str, str, str, str | None]
) -> tuple[Part, ...]:
    """Give a field-effect transistor's elements between its terminals; ends: drain, gate, source, body.

    drain and source as the device works: the drain is where the gate's current flows in.
    """
    d, g_, s, b = ends
    g, cap = _entry(nodes, fit.at_rest()[0]), _entry(nodes, fit.at_rest()[1])
    gm = g(d, g_) - g(g_, d)
    found = [transconductance(owner, (d, s), (g_, s), gm, "gm")]
    g_mb = 0.0
    if b is not None:
        g_mb = g(d, b) - g(b, d)
        found.append(transconductance(owner, (d, s), (b, s), g_mb, "g_mb"))
    found += [
        conductance(owner, d, s, -g(d, s) - gm - g_mb, "g_o"),
        conductance(owner, g_, s, -g(g_, s), "g_gs"),
        conductance(owner, g_, d, -g(g_, d), "g_gd"),
        capacitance(owner, g_, s, -cap(g_, s), "c_gs"),
        capacitance(owner, g_, d, -cap(g_, d), "c_gd"),
    ]
    if b is not None:
        found += [
            capacitance(owner, g_, b, -cap(g_, b), "c_gb"),
            conductance(owner, b, d, -g(b, d), "g_bd"),
            conductance(owner, b, s, -g(b, s), "g_bs"),
            capacitance(owner, b, d, -cap(b, d), "c_db"),
            capacitance(owner, b, s, -cap(b, s), "c_sb"),
        ]
    return _kept(found, fit)


def with_remainder(owner: str, nodes: tuple[str, ...], fit: Fit, elements: Iterable[Part]) -> tuple[Part, ...]:
    """Give the elements and, as the last part, the block of all that they are not.

    Its inner states stand at nodes of their own, Q1'1, Q1'2, ….
    """
    elements = tuple(elements)
    g, c = fit.conductance.copy(), fit.capacitance.copy()
    place = {node: np.eye(len(g))[k] for k, node in enumerate(nodes)}
    for part in elements:
        p, m, cp, cm = (*part.nodes[:2], *part.nodes[-2:])
        matrix = c if part.kind == "capacitance" else g
        matrix -= part.value * np.outer(place[p] - place[m], place[cp] - place[cm])
    inner = tuple(inner_node(owner, str(k)) for k in range(1, fit.states + 1))
    return (*elements, block(owner, (*nodes, *inner), _rows(g), _rows(c), REMAINDER))


def placed(parts: Iterable[Part], nodes: Mapping[str, str]) -> tuple[Part, ...]:
    """Put parts between terminals at the circuit's nodes, by terminal; inner nodes, which are not named, stay.

    An element with its ends, or its control's ends, at one node does nothing and is left out; rows and columns of a
    block that come to one node are added.
    """
    found = []
    for part in parts:
        at = tuple(nodes.get(node, node) for node in part.nodes)
        if part.kind == "block":
            found.append(_joined(part, at))
        elif at[0] != at[1] and at[-2] != at[-1]:
            found.append(replace(part, nodes=at))
    return tuple(found)


def _joined(part: Part, at: tuple[str, ...]) -> Part:
    distinct = tuple(dict.fromkeys(at))
    place = np.array([[float(node == other) for other in distinct] for node in at])
    g, c = (_rows(place.T @ np.array(matrix) @ place) for matrix in (part.conductances, part.capacitances))
    return block(part.owner, distinct, g, c, part.label)


def _entry(nodes: tuple[str, ...], matrix: Real) -> Callable[[str, str], float]:
    at = {node: k for k, node in enumerate(nodes)}

    def entry(row: str, column: str) -> float:
        return float(matrix[at[row], at[column]])

    return entry


def _kept(found: list[Part], fit: Fit) -> tuple[Part, ...]:
    """Leave out what is rounding, or would be negative but for a gm."""
    g0, c0 = fit.at_rest()
    least = {"capacitance": NEGLIGIBLE * float(np.abs(c0).max())}
    kept = []
    for part in found:
        size = abs(part.value) if part.kind == "transconductance" else part.value
        if size > least.get(part.kind, NEGLIGIBLE * float(np.abs(g0).max())):
            kept.append(part)
    return tuple(kept)


def _rows(matrix: Real) -> tuple[tuple[float, ...], ...]:
    return tuple(tuple(float(value) for value in row) for row in matrix)
