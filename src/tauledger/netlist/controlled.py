"""Controlled and behavioural sources E F G H B, and the cards without a model of their own: K and T."""

from __future__ import annotations

import math

from tauledger.circuit import fold
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.elements import ElementCard, Fields, keyword_fault, multiplicity, nodes, positive
from tauledger.netlist.formulas import Behaviour
from tauledger.netlist.items import Setting, Value, Word
from tauledger.netlist.letters import CONTROLLED
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, number_of

SHAPE = {
    "E": "E1 n+ n- nc+ nc- gain",
    "F": "F1 n+ n- source gain",
    "G": "G1 n+ n- nc+ nc- value",
    "H": "H1 n+ n- source ohms",
    "B": "B1 n+ n- v={..} or i={..}",
    "K": "K1 L1 L2 coupling",
    "T": "T1 n1+ n1- n2+ n2- z0=50 td=10n",
}
GIVES = {"E": "v", "F": "i", "G": "i", "H": "v"}
OUT_OF_REACH = {"laplace": "a transfer function", "freq": "a table over frequency", "chebyshev": "a filter function"}
MOST_CONTROLS = 20


def controlled(site: Site, card: Fields, letter: str, scope: Scope) -> ElementCard:
    """Read E, F, G or H: a gain, POLY(n), or for E and G a formula (value=, vol=, cur=) or TABLE."""
    m = 1.0
    behaviour: Behaviour | None = None
    table = False
    for setting in card.settings:
        name = fold(setting.name.text)
        if name == "m" and letter in "FG":
            m = multiplicity(site, setting, scope)
        elif isinstance(setting.value, Behaviour):
            behaviour, table = setting.value, name == "table"
        elif name != "ic":
            known = {"E": {"value", "vol"}, "G": {"value", "cur", "m"}, "F": {"m"}, "H": set()}[letter]
            raise keyword_fault(site, setting, CONTROLLED[letter], known or {"poly"})
    places = card.places
    for place in places[2:3]:
        word = fold(place.text) if isinstance(place, Word) else ""
        if word in OUT_OF_REACH:
            message = f"ngspice has no {word.upper()} source ({OUT_OF_REACH[word]})"
            raise site.fault(place, message, "build it of R, C and controlled sources")
        if word == "poly":
            return _polynomial(site, places, letter, m, scope)
    if behaviour is not None:
        output = tuple(nodes(site, places[:2]))
        if len(output) < 2:
            raise site.fault(
                len(site.card.text), f"a {CONTROLLED[letter]} has two nodes of its own", f"write {SHAPE[letter]}"
            )
        pairs = tuple(number_of(site, place, scope) for place in places[2:])
        if not table and pairs:
            raise site.fault(places[2], "this is one too many", f"write {letter}1 n+ n- value={{..}}")
        if table:
            _check_table(site, card, pairs)
        return ElementCard(output, m=m, behaviour=behaviour, quantity=GIVES[letter], table=pairs)
    if len(places) == 3 and not isinstance(places[2], Word) and letter in "EG":
        raise site.fault(places[2], "a formula alone cannot stand here", f"write {letter}1 n+ n- value={{..}}")
    control = 2 if letter in "EG" else 1
    if len(places) < 3 + control:
        has = "four nodes and a gain" if letter in "EG" else "two nodes, a voltage source and a gain"
        raise site.fault(len(site.card.text), f"a {CONTROLLED[letter]} has {has}", f"write {SHAPE[letter]}")
    if len(places) > 3 + control:
        raise site.fault(places[3 + control], "this is one too many", f"write {SHAPE[letter]}")
    words = tuple(nodes(site, places[: 2 + control]))
    gain = (("gain", number_of(site, places[-1], scope)),)
    if letter in "EG":
        return ElementCard(words, gain, m)
    return ElementCard(words[:2], gain, m, references=words[2:])


def _polynomial(site: Site, places: tuple[Value, ...], letter: str, m: float, scope: Scope) -> ElementCard:
    """Read POLY(n) with n pairs of nodes or n voltage sources, then the coefficients."""
    count = places[3] if len(places) > 3 else None
    dimension = read_number(count.text) if isinstance(count, Word) else None
    if dimension is None or dimension.value != int(dimension.value) or not 1 <= dimension.value <= MOST_CONTROLS:
        at = len(site.card.text) if count is None else count
        raise site.fault(at, f"POLY needs its number of controls, 1 to {MOST_CONTROLS}", "write POLY(1)")
    each = 2 if letter in "EG" else 1
    first = 4 + each * int(dimension.value)
    if len(places) <= first:
        what = "pairs of nodes" if each == 2 else "voltage sources"
        message = f"POLY({int(dimension.value)}) needs {int(dimension.value)} {what} and coefficients"
        raise site.fault(len(site.card.text), message)
    controls = tuple(nodes(site, places[4:first]))
    coefficients = tuple(number_of(site, place, scope) for place in places[first:])
    output = tuple(nodes(site, places[:2]))
    if each == 2:
        return ElementCard((*output, *controls), m=m, polynomial=coefficients)
    return ElementCard(output, m=m, references=controls, polynomial=coefficients)


def _check_table(site: Site, card: Fields, pairs: tuple[float, ...]) -> None:
    if len(pairs) < 4 or len(pairs) % 2:
        raise site.fault(len(site.card.text), "TABLE needs at least two pairs of numbers", "write (-1,-5) (1,5)")
    for k in range(2, len(pairs), 2):
        if pairs[k] <= pairs[k - 2]:
            raise site.fault(card.places[2 + k], "the first numbers of the pairs must rise")


def behavioural(site: Site, card: Fields, scope: Scope) -> ElementCard:
    """Read a B source: v= or i=, then tc1, tc2, m, temp, dtemp."""
    behaviour: Behaviour | None = None
    quantity = ""
    parameters: list[tuple[str, float]] = []
    m = 1.0
    for setting in card.settings:
        name = fold(setting.name.text)
        if isinstance(setting.value, Behaviour):
            behaviour, quantity = setting.value, name
        elif name == "m":
            m = multiplicity(site, setting, scope)
        elif name in ("tc1", "tc2", "temp", "dtemp"):
            parameters.append((name, number_of(site, setting.value, scope)))
        else:
            raise keyword_fault(site, setting, "behavioural source", {"v", "i", "m", "tc1", "tc2", "temp", "dtemp"})
    if len(card.places) < 2 or behaviour is None:
        missing = "a behavioural source has two nodes" if len(card.places) < 2 else "v= or i= is missing"
        raise site.fault(len(site.card.text), missing, f"write {SHAPE['B']}")
    if len(card.places) > 2:
        raise site.fault(card.places[2], "this is one too many", f"write {SHAPE['B']}")
    output = tuple(nodes(site, card.places))
    return ElementCard(output, tuple(parameters), m, behaviour=behaviour, quantity=quantity)


def coupling(site: Site, card: Fields, scope: Scope) -> ElementCard:
    """Read K: two inductors and the coupling between -1 and 1."""
    words = tuple(nodes(site, card.places[:-1]))
    if len(words) < 2 or card.settings:
        at = card.settings[0] if card.settings else len(site.card.text)
        raise site.fault(at, "a coupling has two inductors and a number", f"write {SHAPE['K']}")
    if len(words) > 2:
        raise site.fault(words[2], "ngspice couples two inductors at a time", "write one K for each pair")
    value = number_of(site, card.places[-1], scope)
    if not -1.0 <= value <= 1.0:
        raise site.fault(card.places[-1], f"a coupling lies between -1 and 1, not at {value:.6g}")
    return ElementCard((), (("coupling", value),), references=words)


def line(site: Site, card: Fields, scope: Scope) -> ElementCard:
    """Read T: four nodes, z0, and the delay td, or f with nl (a quarter of a wave where nl is left out)."""
    values: dict[str, tuple[Setting, float]] = {}
    for setting in card.settings:
        name = {"zo": "z0"}.get(fold(setting.name.text), fold(setting.name.text))
        if name == "ic":
            continue
        if name not in ("z0", "td", "f", "nl"):
            raise keyword_fault(site, setting, "lossless line", {"z0", "td", "f", "nl"})
        values[name] = setting, number_of(site, setting.value, scope)
    ends = [place for place in card.places if not _of_initial(place, card.settings)]
    if len(ends) != 4:
        at = len(site.card.text) if len(ends) < 4 else ends[4]
        raise site.fault(at, "a lossless line has four nodes", f"write {SHAPE['T']}")
    for name in ("z0", "td", "f"):
        if name in values:
            setting, value = values[name]
            positive(site, setting.value, value, name)
    if "z0" not in values or not values.keys() & {"td", "f"}:
        missing = "z0" if "z0" not in values else "td"
        raise site.fault(len(site.card.text), f"{missing}= is missing", f"write {SHAPE['T']}")
    wavelengths = values["nl"][1] if "nl" in values else 0.25
    delay = values["td"][1] if "td" in values else wavelengths / values["f"][1]
    if not (delay > 0.0 and math.isfinite(delay)):
        raise site.fault(values["nl"][0], "nl must be greater than 0")
    return ElementCard(tuple(nodes(site, ends)), (("z0", values["z0"][1]), ("td", delay)))


def _of_initial(place: Value, settings: tuple[Setting, ...]) -> bool:
    before = [setting for setting in settings if setting.at < place.at]
    return bool(before) and fold(before[-1].name.text) == "ic"
