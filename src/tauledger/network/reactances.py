"""Every capacitance, inductance and transcapacitance as a rank-one term of C: C = Σ value · out · controlᵀ.

A mutual inductance has two terms and a block one per row of its C; `together` adds them up. `by_part` gives those of a
mutual inductance to its two inductors: M = k·√(L1·L2), a designer chooses L1, L2 and k, and with M held a little less
of one L would be a coupling of k > 1, which no coils have.

All that a single part does to the network follows from it: its time constant value · controlᵀ Z out, its share
value · (λᵀ out)(controlᵀ x), the pole it owns.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
from msgspec import Struct

from tauledger.circuit import fold
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, Triplets, has_branch, incidence
from tauledger.network.solve import Complex, Real, Solution

TERMS = {"mutual inductance": 2}
REACTIVE = ("capacitance", "inductance", "transcapacitance", "mutual inductance", "block")


class Reactances(Struct, frozen=True):
    """The reactive parts in the network's order, each once per term. value: (m,) F or H. out, control: (n, m)."""

    parts: tuple[Part, ...]
    value: Real
    out: Real
    control: Real

    @property
    def names(self) -> tuple[str, ...]:
        """Part names, (m,)."""
        return tuple(part.name for part in self.parts)

    @property
    def distinct(self) -> tuple[Part, ...]:
        """The parts, each once."""
        return tuple({part.name: part for part in self.parts}.values())


def reactances(network: Network) -> Reactances:
    """Give the rank-one terms of C, one per reactive part; an inductance acts on its own branch current.

    A mutual inductance acts on the branch of either inductor by the current of the other.
    """
    blocks = {part.name: _terms(network, part) for part in network.parts if part.kind == "block" and part.value}
    times = {name: len(columns) for name, columns in blocks.items()}
    parts = tuple(
        part
        for part in network.parts
        if part.kind in REACTIVE
        for _ in range(times.get(part.name, 0) if part.kind == "block" else TERMS.get(part.kind, 1))
    )
    out = np.zeros((network.size, len(parts)))
    control = np.zeros_like(out)
    for k, part in enumerate(parts):
        if part.kind == "block":
            out[:, k], control[:, k] = blocks[part.name].pop(0)
        elif part.kind == "inductance":
            row = network.branch(part.owner)
            out[row, k], control[row, k] = 1.0, -1.0
        elif has_branch(part):
            out[network.branch(part.name), k] = 1.0
            control[:, k] = incidence(network, *part.nodes)
        elif part.kind == "mutual inductance":
            here, there = (network.branch(owner) for owner in part.references)
            # its second term stands beside its first
            here, there = (there, here) if k and parts[k - 1] is part else (here, there)
            out[here, k], control[there, k] = 1.0, -1.0
        else:
            out[:, k] = incidence(network, part.nodes[0], part.nodes[1])
            control[:, k] = incidence(network, part.nodes[-2], part.nodes[-1])
    return Reactances(parts, np.array([part.value for part in parts]), out, control)


def together(terms: Reactances, values: Complex | Real) -> Complex:
    """Add up what belongs to one part, (n_parts,) in the order of `terms.distinct`; values: (m,)."""
    place = {part.name: k for k, part in enumerate(terms.distinct)}
    found = np.zeros(len(place), dtype=complex)
    np.add.at(found, [place[name] for name in terms.names], values)
    return found


def by_part(terms: Reactances, values: Real) -> dict[str, float]:
    """Add up what belongs to one part, by its name in the network's order, couplings k held; values: (m,).

    Half of a mutual inductance's goes to either of its inductors, for M follows the root of each.
    """
    of_parts = together(terms, values)
    moved = {part.name: of_parts[k : k + 1] for k, part in enumerate(terms.distinct)}
    held = at_held_coupling(terms.distinct, moved)
    return {part.name: float(held[part.name][0].real) for part in terms.distinct if part.kind != "mutual inductance"}


def at_held_coupling(parts: Iterable[Part], moved: Mapping[str, Complex]) -> dict[str, Complex]:
    """Give ∂/∂ln of every value by part name, any shape, those of inductors with k held; `moved` has them with M held.

    That of a mutual inductance, the inductors held, is the one of its k.
    """
    parts = tuple(parts)
    windings = {fold(part.owner): part.name for part in parts if part.kind == "inductance"}
    found = dict(moved)
    for part in parts:
        if part.kind == "mutual inductance":
            for owner in part.references:
                name = windings[fold(owner)]
                found[name] = found[name] + 0.5 * moved[part.name]
    return found


def _terms(network: Network, part: Part) -> list[tuple[Real, Real]]:
    """Give out and control, (n,) each, of every term of a block's C: one per row, which loses no digit of any entry."""
    rows = [network.index(node) for node in part.nodes]
    found = []
    for row, values in zip(rows, part.capacitances, strict=True):
        if row is None or not any(values):
            continue
        out, control = np.zeros(network.size), np.zeros(network.size)
        # half of its size on each side, as of a symmetric term
        out[row] = max(map(abs, values)) ** 0.5
        for column, value in zip(rows, values, strict=True):
            if column is not None:
                control[column] += value / out[row]
        found.append((out, control))
    return found


def moments(terms: Reactances, solution: Solution) -> Complex:
    """Give value · (λᵀ out)(controlᵀ x) / H = −∂ln H/∂ln(value) / s of every part at every s, (k, m), in s."""
    response = solution.response[:, None]
    moment: Complex = terms.value * (solution.adjoint @ terms.out) * (solution.x @ terms.control) / response
    return moment


def stamped(terms: Reactances, value: Real) -> Triplets:
    """Give C = Σ value · out · controlᵀ for other values (m,) of the same parts."""
    c = (terms.out * value) @ terms.control.T
    row, column = np.nonzero(c)
    return Triplets(row, column, c[row, column])
