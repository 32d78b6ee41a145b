"""Two closely coupled inductors drawn as what a transformer is on paper: leakage, magnetising inductance, ideal turns.

With M = k·√(L1·L2) the pair is exactly: L1·(1 − k²) in series with the first winding, k²·L1 across it behind that, and
an ideal transformer of 1 : n with n = L2/M = √(L2/L1)/k. What a pair of windings does to a band is then in single
parts: the magnetising inductance makes a lower edge, the leakage an upper one, and their shares do not cancel.

Source: Terman, "Radio Engineers' Handbook", 1943, section 2 (equivalent circuits of coupled coils; from memory).
"""

from __future__ import annotations

from collections.abc import Collection, Iterable

import numpy as np

from tauledger.circuit import GROUND, fold
from tauledger.devices.family import inner_node
from tauledger.devices.parts import Part, current_gain, inductance, voltage_gain
from tauledger.network.assemble import Network, assemble
from tauledger.network.merge import joined_nodes

# Below, as between two tuned circuits, nobody thinks in leakage and turns.
CLOSE = 0.9
LESS = 0.9
NO_LEAKAGE = 1e-9
MAGNETISING, LEAKAGE, TURNS, REFLECTED = "l_m", "l_leak", "turns", "reflected"


def drawn_out(network: Network) -> Network:
    """Give the same network with every two windings of k ≥ 0.9 drawn as leakage, magnetising inductance and turns.

    Windings that are coupled with more than one other, or whose current is the output or is sensed, stay as they are.
    """
    pairs = _pairs(network)
    if not pairs:
        return network
    gone = {name for _, _, names in pairs for name in names}
    kept = [part for part in network.parts if part.name not in gone]
    sources = [part for part in network.parts if part.kind == "voltage source"]
    rest = {node for node, root in joined_nodes(network, sources).items() if root == GROUND}
    for coupling, ends, _ in pairs:
        kept += _drawn(coupling, *ends, rest)
    return assemble(tuple(kept), network.port, network.amplitudes)


def loose_couplings(network: Network) -> frozenset[str]:
    """Name the mutual inductances of k < 0.9 that may be 10 % less with all else held.

    Of a close coupling nobody takes 10 %: that would multiply its leakage. And among three windings one k bounds the
    others, for the energy of no currents is below zero.
    """
    mutual = [part for part in network.parts if part.kind == "mutual inductance" and part.value]
    if not mutual:
        return frozenset()
    windings = [part for part in network.parts if part.kind == "inductance"]
    row = {fold(part.owner): k for k, part in enumerate(windings)}
    henry = np.array([part.value for part in windings])
    coupling = np.eye(len(windings))
    places = {part.name: tuple(row[fold(owner)] for owner in part.references) for part in mutual}
    for part in mutual:
        a, b = places[part.name]
        coupling[a, b] += part.value / np.sqrt(abs(henry[a] * henry[b]))
        coupling[b, a] = coupling[a, b]

    def exists(name: str) -> bool:
        a, b = places[name]
        less = coupling.copy()
        less[a, b] *= LESS
        less[b, a] = less[a, b]
        return bool(abs(coupling[a, b]) < CLOSE and np.linalg.eigvalsh(less)[0] >= 0.0)

    return frozenset(name for name in places if exists(name))


def _pairs(network: Network) -> list[tuple[Part, tuple[Part, Part], tuple[str, ...]]]:
    """Give the mutual inductance of every close pair, its two windings, and the names of all that it replaces."""
    mutual = [part for part in network.parts if part.kind == "mutual inductance"]
    windings = {fold(part.owner): part for part in network.parts if part.kind == "inductance"}
    times: dict[str, int] = {}
    for part in mutual:
        for owner in map(fold, part.references):
            times[owner] = times.get(owner, 0) + 1
    busy = {fold(name) for part in network.parts if part.kind != "mutual inductance" for name in part.references}
    busy |= {fold(network.port.through)} if network.port.kind == "current" else set()
    found: list[tuple[Part, tuple[Part, Part], tuple[str, ...]]] = []
    for part in mutual:
        first, second = (fold(owner) for owner in part.references)
        if {first, second} & busy or times[first] != 1 or times[second] != 1:
            continue
        one, two = windings[first], windings[second]
        if part.value**2 >= CLOSE**2 * one.value * two.value > 0.0:
            found.append((part, (one, two), (one.name, two.name, part.name)))
    return found


def _drawn(coupling: Part, one: Part, two: Part, rest: Collection[str]) -> Iterable[Part]:
    """Draw the leakage at that end of the first winding which no source holds."""
    (a, b), (c, d) = one.nodes, two.nodes
    if a in rest and b not in rest:
        (a, b), (c, d) = (b, a), (d, c)
    k2 = coupling.value**2 / (one.value * two.value)
    n = two.value / coupling.value
    behind = a
    if 1.0 - k2 > NO_LEAKAGE:
        behind = inner_node(one.owner, "m")
        yield inductance(coupling.owner, a, behind, one.value * (1.0 - k2), label=LEAKAGE)
    yield inductance(one.owner, behind, b, one.value * k2, label=MAGNETISING)
    yield voltage_gain(two.owner, (c, d), (behind, b), n, label=TURNS)
    yield current_gain(two.owner, behind, b, -n, two.owner, label=REFLECTED)
