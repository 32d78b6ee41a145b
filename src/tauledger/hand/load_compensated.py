"""The amplifier whose load makes the dominant pole: one node of high resistance, at the output."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.hand.compensated import capacitors_at, farads_at, find_places, input_device
from tauledger.hand.compensation import load_pole_hz
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.nodes import node_name

# So much of the dominant pole belongs to the capacitances at the output, or the load does not make it.
MAKES_IT = 0.8
FITS = 1.1


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
    """Find the load that makes the dominant pole; None where the capacitances at the output own less than 80 % of it.

    circuit: the hand circuit, of a balanced one its half. response: of the whole network. dominant_hz, owners: of the
    dominant pole, exact.
    """
    places = find_places(circuit)
    live = [node for node in circuit.output_hand if node != GROUND]
    plus = next((node for node in live if node in circuit.row), None)
    if plus is None or (len(live) > 1 and not halves):
        return None
    at = places.of(plus)
    parts = frozenset(c.part for c in capacitors_at(circuit, places, at))
    owned = sum(owners.get(part, 0.0) for part in parts) * (2.0 if halves else 1.0)
    # a capacitor across the output belongs to both halves, and counted twice it is no less
    if owned < MAKES_IT:
        return None
    r_out, c_l = circuit.z(plus, plus), farads_at(circuit, places, at)
    if r_out <= 0.0 or not c_l or not 1.0 / FITS < load_pole_hz(r_out, c_l) / dominant_hz < FITS:
        return None
    reached = abs(circuit.voltage[circuit.row[plus]])
    if not reached:
        return None
    sent = float(reached) / r_out
    gm_1, first = input_device(circuit, places, at, sent)
    return LoadedOutput(node_name(circuit, at), r_out, c_l, gm_1, first, sent, parts, float(abs(response) / reached))
