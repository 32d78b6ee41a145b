"""Resistors, capacitors and inductors: one part each, the value as the netlist room worked it out."""

from __future__ import annotations

from tauledger.circuit import Circuit, Element
from tauledger.devices.family import Device, Family, names, never_refused, observe_nothing
from tauledger.devices.parts import Part, capacitance, inductance, resistance
from tauledger.solution import Bias

TERMINALS = ("plus", "minus")
WORDS = {"R": "resistor", "C": "capacitor", "L": "inductor"}


def passive_part(letter: str, owner: str, a: str, b: str, value: float) -> Part:
    """Give the part of one R, C or L between nodes a and b; value in ohm, farad or henry, multiplicity included."""
    match letter:
        case "R":
            return resistance(owner, a, b, value)
        case "C":
            return capacitance(owner, a, b, value)
        case "L":
            return inductance(owner, a, b, value)
    raise ValueError(f"not a passive: {letter}")


def _linearise(circuit: Circuit, element: Element, _bias: Bias) -> Device:
    a, b = (circuit.nodes[node] for node in element.nodes)
    part = passive_part(element.letter, element.name, a, b, dict(element.parameters)["value"])
    return Device(element.name, WORDS[element.letter], "", (), (), None, (part,))


RESISTOR = Family(
    letter="R",
    words=WORDS["R"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=names("r resistance m scale tc tc1 tc2 temp dtemp noisy"),
)
CAPACITOR = Family(
    letter="C",
    words=WORDS["C"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=names("c capacitance m scale tc tc1 tc2 temp dtemp ic"),
)
INDUCTOR = Family(
    letter="L",
    words=WORDS["L"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=names("l inductance m scale tc tc1 tc2 temp dtemp ic"),
)
