"""Circuit → deck text for ngspice, by whitelist: every name is generated, every number is a finite float.

No character of the netlist reaches the engine. Nodes are n1, n2, …; an element is its letter and a running number; a
model is model1, model2, …. The table back to the user's names stays with the deck.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping

from msgspec import Struct

from tauledger.circuit import Circuit, Element, Model, fold
from tauledger.devices.catalogue import FAMILIES, family_of
from tauledger.errors import EngineError

TITLE = "generated circuit"
# Measured: gm is right to 1e-12 from reltol = 1e-5 on, and wrong by 1.7e-3 at ngspice's default of 1e-3.
TIGHT = (("reltol", 1e-6), ("abstol", 1e-15), ("vntol", 1e-9))
OPTIONS = {"gmin": 1e-12}
WITH_BRANCH_CURRENT = ("V", "L")


class Deck(Struct, frozen=True):
    """A deck and its names.

    text: the deck, one card a line. nodes: generated name per node of the circuit; "0" is ground. elements: generated
    name by the element's folded name. says: the user's name by generated name.
    """

    text: str
    nodes: tuple[str, ...]
    elements: Mapping[str, str]
    says: Mapping[str, str]


def write_deck(circuit: Circuit, *, tight: bool = True) -> Deck:
    """Write the deck of a circuit; `tight` tolerances, else ngspice's own.

    Raises EngineError where the circuit holds something that must not reach the engine: a value that is not finite, a
    resistor of 0 Ω, a parameter or an element that no device family knows.
    """
    nodes = ("0", *(f"n{k}" for k in range(1, len(circuit.nodes))))
    passives = circuit.passives
    names = [*zip(passives.kind, passives.name, strict=True), *((e.letter, e.name) for e in circuit.elements)]
    generated = [f"{letter.lower()}{k}" for k, (letter, _) in enumerate(names, start=1)]
    models = {fold(model.name): f"model{k}" for k, model in enumerate(circuit.models, start=1)}

    cards = [TITLE, _options(circuit, tight)]
    for k, name in enumerate(generated[: len(passives)]):
        a, b, value = nodes[passives.a[k]], nodes[passives.b[k]], float(passives.value[k])
        if passives.kind[k] == "R" and value == 0.0:
            raise EngineError(f"{passives.name[k]} has no resistance: ngspice would put its own value there")
        cards.append(f"{name} {a} {b} {_number(value, passives.name[k])}")
    amplitudes = {fold(drive.source): drive.amplitude for drive in circuit.drive}
    for name, element in zip(generated[len(passives) :], circuit.elements, strict=True):
        cards.append(" ".join((name, *(nodes[node] for node in element.nodes), *_values(element, models, amplitudes))))
    cards += [_model(models[fold(model.name)], model) for model in circuit.models]
    cards.append(".end")
    return Deck(
        text="\n".join(cards) + "\n",
        nodes=nodes,
        elements={fold(name): made for (_, name), made in zip(names, generated, strict=True)},
        says={
            **dict(zip(nodes[1:], circuit.nodes[1:], strict=True)),
            **{made: name for (_, name), made in zip(names, generated, strict=True)},
            **{models[fold(model.name)]: model.name for model in circuit.models},
        },
    )


def _options(circuit: Circuit, tight: bool) -> str:
    asked = dict(circuit.options)
    if unknown := sorted(asked.keys() - OPTIONS.keys()):
        raise EngineError(f"option {unknown[0]} has no place in the engine's deck")
    options = [*(TIGHT if tight else ()), *({**OPTIONS, **asked}).items()]
    options += [("temp", circuit.temperature_c), ("tnom", circuit.tnom_c)]
    return " ".join([".options", *(f"{name}={_number(value, name)}" for name, value in options)])


def _values(element: Element, models: Mapping[str, str], amplitudes: Mapping[str, complex]) -> Iterable[str]:
    """Give what follows the nodes on an element's card."""
    family = family_of(element.letter)
    if family is None:
        raise EngineError(f"{element.name} is of no family that the engine is given")
    if unknown := sorted({name for name, _ in element.parameters} - family.instance_parameters):
        raise EngineError(f"{element.name}: parameter {unknown[0]} has no place in the engine's deck")
    given = {name: _number(value, element.name) for name, value in element.parameters}
    if element.letter in ("V", "I"):
        yield f"dc {given.get('dc', '0.0')}"
        amplitude = complex(amplitudes.get(fold(element.name), 0.0))
        if amplitude:
            yield f"ac {_amplitude(amplitude, element.name)}"
        given = {name: value for name, value in given.items() if name == "m"}
    elif element.letter == "G":
        yield given.pop("gain", "0.0")
    else:
        yield models[fold(element.model)]
    for name, value in given.items():
        yield "off" if name == "off" else f"{name}={value}"


def _amplitude(amplitude: complex, name: str) -> str:
    """Write magnitude and phase; a real amplitude keeps its sign in the magnitude and is exact."""
    if amplitude.imag == 0.0:
        return f"{_number(amplitude.real, name)} 0.0"
    phase_deg = math.degrees(math.atan2(amplitude.imag, amplitude.real))
    return f"{_number(abs(amplitude), name)} {_number(phase_deg, name)}"


def _model(name: str, model: Model) -> str:
    family = next((family for family in FAMILIES if model.type in family.model_types), None)
    if family is None or model.level not in family.levels:
        raise EngineError(f"model {model.name} is of no type or level that the engine is given")
    if unknown := sorted({parameter for parameter, _ in model.parameters} - family.model_parameters):
        raise EngineError(f"model {model.name}: parameter {unknown[0]} has no place in the engine's deck")
    values = " ".join(
        f"{parameter}={_number(value, model.name)}" for parameter, value in model.parameters if parameter != "level"
    )
    return f".model {name} {model.type}(level={model.level} {values})"


def _number(value: float, owner: str) -> str:
    value = float(value)
    if not math.isfinite(value):
        raise EngineError(f"a value of {owner} is not a finite number")
    return repr(value)
