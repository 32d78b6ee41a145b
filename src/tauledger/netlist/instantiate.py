"""One element of one instance: its card read, its values changed, scaled and multiplied, its model found."""

from __future__ import annotations

from msgspec.structs import replace

from tauledger import circuit
from tauledger.circuit import Element, ReadingNote, fold
from tauledger.devices.catalogue import choose, families_of
from tauledger.devices.family import Refusal
from tauledger.errors import InputError, NetlistError
from tauledger.netlist.behaviour import MOST_DEEP, MOST_PARTS, applies, extent, formula_of
from tauledger.netlist.controlled import behavioural, controlled, coupling, line
from tauledger.netlist.diagnostics import Site, visible
from tauledger.netlist.draft import Draft, Row
from tauledger.netlist.elements import FLAGS, ElementCard, Fields, device
from tauledger.netlist.items import Item, Word
from tauledger.netlist.letters import CONTROLLED, MODELLED, PASSIVES, PLURAL, SOURCES
from tauledger.netlist.lookup import model_for, picked_bin, visible_models
from tauledger.netlist.models import ModelCard
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.numbers import CAPITAL_M
from tauledger.netlist.passive import impossible, passive
from tauledger.netlist.scale import grows, scaled, scaled_sizes
from tauledger.netlist.scopes import Scope
from tauledger.netlist.sources import source
from tauledger.netlist.surroundings import Surroundings, node_of

# Letters whose elements ngspice does not multiply by the m of the instances around them.
WITHOUT_M = frozenset("VEHBKTSWOUYP")
# What ngspice takes for a resistor of 0 Ω.
LEAST_OHM = 1e-3
READ_ONLY = "`tauledger netlist` shows what was read"


def add_element(
    netlist: Netlist, draft: Draft, around: Surroundings, number: int, site: Site, card: Fields, name: str
) -> None:
    """Work out the element of one card and put it into the draft under its full name; number, site: of that card.

    A device that can be read but not reviewed is put in as well, and its fault among the draft's refusals.
    Raises NetlistError for what is wrong on the card, InputError for a changed value that is not possible.
    """
    letter = site.card.text[0].upper()
    if letter in SOURCES:
        part = _source(site, netlist.items[number], letter, around.scope)
    elif letter in CONTROLLED:
        part = controlled(site, card, letter, around.scope)
    elif letter == "B":
        part = behavioural(site, card, around.scope)
    elif letter == "K":
        part = coupling(site, card, around.scope)
    elif letter == "T":
        part = line(site, card, around.scope)
    else:
        seen = visible_models(netlist, around)
        part = _modelled(site, card, letter, seen.with_bins if letter == "M" else seen.names, around.scope)
        part = _given(draft, name, part, letter)
        if part.model is not None and fold(part.model.text) not in seen.models:
            drawn = replace(part, parameters=scaled_sizes(part.parameters, draft.scale))
            part = replace(part, model=picked_bin(netlist, draft, seen, drawn, part.model, letter, site))
        if draft.scale != 1.0 and part.model is not None:
            part = _scaled(netlist, draft, around, part, part.model, letter, name, site)
    plain = letter in PASSIVES and part.model is None and [key for key, _ in part.parameters] == ["value"]
    if not plain:
        part = replace(part, parameters=_own_value(draft, name, part, letter))
    part = _multiplied(draft, around, part, letter, name, site)
    if plain and [key for key, _ in part.parameters] == ["value"]:
        _plain(netlist, draft, around, part, letter, name, number, site)
        return
    model = None
    if part.model is not None:
        found = visible_models(netlist, around).models[fold(part.model.text)]
        model = model_for(netlist, draft, found, part.model, letter)
    element = Element(
        letter=letter,
        name=name,
        nodes=tuple(node_of(netlist, draft, around, node) for node in part.nodes),
        model=model.model.name if model else "",
        parameters=part.parameters,
        card=number,
        path=around.path,
        references=tuple(around.prefix + word.text for word in part.references),
        polynomial=part.polynomial,
        formula=_formula(netlist, draft, around, part, site),
        quantity=part.quantity,
    )
    draft.elements.append(element)
    family = choose(element, model.model if model else None)
    if isinstance(family, Refusal):
        draft.refusals.extend(_refused(netlist, site, card, element, model, family).diagnostics)
    elif family.model_types and len(element.nodes) > len(family.terminals):
        message = f"a {family.words} has at most {len(family.terminals)} nodes"
        hint = f"write {card.name.text} {' '.join(family.terminals)} model"
        draft.refusals.extend(site.fault(part.nodes[len(family.terminals)], message, hint).diagnostics)


def _source(site: Site, items: tuple[Item, ...], letter: str, scope: Scope) -> ElementCard:
    given = source(site, items, letter, scope)
    values = [("dc", given.dc)]
    if given.ac_magnitude is not None:
        values += [("acmag", given.ac_magnitude), ("acphase", given.ac_phase)]
    return ElementCard(given.nodes, tuple(values), given.m)


def _modelled(site: Site, card: Fields, letter: str, models: frozenset[str], scope: Scope) -> ElementCard:
    """Read a card whose last place is a model: a passive may have one, a device must."""
    if letter in PASSIVES:
        return passive(site, card, letter, models, scope)
    if letter == "U" and len(card.places) > MODELLED["U"].least + 1:
        message = f"{card.name.text}: digital parts are not supported"
        raise site.fault(card.name, message, "U is read as a distributed RC line: U1 near far capacitances model")
    control = card.places[2] if letter == "W" and len(card.places) > 2 else None
    if control is not None:
        if not isinstance(control, Word):
            raise site.fault(control, "the name of a voltage source is expected here", "write W1 n+ n- source model")
        card = replace(card, places=card.places[:2] + card.places[3:])
    known = frozenset().union(*(family.instance_parameters for family in families_of(letter)))
    part = device(site, card, MODELLED[letter], models, known, scope)
    return part if control is None else replace(part, references=(control,))


def _given(draft: Draft, name: str, part: ElementCard, letter: str) -> ElementCard:
    """Put changed values of the card's own in their places: m, and the parameters that the letter's devices take."""
    changes = [change for change in list(draft.changed_given.values()) if fold(change[0]) == fold(name)]
    for _, parameter, value in changes:
        word = fold(parameter)
        if word not in settable(letter):
            continue
        del draft.changed_given[fold(name), word]
        if (word == "m" or word.startswith("area")) and not value > 0.0:
            raise InputError(f"{name}: {word} must be greater than 0, not {value:.6g}")
        if word == "m":
            part = replace(part, m=value)
            continue
        kept = tuple(pair for pair in part.parameters if pair[0] != word)
        part = replace(part, parameters=(*kept, (word, value)))
    return part


def settable(letter: str) -> frozenset[str]:
    """Give the folded names that a device's own card can give a value, m included; none for a letter without model."""
    if letter in PASSIVES:
        return frozenset({"m"})
    if letter not in MODELLED:
        return frozenset()
    own = frozenset().union(*(family.instance_parameters for family in families_of(letter)))
    return own - FLAGS if letter in WITHOUT_M else (own | {"m"}) - FLAGS


def _scaled(
    netlist: Netlist,
    draft: Draft,
    around: Surroundings,
    part: ElementCard,
    word: Word,
    letter: str,
    name: str,
    site: Site,
) -> ElementCard:
    """Apply `.options scale` to the sizes of a device with a model."""
    found = visible_models(netlist, around).models[fold(word.text)]
    model = model_for(netlist, draft, found, word, letter).model
    if grows(part.parameters, letter, model):
        says = (
            f"{name}: scale = {draft.scale:g} multiplies area and pj once, as in the first analysis of ngspice; "
            "ngspice multiplies them again with every further analysis of a run"
        )
        around.scope.notes.append(ReadingNote(site.where, says))
    return replace(part, parameters=scaled(part.parameters, letter, model, draft.scale))


def _multiplied(
    draft: Draft, around: Surroundings, part: ElementCard, letter: str, name: str, site: Site
) -> ElementCard:
    """Work in m: of the card and of the instances around, where ngspice counts it for this letter."""
    if letter in WITHOUT_M:
        if around.m != 1.0 and (letter in "TO" or (letter == "B" and part.quantity == "i")):
            says = (
                f"{name} does not count the m = {around.m:g} of the instances around it: ngspice has none for {letter}"
            )
            around.scope.notes.append(ReadingNote(site.where, says))
        return part if part.m == 1.0 else replace(part, parameters=(*part.parameters, ("m", part.m)))
    m = product(around, part.m, name, site)
    if letter == "L" and m != 1.0:
        draft.divided[fold(name)] = m
    if letter == "I":
        return replace(
            part,
            parameters=tuple((key, value if key == "acphase" else m * value) for key, value in part.parameters),
            m=1.0,
        )
    if m != 1.0 and (letter in PASSIVES and [key for key, _ in part.parameters] == ["value"] and part.model is None):
        return replace(part, m=m)
    if letter in "FG" and part.behaviour is None and not part.polynomial:
        return replace(part, parameters=tuple((key, m * value) for key, value in part.parameters))
    return part if m == 1.0 else replace(part, parameters=(*part.parameters, ("m", m)))


def product(around: Surroundings, own: float, name: str, site: Site) -> float:
    """Multiply the m of an element or instance with that of the instances around it; a note where both count."""
    if own != 1.0 and around.m != 1.0:
        says = (
            f"{name} counts m = {own:g} × {around.m:g}: its own and that of the instances around it; "
            "ngspice would take the outermost alone"
        )
        around.scope.notes.append(ReadingNote(site.where, says))
    return own * around.m


def _plain(
    netlist: Netlist,
    draft: Draft,
    around: Surroundings,
    part: ElementCard,
    letter: str,
    name: str,
    number: int,
    site: Site,
) -> None:
    """Add an R, C or L of which only the value counts."""
    own = part.parameters[0][1]
    value = _changed(draft, name, own)
    if letter == "R" and value == own == 0.0:
        value = LEAST_OHM
        around.scope.notes.append(ReadingNote(site.where, f"{name} has 0 Ω: 1 mΩ is put there, as ngspice does"))
    elif problem := impossible(letter, value):
        raise InputError(f"{name}: {problem}")
    elif letter == "R" and 0.0 < value < 1.0 and value == own and (written := CAPITAL_M.search(site.card.text)):
        says = f"{name} has {written.group()}: M is milli in SPICE, as m is; {value:.6g} Ω is taken, write "
        says += f"{written.group(1)}meg for megohms"
        around.scope.notes.append(ReadingNote(site.where, says))
    elif value < 0.0:
        own_name = site.card.text.split(maxsplit=1)[0]
        says = f"{own_name} has {value:.6g} Ω, less than 0: taken as written, as ngspice does"
        around.scope.notes.append(ReadingNote(site.where, says))
    a, b = (node_of(netlist, draft, around, node) for node in part.nodes)
    scaled = value * part.m if letter == "C" else value / part.m
    draft.rows.append(Row(letter, name, a, b, scaled, number, around.path))


def _own_value(draft: Draft, name: str, part: ElementCard, letter: str) -> tuple[tuple[str, float], ...]:
    """Give the parameters with a changed value in its place: of R C L the value, of V I dc, of E F G H the gain."""
    key = fold(name)
    if key not in draft.changed_elements:
        return part.parameters
    own = "dc" if letter in SOURCES else "gain" if letter in CONTROLLED else "value"
    if own not in dict(part.parameters):
        draft.fixed.add(key)
        return part.parameters
    changed = _changed(draft, name, 0.0)
    if own == "value" and (problem := impossible(letter, changed)):
        raise InputError(f"{name}: {problem}")
    return tuple((word, changed if word == own else value) for word, value in part.parameters)


def _changed(draft: Draft, name: str, value: float) -> float:
    found = draft.changed_elements.pop(fold(name), None)
    return value if found is None else found[1]


def _formula(
    netlist: Netlist, draft: Draft, around: Surroundings, part: ElementCard, site: Site
) -> circuit.Formula | None:
    if part.behaviour is None:
        return None
    at = part.behaviour.at

    limits = f"at most {MOST_DEEP} levels and {MOST_PARTS} operators when its functions are put in"
    too_large = site.fault(part.behaviour, "the formula is too large", f"split it into sources: {limits}")
    try:
        found = formula_of(
            site,
            part.behaviour,
            scope=around.scope,
            node=lambda text: node_of(netlist, draft, around, Word(text, at)),
            source=lambda text: around.prefix + text,
        )
        whole = extent(found)
    except RecursionError as error:
        raise too_large from error
    if whole.depth > MOST_DEEP or whole.size > MOST_PARTS:
        raise too_large
    if applies(found, "ddt"):
        says = "ngspice's AC analysis takes a derivative by time (ddt) as nothing, and so does the rebuilt network"
        around.scope.notes.append(ReadingNote(site.where, says))
    if part.table:
        return circuit.Apply("table", (found, *map(circuit.Number, part.table)))
    return found


def _refused(
    netlist: Netlist, site: Site, card: Fields, element: Element, model: ModelCard | None, refusal: Refusal
) -> NetlistError:
    """Make the message for an element that can be read but not reviewed: at the culprit on the model or on its card."""
    letter = element.letter
    if not families_of(letter):
        return site.fault(
            card.name, f"{card.name.text}: {PLURAL[letter]} ({letter}) are not supported by this version", READ_ONLY
        )
    where = model.places.get(fold(refusal.parameter)) if model else None
    if model is not None and where is not None:
        user = (f"used by {visible(element.name)} ({site.where})",)
        return Site(netlist.files, netlist.cards[model.model.card], user).fault(where, refusal.reason, refusal.hint)
    setting = next((s for s in card.settings if fold(s.name.text) == fold(refusal.parameter)), None)
    return site.fault(setting or card.name, refusal.reason, refusal.hint)
