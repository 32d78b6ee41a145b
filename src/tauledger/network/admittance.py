"""Y(s) and its slope dY/ds: here alone stands what is not G + s·C, delays and the rows of lines.

A transconductance g with the delay τ is g·exp(−s·τ). G holds g, so that with D = out·controlᵀ
Y(s) = G + s·C + Σ g·(exp(−s·τ) − 1)·D and dY/ds = C − Σ g·τ·exp(−s·τ)·D.
Poles and zeros need a rational network: `all_pass` gives one.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.devices.parts import Part, capacitance, conductance, transconductance
from tauledger.network.assemble import Network, Triplets, assemble, incidence
from tauledger.network.lines import at_rest, line_moments, line_rows

if TYPE_CHECKING:
    from tauledger.network.solve import Solution

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

DENSE_LIMIT = 150


class Delays(Struct, frozen=True):
    """The delayed transconductances as rank-one terms: value (m,) S, delay_s (m,), out and control (n, m)."""

    names: tuple[str, ...]
    value: Real
    delay_s: Real
    out: Real
    control: Real

    def delayed(self, s: Complex) -> Complex:
        """Give value·exp(−s·τ) of each at every s (k,), (k, m)."""
        return np.asarray(self.value * np.exp(-s[:, None] * self.delay_s), dtype=np.complex128)


def delays(network: Network) -> Delays:
    """Give the rank-one terms of the parts with a delay."""
    parts = network.delayed
    out = np.zeros((network.size, len(parts)))
    control = np.zeros_like(out)
    for k, part in enumerate(parts):
        out[:, k] = incidence(network, *part.nodes[:2])
        control[:, k] = incidence(network, *part.nodes[2:])
    return Delays(
        tuple(part.name for part in parts),
        np.array([part.value for part in parts]),
        np.array([part.delay_s for part in parts]),
        out,
        control,
    )


def admittance(network: Network, s: Complex) -> Complex:
    """Give Y(s) dense, (k, n, n), for s (k,)."""
    y = network.conductance.dense(network.size) + s[:, None, None] * network.capacitance.dense(network.size)
    if network.delayed:
        terms = delays(network)
        lag = terms.delayed(s) - terms.value
        y = np.asarray(y + np.einsum("nm,km,jm->knj", terms.out, lag, terms.control), dtype=np.complex128)
    for line in line_rows(network, s):
        y[:, np.array(line.row)[:, None], list(line.columns)] = line.entries
    return y


def coordinates(network: Network, s: complex) -> tuple[NDArray[np.intp], NDArray[np.intp], Complex]:
    """Give Y(s) sparse: rows, columns and values; equal coordinates add."""
    g, c = network.conductance, network.capacitance
    row, column = [g.row, c.row], [g.column, c.column]
    value: list[Complex] = [g.value.astype(complex), np.asarray(s * c.value, dtype=np.complex128)]
    if network.delayed:
        terms = delays(network)
        lag = terms.delayed(np.array([s])) - terms.value
        extra = (terms.out * lag) @ terms.control.T
        at = np.nonzero(extra)
        row.append(at[0])
        column.append(at[1])
        value.append(extra[at])
    for line in line_rows(network, np.array([s], dtype=complex)):
        row.append(np.repeat(line.row, len(line.columns)))
        column.append(np.tile(line.columns, 2))
        value.append(line.entries[0].ravel())
    return np.concatenate(row), np.concatenate(column), np.concatenate(value)


def slope_moment(network: Network, solution: Solution) -> Complex:
    """Give λᵀ (dY/ds) x at every s of the solution, (k,)."""
    moment: Complex = np.sum(solution.adjoint * times(network.capacitance, solution.x), axis=1)
    if network.delayed:
        moment = moment + np.sum(_delay_products(delays(network), solution), axis=1)
    for of_line in line_moments(network, solution).values():
        moment = moment + of_line
    return moment


def delay_moments(network: Network, solution: Solution) -> dict[str, Complex]:
    """Give λᵀ (∂Y/∂ln τ) x / (s·H) of every part with a delay by its name, each (k,), in s; lines are among them.

    It stands beside the moments of the reactive parts: scaling all of them and all delays scales frequency.
    """
    found = {name: moment / solution.response for name, moment in line_moments(network, solution).items()}
    if network.delayed:
        terms = delays(network)
        products = _delay_products(terms, solution) / solution.response[:, None]
        found |= {name: products[:, k] for k, name in enumerate(terms.names)}
    return found


def _delay_products(terms: Delays, solution: Solution) -> Complex:
    slope = -terms.delay_s * terms.delayed(solution.s)
    return np.asarray(slope * (solution.adjoint @ terms.out) * (solution.x @ terms.control), dtype=np.complex128)


def times(matrix: Triplets, x: Complex) -> Complex:
    """Give the matrix times every row of x (k, n), as (k, n)."""
    if x.shape[1] <= DENSE_LIMIT:
        return np.asarray(x @ matrix.dense(x.shape[1]).T, dtype=np.complex128)
    product = np.zeros_like(x)
    np.add.at(product.T, matrix.row, (x[:, matrix.column] * matrix.value).T)
    return product


def all_pass(network: Network) -> Network:
    """Give the network with every delay as the all-pass (1 − s·τ/2)/(1 + s·τ/2), which has the same phase to (s·τ)².

    An inner node x of 1 S and τ/2 F follows the control, and the current is value·(2·v(x) − v(control)). Lines
    are taken as at DC.
    """
    network = at_rest(network)
    if not network.delayed:
        return network
    parts: list[Part] = []
    for part in network.parts:
        if part.kind != "delayed transconductance":
            parts.append(part)
            continue
        out, control = (part.nodes[0], part.nodes[1]), (part.nodes[2], part.nodes[3])
        node = f"{part.owner}'{part.label or 'delay'}"
        parts += [
            conductance(part.owner, node, GROUND, 1.0, f"{part.label}.pole"),
            capacitance(part.owner, node, GROUND, 0.5 * part.delay_s, f"{part.label}.delay"),
            transconductance(part.owner, (GROUND, node), control, 1.0, f"{part.label}.follow"),
            transconductance(part.owner, out, (node, GROUND), 2.0 * part.value, f"{part.label}.lag"),
            transconductance(part.owner, out, control, -part.value, part.label),
        ]
    return assemble(tuple(parts), network.port, network.amplitudes)
