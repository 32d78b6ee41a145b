"""The network solved again with parts of other value: bias and plateau's frequency held, the change finite.

This is what "rerun" and "10 % less" mean. Scaling one part changes Y by a matrix of rank one (rank_one.py), so all
single changes are scanned together from the solutions of the unchanged network, and only the crossings are solved anew.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import fold
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network, assemble, without_loose_ends
from tauledger.network.edges import HALF_POWER, Edges, crossing, first_crossings
from tauledger.network.midband import MidBand, in_changed
from tauledger.network.rank_one import changed_response, places_of_change
from tauledger.network.reactances import Reactances, reactances
from tauledger.network.solve import Complex, Real, on_axis
from tauledger.network.spectrum import passes_signal
from tauledger.network.transformers import loose_couplings

SCANNED_BEYOND = 10.0


class EdgeFrequencies(Struct, frozen=True):
    """Both band edges in Hz, None where there is none."""

    f_low: float | None
    f_high: float | None


def scaled(network: Network, factors: Mapping[str, float]) -> Network:
    """Give the network with the values of the named parts multiplied: S of a conductance, F, H.

    Of coupled inductors k is held: a mutual inductance follows the root of either, and is itself multiplied as k is.
    Raises KeyError where a name belongs to no part.
    """
    windings = {fold(part.owner): part.name for part in map(network.part, factors) if part.kind == "inductance"}

    def factor(part: Part) -> float:
        own = factors.get(part.name, 1.0)
        if part.kind != "mutual inductance":
            return own
        beside = [factors[windings[fold(owner)]] for owner in part.references if fold(owner) in windings]
        return own * float(np.sqrt(np.prod(beside)))

    parts = tuple(replace(part, value=part.value * factor(part)) for part in network.parts)
    return assemble(parts, network.port, network.amplitudes)


def without(network: Network, names: frozenset[str]) -> Network:
    """Give the network with the named parts taken out.

    Raises KeyError where a name belongs to no part, NetworkError where nothing is left at the output.
    """
    for name in names:
        network.part(name)
    kept = without_loose_ends(part for part in network.parts if part.name not in names)
    return assemble(kept, network.port, network.amplitudes)


def edge_frequencies(network: Network, midband: MidBand) -> EdgeFrequencies:
    """Give the band edges of a changed network, its reference at the unchanged mid-band frequency or its own maximum.

    None where no signal passes at the unchanged one any more.
    Raises NetworkError where the network has no unique solution.
    """
    if not passes_signal(network, on_axis(midband.frequency_hz)):
        return EdgeFrequencies(None, None)
    return EdgeFrequencies(*first_crossings(network, in_changed(network, midband)))


def each_scaled(network: Network, midband: MidBand, edges: Edges, factor: float) -> dict[str, EdgeFrequencies]:
    """Give the band edges with one reactive part or line at a time multiplied by `factor`, by part name.

    edges: those of the unchanged network. The scan reaches ten times beyond them; where an edge is not found there,
    that part's network is searched in full. Couplings that are not loose have no entry.
    Raises NetworkError where a network has no unique solution.
    """
    terms = reactances(network)
    if not len(edges.frequency_hz):
        names = (*terms.names, *(line.name for line in network.lines))
        return {name: EdgeFrequencies(None, None) for name in names}
    # a line is no change of rank one either
    result = {line.name: edge_frequencies(scaled(network, {line.name: factor}), midband) for line in network.lines}
    if not terms.parts:
        return result
    frequency = _window(midband, edges)
    gain = np.abs(_each_response(network, terms, np.concatenate([[midband.frequency_hz], frequency]), factor))
    tied = {fold(owner) for part in terms.parts for owner in part.references}
    loose = loose_couplings(network)
    for k, part in enumerate(terms.parts):
        if part.kind == "mutual inductance" and part.name not in loose:
            continue
        if midband.maximum or part.kind in ("block", "mutual inductance") or fold(part.owner) in tied:
            # several terms at once are no change of rank one, and a maximum moves
            if part.name not in result:
                result[part.name] = edge_frequencies(scaled(network, {part.name: factor}), midband)
            continue
        level = HALF_POWER * float(gain[0, k])
        changed = scaled(network, {part.name: factor})
        found = EdgeFrequencies(
            f_low=_first(changed, level, midband.frequency_hz, frequency[::-1], gain[:0:-1, k], outwards=-1.0),
            f_high=_first(changed, level, midband.frequency_hz, frequency, gain[1:, k], outwards=1.0),
        )
        complete = all(
            (edge is None or edge.hz is None) == (hz is None)
            for edge, hz in ((edges.f_low, found.f_low), (edges.f_high, found.f_high))
        )
        result[part.name] = found if complete else edge_frequencies(changed, midband)
    return result


def _window(midband: MidBand, edges: Edges) -> Real:
    """Give the part of the scan that reaches somewhat beyond the band edges; all of it on a side without an edge."""
    low, high = edges.frequency_hz[0], edges.frequency_hz[-1]
    if edges.f_low is not None and edges.f_low.hz is not None:
        low = edges.f_low.hz / SCANNED_BEYOND
    elif midband.reaches_dc and edges.f_high is not None and edges.f_high.hz is not None:
        low = edges.f_high.hz / SCANNED_BEYOND**3
    if edges.f_high is not None and edges.f_high.hz is not None:
        high = edges.f_high.hz * SCANNED_BEYOND
    inside: Real = edges.frequency_hz[(edges.frequency_hz >= low) & (edges.frequency_hz <= high)]
    return inside


def _each_response(network: Network, terms: Reactances, frequency_hz: Real, factor: float) -> Complex:
    """Give H (k, m) at every frequency with each of the m parts scaled alone."""
    s = on_axis(frequency_hz)
    places = places_of_change(network, terms.out, terms.control, s)
    return changed_response(places, s[:, None] * terms.value * (factor - 1.0))


def _first(
    network: Network, level: float, f_mid: float, frequency_hz: Real, magnitude: Real, *, outwards: float
) -> float | None:
    """Give the first crossing of the level going outwards from f_mid; frequency and magnitude run outwards."""
    side = outwards * (frequency_hz - f_mid) > 0.0
    frequency, over = frequency_hz[side], magnitude[side] >= level
    falls = np.flatnonzero(~over)
    if not len(falls):
        return None
    k = int(falls[0])
    inside = float(frequency[k - 1]) if k > 0 else (f_mid or float(frequency[0]) / SCANNED_BEYOND)
    return crossing(network, level, inside, float(frequency[k]))
