"""`.model` cards: type, level and parameters, checked against the family that the type belongs to."""

from __future__ import annotations

from msgspec import Struct

from tauledger.circuit import Model, fold
from tauledger.devices.family import Family
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.items import Item, Setting, Value, Word, flattened
from tauledger.netlist.letters import DEVICES
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, number_of


class ModelCard(Struct, frozen=True):
    """A model with its values; `places` gives, by folded name, the item of each parameter for messages."""

    model: Model
    places: dict[str, Item]


def model_name(items: tuple[Item, ...]) -> str:
    """Give the folded name on a `.model` card; structure has made sure that there is one."""
    name = items[1]
    assert isinstance(name, Word)
    return fold(name.text)


def read_model(
    site: Site, items: tuple[Item, ...], family: Family, scope: Scope, *, name: str, card: int, path: int
) -> ModelCard:
    """Read a model for an element of `family`; `name` is its flat name.

    Raises NetlistError with all that is wrong on the card.
    """
    kind = items[2] if len(items) > 2 else None
    if not isinstance(kind, Word):
        at = len(site.card.text) if kind is None else kind
        raise site.fault(at, "the type of the model is missing", f"one of: {', '.join(family.model_types)}")
    if fold(kind.text) not in family.model_types:
        types = [known for other in DEVICES.values() for known in other.model_types]
        message = f"a {family.words} needs a model of type {' or '.join(family.model_types)}, not {kind.text}"
        raise site.fault(kind, message, nearest(kind.text, types) if fold(kind.text) not in types else "")
    faults: list[Diagnostic] = []
    values: dict[str, float] = {}
    places: dict[str, Item] = {}
    for setting in _settings(site, items[3:]):
        parameter = fold(setting.name.text)
        try:
            if parameter != "level" and parameter not in family.model_parameters:
                message = f"a {family.words} has no model parameter {setting.name.text}"
                raise site.fault(setting.name, message, nearest(parameter, family.model_parameters))
            if parameter in values:
                raise site.fault(setting, f"{setting.name.text} is given twice")
            values[parameter] = number_of(site, setting.value, scope)
            places[parameter] = setting
        except NetlistError as error:
            faults.extend(error.diagnostics)
    if faults:
        raise NetlistError(*faults)
    level = values.pop("level", 1.0)
    if level != int(level) or (family.levels and int(level) not in family.levels):
        known = ", ".join(map(str, family.levels))
        message = f"level {level:g} of a {family.words} is not supported by this version"
        raise site.fault(places["level"], message, f"supported: {known}")
    model = Model(name, fold(kind.text), int(level), tuple(values.items()), card, path)
    return ModelCard(model, places)


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
