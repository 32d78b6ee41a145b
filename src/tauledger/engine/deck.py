"""Circuit → deck text for ngspice, by whitelist: every name is generated, every number is a finite float.

No character of the netlist reaches the engine. Nodes are n1, n2, …; an element is its letter and a running number; a
model is model1, model2, …. The table back to the user's names stays with the deck.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping

from msgspec import Struct

from tauledger.circuit import Apply, Circuit, Element, Model, Number, fold
from tauledger.devices.catalogue import FAMILIES, fitting
from tauledger.devices.family import GMIN, Family
from tauledger.devices.polynomial import as_formula
from tauledger.engine.formula import written
from tauledger.errors import EngineError

TITLE = "generated circuit"
# Measured: gm is right to 1e-12 from reltol = 1e-5 on, and wrong by 1.7e-3 at ngspice's default of 1e-3.
TIGHT = (("reltol", 1e-6), ("abstol", 1e-15), ("vntol", 1e-9))
OPTIONS = {"gmin": GMIN}
ACCEPTED = frozenset({*OPTIONS, "rshunt"})
WITH_BRANCH_CURRENT = ("V", "L", "E", "H")
CONTROLLED = ("E", "F", "G", "H", "B")
# Other names that the reader takes for the types of resistors, capacitors and inductors.
SHORT_TYPES = {"res": "r", "cap": "c", "ind": "l"}


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
    names = [*zip(passives.kind, passives.name, strict=True), *((_letter(e), e.name) for e in circuit.elements)]
    generated = [f"{letter.lower()}{k}" for k, (letter, _) in enumerate(names, start=1)]
    elements = {fold(name): made for (_, name), made in zip(names, generated, strict=True)}
    models = {fold(model.name): f"model{k}" for k, model in enumerate(circuit.models, start=1)}

    cards = [TITLE, _options(circuit, tight)]
    for k, name in enumerate(generated[: len(passives)]):
        a, b, value = nodes[passives.a[k]], nodes[passives.b[k]], float(passives.value[k])
        if passives.kind[k] == "R" and value == 0.0:
            raise EngineError(f"{passives.name[k]} has no resistance: ngspice would put its own value there")
        cards.append(f"{name} {a} {b} {_number(value, passives.name[k])}")
    amplitudes = {fold(drive.source): drive.amplitude for drive in circuit.drive}
    words = _Words({fold(model.name): model for model in circuit.models}, nodes, elements, models, amplitudes, {})
    for name, element in zip(generated[len(passives) :], circuit.elements, strict=True):
        cards.append(" ".join((name, *_behind_name(element, words))))
    cards += [_model(models[fold(model.name)], model) for model in circuit.models]
    if circuit.nodesets:
        starts = (f"v({nodes[node]})={_number(volt, circuit.nodes[node])}" for node, volt in circuit.nodesets)
        cards.append(" ".join((".nodeset", *starts)))
    cards.append(".end")
    return Deck(
        text="\n".join(cards) + "\n",
        nodes=nodes,
        elements=elements,
        says={
            **dict(zip(nodes[1:], circuit.nodes[1:], strict=True)),
            **{made: name for (_, name), made in zip(names, generated, strict=True)},
            **{models[fold(model.name)]: model.name for model in circuit.models},
        },
    )


class _Words(Struct, frozen=True):
    """What the cards of a deck are made of: generated names of nodes, elements and models, and the AC amplitudes.

    cards, models: model card and generated name by the model's folded name. families: those found so far, by letter and
    model.
    """

    cards: Mapping[str, Model]
    nodes: tuple[str, ...]
    elements: Mapping[str, str]
    models: Mapping[str, str]
    amplitudes: Mapping[str, complex]
    families: dict[tuple[str, str], tuple[tuple[Family, ...], frozenset[str]]]

    def families_of(self, element: Element, model: Model | None) -> tuple[tuple[Family, ...], frozenset[str]]:
        """Give the families that fit to an element and the instance parameters that they know."""
        key = (element.letter, element.model)
        if key not in self.families:
            found = fitting(element, model)
            known = frozenset[str]().union(*(family.instance_parameters for family in found))
            self.families[key] = (found, known)
        return self.families[key]


def has_branch_current(element: Element) -> bool:
    """Say whether the engine gives a current through this element."""
    if element.letter == "L" and element.formula is not None:
        return False
    return element.letter in WITH_BRANCH_CURRENT or (_letter(element) == "B" and element.quantity == "v")


def _letter(element: Element) -> str:
    """Give the letter that an element has in the deck: a polynomial or a formula is a behavioural source."""
    if element.letter in CONTROLLED and (element.polynomial or element.formula is not None):
        return "B"
    return element.letter


def _options(circuit: Circuit, tight: bool) -> str:
    asked = dict(circuit.options)
    if unknown := sorted(asked.keys() - ACCEPTED):
        raise EngineError(f"option {unknown[0]} has no place in the engine's deck")
    options = [*(TIGHT if tight else ()), *({**OPTIONS, **asked}).items()]
    options += [("temp", circuit.temperature_c), ("tnom", circuit.tnom_c)]
    return " ".join([".options", *(f"{name}={_number(value, name)}" for name, value in options)])


def _behind_name(element: Element, words: _Words) -> Iterable[str]:
    """Give what follows the name on an element's card: nodes, value or model, parameters."""
    model = words.cards.get(fold(element.model)) if element.model else None
    families, known = words.families_of(element, model)
    if not families:
        raise EngineError(f"{element.name} is of no family that the engine is given (model: {element.model or None})")
    parameters = families[0].as_written(element, model)
    if unknown := sorted({name for name, _ in parameters} - known):
        raise EngineError(f"{element.name}: parameter {unknown[0]} has no place in the engine's deck")
    given = {name: _number(value, element.name) for name, value in parameters}
    references = [words.elements[fold(name)] for name in element.references]
    if _letter(element) == "B":
        yield from (words.nodes[node] for node in element.nodes[:2])
        yield _behaviour(element, words)
        given = {name: value for name, value in given.items() if element.letter == "B" or name not in ("gain", "m")}
    elif element.letter == "K":
        yield from (*references, given.pop("coupling"))
    elif element.formula is not None:
        yield from (words.nodes[node] for node in element.nodes)
        yield f"{_quantity(element)} = {written(element.formula, words.nodes, words.elements)}"
    else:
        yield from (words.nodes[node] for node in element.nodes)
        yield from references
        if element.letter in ("V", "I"):
            yield from _independent(element, given, words.amplitudes)
            given = {name: value for name, value in given.items() if name == "m"}
        own = [given.pop(name) for name in ("value", "gain") if name in given]
        of_model = [words.models[fold(element.model)]] if element.model else []
        # ngspice takes the model of a capacitor or inductor before the value, that of a resistor behind it.
        yield from (*own, *of_model) if element.letter == "R" else (*of_model, *own)
    for name, value in given.items():
        yield name if name in ("on", "off", "thermal") else f"{name}={value}"


def _independent(element: Element, given: Mapping[str, str], amplitudes: Mapping[str, complex]) -> Iterable[str]:
    yield f"dc {given.get('dc', '0.0')}"
    amplitude = complex(amplitudes.get(fold(element.name), 0.0))
    if amplitude:
        yield f"ac {_amplitude(amplitude, element.name)}"


def _behaviour(element: Element, words: _Words) -> str:
    """Write what a behavioural source gives: of a controlled source times its m, which B does not know."""
    formula = as_formula(element) if element.polynomial else element.formula
    assert formula is not None
    quantity = element.quantity or {"E": "v", "H": "v"}.get(element.letter, "i")
    if quantity not in ("v", "i"):
        raise EngineError(f"{element.name} gives {quantity!r}, which has no place in the engine's deck")
    m = element.parameter("m", 1.0) if element.letter in "FG" else 1.0
    if m != 1.0:
        formula = Apply("*", (Number(m), formula))
    return f"{quantity} = {written(formula, words.nodes, words.elements)}"


def _quantity(element: Element) -> str:
    if element.quantity not in {"R": "r", "C": "cq", "L": "l"}.get(element.letter, ""):
        raise EngineError(f"{element.name} gives {element.quantity!r}, which has no place in the engine's deck")
    return element.quantity


def _amplitude(amplitude: complex, name: str) -> str:
    """Write magnitude and phase; a real amplitude keeps its sign in the magnitude and is exact."""
    if amplitude.imag == 0.0:
        return f"{_number(amplitude.real, name)} 0.0"
    phase_deg = math.degrees(math.atan2(amplitude.imag, amplitude.real))
    return f"{_number(abs(amplitude), name)} {_number(phase_deg, name)}"


def _model(name: str, model: Model) -> str:
    families = [family for family in FAMILIES if model.type in family.model_types and model.level in family.levels]
    if not families:
        raise EngineError(f"model {model.name} is of no type or level that the engine is given")
    known = frozenset[str]().union(*(family.model_parameters for family in families))
    flags = frozenset[str]().union(*(family.flags for family in families))
    if unknown := sorted({parameter for parameter, _ in model.parameters} - known - flags):
        raise EngineError(f"model {model.name}: parameter {unknown[0]} has no place in the engine's deck")
    values = [] if model.level == 1 else [f"level={model.level}"]
    for parameter, value in model.parameters:
        if parameter in flags:
            values += [parameter] if value else []
        elif parameter != "level":
            values.append(f"{parameter}={_number(value, model.name)}")
    return f".model {name} {SHORT_TYPES.get(model.type, model.type)}({' '.join(values)})"


def _number(value: float, owner: str) -> str:
    value = float(value)
    if not math.isfinite(value):
        raise EngineError(f"a value of {owner} is not a finite number")
    return repr(value)
