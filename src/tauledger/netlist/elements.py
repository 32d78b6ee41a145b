"""What the places and keywords of an element card mean, for all letters alike, and the cards with a model and X."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Iterator, Sequence

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.errors import NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.formulas import Behaviour
from tauledger.netlist.items import Item, Setting, Value, Word, flattened
from tauledger.netlist.letters import Letter
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, number_of

_SCALE_AND_UNIT = re.compile(r"(?:meg|mil|[tgkmuµμnpf])?(?:ohms?|Ω|f|h|hz|v|a)?", re.IGNORECASE)

X_SHAPE = "X1 node1 node2 .. name"

# Words that stand alone on a card and mean yes.
FLAGS = frozenset({"off", "on", "thermal"})


class Fields(Struct, frozen=True):
    """An element card by places and keywords: parentheses are blanks, the element's name left out."""

    name: Word
    places: tuple[Value, ...]
    settings: tuple[Setting, ...]


class ElementCard(Struct, frozen=True):
    """An element as its card has it, names not yet those of the flat circuit.

    parameters: (name, value) in SI units, flags are 1. model, references: names of the model and of the elements that
    it depends on. behaviour, quantity: what it gives by a formula; table: the pairs by which the formula is looked up.
    """

    nodes: tuple[Word, ...]
    parameters: tuple[tuple[str, float], ...] = ()
    m: float = 1.0
    model: Word | None = None
    references: tuple[Word, ...] = ()
    polynomial: tuple[float, ...] = ()
    behaviour: Behaviour | None = None
    quantity: str = ""
    table: tuple[float, ...] = ()


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


def device(
    site: Site, card: Fields, letter: Letter, models: frozenset[str], known: frozenset[str], scope: Scope
) -> ElementCard:
    """Read a device with a model. models: folded names that can be seen from here. known: parameters of its families,
    empty where no family has it: then every name counts."""
    places = card.places
    last = min(letter.most + 1, len(places))
    where = next((k for k in range(letter.least, last) if _is_name(places[k], models)), None)
    if where is None:
        raise _no_model(site, card, letter, models)
    model = places[where]
    assert isinstance(model, Word)
    parameters: list[tuple[str, float]] = []
    m = 1.0
    for number, extra in enumerate(places[where + 1 :]):
        if isinstance(extra, Word) and fold(extra.text) in FLAGS:
            parameters.append((fold(extra.text), 1.0))
        elif behind(site, extra, card.settings, "ic"):
            continue
        elif number == 0 and letter.area:
            parameters.append(("area", positive(site, extra, number_of(site, extra, scope), "area")))
        else:
            area = number == 0 and "area" in known
            raise site.fault(extra, "this is one too many", "write area=value" if area else "write name=value")
    for setting in card.settings:
        name = fold(setting.name.text)
        if name == "m":
            m = multiplicity(site, setting, scope)
        elif name == "ic" or name in ("icvbe", "icvce", "icvds", "icvgs", "icvbs"):
            continue
        elif known and name not in known:
            raise keyword_fault(site, setting, letter.words, set(known) | {"ic"})
        elif name in dict(parameters):
            raise site.fault(setting, f"{name} is given twice")
        else:
            value = number_of(site, setting.value, scope)
            if name.startswith("area"):
                positive(site, setting.value, value, name)
            parameters.append((name, value))
    # One order for all ways to write it, so that what is written of it is read back the same.
    parameters.sort(key=lambda parameter: parameter[0] not in FLAGS)
    return ElementCard(tuple(nodes(site, places[:where])), tuple(parameters), m, model)


def _is_name(value: Value, models: frozenset[str]) -> bool:
    return isinstance(value, Word) and fold(value.text) in models


def _no_model(site: Site, card: Fields, letter: Letter, models: frozenset[str]) -> Exception:
    places, least, most = card.places, letter.least, letter.most
    shape = f"write {card.name.text} {' '.join(letter.terminals[:least])} model"
    if len(places) <= least:
        message = f"a {letter.words} has at least {least} nodes and a model"
        return site.fault(len(site.card.text), message, shape)
    beyond = next((place for place in places[most + 1 :] if _is_name(place, models)), None)
    if beyond is not None:
        return site.fault(beyond, f"a {letter.words} has at most {most} nodes", shape)
    last = places[min(len(places), most + 1) - 1]
    # A number in the last place is the area: the name before it was meant to be the model.
    if isinstance(last, Word) and read_number(last.text) is not None and len(places) > least + 1:
        last = places[min(len(places), most + 1) - 2]
    if not isinstance(last, Word):
        return site.fault(last, "the name of a model is expected here", shape)
    return site.fault(last, f"no model is called {last.text!r}", nearest(last.text, models, otherwise=shape))


def behind(site: Site, value: Value, settings: Sequence[Setting], name: str) -> bool:
    """Say whether a value belongs to a list such as ic=0.7,5 of the setting `name`: a comma stands before it."""
    before = [setting for setting in settings if setting.at < value.at]
    if not before or fold(before[-1].name.text) != name:
        return False
    between = site.card.text[before[-1].value.at : value.at]
    return between.rstrip().endswith(",")


def instance(site: Site, card: Fields) -> InstanceCard:
    """Read an X card: nodes, name of the subcircuit, parameters; `params:` may stand before them."""
    places = [place for place in card.places if not (isinstance(place, Word) and fold(place.text) == "params:")]
    if not places:
        raise site.fault(len(site.card.text), "the name of the subcircuit is missing", f"write {X_SHAPE}")
    words = tuple(nodes(site, places))
    return InstanceCard(words[:-1], words[-1], card.settings)


def parted_number(site: Site, first: Item, second: Item) -> NetlistError | None:
    """Make the error for a number that a blank or a decimal comma has parted in two words; None where it has not."""
    if not (isinstance(first, Word) and isinstance(second, Word)):
        return None
    number = read_number(first.text)
    if number is None or number.tail:
        return None
    end = first.at + len(first.text)
    between = site.card.text[end : second.at]
    both = f"{first.text}{between}{second.text}"
    if between.strip() == "," and first.text.lstrip("+-").isdigit() and second.text[:1].isdigit():
        message = f"{both!r} is two numbers: a comma parts them"
        return site.fault(first, message, f"write the decimal point: {first.text}.{second.text}")
    if not between.strip() and first.text[-1].isdigit() and _SCALE_AND_UNIT.fullmatch(second.text):
        return site.fault(first, f"{both!r} is two words", f"write {first.text}{second.text}")
    return None


def multiplicity(site: Site, setting: Setting, scope: Scope) -> float:
    """Read m=."""
    return positive(site, setting.value, number_of(site, setting.value, scope), "m")


def positive(site: Site, value: Value, number: float, what: str) -> float:
    """Give a number back where it is greater than 0, else raise NetlistError at its place."""
    if not (number > 0.0 and math.isfinite(number)):
        raise site.fault(value, f"{what} must be greater than 0, not {number:.6g}")
    return number


def keyword_fault(site: Site, setting: Setting, words: str, known: set[str]) -> Exception:
    """Make the error for a keyword that an element does not have."""
    name = setting.name.text
    article = "an" if words[0] in "aeiou" else "a"
    hint = nearest(name, known, otherwise=f"known here: {', '.join(sorted(known))}")
    return site.fault(setting.name, f"{name}= on {article} {words} is not supported by this version", hint)
