"""Flattening: every instance of every subcircuit becomes elements, nodes and models with hierarchical names."""

from __future__ import annotations

from collections.abc import Iterator

from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND, Element, Instance, ReadingNote, fold
from tauledger.devices.family import Family
from tauledger.errors import Diagnostic, InputError, NetlistError
from tauledger.netlist.diagnostics import MOST_DIAGNOSTICS, Site, nearest, visible
from tauledger.netlist.draft import MOST_ELEMENTS, MOST_INSTANCES, MOST_NESTED_INSTANCES, Draft, Row, node_number
from tauledger.netlist.elements import (
    Fields,
    InstanceCard,
    device,
    fields,
    impossible,
    instance,
    multiplicity,
    passive,
    transconductance,
)
from tauledger.netlist.items import Setting, Word
from tauledger.netlist.letters import DEVICES, NOT_READ, PASSIVES, READ, SOURCES
from tauledger.netlist.models import ModelCard, model_name, read_model
from tauledger.netlist.netlist import Definition, Netlist
from tauledger.netlist.scopes import Binding, Scope, define, work_out_all
from tauledger.netlist.sources import source


class Surroundings(Struct, frozen=True):
    """The instance whose cards are being read.

    prefix: "X1." before its own names. ports: node numbers by folded formal name. m: product of m of all instances
    around. caller: the instance that holds it. lexical: where its definition stands, for the models and definitions
    that it can see. models: what has been read here already, by folded name.
    """

    definition: Definition
    scope: Scope
    prefix: str
    ports: dict[str, int]
    m: float
    path: int
    context: tuple[str, ...]
    caller: Surroundings | None
    lexical: Surroundings | None
    models: dict[str, ModelCard]


def flatten(netlist: Netlist, draft: Draft, around: Surroundings, faults: list[Diagnostic]) -> None:
    """Read the element cards of one instance, and of all instances in it, into the draft; faults are added up."""
    for number in around.definition.elements:
        site = Site(netlist.files, netlist.cards[number], around.context)
        try:
            _element(netlist, draft, around, faults, number, site)
        except NetlistError as error:
            faults.extend(error.diagnostics)
        if len(faults) > 10 * MOST_DIAGNOSTICS:
            return


def _element(
    netlist: Netlist, draft: Draft, around: Surroundings, faults: list[Diagnostic], number: int, site: Site
) -> None:
    letter = site.card.text[0].upper()
    if letter not in READ:
        raise _not_read(site, letter)
    if len(draft.taken) >= MOST_ELEMENTS:
        raise site.fault(0, f"the circuit has more than {MOST_ELEMENTS} elements")
    items = netlist.items[number]
    card = fields(site, items)
    name = _take_name(draft, around, card, site)
    scope = around.scope
    if letter == "X":
        _instance(netlist, draft, around, faults, number, site, card, name)
    elif letter in PASSIVES:
        part = passive(site, card, letter, scope)
        m = _product(around, part.m, name, site)
        value = _changed(draft, name, part.value)
        if problem := impossible(letter, value):
            raise InputError(f"{name}: {problem}")
        scaled = value * m if letter == "C" else value / m
        a, b = (_node(netlist, draft, around, node) for node in part.nodes)
        draft.rows.append(Row(letter, name, a, b, scaled, number, around.path))
    elif letter in SOURCES:
        given = source(site, items, letter, scope)
        m = _product(around, given.m, name, site) if letter == "I" else 1.0
        values = [("dc", m * _changed(draft, name, given.dc))]
        if given.ac_magnitude is not None:
            values += [("acmag", m * given.ac_magnitude), ("acphase", given.ac_phase)]
        _add(netlist, draft, around, number, letter, name, given.nodes, "", tuple(values))
    elif letter == "G":
        controlled = transconductance(site, card, scope)
        m = _product(around, controlled.m, name, site)
        gain = (("gain", m * _changed(draft, name, controlled.gain)),)
        _add(netlist, draft, around, number, letter, name, controlled.nodes, "", gain)
    else:
        _device(netlist, draft, around, number, site, card, name, DEVICES[letter])


def _not_read(site: Site, letter: str) -> NetlistError:
    word = site.card.text.split(maxsplit=1)[0]
    if letter in NOT_READ:
        message = f"{word}: {NOT_READ[letter]} ({letter}) are not supported by this version"
        return site.fault(0, message, f"read are: {', '.join(sorted(READ))}", wide=len(word))
    message = f"no element begins with {visible(word[0])!r}"
    return site.fault(0, message, "a comment begins with *, a continuation with +", wide=len(word))


def _take_name(draft: Draft, around: Surroundings, card: Fields, site: Site) -> str:
    name = around.prefix + card.name.text
    first = draft.taken.get(fold(name))
    if first is not None:
        raise site.fault(card.name, f"there is an element {card.name.text} already", f"it stands at {first}")
    draft.taken[fold(name)] = site.where
    return name


def _changed(draft: Draft, name: str, value: float) -> float:
    found = draft.changed_elements.pop(fold(name), None)
    return value if found is None else found[1]


def _product(around: Surroundings, own: float, name: str, site: Site) -> float:
    """Multiply an element's m with that of the instances around it."""
    if own != 1.0 and around.m != 1.0:
        says = (
            f"{name} counts m = {own:g} × {around.m:g}: its own and that of the instances around it; "
            "ngspice would take the outermost alone"
        )
        around.scope.notes.append(ReadingNote(site.where, says))
    return own * around.m


def _node(netlist: Netlist, draft: Draft, around: Surroundings, word: Word) -> int:
    key = fold(word.text)
    if key in (GROUND, "gnd"):
        return 0
    if key in netlist.globals:
        return node_number(draft, word.text)
    port = around.ports.get(key)
    return node_number(draft, around.prefix + word.text) if port is None else port


def _add(
    netlist: Netlist,
    draft: Draft,
    around: Surroundings,
    card: int,
    letter: str,
    name: str,
    nodes: tuple[Word, ...],
    model: str,
    parameters: tuple[tuple[str, float], ...],
) -> Element:
    numbers = tuple(_node(netlist, draft, around, node) for node in nodes)
    element = Element(letter, name, numbers, model, parameters, card, around.path)
    draft.elements.append(element)
    return element


def _device(
    netlist: Netlist,
    draft: Draft,
    around: Surroundings,
    number: int,
    site: Site,
    card: Fields,
    name: str,
    family: Family,
) -> None:
    seen = dict(reversed(list(_visible_models(netlist, around))))
    part = device(site, card, family, frozenset(seen), around.scope)
    found = _model(netlist, draft, seen[fold(part.model.text)], fold(part.model.text), family)
    m = _product(around, part.m, name, site)
    parameters = part.parameters if m == 1.0 else (*part.parameters, ("m", m))
    if fold(name) in draft.changed_elements:
        draft.fixed.add(fold(name))
    element = _add(netlist, draft, around, number, family.letter, name, part.nodes, found.model.name, parameters)
    refusal = family.refuse(element, found.model)
    if refusal is None:
        return
    where = found.places.get(fold(refusal.parameter))
    if where is not None:
        user = (f"used by {visible(name)} ({site.where})",)
        raise Site(netlist.files, netlist.cards[found.model.card], user).fault(where, refusal.reason, refusal.hint)
    setting = next((s for s in card.settings if fold(s.name.text) == fold(refusal.parameter)), None)
    raise site.fault(setting or card.name, refusal.reason, refusal.hint)


def _visible_models(netlist: Netlist, around: Surroundings) -> Iterator[tuple[str, tuple[Surroundings, int]]]:
    """Run through the models that can be seen, nearest first; of two in one place the first counts."""
    here: Surroundings | None = around
    while here is not None:
        for number in here.definition.models:
            yield model_name(netlist.items[number]), (here, number)
        here = here.lexical


def _model(netlist: Netlist, draft: Draft, found: tuple[Surroundings, int], key: str, family: Family) -> ModelCard:
    """Read a model where it stands, once for each instance that holds it, with the changes for it."""
    home, number = found
    known = home.models.get(key)
    if known is not None and known.model.type in family.model_types:
        return known
    site = Site(netlist.files, netlist.cards[number], home.context)
    name = netlist.items[number][1]
    assert isinstance(name, Word)
    flat = f"{home.prefix.removesuffix('.')}:{name.text}" if home.prefix else name.text
    card = read_model(site, netlist.items[number], family, home.scope, name=flat, card=number, path=home.path)
    values = dict(card.model.parameters)
    for owner, parameter in [key for key in draft.changed_models if key[0] == fold(flat)]:
        if parameter in family.model_parameters:
            values[parameter] = draft.changed_models.pop((owner, parameter))[2]
    card = replace(card, model=replace(card.model, parameters=tuple(values.items())))
    twins = [other for other in home.definition.models if model_name(netlist.items[other]) == key]
    for twin in twins[1:]:
        says = f"model {name.text} is defined twice; the first definition counts, as in ngspice"
        home.scope.notes.append(ReadingNote(Site(netlist.files, netlist.cards[twin]).where, says))
    home.models[key] = card
    draft.models[fold(flat)] = card.model
    return card


def _instance(
    netlist: Netlist,
    draft: Draft,
    around: Surroundings,
    faults: list[Diagnostic],
    number: int,
    site: Site,
    card: Fields,
    name: str,
) -> None:
    call = instance(site, card)
    definition, home = _definition(around, call.subcircuit, site)
    where = Site(netlist.files, netlist.cards[definition.card]).where
    if len(call.nodes) != len(definition.ports):
        ports = " ".join(port.text for port in definition.ports)
        message = f"subcircuit {definition.name} has {len(definition.ports)} nodes, not {len(call.nodes)}"
        raise site.fault(call.subcircuit, message, f"{where}: .subckt {definition.name} {ports}")
    _check_nesting(around, definition, call.subcircuit, site, where)
    if len(draft.instances) > MOST_INSTANCES:
        raise site.fault(0, f"the circuit has more than {MOST_INSTANCES} instances of subcircuits")
    path = len(draft.instances)
    draft.instances.append(Instance(name, definition.name, number, definition.card, around.path))
    context = (f"in {visible(name)} ({site.where}), subcircuit {visible(definition.name)} ({where})", *around.context)
    scope = _scope(netlist, around, definition, call, site, context)
    inner = Surroundings(
        definition=definition,
        scope=scope,
        prefix=f"{name}.",
        ports={
            fold(port.text): _node(netlist, draft, around, node)
            for port, node in zip(definition.ports, call.nodes, strict=True)
        },
        m=_instance_m(around, definition, call, site, netlist),
        path=path,
        context=context,
        caller=around,
        lexical=home,
        models={},
    )
    before = len(faults)
    work_out_all(scope, faults)
    if len(faults) == before:
        flatten(netlist, draft, inner, faults)


def _check_nesting(around: Surroundings, definition: Definition, item: Word, site: Site, where: str) -> None:
    if len(around.context) >= MOST_NESTED_INSTANCES:
        raise site.fault(0, f"subcircuits are nested more than {MOST_NESTED_INSTANCES} deep")
    here: Surroundings | None = around
    while here is not None:
        if here.definition is definition:
            raise site.fault(item, f"subcircuit {definition.name} contains itself", f"it begins at {where}")
        here = here.caller


def _definition(around: Surroundings, name: Word, site: Site) -> tuple[Definition, Surroundings]:
    """Find a subcircuit where the card stands, else in the definitions around it; give it with its home."""
    seen: list[str] = []
    here: Surroundings | None = around
    while here is not None:
        for definition in here.definition.definitions:
            if fold(definition.name) == fold(name.text):
                return definition, here
            seen.append(definition.name)
        here = here.lexical
    hint = nearest(name.text, seen, otherwise="define it with .subckt, or include the file that does")
    raise site.fault(name, f"no subcircuit is called {name.text!r}", hint)


def _own_names(netlist: Netlist, definition: Definition) -> dict[str, str]:
    """Give the parameters that a subcircuit defines, folded and as written."""
    settings = list(definition.defaults)
    for card in definition.parameters:
        settings += [item for item in netlist.items[card] if isinstance(item, Setting)]
    return {fold(setting.name.text): setting.name.text for setting in settings}


def _scope(
    netlist: Netlist,
    around: Surroundings,
    definition: Definition,
    call: InstanceCard,
    site: Site,
    context: tuple[str, ...],
) -> Scope:
    """Open the scope of an instance: what X gives wins over `.param` in the body, that over the default."""
    scope = around.scope.inner()
    header = Site(netlist.files, netlist.cards[definition.card], context)
    for setting in definition.defaults:
        define(scope, Binding(header, setting))
    for card in definition.parameters:
        local = Site(netlist.files, netlist.cards[card], context)
        for item in netlist.items[card]:
            if isinstance(item, Setting):
                define(scope, Binding(local, item))
    own = _own_names(netlist, definition)
    for setting in call.settings:
        name = fold(setting.name.text)
        if name in own:
            define(scope, Binding(site, setting, actual=True))
        elif name != "m":
            message = f"subcircuit {definition.name} has no parameter {setting.name.text}"
            otherwise = f"its parameters: {', '.join(sorted(own.values()))}" if own else "it has none"
            raise site.fault(setting.name, message, nearest(setting.name.text, own.values(), otherwise=otherwise))
    return scope


def _instance_m(
    around: Surroundings, definition: Definition, call: InstanceCard, site: Site, netlist: Netlist
) -> float:
    """Give the product of m for the body: m on X multiplies unless the subcircuit has a parameter of that name."""
    given = next((setting for setting in call.settings if fold(setting.name.text) == "m"), None)
    if given is None or "m" in _own_names(netlist, definition):
        return around.m
    own = multiplicity(site, given, around.scope)
    return _product(around, own, around.prefix + site.card.text.split(maxsplit=1)[0], site)
