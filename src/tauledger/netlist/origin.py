"""Where an element, model or parameter stands, and how its value came about, as text."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from msgspec import Struct

from tauledger.circuit import ADDED, Element, Model, fold
from tauledger.errors import InputError
from tauledger.netlist.diagnostics import nearest, visible
from tauledger.netlist.elaborate import Elaborated, instance_context
from tauledger.netlist.formulas import Behaviour, Formula, names
from tauledger.netlist.items import Item, Setting, Value, Word, flattened, width
from tauledger.netlist.netlist import Netlist, place
from tauledger.netlist.scopes import Binding, Scope, find
from tauledger.netlist.writer import element_names

_UNIT = {"R": "ohm", "C": "F", "L": "H"}


class _Step(Struct, frozen=True):
    """One parameter on the way to a value: as whom it was asked for, its definition, its scope, how deep it lies."""

    name: str
    binding: Binding
    scope: Scope
    depth: int


def origin(netlist: Netlist, elaborated: Elaborated, name: str) -> str:
    """Say where the element, model or parameter of a flat name stands and how its value came about.

    A parameter of an instance is X1.name. Raises InputError with the nearest name where nothing is called so.
    """
    circuit = elaborated.circuit
    key = fold(name.strip())
    written = {fold(card): flat for flat, card in element_names(circuit).items()}
    flat = written.get(key, key)
    found: list[str] = []
    for k, passive in enumerate(circuit.passives.name):
        if fold(passive) == flat:
            value = f"value {float(circuit.passives.value[k]):.6g} {_UNIT[circuit.passives.kind[k]]}"
            card, path = int(circuit.passives.card[k]), int(circuit.passives.path[k])
            found += _of_card(netlist, elaborated, passive, card, path, [value])
    for element in circuit.elements:
        if fold(element.name) == flat:
            found += _of_card(netlist, elaborated, element.name, element.card, element.path, _of_element(element))
    for model in circuit.models:
        if fold(model.name) == key:
            head = f"model {model.name}"
            found += _of_card(netlist, elaborated, head, model.card, model.path, _of_model(model))
    found += _of_parameter(netlist, elaborated, key)
    if not found:
        known = [*circuit.passives.name, *(e.name for e in circuit.elements), *(m.name for m in circuit.models)]
        known += _parameters(elaborated)
        raise InputError(f"no element, model or parameter is called {visible(name)!r}", nearest(name, known))
    return "\n".join(found) + "\n"


def _of_element(element: Element) -> list[str]:
    told = [f"{name}={value:.6g}" for name, value in element.parameters]
    lines = [", ".join(told)] if told else []
    return ([f"model {element.model}"] if element.model else []) + lines


def _of_model(model: Model) -> list[str]:
    level = f", level {model.level}" if model.level != 1 else ""
    told = ", ".join(f"{name}={value:.6g}" for name, value in model.parameters)
    return [f"type {model.type}{level}", *([told] if told else [])]


def _of_card(netlist: Netlist, elaborated: Elaborated, head: str, card: int, path: int, facts: list[str]) -> list[str]:
    if card == ADDED:
        return [f"{visible(head)}: added from outside of the netlist", *(f"  {fact}" for fact in facts)]
    at = place(netlist, card)
    lines = [f"{visible(head)}  {visible(at.file)}:{at.line}", f"  {visible(netlist.cards[card].text)}"]
    lines += [f"  {where}" for where in instance_context(netlist, elaborated.circuit, path)]
    lines += [f"  {visible(fact)}" for fact in facts]
    scope = elaborated.scopes[path]
    return lines + [_told(step) for step in _steps(_mentioned(netlist.items[card]), scope, scope, 0, [])]


def _of_parameter(netlist: Netlist, elaborated: Elaborated, key: str) -> list[str]:
    """Tell of a parameter: of the netlist by its name, of an instance as X1.name."""
    head, _, last = key.rpartition(".")
    for path, instance in enumerate(elaborated.circuit.instances):
        scope = elaborated.scopes[path]
        if fold(instance.name) != head or last not in scope.bindings:
            continue
        steps = list(_steps([last], scope, scope, 0, []))
        first = f"parameter {steps[0].binding.setting.name.text}"
        inside = [f"  {where}" for where in instance_context(netlist, elaborated.circuit, path)]
        return [first, *inside, *map(_told, steps)]
    return []


def _parameters(elaborated: Elaborated) -> Iterator[str]:
    for instance, scope in zip(elaborated.circuit.instances, elaborated.scopes, strict=True):
        for binding in scope.bindings.values():
            yield f"{instance.name}.{binding.setting.name.text}" if instance.name else binding.setting.name.text


def _mentioned(items: Iterable[Item]) -> Iterator[str]:
    """Run through the folded names that a card's values mention, each as it comes."""
    for item in flattened(items):
        value = item.value if isinstance(item, Setting) else item
        yield from _in_value(value)


def _in_value(value: Value) -> Iterator[str]:
    if isinstance(value, Formula | Behaviour):
        yield from map(fold, names(value.tree))
    elif isinstance(value, Word):
        yield fold(value.text)


def _steps(
    wanted: Iterable[str], scope: Scope, start: Scope, depth: int, seen: list[tuple[int, str]]
) -> Iterator[_Step]:
    """Follow names to their definitions, depth first, each definition once."""
    for name in wanted:
        here: Scope | None = start
        while here is not None and name not in here.bindings:
            here = here.outer
        if here is None or (id(here), name) in seen:
            continue
        seen.append((id(here), name))
        binding = here.bindings[name]
        yield _Step(name, binding, here, depth)
        if name in here.fixed:
            continue
        for inner in dict.fromkeys(_in_value(binding.setting.value)):
            # A definition that names itself means what is defined outside.
            begin = here.outer if inner == name and here.outer is not None else here
            yield from _steps([inner], scope, begin, depth + 1, seen)


def _told(step: _Step) -> str:
    value = find(step.scope, step.name)
    setting, card = step.binding.setting, step.binding.site.card
    text = card.text[setting.name.at : setting.value.at + width(setting.value)]
    how = "set from outside of the netlist" if step.name in step.scope.fixed else f"{text}  {step.binding.site.where}"
    number = "no number" if value is None else f"{value:.9g}"
    return f"  {'  ' * step.depth}{visible(setting.name.text)} = {number}  {visible(how)}"
