"""`.options`: which words change the result, which are read past, and which are refused."""

from __future__ import annotations

from tauledger.circuit import fold
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.items import Item, Setting, Word, flattened
from tauledger.netlist.numbers import read_number

EFFECTIVE = frozenset({"temp", "tnom", "gmin"})

REFUSED = {
    "scale": "it scales the sizes of devices",
    "rshunt": "it puts a resistor from every node to ground",
    "cshunt": "it puts a capacitor from every node to ground",
    "rseries": "it puts a resistor in series with every inductor",
}


def option_settings(site: Site, items: tuple[Item, ...]) -> tuple[Setting, ...]:
    """Give the options of a card; `key value` counts as `key=value`, a lone word is a flag (its value is the word).

    Raises NetlistError for an option that would change the result and is not supported.
    """
    settings: list[Setting] = []
    for item in flattened(items[1:]):
        if isinstance(item, Setting):
            settings.append(item)
        elif isinstance(item, Word) and read_number(item.text) is None:
            settings.append(Setting(item, item))
        elif settings and settings[-1].value is settings[-1].name:
            settings[-1] = Setting(settings[-1].name, item)
        else:
            raise site.fault(item, "the name of an option is expected here", "write .options name=value")
    for setting in settings:
        name = fold(setting.name.text)
        if name in REFUSED:
            message = f"option {name} is not supported by this version: {REFUSED[name]}"
            raise site.fault(setting.name, message)
        if name in EFFECTIVE and setting.value is setting.name:
            raise site.fault(setting.name, f"option {name} needs a value", f"write {name}=value")
    return tuple(settings)
