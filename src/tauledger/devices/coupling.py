"""The coupling of two inductors: a mutual inductance M = k·√(L1·L2), as the engine has worked it out."""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, fold
from tauledger.devices.family import Device, Family, never_refused, readings_of
from tauledger.devices.parts import mutual_inductance
from tauledger.solution import Bias, Observation

WORDS = "coupling of two inductors"


def _observe(element: Element) -> Observation | None:
    # ngspice calls the mutual inductance in henry k, like the coupling on the card.
    return Observation(element.name, ("k",))


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    first, second = element.references
    ends = (*_ends(circuit, first), *_ends(circuit, second))
    part = mutual_inductance(element.name, first, second, ends, readings_of(bias, element)["k"])
    return Device(element.name, WORDS, "", (), (), None, (part,))


def _ends(circuit: Circuit, inductor: str) -> tuple[str, str]:
    """Give the names of the nodes of an inductor, a column or an element."""
    key, passives = fold(inductor), circuit.passives
    for k, name in enumerate(passives.name):
        if fold(name) == key:
            return circuit.nodes[passives.a[k]], circuit.nodes[passives.b[k]]
    for element in circuit.elements:
        if fold(element.name) == key:
            return circuit.nodes[element.nodes[0]], circuit.nodes[element.nodes[1]]
    raise KeyError(inductor)


COUPLING = Family(
    letter="K",
    words=WORDS,
    terminals=(),
    linearise=_linearise,
    observe=_observe,
    refuse=never_refused,
    instance_parameters=frozenset({"coupling"}),
)
