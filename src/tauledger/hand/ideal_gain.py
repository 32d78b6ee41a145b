"""The ideal gain of a feedback amplifier by hand: what the feedback elements alone make of it, T → ∞.

Feedback into a base or gate (shunt): no voltage is left there, so that the current of the source goes through R_F:
A∞ = −R_F for a current, −R_F/R_S for a voltage behind R_S. Into an emitter or source (series): it follows the input,
so that R_E takes what R_F brings: A∞ = 1 + R_F/R_E, times the divider before the input.

Source: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed., 2009, sections 8.4
and 8.5 (from memory).
"""

from __future__ import annotations

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.errors import NetworkError
from tauledger.hand.elements import COMMON_WORDS, CONTROL_WORDS, Resistor
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import StageRow
from tauledger.hand.feedback import FoundLoop
from tauledger.network.bands import Bands

# The feedback may leave from before a follower whose gain is within 5 % of 1.
SAME_NODE = 0.05
LONGEST_CHAIN = 4
# A divider this near to 1 is left out of the text; the value counts it.
NO_DIVIDER = 0.002
# Rounding of a Norton current that is 1 V over one resistor.
ROUNDING = 1e-9


class IdealGain(Struct, frozen=True):
    """A∞ as written on paper, and its value in the unit of the response."""

    text: str
    value: float


def ideal_gain(
    bands: Bands, devices: tuple[Device, ...], stages: tuple[StageRow, ...], loop: FoundLoop
) -> IdealGain | None:
    """Give A∞ by hand where one resistor brings the output back to the wire of the loop; None for any other form."""
    if not loop.node or not stages or bands.gain_setting:
        return None
    try:
        circuit = upper_circuit(bands, devices)
    except NetworkError:
        return None
    entry = circuit.at[loop.node]
    later = [circuit.at[node] for node in loop.path if node in circuit.at]
    back = [r for r in _at(circuit, entry) if r.other(entry) in later and r.other(entry) != entry]
    if len(back) != 1 or entry == GROUND:
        return None
    feedback = back[0]
    end, out = circuit.row[feedback.other(entry)], circuit.row.get(circuit.output_hand[0])
    if out is None or abs(complex(circuit.voltage[out] / circuit.voltage[end]) - 1.0) > SAME_NODE:
        return None
    if loop.word in CONTROL_WORDS:
        return _shunt(circuit, entry, feedback)
    if loop.word in COMMON_WORDS:
        return _series(circuit, entry, feedback, stages[0])
    return None


def _shunt(circuit: EquivalentCircuit, entry: str, feedback: Resistor) -> IdealGain | None:
    """Give −R_F/R_S, or −R_F where a current drives."""
    into = float(circuit.injected[circuit.row[entry]].real)
    if into:
        grounded = [r for r in _at(circuit, entry) if r.other(entry) == GROUND]
        source = next((r for r in grounded if abs(1.0 / r.ohm - abs(into)) <= ROUNDING * abs(into)), None)
        sign = "-" if into > 0.0 else ""
        text = f"{sign}{feedback.name}" + (f"/{source.name}" if source is not None else "")
        return IdealGain(text, -feedback.ohm * into)
    chain = _chain(circuit, entry, feedback)
    if chain is None:
        return None
    total = sum(resistor.ohm for resistor in chain)
    names = " + ".join(resistor.name for resistor in reversed(chain))
    below = f"({names})" if len(chain) > 1 else names
    return IdealGain(f"-{feedback.name}/{below}", -feedback.ohm / total)


def _chain(circuit: EquivalentCircuit, entry: str, feedback: Resistor) -> list[Resistor] | None:
    """Give the resistors in series from the entry to the driven source, nearest first; None where it branches."""
    node, before, chain = entry, feedback, list[Resistor]()
    while len(chain) < LONGEST_CHAIN:
        ways = [r for r in _at(circuit, node) if r is not before and r not in chain]
        if len(ways) != 1 or (node != entry and circuit.cells_at.get(node)):
            return None
        step = ways[0]
        far = step.other(node)
        chain.append(step)
        if far == GROUND:
            driven = circuit.injected[circuit.row[node]].real
            return chain if driven > 0.0 else None
        node, before = far, step
    return None


def _series(circuit: EquivalentCircuit, entry: str, feedback: Resistor, first: StageRow) -> IdealGain | None:
    """Give 1 + R_F/R_E times the divider before the first transistor."""
    grounded = [r for r in _at(circuit, entry) if r.other(entry) == GROUND]
    if len(grounded) != 1 or first.gain_hand is None:
        return None
    ratio = 1.0 + feedback.ohm / grounded[0].ohm
    divider = first.gain_hand
    told = f"1 + {feedback.name}/{grounded[0].name}"
    if abs(divider - 1.0) > NO_DIVIDER:
        told = f"{divider:.4g}·({told})"
    return IdealGain(told, divider * ratio)


def _at(circuit: EquivalentCircuit, node: str) -> list[Resistor]:
    return [circuit.resistors[k] for k in circuit.resistors_at.get(node, ())]
