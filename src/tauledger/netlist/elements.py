"""What the places and keywords of an element card mean, by letter: R C L, G, X, and the devices with a model."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.devices.family import Family
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.items import Item, Setting, Value, Word, flattened
from tauledger.netlist.letters import PASSIVES
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, find, known_names, number_of

# The keyword for the value of a passive element, and the keywords without effect on operating point and AC.
VALUE_KEYWORD = {"R": "r", "C": "c", "L": "l"}
READ_PAST = {"R": frozenset({"noisy"}), "C": frozenset({"ic"}), "L": frozenset({"ic"})}
UNIT_WORD = {"R": "ohm", "C": "F", "L": "H"}
SHAPE = {
    "R": "R1 n+ n- value",
    "C": "C1 n+ n- value",
    "L": "L1 n+ n- value",
    "G": "G1 n+ n- nc+ nc- value",
    "X": "X1 node1 node2 .. name",
}


class Fields(Struct, frozen=True):
    """An element card by places and keywords: parentheses are blanks, the element's name left out."""

    name: Word
    places: tuple[Value, ...]
    settings: tuple[Setting, ...]


class PassiveCard(Struct, frozen=True):
    """R, C or L: nodes, value as on the card in SI units, and m."""

    nodes: tuple[Word, Word]
    value: float
    m: float


class TransconductanceCard(Struct, frozen=True):
    """G: output and control nodes, gain in S, and m."""

    nodes: tuple[Word, ...]
    gain: float
    m: float


class DeviceCard(Struct, frozen=True):
    """A device with a model: nodes, the model's name, parameters in SI units (flags are 1), and m."""

    nodes: tuple[Word, ...]
    model: Word
    parameters: tuple[tuple[str, float], ...]
    m: float


class InstanceCard(Struct, frozen=True):
    """X: nodes, the subcircuit's name, and the parameters given."""

    nodes: tuple[Word, ...]
    subcircuit: Word
    settings: tuple[Setting, ...]


def fields(site: Site, items: tuple[Item, ...]) -> Fields:
    """Sort the items of an element card; raises NetlistError for a keyword that is given twice."""
    head = items[0]
    if not isinstance(head, Word):
        raise site.fault(head, "an element begins with its name")
    places: list[Value] = []
    settings: dict[str, Setting] = {}
    for item in flattened(items[1:]):
        if isinstance(item, Setting):
            if fold(item.name.text) in settings:
                raise site.fault(item, f"{item.name.text} is given twice")
            settings[fold(item.name.text)] = item
        else:
            places.append(item)
    return Fields(head, tuple(places), tuple(settings.values()))


def nodes(site: Site, values: Iterable[Value]) -> Iterator[Word]:
    """Check that values can be names of nodes."""
    for value in values:
        if not isinstance(value, Word):
            raise site.fault(value, "the name of a node is expected here, not a formula")
        yield value


def passive(site: Site, card: Fields, letter: str, scope: Scope) -> PassiveCard:
    """Read R, C or L: two nodes and a value, or the value as r=, c= or l=."""
    word, keyword = PASSIVES[letter], VALUE_KEYWORD[letter]
    m = 1.0
    given: Value | None = None
    for setting in card.settings:
        name = fold(setting.name.text)
        if name == keyword:
            given = setting.value
        elif name == "m":
            m = multiplicity(site, setting, scope)
        elif name not in READ_PAST[letter]:
            raise _keyword_fault(site, setting, word, {keyword, "m", *READ_PAST[letter]})
    places = card.places
    if len(places) < 2 or (len(places) == 2 and given is None):
        missing = "the value is missing" if len(places) == 2 else f"a {word} has two nodes"
        raise site.fault(len(site.card.text), missing, f"write {SHAPE[letter]}")
    if len(places) > 2 and given is not None:
        raise site.fault(places[2], "the value is given twice", f"write {SHAPE[letter]}")
    if len(places) > 3:
        raise _too_many(site, places, letter, scope)
    value = places[2] if given is None else given
    if isinstance(value, Word) and read_number(value.text) is None and find(scope, fold(value.text)) is None:
        message = f"{value.text!r} is neither a number nor a parameter"
        hint = nearest(value.text, known_names(scope), otherwise=f"a {word} with a model is not supported yet")
        raise site.fault(value, message, hint)
    plus, minus = nodes(site, places[:2])
    return PassiveCard((plus, minus), _checked(site, value, number_of(site, value, scope), letter), m)


def impossible(letter: str, value: float) -> str:
    """Say why an R, C or L cannot have this value in SI units; empty where it can."""
    if value > 0.0 or (value == 0.0 and letter != "R"):
        return ""
    least = "greater than 0" if letter == "R" else "0 or more"
    return f"the value of a {PASSIVES[letter]} must be {least}, not {value:.6g} {UNIT_WORD[letter]}"


def _checked(site: Site, value: Value, number: float, letter: str) -> float:
    message = impossible(letter, number)
    if message:
        raise site.fault(value, message, "join the two nodes instead, or write 1m" if number == 0.0 else "")
    return number


def _too_many(site: Site, places: tuple[Value, ...], letter: str, scope: Scope) -> Exception:
    word = PASSIVES[letter]
    for extra in places[2:4]:
        if isinstance(extra, Word) and read_number(extra.text) is None and find(scope, fold(extra.text)) is None:
            return site.fault(
                extra, f"a {word} with a model is not supported by this version", f"write {SHAPE[letter]}"
            )
    return site.fault(places[3], f"a {word} has two nodes and one value", f"write {SHAPE[letter]}")


def transconductance(site: Site, card: Fields, scope: Scope) -> TransconductanceCard:
    """Read a linear G: output pair, control pair, gain."""
    m = 1.0
    for setting in card.settings:
        name = fold(setting.name.text)
        if name == "m":
            m = multiplicity(site, setting, scope)
        elif name in ("value", "vol", "cur", "table"):
            message = f"a controlled source with {setting.name.text}= is not supported by this version"
            raise site.fault(setting.name, message, f"write {SHAPE['G']}")
        else:
            raise _keyword_fault(site, setting, "voltage-controlled current source", {"m"})
    for place in card.places[2:]:
        if isinstance(place, Word) and fold(place.text) in ("poly", "value", "table", "laplace", "freq"):
            message = f"a controlled source with {place.text.upper()} is not supported by this version"
            raise site.fault(place, message, f"write {SHAPE['G']}")
    if len(card.places) < 5:
        message = "a voltage-controlled current source has four nodes and a gain"
        raise site.fault(len(site.card.text), message, f"write {SHAPE['G']}")
    if len(card.places) > 5:
        raise site.fault(card.places[5], "this is one too many", f"write {SHAPE['G']}")
    return TransconductanceCard(tuple(nodes(site, card.places[:4])), number_of(site, card.places[4], scope), m)


def device(site: Site, card: Fields, family: Family, models: frozenset[str], scope: Scope) -> DeviceCard:
    """Read a device with a model by its family's table. models: folded names that can be seen from here."""
    most = len(family.terminals)
    least = most - family.optional_terminals
    places = card.places
    where = next((k for k in range(least, min(most + 1, len(places))) if _is_name(places[k], models)), None)
    if where is None:
        raise _no_model(site, card, family, models, least)
    model = places[where]
    assert isinstance(model, Word)
    parameters: list[tuple[str, float]] = []
    m = 1.0
    for number, extra in enumerate(places[where + 1 :]):
        if isinstance(extra, Word) and fold(extra.text) == "off":
            parameters.append(("off", 1.0))
        elif _behind_initial_condition(site, extra, card.settings):
            continue
        elif number == 0 and "area" in family.instance_parameters:
            parameters.append(("area", _positive(site, extra, number_of(site, extra, scope), "area")))
        else:
            raise site.fault(extra, "this is one too many", "write name=value")
    for setting in card.settings:
        name = fold(setting.name.text)
        if name == "m":
            m = multiplicity(site, setting, scope)
        elif name == "ic" or (name.startswith("ic") and name in family.instance_parameters):
            continue
        elif name not in family.instance_parameters:
            raise _keyword_fault(site, setting, family.words, set(family.instance_parameters) | {"ic"})
        elif name in dict(parameters):
            raise site.fault(setting, f"{name} is given twice")
        else:
            value = number_of(site, setting.value, scope)
            if name.startswith("area"):
                _positive(site, setting.value, value, name)
            parameters.append((name, value))
    return DeviceCard(tuple(nodes(site, places[:where])), model, tuple(parameters), m)


def _is_name(value: Value, models: frozenset[str]) -> bool:
    return isinstance(value, Word) and fold(value.text) in models


def _no_model(site: Site, card: Fields, family: Family, models: frozenset[str], least: int) -> Exception:
    places = card.places
    shape = f"write {card.name.text} {' '.join(family.terminals[:least])} model"
    if len(places) <= least:
        message = f"a {family.words} has at least {least} nodes and a model"
        return site.fault(len(site.card.text), message, shape)
    beyond = next((place for place in places[len(family.terminals) + 1 :] if _is_name(place, models)), None)
    if beyond is not None:
        return site.fault(beyond, f"a {family.words} has at most {len(family.terminals)} nodes", shape)
    last = places[min(len(places), len(family.terminals) + 1) - 1]
    # A number in the last place is the area: the name before it was meant to be the model.
    if isinstance(last, Word) and read_number(last.text) is not None and len(places) > least + 1:
        last = places[min(len(places), len(family.terminals) + 1) - 2]
    if not isinstance(last, Word):
        return site.fault(last, "the name of a model is expected here", shape)
    return site.fault(last, f"no model is called {last.text!r}", nearest(last.text, models, otherwise=shape))


def _behind_initial_condition(site: Site, value: Value, settings: tuple[Setting, ...]) -> bool:
    """Say whether a value belongs to a list such as ic=0.7,5: only commas and values stand between."""
    before = [setting for setting in settings if setting.at < value.at]
    if not before or fold(before[-1].name.text) != "ic":
        return False
    between = site.card.text[before[-1].value.at : value.at]
    return between.rstrip().endswith(",")


def instance(site: Site, card: Fields) -> InstanceCard:
    """Read an X card: nodes, name of the subcircuit, parameters; `params:` may stand before them."""
    places = [place for place in card.places if not (isinstance(place, Word) and fold(place.text) == "params:")]
    if not places:
        raise site.fault(len(site.card.text), "the name of the subcircuit is missing", f"write {SHAPE['X']}")
    words = tuple(nodes(site, places))
    return InstanceCard(words[:-1], words[-1], card.settings)


def multiplicity(site: Site, setting: Setting, scope: Scope) -> float:
    """Read m=."""
    return _positive(site, setting.value, number_of(site, setting.value, scope), "m")


def _positive(site: Site, value: Value, number: float, what: str) -> float:
    if not (number > 0.0 and math.isfinite(number)):
        raise site.fault(value, f"{what} must be greater than 0, not {number:.6g}")
    return number


def _keyword_fault(site: Site, setting: Setting, words: str, known: set[str]) -> Exception:
    name = setting.name.text
    article = "an" if words[0] in "aeiou" else "a"
    hint = nearest(name, known, otherwise=f"known here: {', '.join(sorted(known))}")
    return site.fault(setting.name, f"{name}= on {article} {words} is not supported by this version", hint)
