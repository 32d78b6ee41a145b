"""Uniform lines: their two rows at every s, and networks that have none, the line as at DC or as one lumped section.

A line of z in series and y across, of its whole length, has γ² = z·y and Zc = z/γ. Its ends obey two equations between
v₁, v₂ and the currents i₁, i₂ into them. For the sum and for the difference of its ends, with x = γ/2,
(y/2)·(sinh x/x)·(v₁ + v₂) = cosh x·(i₁ + i₂) and cosh x·(v₁ − v₂) = (z/2)·(sinh x/x)·(i₁ − i₂),
which has no singularity at any s. Where the line attenuates much, that loses what little arrives; there the waves are
taken, v₁ − Zc·i₁ = e^(−γ)·(v₂ + Zc·i₂) and the same with its ends exchanged, which is singular at DC instead.

Source: Pozar, "Microwave engineering", 4th ed., 2012, sections 2.1 and 4.1 (telegrapher's equations; even and odd
excitation of a symmetric two-port).
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.devices.family import inner_node
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_gain,
    inductance,
    resistance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import InputError
from tauledger.network.assemble import Network, assemble, incidence
from tauledger.network.merge import root_of

if TYPE_CHECKING:
    from tauledger.network.solve import Solution

Complex = NDArray[np.complex128]

# Below this |x| the power series of the derivative of sinh x/x is exact to rounding.
SMALL = 0.1
# Above this attenuation in neper the waves are taken.
ATTENUATES = 1.0


class LineRows(Struct, frozen=True):
    """The two rows of one line at every s (k,).

    row: where they stand. columns: (8,) unknowns on which they act, ground left out. entries, slope: the rows and their
    derivative by s over those columns, each (k, 2, 8).
    """

    name: str
    row: tuple[int, int]
    columns: tuple[int, ...]
    entries: Complex
    slope: Complex


def line_rows(network: Network, s: Complex) -> tuple[LineRows, ...]:
    """Give the rows of every line at every s (k,) in rad/s."""
    return tuple(_rows(network, part, s) for part in network.lines)


def _rows(network: Network, part: Part, s: Complex) -> LineRows:
    first = network.branch(part.owner)
    ends = np.array([incidence(network, *part.nodes[:2]), incidence(network, *part.nodes[2:])])
    into = np.eye(network.size)[[first, first + 1]]
    touched = np.flatnonzero(np.any(ends, axis=0) | np.any(into, axis=0))
    basis = np.concatenate([ends, into])[:, touched]
    on_ends, slope = _equations(part, s)
    return LineRows(part.name, (first, first + 1), tuple(touched.tolist()), on_ends @ basis, slope @ basis)


def _equations(part: Part, s: Complex) -> tuple[Complex, Complex]:
    """Give the two equations over (v₁, v₂, i₁, i₂) and their derivatives by s, each (k, 2, 4)."""
    ohm, henry, farad = series_and_shunt(part)
    z, y = ohm + s * henry, s * farad
    if ohm == 0.0:
        gamma = s * part.value
    elif henry == 0.0:
        gamma = np.sqrt(s * part.value)
    else:
        gamma = np.sqrt(s * part.value) * np.sqrt(s * part.value + ohm / part.surge_ohm)
    square_slope = henry * y + z * farad
    waves = gamma.real > ATTENUATES
    near_dc, far = _by_symmetry(z, y, gamma, (henry, farad, square_slope)), _by_waves(z, gamma, henry, square_slope)
    return (
        np.where(waves[:, None, None], far[0], near_dc[0]),
        np.where(waves[:, None, None], far[1], near_dc[1]),
    )


def _by_symmetry(
    z: Complex, y: Complex, gamma: Complex, slopes: tuple[float, float, Complex]
) -> tuple[Complex, Complex]:
    henry, farad, square_slope = slopes
    x = np.where(gamma.real > ATTENUATES, 0.0, gamma / 2.0)
    x2, x2_slope = x * x, square_slope / 4.0
    small = np.abs(x) < SMALL
    at = np.where(x == 0.0, 1.0, x)
    cosh = np.cosh(x)
    ratio = np.where(x == 0.0, 1.0, np.sinh(at) / at)
    bend = np.where(
        small, (1.0 + x2 / 10.0 * (1.0 + x2 / 28.0 * (1.0 + x2 / 54.0))) / 6.0, (cosh - ratio) / (2.0 * at * at)
    )
    cosh_slope, ratio_slope = ratio / 2.0 * x2_slope, bend * x2_slope

    def equations(shunt: Complex, through: Complex, series: Complex) -> Complex:
        both = [[shunt, shunt, -through, -through], [through, -through, -series, series]]
        return np.moveaxis(np.array(both), -1, 0)

    return (
        equations(y / 2.0 * ratio, cosh, z / 2.0 * ratio),
        equations((farad * ratio + y * ratio_slope) / 2.0, cosh_slope, (henry * ratio + z * ratio_slope) / 2.0),
    )


def _by_waves(z: Complex, gamma: Complex, henry: float, square_slope: Complex) -> tuple[Complex, Complex]:
    at = np.where(gamma == 0.0, 1.0, gamma)
    gamma_slope = square_slope / (2.0 * at)
    surge, late = z / at, np.exp(-gamma)
    surge_slope, late_slope = (henry - surge * gamma_slope) / at, -gamma_slope * late
    one, late_surge_slope = np.ones_like(z), surge_slope * late + surge * late_slope

    def equations(own: Complex, other: Complex, own_i: Complex, other_i: Complex) -> Complex:
        both = [[own, -other, -own_i, -other_i], [-other, own, -other_i, -own_i]]
        return np.moveaxis(np.array(both), -1, 0)

    return (
        equations(one, late, surge, surge * late),
        equations(0.0 * one, late_slope, surge_slope, late_surge_slope),
    )


def line_moments(network: Network, solution: Solution) -> dict[str, Complex]:
    """Give λᵀ (∂Y/∂s) x of the rows of every line by its name, (k,): what its L and C do, R held."""
    found = {}
    for rows in line_rows(network, solution.s):
        x, adjoint = solution.x[:, list(rows.columns)], solution.adjoint[:, list(rows.row)]
        found[rows.name] = np.einsum("kr,krc,kc->k", adjoint, rows.slope, x)
    return found


def series_and_shunt(part: Part) -> tuple[float, float, float]:
    """Give R in ohm, L in henry and C in farad of a whole line."""
    if part.surge_ohm == 0.0:
        return part.series_ohm, 0.0, part.value / part.series_ohm
    return part.series_ohm, part.surge_ohm * part.value, part.value / part.surge_ohm


def at_rest(network: Network) -> Network:
    """Give the network with every line as it is at DC: a wire, or its resistance; the network itself without lines."""
    return _replaced(network, lumped_section=False)


def lumped(network: Network) -> Network:
    """Give the network with every line as one section, half of C at either end: where the response happens, if not how.

    True far below the first resonance of a line of little loss.
    """
    return _replaced(network, lumped_section=True)


def require_held_ends(network: Network) -> None:
    """Raise InputError where nothing but a line holds a node: it passes no voltage common to both of its conductors."""
    held: dict[str, str] = {}
    for part in network.parts:
        if part.kind == "line":
            pairs = [part.nodes[:2], part.nodes[2:]]
        elif part.kind == "block":
            pairs = [(part.nodes[0], node) for node in part.nodes[1:]]
        elif part.kind in ("current source", "transconductance", "transcapacitance", "current gain"):
            continue
        else:
            pairs = [part.nodes[:2]]
        for a, b in pairs:
            held[root_of(held, a)] = root_of(held, b)
    ground = root_of(held, GROUND)
    for part in network.lines:
        for pair in (part.nodes[:2], part.nodes[2:]):
            if root_of(held, pair[0]) != ground:
                raise InputError(
                    f"{part.owner}: nothing but the line holds the nodes {pair[0]} and {pair[1]}",
                    f"tie {pair[1]} to ground, or to the other end: a line passes no voltage common to its conductors",
                )


def delay_of_waves(network: Network) -> float:
    """Give the sum of √(L·C) over all lines in s: what is reflected ripples |H| no faster than 1/(2·this) in Hz."""
    return sum(part.value for part in network.lines if part.surge_ohm)


def _replaced(network: Network, *, lumped_section: bool) -> Network:
    if not network.lines:
        return network
    parts: list[Part] = []
    joined: dict[str, str] = {}
    for part in network.parts:
        if part.kind != "line":
            parts.append(part)
            continue
        if part.series_ohm == 0.0 and not lumped_section and _beside(joined, part):
            continue
        parts += _section(part, *(series_and_shunt(part) if lumped_section else (part.series_ohm, 0.0, 0.0)))
    return assemble(tuple(parts), network.port, network.amplitudes)


def _beside(joined: dict[str, str], part: Part) -> bool:
    """Whether wires already join the ends of a line with one return; if not, they do from now on."""
    a, near_minus, b, far_minus = part.nodes
    if near_minus != far_minus:
        return False
    a, b = root_of(joined, a), root_of(joined, b)
    joined[a] = b
    return a == b


def _section(part: Part, ohm: float, henry: float, farad: float) -> Iterable[Part]:
    """One section between the ends; where they have no common return, behind an ideal transformer of 1 : 1."""
    owner, (near_plus, near_minus, far_plus, far_minus) = part.owner, part.nodes
    transformer = near_minus != far_minus
    start, end = near_plus, inner_node(owner, "through") if transformer else far_plus
    between = inner_node(owner, "between")
    if farad:
        yield capacitance(owner, near_plus, near_minus, farad / 2.0, "c_near")
        yield capacitance(owner, far_plus, far_minus, farad / 2.0, "c_far")
    if ohm and henry:
        yield resistance(owner, start, between, ohm, "r")
        yield inductance(owner, between, end, henry, "l")
    elif ohm:
        yield resistance(owner, start, end, ohm, "r")
    elif henry:
        yield inductance(owner, start, end, henry, "l")
    elif not transformer:
        yield voltage_source(owner, start, end)
    else:
        end = start
    if transformer:
        forced = inner_node(owner, "transformer")
        yield voltage_gain(forced, (end, near_minus), (far_plus, far_minus), 1.0)
        yield current_gain(owner, far_plus, far_minus, -1.0, forced, "transformer")
