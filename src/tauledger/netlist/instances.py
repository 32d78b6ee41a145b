"""What an X card calls: which subcircuit its name means there, and the scope of the new instance."""

from __future__ import annotations

from tauledger.circuit import ReadingNote, fold
from tauledger.netlist.conditions import define_all
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.draft import MOST_NESTED_INSTANCES
from tauledger.netlist.elements import InstanceCard
from tauledger.netlist.items import Setting, Word
from tauledger.netlist.netlist import Definition, Netlist
from tauledger.netlist.scopes import Binding, Scope, define
from tauledger.netlist.surroundings import Surroundings


def check_nesting(around: Surroundings, definition: Definition, item: Word, site: Site, where: str) -> None:
    """Raise NetlistError where instances stand too deep in one another, or a subcircuit in itself."""
    if len(around.context) >= MOST_NESTED_INSTANCES:
        raise site.fault(0, f"subcircuits are nested more than {MOST_NESTED_INSTANCES} deep")
    here: Surroundings | None = around
    while here is not None:
        if here.definition is definition:
            raise site.fault(item, f"subcircuit {definition.name} contains itself", f"it begins at {where}")
        here = here.caller


def find_definition(around: Surroundings, name: Word, site: Site) -> tuple[Definition, Surroundings]:
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


def own_names(netlist: Netlist, definition: Definition) -> dict[str, str]:
    """Give the parameters that a subcircuit defines, folded and as written."""
    settings = list(definition.defaults)
    for card in definition.parameters:
        settings += [item for item in netlist.items[card] if isinstance(item, Setting)]
    return {fold(setting.name.text): setting.name.text for setting in settings}


def open_scope(
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
    own = own_names(netlist, definition)
    for setting in call.settings:
        name = fold(setting.name.text)
        if name in own:
            define(scope, Binding(site, setting, actual=True))
        elif name != "m" and definition.defaults:
            says = f"subcircuit {definition.name} has no parameter {setting.name.text}: read past, as ngspice does"
            near = nearest(setting.name.text, own.values())
            scope.notes.append(ReadingNote(site.where, f"{says}; {near}" if near else says))
        elif name != "m":
            message = f"subcircuit {definition.name} has no parameter {setting.name.text}"
            otherwise = f"its parameters: {', '.join(sorted(own.values()))}" if own else "it has none"
            raise site.fault(setting.name, message, nearest(setting.name.text, own.values(), otherwise=otherwise))
    define_all(netlist, definition, scope, context)
    return scope
