"""Parts → the matrices of the small-signal network, by modified nodal analysis.

Y(s) = G + s·C acts on the unknowns x = (node voltages, branch currents); Y x = b is the forward problem with the
drive b, Yᵀ λ = e the adjoint problem with the output e, and H = eᵀ x = λᵀ b.
Branch unknowns belong to voltage sources (v_a - v_b = V), inductors (v_a - v_b - s·L·i - Σ s·M·i_k = 0), voltage
gains (v_a - v_b - A·v(control) = 0), transresistances (v_a - v_b - R·i_k = 0) and capacitors from 1 F on
(s·C·(v_a - v_b) - i = 0).
A line has two, the currents into its ends, and rows that are no part of G + s·C: `lines` knows them.
G holds a delayed transconductance as it is at s = 0; `admittance` alone knows the delay.

Source: Ho, Ruehli and Brennan, "The modified nodal approach to network analysis", IEEE Trans. Circuits Syst.
CAS-22(6), 1975.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.circuit import GROUND, Port, fold
from tauledger.devices.family import inner_node
from tauledger.devices.parts import SOURCES, WITH_BRANCH, Part, voltage_source
from tauledger.errors import NetworkError

LARGE_FARAD = 1.0


class Triplets(Struct, frozen=True):
    """A sparse real matrix as coordinates; equal coordinates add. row, column: (nnz,) int; value: (nnz,)."""

    row: NDArray[np.intp]
    column: NDArray[np.intp]
    value: NDArray[np.float64]

    def dense(self, size: int) -> NDArray[np.float64]:
        """Give the (size, size) array."""
        matrix = np.zeros((size, size))
        np.add.at(matrix, (self.row, self.column), self.value)
        return matrix


class Network(Struct, frozen=True):
    """The assembled small-signal network.

    parts: what it was built from. unknowns: node names, then the owners of the branch currents. n_nodes: how
    many are nodes.
    conductance G and capacitance C: triplets of order n. drive b: (n,) complex, V or A. output e: (n,) real.
    amplitudes: complex amplitude of every source by its folded name, V or A. delayed: the transconductances with a
    delay. lines: the lines, whose rows G + s·C leaves empty.
    """

    parts: tuple[Part, ...]
    port: Port
    unknowns: tuple[str, ...]
    n_nodes: int
    conductance: Triplets
    capacitance: Triplets
    drive: NDArray[np.complex128]
    output: NDArray[np.float64]
    amplitudes: Mapping[str, complex]
    delayed: tuple[Part, ...] = ()
    lines: tuple[Part, ...] = ()

    @classmethod
    def from_parts(cls, parts: Iterable[Part], *, output: Port, drive: Mapping[str, complex] | None = None) -> Network:
        """Assemble parts into a network.

        drive: complex amplitude by source name; sources not named keep the amplitude of their part.
        Raises NetworkError where the output, or a part, names a node or branch that no part has.
        """
        return assemble(tuple(parts), output, {fold(name): value for name, value in (drive or {}).items()})

    @property
    def size(self) -> int:
        """Number of unknowns n."""
        return len(self.unknowns)

    def index(self, node: str) -> int | None:
        """Give the row of a node, or None for ground."""
        return None if node == GROUND else self.unknowns[: self.n_nodes].index(node)

    def branch(self, owner: str) -> int:
        """Give the row of the branch current of a voltage source, inductor, voltage gain or transresistance."""
        return self.n_nodes + [fold(name) for name in self.unknowns[self.n_nodes :]].index(fold(owner))

    def amplitude(self, source: Part) -> complex:
        """Give the complex amplitude in V or A with which a source of this network is driven."""
        return self.amplitudes[fold(source.owner)]

    @property
    def driving(self) -> tuple[Part, ...]:
        """The sources that drive, in the order of the parts: those with an amplitude other than 0."""
        return tuple(part for part in self.parts if part.kind in SOURCES and self.amplitude(part) != 0.0)

    def part(self, name: str) -> Part:
        """Give the part with this name ("CL", "Q1.c_mu"); KeyError where there is none."""
        for part in self.parts:
            if part.name == name:
                return part
        raise KeyError(name)


def assemble(parts: tuple[Part, ...], port: Port, drive: Mapping[str, complex]) -> Network:
    """Stamp every part; `drive` overrides the amplitudes of the sources it names (folded).

    Raises NetworkError where the output names a node or branch that no part touches, where two parts share a name, and
    where a part refers to a branch that is not there.
    """
    names = [part.name for part in parts]
    if len(set(names)) < len(names):
        twice = sorted({name for name in names if names.count(name) > 1})
        raise NetworkError(f"two parts of one name: {', '.join(twice)}")
    nodes = list(dict.fromkeys(node for part in parts for node in part.nodes if node != GROUND))
    branches = [name for part in parts for name in _branches(part)]
    row_of = {fold(owner): row for row, owner in enumerate(branches, start=len(nodes))}
    at: dict[str, int] = {node: row for row, node in enumerate(nodes)}
    n = len(nodes) + len(branches)
    g_rows: list[tuple[int, int, float]] = []
    c_rows: list[tuple[int, int, float]] = []
    b = np.zeros(n, dtype=complex)
    branch = len(nodes)
    amplitudes = {
        fold(part.owner): complex(drive.get(fold(part.owner), part.amplitude)) for part in parts if part.kind in SOURCES
    }
    for part in parts:
        rows = [at.get(node, -1) for node in part.nodes]
        if missing := [owner for owner in part.references if fold(owner) not in row_of]:
            raise NetworkError(f"{part.name} refers to {missing[0]}, which has no branch")
        sensed = [row_of[fold(owner)] for owner in part.references]
        match part.kind:
            case "capacitance" if has_branch(part):
                p, m = rows
                g_rows += [(p, branch, 1.0), (m, branch, -1.0), (branch, branch, -1.0)]
                c_rows += [(branch, p, part.value), (branch, m, -part.value)]
                branch += 1
            case "conductance" | "capacitance":
                p, m = rows
                _stamp(g_rows if part.kind == "conductance" else c_rows, (p, m), (p, m), part.value)
            case "transconductance" | "transcapacitance" | "delayed transconductance":
                p, m, cp, cm = rows
                _stamp(c_rows if part.kind == "transcapacitance" else g_rows, (p, m), (cp, cm), part.value)
            case "block":
                _stamp_matrix(g_rows, rows, part.conductances, 1.0)
                _stamp_matrix(c_rows, rows, part.capacitances, part.value)
            case "current gain":
                p, m = rows
                g_rows += [(p, sensed[0], part.value), (m, sensed[0], -part.value)]
            case "mutual inductance":
                c_rows += [(sensed[0], sensed[1], -part.value), (sensed[1], sensed[0], -part.value)]
            case "voltage gain" | "transresistance":
                p, m = rows[:2]
                g_rows += [(p, branch, 1.0), (m, branch, -1.0), (branch, p, 1.0), (branch, m, -1.0)]
                if part.kind == "voltage gain":
                    g_rows += [(branch, rows[2], -part.value), (branch, rows[3], part.value)]
                else:
                    g_rows.append((branch, sensed[0], -part.value))
                branch += 1
            case "voltage source" | "inductance":
                p, m = rows
                g_rows += [(p, branch, 1.0), (m, branch, -1.0), (branch, p, 1.0), (branch, m, -1.0)]
                if part.kind == "inductance":
                    c_rows.append((branch, branch, -part.value))
                else:
                    b[branch] = amplitudes[fold(part.owner)]
                branch += 1
            case "line":
                near_plus, near_minus, far_plus, far_minus = rows
                g_rows += [(near_plus, branch, 1.0), (near_minus, branch, -1.0)]
                g_rows += [(far_plus, branch + 1, 1.0), (far_minus, branch + 1, -1.0)]
                branch += 2
            case "current source":
                p, m = rows
                amplitude = amplitudes[fold(part.owner)]
                if p >= 0:
                    b[p] -= amplitude
                if m >= 0:
                    b[m] += amplitude
    return Network(
        parts=parts,
        port=port,
        unknowns=(*nodes, *branches),
        n_nodes=len(nodes),
        conductance=_triplets(g_rows),
        capacitance=_triplets(c_rows),
        drive=b,
        output=_selector(port, at, branches, n),
        amplitudes=amplitudes,
        delayed=tuple(part for part in parts if part.kind == "delayed transconductance"),
        lines=tuple(part for part in parts if part.kind == "line"),
    )


def _branches(part: Part) -> tuple[str, ...]:
    """Name the branch currents of a part."""
    if part.kind == "line":
        return part.owner, inner_node(part.owner, "far")
    return (part.owner,) if part.kind in WITH_BRANCH else (part.name,) if has_branch(part) else ()


def has_branch(part: Part) -> bool:
    """Whether this is a capacitance so large that s·C beside what its nodes see would leave nothing but rounding."""
    return part.kind == "capacitance" and part.value >= LARGE_FARAD


def without_loose_ends(parts: Iterable[Part]) -> tuple[Part, ...]:
    """Leave out what refers to a branch that is no longer there: no current is sensed, nothing is coupled.

    A transresistance then forces 0 V.
    """
    parts = tuple(parts)
    owners = {fold(part.owner) for part in parts if part.kind in WITH_BRANCH}
    kept: list[Part] = []
    for part in parts:
        if all(fold(owner) in owners for owner in part.references):
            kept.append(part)
        elif part.kind == "transresistance":
            kept.append(voltage_source(part.owner, part.nodes[0], part.nodes[1]))
    return tuple(kept)


def incidence(network: Network, plus: str, minus: str) -> NDArray[np.float64]:
    """Give the (n,) vector d with dᵀx = v(plus) - v(minus)."""
    d = np.zeros(network.size)
    for node, sign in ((plus, 1.0), (minus, -1.0)):
        row = network.index(node)
        if row is not None:
            d[row] += sign
    return d


def _stamp(rows: list[tuple[int, int, float]], out: tuple[int, int], control: tuple[int, int], value: float) -> None:
    for row, row_sign in ((out[0], 1.0), (out[1], -1.0)):
        for column, column_sign in ((control[0], 1.0), (control[1], -1.0)):
            rows.append((row, column, row_sign * column_sign * value))


def _stamp_matrix(
    entries: list[tuple[int, int, float]], rows: list[int], matrix: tuple[tuple[float, ...], ...], factor: float
) -> None:
    for row, values in zip(rows, matrix, strict=True):
        entries += [(row, column, factor * value) for column, value in zip(rows, values, strict=True) if value]


def _triplets(rows: list[tuple[int, int, float]]) -> Triplets:
    kept = [entry for entry in rows if entry[0] >= 0 and entry[1] >= 0]
    return Triplets(
        np.array([row for row, _, _ in kept], dtype=np.intp),
        np.array([column for _, column, _ in kept], dtype=np.intp),
        np.array([value for _, _, value in kept], dtype=float),
    )


def _selector(port: Port, at: Mapping[str, int], branches: list[str], n: int) -> NDArray[np.float64]:
    e = np.zeros(n)
    if port.kind == "current":
        owners = [fold(name) for name in branches]
        if fold(port.through) not in owners:
            raise NetworkError(f"no branch current for {port}")
        e[len(at) + owners.index(fold(port.through))] = 1.0
        return e
    for node, sign in ((port.plus, 1.0), (port.minus, -1.0)):
        if node == GROUND:
            continue
        if node not in at:
            raise NetworkError(f"no part touches the output node {node}")
        e[at[node]] += sign
    return e
