"""Which model a name means where it stands, and reading it there: scopes, bins, and models made from others."""

from __future__ import annotations

from msgspec.structs import replace

from tauledger.circuit import ReadingNote, fold
from tauledger.devices.catalogue import families_of
from tauledger.netlist.bins import bins_of, fits
from tauledger.netlist.conditions import counts
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.draft import Draft
from tauledger.netlist.elements import ElementCard
from tauledger.netlist.items import Word
from tauledger.netlist.letters import MODELLED, PASSIVE_MODELS, PASSIVES
from tauledger.netlist.models import ModelCard, base_name, model_name, read_model
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.surroundings import Surroundings, Visible


def visible_models(netlist: Netlist, around: Surroundings) -> Visible:
    """Give the models that can be seen from an instance; worked out once for each instance."""
    if not around.seen:
        models: dict[str, tuple[Surroundings, int]] = {}
        twins: dict[str, list[int]] = {}
        here: Surroundings | None = around
        while here is not None:
            for number in here.definition.models:
                if not counts(netlist, number, here.scope, here.context):
                    continue
                name = model_name(netlist.items[number])
                if name not in models:
                    models[name] = (here, number)
                elif here is around:
                    twins.setdefault(name, []).append(number)
            here = here.lexical
        bins = bins_of(models)
        around.seen.append(Visible(models, bins, twins, frozenset(models), frozenset([*models, *bins])))
    return around.seen[0]


def model_for(netlist: Netlist, draft: Draft, found: tuple[Surroundings, int], word: Word, letter: str) -> ModelCard:
    """Read a model where it stands, once for each instance that holds it, with the changes for it."""
    home, number = found
    key = fold(word.text)
    types = PASSIVE_MODELS[letter] if letter in PASSIVES else MODELLED[letter].model_types
    known = home.models.get(key)
    if known is not None and known.model.type in types:
        return known
    site = Site(netlist.files, netlist.cards[number], home.context)
    name = netlist.items[number][1]
    assert isinstance(name, Word)
    flat = f"{home.prefix.removesuffix('.')}:{name.text}" if home.prefix else name.text
    words = PASSIVES[letter] if letter in PASSIVES else MODELLED[letter].words
    base = _base(netlist, draft, home, number, letter, site)
    card = read_model(
        site,
        netlist.items[number],
        types,
        words,
        home.scope,
        letter=letter,
        name=flat,
        card=number,
        path=home.path,
        base=base,
    )
    values = dict(card.model.parameters)
    settable = frozenset().union(*(family.model_parameters for family in families_of(letter))) | values.keys()
    for owner, parameter in [key for key in draft.changed_models if key[0] == fold(flat)]:
        if parameter in settable:
            values[parameter] = draft.changed_models.pop((owner, parameter))[2]
    card = replace(card, model=replace(card.model, parameters=tuple(values.items())))
    for twin in visible_models(netlist, home).twins.get(key, []):
        says = f"model {name.text} is defined twice; the first definition counts, as in ngspice"
        home.scope.notes.append(ReadingNote(Site(netlist.files, netlist.cards[twin]).where, says))
    home.models[key] = card
    draft.models[fold(flat)] = card.model
    return card


def _base(netlist: Netlist, draft: Draft, home: Surroundings, number: int, letter: str, site: Site) -> ModelCard | None:
    """Read the model that another one is a kind of; it must be seen from there and be another one."""
    word = base_name(netlist.items[number])
    if word is None:
        return None
    seen = visible_models(netlist, home).models
    found = seen.get(fold(word.text))
    if found is None or found[1] == number or base_name(netlist.items[found[1]]) is not None:
        problem = "is a kind of another one itself" if found else "does not exist"
        raise site.fault(word, f"model {word.text} {problem}", nearest(word.text, seen))
    says = f"a model made from {word.text} (AKO): ngspice reads that only in a compatibility mode"
    home.scope.notes.append(ReadingNote(site.where, says))
    return model_for(netlist, draft, found, word, letter)


def picked_bin(
    netlist: Netlist,
    draft: Draft,
    seen: Visible,
    part: ElementCard,
    word: Word,
    letter: str,
    site: Site,
) -> Word:
    """Pick the bin of a model (name.1, name.2, ..) by length and width."""
    for name in seen.bins[fold(word.text)]:
        model = model_for(netlist, draft, seen.models[name], Word(name, word.at), letter).model
        if fits(model, dict(part.parameters)):
            own = fold(model.name).rpartition(":")[2]
            return Word(own, word.at)
    sizes = " and ".join(f"{name}={dict(part.parameters)[name]:g}" for name in "lw" if name in dict(part.parameters))
    raise site.fault(word, f"no bin of model {word.text} takes {sizes or 'a transistor without l and w'}")
