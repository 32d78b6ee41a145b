"""The amplifier whose load makes the dominant pole: one node of high resistance, at the output."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.hand.compensated import Places, capacitors_at, farads_at, find_places, input_device
from tauledger.hand.compensation import load_pole_hz
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.nodes import node_name

# So much of the dominant pole belongs to the capacitances at the output, or the load does not make it.
MAKES_IT = 0.8
FITS = 1.1
# From the node to the output, with followers in between.
PASSED_ON = (0.3, 1.2)


class LoadedOutput(Struct, frozen=True):
    """The output with what stands there.

    r_out: ohm. c_l: F, all of it. gm_1: S, from the whole drive to the output; first: the transistor whose gm that is,
    or "half of M1's", empty where it is no single one's; sent: S, what gm_1 stands for, exact. parts: names of the
    capacitances. between: gain from this node to the output, 2 where both halves of a balanced circuit are the output.
    """

    name: str
    r_out: float
    c_l: float
    gm_1: float
    first: str
    sent: float
    parts: frozenset[str]
    between: float


def find_loaded_output(
    circuit: EquivalentCircuit, response: complex, dominant_hz: float, owners: Mapping[str, float], *, halves: bool
) -> LoadedOutput | None:
    """Find the node whose load makes the dominant pole, the output first, else one before a follower.

    None where the capacitances at no such node own 80 % of it. circuit: the hand circuit, of a balanced one its half.
    response: of the whole network. dominant_hz, owners: of the dominant pole, exact.
    """
    places = find_places(circuit)
    live = [node for node in circuit.output_hand if node != GROUND]
    plus = next((node for node in live if node in circuit.row), None)
    if plus is None or (len(live) > 1 and not halves):
        return None
    # the other half owns as much
    owned = {part: share * (2.0 if halves else 1.0) for part, share in owners.items()}
    for place in dict.fromkeys((places.of(plus), *places.members)):
        found = _load_at(circuit, places, place, response)
        if found is None or sum(owned.get(part, 0.0) for part in found.parts) < MAKES_IT:
            continue
        low, high = PASSED_ON
        fits = 1.0 / FITS < load_pole_hz(found.r_out, found.c_l) / dominant_hz < FITS
        if fits and (place == places.of(plus) or low <= found.between <= high):
            return found
    return None


def _load_at(circuit: EquivalentCircuit, places: Places, place: str, response: complex) -> LoadedOutput | None:
    r_out, c_l = circuit.z(place, place), farads_at(circuit, places, place)
    reached = float(abs(circuit.voltage[circuit.row[place]]))
    if r_out <= 0.0 or not c_l or not reached:
        return None
    sent = reached / r_out
    gm_1, first = input_device(circuit, places, place, sent)
    parts = frozenset(c.part for c in capacitors_at(circuit, places, place))
    between = float(abs(response)) / reached
    return LoadedOutput(node_name(circuit, place), r_out, c_l, gm_1, first, sent, parts, between)
