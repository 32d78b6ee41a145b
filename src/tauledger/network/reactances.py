"""Every capacitance, inductance and transcapacitance as a rank-one term of C: C = Σ value · out · controlᵀ.

All that a single part does to the network follows from it: its time constant value · controlᵀ Z out, its share
value · (λᵀ out)(controlᵀ x), the pole it owns.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, Triplets, incidence
from tauledger.network.solve import Complex, Real, Solution

REACTIVE = ("capacitance", "inductance", "transcapacitance", "mutual inductance")


class Reactances(Struct, frozen=True):
    """The reactive parts in the network's order. value: (m,) F or H. out, control: (n, m)."""

    parts: tuple[Part, ...]
    value: Real
    out: Real
    control: Real

    @property
    def names(self) -> tuple[str, ...]:
        """Part names, (m,)."""
        return tuple(part.name for part in self.parts)


def reactances(network: Network) -> Reactances:
    """Give the rank-one terms of C, one per reactive part; an inductance acts on its own branch current.

    A mutual inductance acts on the branch of the first inductor by the current of the second.
    """
    parts = tuple(part for part in network.parts if part.kind in REACTIVE)
    out = np.zeros((network.size, len(parts)))
    control = np.zeros_like(out)
    for k, part in enumerate(parts):
        if part.kind == "inductance":
            row = network.branch(part.owner)
            out[row, k], control[row, k] = 1.0, -1.0
        elif part.kind == "mutual inductance":
            first, second = (network.branch(owner) for owner in part.references)
            out[first, k], control[second, k] = 1.0, -1.0
        else:
            out[:, k] = incidence(network, part.nodes[0], part.nodes[1])
            control[:, k] = incidence(network, part.nodes[-2], part.nodes[-1])
    return Reactances(parts, np.array([part.value for part in parts]), out, control)


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
