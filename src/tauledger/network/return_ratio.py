"""The return ratio T(s): what comes back to a source or an admittance when it alone acts, by algebra.

Three places to take it. A *source* o·cᵀ of Y = Y₀ + o·cᵀ (gm of a transistor, E, F, G, H): T = cᵀ·Y₀⁻¹·o, and 1 + T =
det Y/det Y₀. A *bilateral element*, by its admittance with the reference 0: the same with o = c. A *wire* into one
terminal: a voltage e is put in series with it and a current j across it, each in turn with the loop closed; with v₁ the
voltage on the far side of e = 1 and i₁ the current that goes on past j = 1, 1/(1 + T) = v₁ + i₁. With the two sides of
the wire as a two-port that is T = (y₂₁ − y₁₂)/(y₁₁ + y₂₂ + 2·y₁₂): the return ratio of that part of the transmission
which is not reciprocal. At the wire of a controlled source it is the return ratio of that source.

Sources: Bode, "Network Analysis and Feedback Amplifier Design", 1945, chapters IV to VI (return ratio, return
difference); Middlebrook, "Measurement of loop gain in feedback systems", Int. J. Electronics 38(4), 1975 (double
injection); Rosenstark, "A simplified method of feedback amplifier analysis", IEEE Trans. Education E-17(4), 1974
(asymptotic gain).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND, fold
from tauledger.devices.parts import Part, voltage_source
from tauledger.errors import InputError, NetworkError
from tauledger.network.admittance import DENSE_LIMIT, admittance
from tauledger.network.assemble import Network, assemble, incidence
from tauledger.network.identities import Identity, check
from tauledger.network.solve import Complex, Real, batches, solve

Kind = Literal["source", "admittance", "wire"]

CURRENT_KINDS = ("transconductance", "delayed transconductance", "current gain")
VOLTAGE_KINDS = ("voltage gain", "transresistance")
CONTROLLED = (*CURRENT_KINDS, *VOLTAGE_KINDS)
BILATERAL = ("conductance", "capacitance", "inductance")
SERIES = "loop'e"
IDENTITY = 1e-6
DELAY_STEP = 1e-3
# What comes back is lost in the rounding of the largest voltage or current that the source makes.
ROUNDING = 1e-14
# A determinant of badly scaled rows has lost more than a solution has.
DETERMINANTS = 1e-3


class Term(Struct, frozen=True):
    """One addend of c(s): vector·exp(−s·delay)·s^power."""

    vector: Real
    delay_s: float = 0.0
    power: int = 0


class Opening(Struct, frozen=True):
    """Where a return ratio is taken: Y(s) = Y₀(s) + out·c(s)ᵀ, c the sum of the terms.

    network: the reference, Y₀; of a wire the closed network with an AC short of its own, `SERIES`, in that wire, whose
    far end is `far`. out: (n,). whole: the unchanged network.
    """

    kind: Kind
    network: Network
    whole: Network
    out: Real
    terms: tuple[Term, ...] = ()
    far: str = ""


class Asymptotic(Struct, frozen=True):
    """H = H∞·T/(1 + T) + H₀/(1 + T) at every s, (k,) each: return ratio, ideal gain H∞ (T → ∞), feedthrough H₀.

    passed: P = (eᵀY₀⁻¹o)(cᵀY₀⁻¹b), what the source makes of the drive where nothing comes back; H∞ = H₀ − P/T.
    """

    return_ratio: Complex
    ideal: Complex
    feedthrough: Complex
    passed: Complex

    @property
    def closed(self) -> Complex:
        """Give H = H₀ − P/(1 + T), which is the formula without H∞: a source without a loop has none."""
        return np.asarray(self.feedthrough - self.passed / (1.0 + self.return_ratio), dtype=np.complex128)


def at_source(network: Network, parts: Sequence[Part]) -> Opening:
    """Open at one controlled source, given by its parts: controls of one current, or voltages in series.

    Raises InputError where these are no controlled sources of one output.
    """
    if not parts or any(part.kind not in CONTROLLED for part in parts):
        raise InputError("a return ratio is taken at controlled sources", "name a transistor, or E, F, G, H, B")
    names = {part.name for part in parts}
    dead = tuple(replace(part, value=0.0) if part.name in names else part for part in network.parts)
    reference = assemble(dead, network.port, network.amplitudes)
    first = parts[0]
    terms: list[Term] = []
    if first.kind in CURRENT_KINDS:
        out = incidence(reference, first.nodes[0], first.nodes[1])
        for part in parts:
            own = incidence(reference, part.nodes[0], part.nodes[1])
            if part.kind not in CURRENT_KINDS or abs(abs(own @ out) - out @ out) > 0.0:
                raise InputError(f"{part.owner} has several outputs", "name one source of one output")
            sign = float(np.sign(own @ out))
            terms.append(Term(sign * part.value * _sensed(reference, part), part.delay_s))
    else:
        if any(part.kind not in VOLTAGE_KINDS for part in parts):
            raise InputError(f"{first.owner} has several outputs", "name one source of one output")
        out = np.zeros(reference.size)
        out[reference.branch(first.owner)] = 1.0
        terms += [Term(-part.value * _sensed(reference, part)) for part in parts]
    return Opening("source", reference, network, out, tuple(terms))


def at_admittance(network: Network, part: Part) -> Opening:
    """Open at a resistor, capacitor or inductor: the return ratio of its admittance, the reference is none.

    Raises InputError for a coupled inductor, or one whose current something else refers to.
    """
    if part.kind not in BILATERAL:
        raise InputError(f"{part.name} is no resistor, capacitor or inductor", "name one, or a controlled source")
    if part.kind == "inductance":
        own = fold(part.owner)
        if own == fold(network.port.through) or any(own in map(fold, other.references) for other in network.parts):
            raise InputError(f"the current of {part.name} is used elsewhere: it cannot be taken out", "name another")
        kept = tuple(other for other in network.parts if other is not part)
        reference = assemble(kept, network.port, network.amplitudes)
        value, power = 1.0 / part.value, -1
    else:
        dead = tuple(replace(other, value=0.0) if other is part else other for other in network.parts)
        reference = assemble(dead, network.port, network.amplitudes)
        value, power = part.value, 1 if part.kind == "capacitance" else 0
    across = incidence(reference, part.nodes[0], part.nodes[1])
    return Opening("admittance", reference, network, across, (Term(value * across, power=power),))


def at_wire(network: Network, owner: str, node: str, *, outward: bool = False) -> Opening:
    """Cut the wire from a node into all that one element has there, and bridge it with an AC short.

    outward: the signal comes out of the element there, so that its side is the near one. T of the two directions
    differs unless all that passes the wire backwards is nothing.
    Raises InputError where that element has nothing there, or the node is ground.
    """
    mine = [part for part in network.parts if fold(part.owner.partition("'")[0]) == fold(owner) and node in part.nodes]
    if node == GROUND or not mine:
        raise InputError(f"no wire leads from {node} into {owner}", "name a terminal that carries signal")
    far = f"{owner}'loop"
    cut = {part.name for part in mine}
    parts = tuple(
        replace(part, nodes=tuple(far if at == node else at for at in part.nodes)) if part.name in cut else part
        for part in network.parts
    )
    ends = (node, far) if outward else (far, node)
    closed = assemble((*parts, voltage_source(SERIES, *ends)), network.port, network.amplitudes)
    return Opening("wire", closed, network, np.zeros(closed.size), far=ends[0])


def leaves_there(network: Network, owner: str, node: str, s: complex) -> bool:
    """Whether the signal of a loop comes out of an element at a node: more passes that way round than the other.

    With both ends of the cut wire held, each moved in turn: the current at the node by the terminal against the current
    into the terminal by the node. Raises NetworkError where the network has no unique solution, InputError as at_wire.
    """
    far = at_wire(network, owner, node).far
    cut = tuple(part for part in at_wire(network, owner, node).network.parts if part.owner != SERIES)
    ends = (voltage_source(f"{SERIES}1", far, GROUND), voltage_source(f"{SERIES}2", node, GROUND))
    held = assemble((*cut, *ends), network.port, network.amplitudes)
    rows = [held.branch(one.owner) for one in ends]
    answer = _driven(held, np.eye(held.size)[rows], np.array([s]))[0]
    return bool(abs(answer[1, rows[0]]) > abs(answer[0, rows[1]]))


def phase_of_delays(opening: Opening, hz: float) -> float:
    """Give the degrees of arg T at a frequency in Hz that the delays of lines make: d arg T/d ln(delay), all together.

    Raises NetworkError where the network has no unique solution.
    """
    network = opening.network
    if not network.lines:
        return 0.0
    longer = tuple(
        replace(part, value=part.value * (1.0 + DELAY_STEP)) if part.kind == "line" and part.label == "delay" else part
        for part in network.parts
    )
    late = replace(opening, network=assemble(longer, network.port, network.amplitudes))
    s = np.array([2j * np.pi * hz])
    moved = return_ratio(late, s) / return_ratio(opening, s)
    return float(np.angle(moved[0], deg=True)) / DELAY_STEP


def return_ratio(opening: Opening, s: Complex) -> Complex:
    """Give T at every s (k,) in rad/s.

    Raises NetworkError where the network has no unique solution.
    """
    if opening.kind == "wire":
        rest = _wire_rest(opening, s)
        return np.asarray((1.0 - rest) / rest, dtype=np.complex128)
    answer = _driven(opening.network, opening.out, s)
    return np.asarray(np.sum(_control(opening, s) * answer, axis=1), dtype=np.complex128)


def asymptotic(opening: Opening, s: Complex) -> Asymptotic:
    """Give T, ideal gain and feedthrough at every s (k,) in rad/s; not defined for a wire.

    H∞ = H₀ − (eᵀY₀⁻¹o)(cᵀY₀⁻¹b)/T, NaN where T is 0, or no more than what rounding makes of 0.
    Source: Rosenstark, 1974, equations 8 and 9 (from memory).
    Raises NetworkError where the reference has no unique solution.
    """
    if opening.kind == "wire":
        raise ValueError("a wire has no single source: take the asymptotic gain at a source")
    at = solve(opening.network, s)
    control = _control(opening, s)
    answer = _driven(opening.network, opening.out, s)
    t = np.sum(control * answer, axis=1)
    passed = (at.adjoint @ opening.out) * np.sum(control * at.x, axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        ideal = at.response - passed / t
    ideal[np.abs(t) <= ROUNDING * _largest(opening.network, control, answer)] = np.nan
    return Asymptotic(np.asarray(t, dtype=np.complex128), ideal, at.response, passed)


def ratio_to(opening: Opening, plus: str, minus: str, s: Complex) -> Complex:
    """Give v(plus, minus) over what the source is controlled by, the source acting alone: (k,), without its gain.

    The sign is that of a loop opened there: what the control makes of 1 V at the output is −1 over it.
    Raises NetworkError where the reference has no unique solution, ValueError where the source has several controls.
    """
    if len(opening.terms) != 1:
        raise ValueError("several controls have no common unit")
    answer = _driven(opening.network, opening.out, s)
    vector = opening.terms[0].vector
    size = float(np.max(np.abs(vector)))
    came_back = answer @ (vector / size) if size else np.zeros(len(s))
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(answer @ incidence(opening.network, plus, minus) / came_back, dtype=np.complex128)


def checked(opening: Opening, s: Complex, response: Complex) -> float:
    """Give the largest relative error of H by the asymptotic formula against `response` (k,) of the closed network.

    Checks as well that 1 + T is det Y/det Y₀.
    Raises NetworkError where the formula does not hold within 1e-6.
    """
    found = asymptotic(opening, s)
    passed = np.abs(found.passed / (1.0 + found.return_ratio))
    scale = np.maximum(np.abs(response), np.maximum(np.abs(found.feedthrough), passed))
    error = float(np.max(np.abs(found.closed - response) / scale))
    identities = [Identity("closed loop by the asymptotic gain formula", error, 0.0, IDENTITY, 1.0)]
    if opening.network.size == opening.whole.size <= DENSE_LIMIT:
        closed, reference = (np.linalg.slogdet(admittance(one, s)) for one in (opening.whole, opening.network))
        difference = closed.sign / reference.sign * np.exp(closed.logabsdet - reference.logabsdet)
        missed = np.abs(difference / (1.0 + found.return_ratio) - 1.0)
        identities.append(Identity("1 + T = ratio of determinants", float(np.max(missed)), 0.0, DETERMINANTS, 1.0))
    check(identities)
    return error


def _sensed(network: Network, part: Part) -> Real:
    if part.references:
        row = np.zeros(network.size)
        row[network.branch(part.references[0])] = 1.0
        return row
    return incidence(network, part.nodes[-2], part.nodes[-1])


def _largest(network: Network, control: Complex, answer: Complex) -> Real:
    """Give what cᵀ·x would be if all that c senses were as large as the largest voltage, or current, of x, (k,)."""
    sensed, found = np.abs(control), np.abs(answer)
    n = network.n_nodes
    voltages = np.sum(sensed[:, :n], axis=1) * np.max(found[:, :n], axis=1, initial=0.0)
    currents = np.sum(sensed[:, n:], axis=1) * np.max(found[:, n:], axis=1, initial=0.0)
    return np.asarray(voltages + currents, dtype=np.float64)


def _control(opening: Opening, s: Complex) -> Complex:
    """Give c(s), (k, n)."""
    total = np.zeros((len(s), opening.network.size), dtype=complex)
    for term in opening.terms:
        total += (np.exp(-s * term.delay_s) * s**term.power)[:, None] * term.vector
    return total


def _driven(network: Network, right: Real, s: Complex) -> Complex:
    """Give Y⁻¹·right at every s: (k, n) for one right side (n,), (k, m, n) for several (m, n)."""
    several = np.atleast_2d(right)
    found: Complex
    if network.size > DENSE_LIMIT:
        answers = [solve(replace(network, drive=one.astype(complex)), s).x for one in several]
        found = np.asarray(np.stack(answers, axis=1), dtype=np.complex128)
    else:
        right_sides = several.T.astype(complex)
        try:
            solved = [
                np.linalg.solve(
                    admittance(network, some), np.broadcast_to(right_sides, (len(some), *right_sides.shape))
                )
                for some in batches(network, np.atleast_1d(s))
            ]
        except np.linalg.LinAlgError as error:
            raise NetworkError("the small-signal network has no unique solution") from error
        found = np.concatenate(solved)
        if not np.all(np.isfinite(found)):
            raise NetworkError("the small-signal network has no finite solution")
        found = found.transpose(0, 2, 1)
    return np.asarray(found[:, 0] if right.ndim == 1 else found, dtype=np.complex128)


def _wire_rest(opening: Opening, s: Complex) -> Complex:
    """Give 1/(1 + T) = v₁ + i₁ of the double injection, (k,)."""
    network = opening.network
    branch, far = network.branch(SERIES), network.index(opening.far)
    near = next(part for part in network.parts if part.owner == SERIES).nodes[1]
    if far is None:
        raise NetworkError("a wire to ground is cut")
    series = np.zeros(network.size)
    series[branch] = 1.0
    answer = _driven(network, np.stack([series, incidence(network, near, GROUND)]), s)
    # what goes on past the injected current comes through the short, from its far end to the near one
    return np.asarray(answer[:, 0, far] - answer[:, 1, branch], dtype=np.complex128)
