"""R, C and L: a value, a model or a formula, in the order in which they come, and the keywords behind."""

from __future__ import annotations

from tauledger.circuit import ReadingNote, fold
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.elements import (
    ElementCard,
    Fields,
    behind,
    keyword_fault,
    multiplicity,
    nodes,
    parted_number,
)
from tauledger.netlist.formulas import Behaviour
from tauledger.netlist.items import Setting, Value, Word
from tauledger.netlist.letters import PASSIVES
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, find, known_names, number_of

SHAPE = {letter: f"{letter}1 n+ n- value" for letter in PASSIVES}
UNIT_WORD = {"R": "ohm", "C": "F", "L": "H"}

# The keywords for the value, those that change it, and those without effect on operating point and AC.
VALUE_KEYWORDS = {"R": ("r", "resistance"), "C": ("c", "capacitance"), "L": ("l", "inductance")}
NUMBERS = {
    "R": frozenset(["tc1", "tc2", "tce", "ac", "scale", "temp", "dtemp", "l", "w"]),
    "C": frozenset(["tc1", "tc2", "scale", "temp", "dtemp", "l", "w"]),
    "L": frozenset(["tc1", "tc2", "scale", "temp", "dtemp", "nt"]),
}
READ_PAST = {"R": frozenset({"noisy", "noise"}), "C": frozenset({"ic"}), "L": frozenset({"ic"})}
# Without a coefficient or a model the element's own temperature changes nothing.
OF_TEMPERATURE = frozenset({"temp", "dtemp"})
OF_FORMULA = frozenset({"tc1", "tc2"})


def passive(site: Site, card: Fields, letter: str, models: frozenset[str], scope: Scope) -> ElementCard:
    """Read R, C or L. models: folded names of the models that can be seen from here.

    A value comes out as parameter "value" with `scale` in it, and so does "ac"; a behavioural one as formula.
    """
    word = PASSIVES[letter]
    parameters: dict[str, float] = {}
    given: Value | None = None
    quantity, m = "", 1.0
    for setting in card.settings:
        name = fold(setting.name.text)
        if name in VALUE_KEYWORDS[letter] or (name == "q" and letter == "C"):
            if given is not None:
                raise site.fault(setting, "the value is given twice", f"write {SHAPE[letter]}")
            given, quantity = setting.value, name
        elif name == "m":
            m = multiplicity(site, setting, scope)
        elif name == "tc":
            parameters |= _coefficients(site, setting, card, scope)
        elif name in NUMBERS[letter]:
            parameters[name] = number_of(site, setting.value, scope)
            if name == "ac" and parameters[name] == 0.0:
                message = "an AC resistance of 0 Ω: ngspice's sweep has no numbers then"
                raise site.fault(setting.value, message, "leave ac out, or give a value other than 0")
        elif name not in READ_PAST[letter]:
            known = {*VALUE_KEYWORDS[letter], *NUMBERS[letter], *READ_PAST[letter], "m", "tc"}
            raise keyword_fault(site, setting, word, known)
    places = [place for place in card.places if not _of_coefficients(place, card)]
    if len(places) < 2:
        raise site.fault(len(site.card.text), f"a {word} has two nodes", f"write {SHAPE[letter]}")
    model: Word | None = None
    for place in places[2:]:
        if model is None and isinstance(place, Word) and _is_model(place, models, scope):
            model = place
        elif given is None:
            given = place
        elif quantity:
            raise site.fault(place, "the value is given twice", f"write {SHAPE[letter]}")
        else:
            raise _too_many(site, given, place, letter, models, scope)
    if given is None and model is None:
        raise site.fault(len(site.card.text), "the value is missing", f"write {SHAPE[letter]}")
    plus, minus = nodes(site, places[:2])
    if isinstance(given, Behaviour):
        past = [name for name in parameters if name not in OF_FORMULA]
        if past:
            says = f"{card.name.text} is given by a formula: ngspice reads past its {', '.join(past)}"
            scope.notes.append(ReadingNote(site.where, says))
            parameters = {name: value for name, value in parameters.items() if name in OF_FORMULA}
        return ElementCard(
            (plus, minus),
            tuple(parameters.items()),
            m,
            model,
            behaviour=given,
            quantity=(quantity or letter.lower())[0],
        )
    if given is not None:
        if isinstance(given, Word) and read_number(given.text) is None and find(scope, fold(given.text)) is None:
            message = f"{given.text!r} is neither a number, a parameter nor a model"
            hint = nearest(given.text, [*known_names(scope), *models], otherwise=f"write {SHAPE[letter]}")
            raise site.fault(given, message, hint)
        value = number_of(site, given, scope)
        scale = parameters.pop("scale", 1.0)
        if "ac" in parameters:
            parameters["ac"] *= scale
        parameters = {"value": _checked(site, given, value * scale, letter), **parameters}
    if model is None and not parameters.keys() & {"tc1", "tc2", "tce"}:
        parameters = {name: value for name, value in parameters.items() if name not in OF_TEMPERATURE}
    return ElementCard((plus, minus), tuple(parameters.items()), m, model)


def impossible(letter: str, value: float) -> str:
    """Say why an R, C or L cannot have this value in SI units; empty where it can."""
    if value > 0.0 or (value != 0.0) == (letter == "R"):
        return ""
    least = "other than 0" if letter == "R" else "0 or more"
    article = "an" if letter == "L" else "a"
    return f"the value of {article} {PASSIVES[letter]} must be {least}, not {value:.6g} {UNIT_WORD[letter]}"


def _checked(site: Site, value: Value, number: float, letter: str) -> float:
    message = "" if number == 0.0 else impossible(letter, number)
    if message:
        raise site.fault(value, message)
    return number


def _is_model(place: Word, models: frozenset[str], scope: Scope) -> bool:
    """A name is a model where there is one of it and no parameter."""
    key = fold(place.text)
    return read_number(place.text) is None and key in models and find(scope, key) is None


def _of_coefficients(place: Value, card: Fields) -> bool:
    """Say whether a place is the second coefficient of tc=a b."""
    before = [setting for setting in card.settings if setting.at < place.at]
    if not before or fold(before[-1].name.text) != "tc":
        return False
    between = [other for other in card.places if before[-1].at < other.at < place.at]
    return not between


def _coefficients(site: Site, setting: Setting, card: Fields, scope: Scope) -> dict[str, float]:
    """Read tc=a or tc=a b."""
    found = {"tc1": number_of(site, setting.value, scope)}
    for place in card.places:
        if place.at > setting.at and _of_coefficients(place, card):
            if behind(site, place, card.settings, "tc"):
                message = "ngspice does not read the second coefficient behind a comma"
                raise site.fault(place, message, "separate them by a blank: tc=a b")
            found["tc2"] = number_of(site, place, scope)
    return found


def _too_many(site: Site, given: Value, place: Value, letter: str, models: frozenset[str], scope: Scope) -> Exception:
    word = PASSIVES[letter]
    if (parted := parted_number(site, given, place)) is not None:
        return parted
    if isinstance(place, Word) and read_number(place.text) is None and find(scope, fold(place.text)) is None:
        hint = nearest(place.text, models, otherwise=f"write {SHAPE[letter]}")
        return site.fault(place, f"no model is called {place.text!r}", hint)
    return site.fault(place, f"a {word} has two nodes and one value", f"write {SHAPE[letter]}")
