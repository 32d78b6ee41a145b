"""`.model` cards: type, level and parameters, checked against the families that take them."""

from __future__ import annotations

import re

from msgspec import Struct

from tauledger.circuit import Model, ReadingNote, fold
from tauledger.devices.catalogue import families_of
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.items import Item, Quoted, Setting, Value, Word, flattened
from tauledger.netlist.letters import MODEL_TYPES
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, number_of

_VERSION = re.compile(r"(\d+)\.(\d+(?:\.\d+)*)")

# Words that stand alone on a model card.
FLAGS = frozenset({"nchan", "pchan"})


class ModelCard(Struct, frozen=True):
    """A model with its values; `places` gives, by folded name, the item of each parameter for messages."""

    model: Model
    places: dict[str, Item]


def model_name(items: tuple[Item, ...]) -> str:
    """Give the folded name on a `.model` card; structure has made sure that there is one."""
    name = items[1]
    assert isinstance(name, Word)
    return fold(name.text)


def base_name(items: tuple[Item, ...]) -> Word | None:
    """Give the model that a card is "a kind of" (AKO:name), or None."""
    kind = items[2] if len(items) > 2 else None
    if not isinstance(kind, Word) or fold(kind.text[:4]) != "ako:":
        return None
    return Word(kind.text[4:], kind.at + 4)


def read_model(
    site: Site,
    items: tuple[Item, ...],
    types: tuple[str, ...],
    words: str,
    scope: Scope,
    *,
    letter: str,
    name: str,
    card: int,
    path: int,
    base: ModelCard | None = None,
) -> ModelCard:
    """Read a model for an element of `letter`, which takes these types; `name` is its flat name.

    A parameter that the families of that type and level do not know is read past with a note, as ngspice does; where
    there is no family every parameter is kept. Raises NetlistError with all that is wrong on the card.
    """
    kind = items[2] if len(items) > 2 else None
    if base is not None:
        # "a kind of": the type may be left out, and all that is not said here is as in the base.
        second = items[3] if len(items) > 3 else None
        typed = isinstance(second, Word) and fold(second.text) in types
        kind = second if typed else Word(base.model.type, items[2].at)
        items = (*items[:3], *items[4 if typed else 3 :])
    if not isinstance(kind, Word):
        at = len(site.card.text) if kind is None else kind
        raise site.fault(at, "the type of the model is missing", f"one of: {', '.join(types)}")
    if fold(kind.text) not in types:
        message = f"a {words} needs a model of type {' or '.join(types)}, not {kind.text}"
        known = nearest(kind.text, MODEL_TYPES) if fold(kind.text) not in MODEL_TYPES else ""
        raise site.fault(kind, message, known)
    faults: list[Diagnostic] = []
    values: dict[str, float] = {}
    places: dict[str, Item] = {}
    for setting in _settings(site, items[3:]):
        parameter = fold(setting.name.text)
        if parameter in values:
            says = f"{setting.name.text} is given twice on a model; the last value counts, as in ngspice"
            scope.notes.append(ReadingNote(site.where, says))
        try:
            values[parameter] = _number(site, setting, scope)
            places[parameter] = setting
        except NetlistError as error:
            faults.extend(error.diagnostics)
    if faults:
        raise NetlistError(*faults)
    if base is not None:
        values = {**dict(base.model.parameters), "level": float(base.model.level), **values}
    level = values.pop("level", 1.0)
    if level != int(level):
        raise site.fault(places["level"], f"a level is a whole number, not {level:g}")
    known_here = _known(letter, fold(kind.text), int(level))
    strange = [parameter for parameter in values if known_here and parameter not in known_here]
    if strange:
        spelt = ", ".join(
            setting.name.text for setting in map(places.__getitem__, strange) if isinstance(setting, Setting)
        )
        meant = nearest(strange[0], known_here)
        says = f"a {words} has no model parameter {spelt}: read past, as ngspice does" + (f"; {meant}" if meant else "")
        scope.notes.append(ReadingNote(site.where, says))
    kept = tuple((parameter, value) for parameter, value in values.items() if parameter not in strange)
    return ModelCard(Model(name, fold(kind.text), int(level), kept, card, path), places)


def _known(letter: str, kind: str, level: int) -> frozenset[str]:
    """Give the parameters of all families that take a model of this type and level."""
    fitting = [
        family.model_parameters
        for family in families_of(letter)
        if kind in family.model_types and (not family.levels or level in family.levels)
    ]
    return frozenset().union(*fitting)


def _number(site: Site, setting: Setting, scope: Scope) -> float:
    """Give a parameter's value; of a version such as 3.2.4 the points behind the first are left out: 3.24."""
    value = setting.value
    if fold(setting.name.text) == "version" and isinstance(value, Word | Quoted):
        match = _VERSION.fullmatch(value.text.strip())
        if match is not None:
            return float(f"{match.group(1)}.{match.group(2).replace('.', '')}")
    if setting.name is value:
        return 1.0
    return number_of(site, value, scope)


def _settings(site: Site, items: tuple[Item, ...]) -> list[Setting]:
    """Give the parameters of a model card; `key value` counts as `key=value`."""
    settings: list[Setting] = []
    waiting: Word | None = None
    for item in flattened(items):
        if waiting is not None and not isinstance(item, Setting):
            settings.append(Setting(waiting, _value(site, item)))
            waiting = None
        elif waiting is not None:
            raise site.fault(waiting, f"{waiting.text} needs a value", f"write {waiting.text}=value")
        elif isinstance(item, Setting):
            settings.append(item)
        elif isinstance(item, Word) and fold(item.text) in FLAGS:
            settings.append(Setting(item, item))
        elif isinstance(item, Word) and read_number(item.text) is None:
            waiting = item
        else:
            raise site.fault(item, "the name of a model parameter is expected here", "write name=value")
    if waiting is not None:
        raise site.fault(waiting, f"{waiting.text} needs a value", f"write {waiting.text}=value")
    return settings


def _value(site: Site, item: Value) -> Value:
    if isinstance(item, Word) and read_number(item.text) is None:
        raise site.fault(item, f"{item.text!r} is not a number", "write name=value")
    return item
