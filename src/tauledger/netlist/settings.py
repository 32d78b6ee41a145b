"""NAME=VALUE as a user writes it → the Change: a parameter, an element, or what a model or a card gives."""

from __future__ import annotations

import math
from collections.abc import Sequence

from tauledger.circuit import Change, Circuit, fold
from tauledger.errors import InputError
from tauledger.netlist.diagnostics import nearest, visible
from tauledger.netlist.elaborate import elaborated
from tauledger.netlist.instantiate import settable
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope
from tauledger.netlist.writer import element_names

# Not a card of the netlist, yet what a user would set: the temperature of the analysis in °C.
TEMPERATURE = "temp"


def change_of(netlist: Netlist, settings: Sequence[str]) -> Change:
    """Give the change that "load=2k", "R3=4.7k", "X1.R1=10", "nsmall.bf=100" or "temp=85" ask for.

    Values are written as in a netlist.
    Raises InputError where one is not NAME=VALUE, where nothing is called so (with the nearest name), and where a name
    is set twice or means two things.
    """
    understood = elaborated(netlist, purpose="reading")
    circuit = understood.circuit
    elements = {fold(name): name for name in circuit.passives.name}
    elements |= {fold(element.name): element.name for element in circuit.elements}
    elements |= {fold(card): elements[flat] for flat, card in element_names(circuit).items()}
    parameters = {key: binding.setting.name.text for key, binding in understood.scopes[0].bindings.items()}
    models = {fold(model.name): model.name for model in circuit.models}
    given = _given(circuit, understood.scopes, elements)
    found: dict[tuple[str, ...], float] = {}
    for setting in settings:
        name, value = _parted(setting)
        key = fold(name)
        model, _, parameter = key.rpartition(".")
        meanings: list[tuple[str, ...]] = []
        if key in parameters:
            meanings.append(("parameter", parameters[key]))
        if key in elements:
            meanings.append(("element", elements[key]))
        if model in models:
            meanings.append(("model", models[model], parameter))
        if key in given:
            meanings.append(("value of a card", *given[key]))
        if not meanings and key == TEMPERATURE:
            meanings.append((TEMPERATURE,))
        if not meanings:
            known = [*parameters.values(), *elements.values(), *(f"{name}.{parameter}" for name in models.values())]
            known += [f"{of}.{word}" for of, word in given.values()]
            raise InputError(
                f"--set {visible(setting)}: nothing is called {visible(name)!r}",
                nearest(name, known, otherwise="give a .param, an element, model.parameter, or X1.parameter"),
            )
        if len(meanings) > 1:
            words = " and ".join(f"a{'n' if kind == 'element' else ''} {kind}" for kind, *_ in meanings)
            raise InputError(
                f"--set {visible(setting)}: {visible(name)} is {words} of the netlist", "rename one of them"
            )
        if meanings[0] in found:
            raise InputError(f"--set {visible(setting)}: {visible(name)} is set twice")
        found[meanings[0]] = value
    return Change(
        temperature_c=found.get((TEMPERATURE,)),
        parameters=tuple((name[1], value) for name, value in found.items() if name[0] == "parameter"),
        elements=tuple((name[1], value) for name, value in found.items() if name[0] == "element"),
        models=tuple((name[1], name[2], value) for name, value in found.items() if name[0] == "model"),
        given=tuple((name[1], name[2], value) for name, value in found.items() if name[0] == "value of a card"),
    )


def _given(circuit: Circuit, scopes: Sequence[Scope], elements: dict[str, str]) -> dict[str, tuple[str, str]]:
    """List what stands on cards of instances and devices, by folded name: "x1.gain", "q1.area", each with its owner."""
    found: dict[str, tuple[str, str]] = {}
    for instance, scope in list(zip(circuit.instances, scopes, strict=True))[1:]:
        words = {"m": "m", **{key: binding.setting.name.text for key, binding in scope.bindings.items()}}
        found |= {f"{fold(instance.name)}.{key}": (instance.name, word) for key, word in words.items()}
    letters = dict(zip(map(fold, circuit.passives.name), circuit.passives.kind, strict=True))
    letters |= {fold(element.name): element.letter for element in circuit.elements}
    words_of = {letter: settable(letter) for letter in set(letters.values())}
    for key, flat in elements.items():
        found |= {f"{key}.{word}": (flat, word) for word in words_of[letters[fold(flat)]]}
    return found


def _parted(setting: str) -> tuple[str, float]:
    name, equals, text = setting.partition("=")
    number = read_number(text.strip())
    if not name.strip() or not equals or number is None or number.tail or not math.isfinite(number.value):
        raise InputError(f"--set {visible(setting)}: not NAME=VALUE", "write the value as in a netlist: --set R3=4.7k")
    return name.strip(), number.value
