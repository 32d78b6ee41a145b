"""Series taken for parallel and the other way round, at the resistances of one node."""

from __future__ import annotations

import math
from collections.abc import Collection
from itertools import combinations

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.hand.branches import Branch, Walk, branches, total
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.network.bands import Bands

Wrong = tuple[str, float]


def drawn(bands: Bands, devices: tuple[Device, ...], *, second: bool) -> EquivalentCircuit:
    """Give the circuit as it is drawn on paper: a balanced one as its half, the second one for a node of that."""
    circuit = upper_circuit(bands, devices)
    mirror = find_mirror(circuit)
    if mirror is None:
        return circuit
    return half_circuit(circuit, mirror.other if second else mirror)


def series_slips(circuit: EquivalentCircuit, node: str, own: Collection[str], bias: Collection[str]) -> list[Wrong]:
    """Give what was done and the ohm that it gives, for every such slip at a hand node.

    own: names of the resistances inside devices; none of them is taken in series with another. bias: those of the bias
    network, which may be one branch, as R1 ‖ R2 on paper.
    """
    if node not in circuit.row:
        return []
    here = branches(circuit, node, frozenset(), Walk())
    found = [wrong for n, branch in enumerate(here) for wrong in _side_by_side(branch, _without(here, n))]
    behind = {t.outer for t in circuit.terminals if t.inner == node != t.outer}
    link = next((n for n, branch in enumerate(here) if branch.name in own and branch.far in behind), None)
    if link is None:
        return found + [wrong for each in _lumpings(here, bias) for wrong in _in_series(each, [], own, 0.0)]
    way = next(k for k in circuit.resistors_at[node] if circuit.resistors[k].name == here[link].name)
    outside = branches(circuit, here[link].far, frozenset({("R", way)}), Walk())
    r_b = here[link].link_ohm or 0.0
    for inside in _shunts(circuit, node, _without(here, link)):
        for each in _lumpings(outside, bias):
            found += _in_series(each, inside, own, r_b) + _in_series(each, inside, own, 0.0)
    return found


def _shunts(circuit: EquivalentCircuit, node: str, inside: list[Branch]) -> list[list[Branch]]:
    """Give the branches behind r_b as looked into, and as on paper where r_e is left out: r_π alone."""
    r_pi = min(
        (circuit.cells[k].r_pi for k in circuit.cells_at.get(node, ()) if circuit.cells[k].control == node), default=0.0
    )
    if len(inside) != 1 or not 0.9 < r_pi / inside[0].ohm < 1.0:
        return [inside]
    return [inside, [Branch(inside[0].name, r_pi, inside[0].symbol)]]


def _in_series(outside: list[Branch], inside: list[Branch], own: Collection[str], r_b: float) -> list[Wrong]:
    """Give every pair in series, and all; `inside` are the branches behind r_b, ohm, that shunt the node itself."""
    found = []
    free = [branch for branch in outside if branch.name not in own]
    fixed = [branch for branch in outside if branch.name in own]
    for (m, one), (n, other) in combinations(enumerate(free), 2):
        rest = [branch for k, branch in enumerate(free) if k not in (m, n)]
        paired = Branch(one.name, one.ohm + other.ohm, one.symbol)
        ohm = total([Branch("", r_b + total([*rest, *fixed, paired]), ""), *inside])
        found.append((_says([one.name, other.name]), ohm))
    if inside:
        for n, one in enumerate(free):
            rest = [*_without(free, n), *fixed]
            if rest:
                ohm = total([*rest, Branch(one.name, one.ohm + r_b + total(inside), one.symbol)])
                found.append((_says([one.name, *(branch.name for branch in inside)]), ohm))
    every = [*free, *inside]
    if len(every) > 2:
        ohm = r_b + math.fsum(branch.ohm for branch in every)
        found.append((_says([branch.name for branch in every]), total([Branch("", ohm, ""), *fixed])))
    return found


def _lumpings(outside: list[Branch], bias: Collection[str]) -> list[list[Branch]]:
    """Give the branches one by one and, where two or more are of the bias network, with those taken together."""
    network = [branch for branch in outside if branch.name in bias]
    if len(network) < 2:
        return [outside]
    name = " ‖ ".join(branch.name for branch in network)
    rest = [branch for branch in outside if branch.name not in bias]
    return [outside, [*rest, Branch(f"({name})", total(network), name)]]


def _side_by_side(branch: Branch, others: list[Branch]) -> list[Wrong]:
    beyond = branch.ohm - branch.link_ohm if branch.link_ohm is not None else 0.0
    if not branch.link_ohm or beyond <= 0.0 or branch.far == GROUND:
        return []
    wrong = branch.link_ohm * beyond / branch.ohm
    ohm = total([*others, Branch(branch.name, wrong, branch.symbol)])
    return [(f"{branch.name} in parallel, not in series", ohm)]


def _without(found: list[Branch], n: int) -> list[Branch]:
    return [one for k, one in enumerate(found) if k != n]


def _says(names: list[str]) -> str:
    return f"{', '.join(names[:-1])} and {names[-1]} in series, not in parallel"
