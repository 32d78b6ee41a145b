"""Flattening: every instance of every subcircuit becomes elements, nodes and models with hierarchical names."""

from __future__ import annotations

from tauledger.circuit import Instance, ReadingNote, fold
from tauledger.errors import Diagnostic, InputError, NetlistError
from tauledger.netlist.assignments import ALL
from tauledger.netlist.bulk import add_run
from tauledger.netlist.conditions import counts
from tauledger.netlist.diagnostics import MOST_DIAGNOSTICS, Site, visible
from tauledger.netlist.draft import MOST_ELEMENTS, MOST_INSTANCES, Draft
from tauledger.netlist.elements import Fields, InstanceCard, fields, instance, multiplicity
from tauledger.netlist.instances import check_nesting, find_definition, open_scope, own_names
from tauledger.netlist.instantiate import add_element, product
from tauledger.netlist.items import Item, Setting
from tauledger.netlist.letters import NOT_READ, READ
from tauledger.netlist.netlist import Definition, Netlist
from tauledger.netlist.runs import Run
from tauledger.netlist.scopes import number_of, work_out_all
from tauledger.netlist.surroundings import Surroundings, existing_node, node_of


def flatten(netlist: Netlist, draft: Draft, around: Surroundings, faults: list[Diagnostic]) -> None:
    """Read the element cards of one instance, and of all instances in it, into the draft; faults are added up."""
    for number in around.definition.elements:
        entry, _ = netlist.cards.entry(number)
        try:
            if not counts(netlist, number, around.scope, around.context):
                continue
            if not isinstance(entry, Run):
                site = Site(netlist.files, entry, around.context)
                _card(netlist, draft, around, faults, number, site)
            elif not add_run(netlist, draft, around, number, entry):
                # Something in it is wrong or changed: line by line the message finds its place.
                _lines(netlist, draft, around, faults, number, entry)
        except NetlistError as error:
            faults.extend(error.diagnostics)
        if draft.full or len(faults) > 10 * MOST_DIAGNOSTICS:
            return
    for number in around.definition.nodesets:
        site = Site(netlist.files, netlist.cards[number], around.context)
        try:
            if counts(netlist, number, around.scope, around.context):
                _start_from(netlist, draft, around, netlist.items[number], site)
        except NetlistError as error:
            faults.extend(error.diagnostics)


def _lines(
    netlist: Netlist, draft: Draft, around: Surroundings, faults: list[Diagnostic], first: int, run: Run
) -> None:
    """Read the lines of a run one by one."""
    for number in range(first, first + run.count):
        site = Site(netlist.files, netlist.cards[number], around.context)
        try:
            _card(netlist, draft, around, faults, number, site)
        except NetlistError as error:
            faults.extend(error.diagnostics)
        if draft.full:
            return


def _start_from(netlist: Netlist, draft: Draft, around: Surroundings, items: tuple[Item, ...], site: Site) -> None:
    """Take the starting voltages of a `.nodeset` card; for a node that does not exist a note says so."""
    for item in items[1:]:
        assert isinstance(item, Setting)
        value = number_of(site, item.value, around.scope)
        if item.name.text == ALL:
            draft.nodesets |= {node: value for node in range(1, len(draft.nodes)) if node not in draft.nodesets}
            continue
        node = existing_node(netlist, draft, around, item.name)
        if node is None:
            says = f".nodeset: there is no node {visible(item.name.text)}, read past"
            around.scope.notes.append(ReadingNote(site.where, says))
        elif node:
            draft.nodesets[node] = value


def _card(
    netlist: Netlist, draft: Draft, around: Surroundings, faults: list[Diagnostic], number: int, site: Site
) -> None:
    letter = site.card.text[0].upper()
    if letter not in READ:
        raise _not_read(site, letter)
    if len(draft.taken) >= MOST_ELEMENTS:
        draft.full = True
        raise site.fault(0, f"the circuit has more than {MOST_ELEMENTS} elements")
    card = fields(site, netlist.items[number])
    name = _take_name(netlist, draft, around, card, number, site)
    if letter == "X":
        _instance(netlist, draft, around, faults, number, site, card, name)
    else:
        add_element(netlist, draft, around, number, site, card, name)


def _take_name(netlist: Netlist, draft: Draft, around: Surroundings, card: Fields, number: int, site: Site) -> str:
    name = around.prefix + card.name.text
    first = draft.taken.get(fold(name))
    if first is not None:
        where = Site(netlist.files, netlist.cards[first]).where
        raise site.fault(card.name, f"there is an element {card.name.text} already", f"it stands at {where}")
    draft.taken[fold(name)] = number
    return name


def _not_read(site: Site, letter: str) -> NetlistError:
    word = site.card.text.split(maxsplit=1)[0]
    if letter in NOT_READ:
        message = f"{word}: {NOT_READ[letter]} are not supported"
        return site.fault(0, message, f"read are: {', '.join(sorted(READ))}", wide=len(word))
    message = f"no element begins with {visible(word[0])!r}"
    return site.fault(0, message, "a comment begins with *, a continuation with +", wide=len(word))


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
    definition, home = find_definition(around, call.subcircuit, site)
    where = Site(netlist.files, netlist.cards[definition.card]).where
    if len(call.nodes) != len(definition.ports):
        ports = " ".join(port.text for port in definition.ports)
        message = f"subcircuit {definition.name} has {len(definition.ports)} nodes, not {len(call.nodes)}"
        raise site.fault(call.subcircuit, message, f"{where}: .subckt {definition.name} {ports}")
    check_nesting(around, definition, call.subcircuit, site, where)
    if len(draft.instances) > MOST_INSTANCES:
        draft.full = True
        raise site.fault(0, f"the circuit has more than {MOST_INSTANCES} instances of subcircuits")
    path = len(draft.instances)
    draft.instances.append(Instance(name, definition.name, number, definition.card, around.path))
    context = (f"in {visible(name)} ({site.where}), subcircuit {visible(definition.name)} ({where})", *around.context)
    draft.contexts.append(context)
    scope = open_scope(netlist, around, definition, call, site, context)
    for key in [key for key in draft.changed_given if key[0] == fold(name) and key[1] in scope.bindings]:
        scope.fixed[key[1]] = draft.changed_given.pop(key)[2]
    draft.scopes.append(scope)
    inner = Surroundings(
        definition=definition,
        scope=scope,
        prefix=f"{name}.",
        ports={
            fold(port.text): node_of(netlist, draft, around, node)
            for port, node in zip(definition.ports, call.nodes, strict=True)
        },
        m=_instance_m(draft, around, definition, call, site, netlist, name),
        path=path,
        context=context,
        caller=around,
        lexical=home,
        models={},
        seen=[],
    )
    draft.pins.extend((node, around.path, number) for node in inner.ports.values())
    before = len(faults)
    work_out_all(scope, faults)
    if len(faults) == before:
        flatten(netlist, draft, inner, faults)


def _instance_m(
    draft: Draft,
    around: Surroundings,
    definition: Definition,
    call: InstanceCard,
    site: Site,
    netlist: Netlist,
    name: str,
) -> float:
    """Give the product of m for the body: m on X multiplies unless the subcircuit has a parameter of that name."""
    if "m" in own_names(netlist, definition):
        return around.m
    product = _instance_product(draft, around, call, site, name)
    if product != 1.0 and definition.definitions:
        says = (
            f"{name} counts m = {product:g} on everything in it; ngspice loses it on what stands outside of the "
            f"subcircuits that {definition.name} defines inside itself, and stops where those have no parameters"
        )
        around.scope.notes.append(ReadingNote(site.where, says))
    return product


def _instance_product(draft: Draft, around: Surroundings, call: InstanceCard, site: Site, name: str) -> float:
    changed = draft.changed_given.pop((fold(name), "m"), None)
    given = next((setting for setting in call.settings if fold(setting.name.text) == "m"), None)
    if changed is not None and not changed[2] > 0.0:
        raise InputError(f"{name}: m must be greater than 0, not {changed[2]:.6g}")
    if changed is not None:
        own = changed[2]
    elif given is not None:
        own = multiplicity(site, given, around.scope)
    else:
        return around.m
    return product(around, own, around.prefix + site.card.text.split(maxsplit=1)[0], site)
