"""Independent sources: an AC short or an AC open, driven where the circuit's drive says so."""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, fold
from tauledger.devices.family import Device, Family, never_refused, observe_nothing
from tauledger.devices.parts import current_source, voltage_source
from tauledger.solution import Bias

WORDS = {"V": "voltage source", "I": "current source"}


def _linearise(circuit: Circuit, element: Element, _bias: Bias) -> Device:
    a, b = (circuit.nodes[node] for node in element.nodes)
    amplitude = sum(drive.amplitude for drive in circuit.drive if fold(drive.source) == fold(element.name))
    multiplicity = element.parameter("m", 1.0)
    part = (
        voltage_source(element.name, a, b, amplitude)
        if element.letter == "V"
        else current_source(element.name, a, b, multiplicity * amplitude)
    )
    return Device(element.name, WORDS[element.letter], "", (), (), None, (part,))


VOLTAGE_SOURCE = Family(
    letter="V",
    words=WORDS["V"],
    terminals=("plus", "minus"),
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=frozenset({"dc", "acmag", "acphase"}),
)
CURRENT_SOURCE = Family(
    letter="I",
    words=WORDS["I"],
    terminals=("plus", "minus"),
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=frozenset({"dc", "acmag", "acphase", "m"}),
)
