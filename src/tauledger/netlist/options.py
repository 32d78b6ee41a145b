"""`.options`: which words change the result, which are read past, and which are refused."""

from __future__ import annotations

from tauledger.circuit import fold
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.items import Group, Item, Setting, Value, Word
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, number_of

# What they give to a transistor of these levels whose card does not; others have defaults of their own (measured).
GEOMETRY = {"defl": "l", "defw": "w", "defad": "ad"}
GEOMETRY_LEVELS = frozenset({1, 2, 3, 6, 9})
EFFECTIVE = frozenset({"temp", "tnom", "gmin", "scale", "rshunt", "cshunt", *GEOMETRY})
# Measured: the reading of AS stays 0 with it.
WITHOUT_EFFECT = {"defas": "ngspice takes it for nothing: no transistor has the area of its source from it"}

REFUSED = {
    "rseries": "it puts a resistor in series with every inductor",
    "badmos3": "it takes other equations",
}


def option_settings(site: Site, items: tuple[Item, ...]) -> tuple[Setting, ...]:
    """Give the options of a card; a lone word is a flag (its value is the word).

    Raises NetlistError for an option that would change the result and is not supported, and where ngspice would not
    take the value of one that is (it reads name=value only).
    """
    settings: list[Setting] = []
    for item in items[1:]:
        if isinstance(item, Setting):
            settings.append(item)
        elif isinstance(item, Word) and read_number(item.text) is None:
            settings.append(Setting(item, item))
        elif isinstance(item, Group):
            raise site.fault(item, "options do not stand in parentheses", "write .options name=value")
        elif not settings or settings[-1].value is not settings[-1].name:
            raise site.fault(item, "the name of an option is expected here", "write .options name=value")
    for setting in settings:
        name = fold(setting.name.text)
        if name in REFUSED:
            message = f"option {name} is not supported by this version: {REFUSED[name]}"
            raise site.fault(setting.name, message)
        if name in EFFECTIVE and setting.value is setting.name:
            raise site.fault(setting.name, f"option {name} needs a value", f"write {name}=value")
    return tuple(settings)


def plain_value(site: Site, value: Value, scope: Scope) -> float:
    """Give a number or a formula in braces; a bare parameter is refused, as ngspice would not take it here."""
    if isinstance(value, Word) and read_number(value.text) is None:
        raise site.fault(
            value, f"{value.text!r} is not a number", f"a parameter stands in braces here: {{{value.text}}}"
        )
    return number_of(site, value, scope)
