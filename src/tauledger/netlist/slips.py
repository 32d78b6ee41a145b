"""Slips that leave a netlist readable: a request for what is not there, a node left alone, a title forgotten."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

from tauledger.circuit import ADDED, Circuit, ReadingNote, fold, terminals_of
from tauledger.netlist.diagnostics import Site, nearest, visible
from tauledger.netlist.draft import Draft
from tauledger.netlist.hints import Asked
from tauledger.netlist.letters import CONTROLLED, MODELLED, OWN, PASSIVES, SOURCES, TIME_FUNCTIONS
from tauledger.netlist.models import model_name
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.numbers import read_number
from tauledger.netlist.structure import KNOWN

MOST_NOTES = 12
# Looking for a name that is alike takes its time.
MOST_ALIKE = 2000

# Variables and inner nodes, which only ngspice can tell.
_OF_A_SCRIPT = re.compile(r"[#$@{}\[\]]")
_PARTS = re.compile(r"[\s(),=]+")


def strange_requests(draft: Draft, circuit: Circuit, requests: Sequence[Asked]) -> list[ReadingNote]:
    """Note every request for a node or an element that does not exist."""
    notes: list[ReadingNote] = []
    for request in requests:
        of = "node" if request.name[0] == "v" else "element"
        known = draft.numbers if of == "node" else draft.taken
        for name in request.name[2:-1].split(","):
            # ngspice puts the letter before the name of an element inside of an instance: v.x1.vsense.
            key = fold(name)
            tail = key.partition(".")[2] if of == "element" else key
            if _OF_A_SCRIPT.search(name) or key == "all" or key in known or tail in known:
                continue
            says = f"{request.word} {visible(request.name)}: no {of} is called {visible(name)!r}"
            alike = circuit.nodes if of == "node" else [*circuit.passives.name, *(e.name for e in circuit.elements)]
            meant = nearest(name, alike) if len(alike) <= MOST_ALIKE else ""
            notes.append(ReadingNote(request.site.where, f"{says}; {meant}" if meant else says))
    return notes


def single_connections(netlist: Netlist, draft: Draft, circuit: Circuit, spared: Iterable[int]) -> list[ReadingNote]:
    """Note every node to which one element only is connected, in a subcircuit once for all its instances.

    Counted is where the node's name belongs: on the cards of the netlist itself, or of the one instance.
    spared: numbers of nodes that need no second connection (those that are looked at).
    """
    import numpy as np

    plain = circuit.passives
    touches = [(node, e.path, e.card) for e in circuit.elements for node in e.nodes]
    touches += [(node, e.path, e.card) for e in circuit.elements for node in terminals_of(e) if node not in e.nodes]
    others = np.array([*touches, *draft.pins], dtype=np.int64).reshape(-1, 3)
    node = np.concatenate([plain.a, plain.b, others[:, 0]])
    path = np.concatenate([plain.path, plain.path, others[:, 1]])
    card = np.concatenate([plain.card, plain.card, others[:, 2]])
    written = card != ADDED
    node, path, card = node[written], path[written], card[written]
    everywhere = [number for number, name in enumerate(circuit.nodes) if fold(name) in netlist.globals]
    # An instance comes after the one that holds it: the least path is where the name belongs.
    home = np.full(len(circuit.nodes), len(circuit.instances))
    np.minimum.at(home, node, path)
    count = np.bincount(node[path == home[node]], minlength=len(circuit.nodes))
    count[everywhere] = np.bincount(node, minlength=len(circuit.nodes))[everywhere]
    count[[0, *spared]] = 0
    notes: dict[tuple[int, str], ReadingNote] = {}
    more = 0
    for number in np.flatnonzero(count == 1).tolist():
        instance = circuit.instances[int(home[number])]
        name = circuit.nodes[number].removeprefix(f"{instance.name}.") if instance.name else circuit.nodes[number]
        if (instance.definition, fold(name)) in notes:
            continue
        if len(notes) == MOST_NOTES:
            more += 1
            continue
        at = int(np.flatnonzero((node == number) & (path == home[number]))[0])
        site = Site(netlist.files, netlist.cards[int(card[at])])
        of = f" of subcircuit {visible(instance.subcircuit)}" if instance.name else ""
        only = visible(site.card.text.split(maxsplit=1)[0])
        says = f"node {visible(name)}{of} has one connection only, {only}"
        beside = [circuit.nodes[k] for k in np.flatnonzero((home == home[number]) & (count != 1)).tolist()]
        meant = _meant(name, [other.removeprefix(f"{instance.name}.") for other in beside[:MOST_ALIKE]])
        notes[(instance.definition, fold(name))] = ReadingNote(site.where, f"{says}; {meant}" if meant else says)
    found = list(notes.values())
    if more:
        found.append(ReadingNote(found[-1].where, f"{more} more nodes have one connection only"))
    return found


def _meant(name: str, others: list[str]) -> str:
    return "is ground, 0, meant?" if fold(name) == "o" else nearest(name, others)


def first_place(netlist: Netlist, draft: Draft, circuit: Circuit, node: int) -> str:
    """Give file and line of the first card of the netlist itself that names a node, e.g. "board.cir:12"."""
    plain = circuit.passives
    cards = [e.card for e in circuit.elements if e.path == 0 and node in e.nodes]
    cards += [card for number, path, card in draft.pins if path == 0 and number == node]
    cards += plain.card[(plain.path == 0) & ((plain.a == node) | (plain.b == node))].tolist()
    return Site(netlist.files, netlist.cards[min(card for card in cards if card != ADDED)]).where


def forgotten_title(netlist: Netlist, draft: Draft) -> ReadingNote | None:
    """Note a first line that would make a card: a dot card, or an element between nodes that exist without it."""
    line = netlist.files[0].text.partition("\n")[0].strip()
    what = _looks_like(line, netlist, draft)
    if not what:
        return None
    where = f"{visible(netlist.files[0].path)}:1"
    says = f"the first line is the title: it looks like {what}; if it is one, put a title above it"
    return ReadingNote(where, says)


def _looks_like(line: str, netlist: Netlist, draft: Draft) -> str:
    """Say what a line looks like, with its article; empty where it looks like a title."""
    words = [word for word in _PARTS.split(line) if word]
    if not words:
        return ""
    if fold(words[0]) in KNOWN:
        return f"a {fold(words[0])} card"
    letter, last = words[0][0].upper(), fold(words[-1])
    models = {model_name(netlist.items[number]) for number in netlist.top.models}
    nodes = 2
    if letter in PASSIVES:
        fits = len(words) > 3 and (read_number(words[3]) is not None or fold(words[3]) in models or words[3][0] in "{'")
    elif letter in SOURCES:
        fits = len(words) > 3 and (read_number(words[3]) is not None or fold(words[3]) in {"dc", "ac", *TIME_FUNCTIONS})
    elif letter in CONTROLLED:
        fits = len(words) > 4 and read_number(words[-1]) is not None
    elif letter in MODELLED:
        nodes = MODELLED[letter].least
        fits = any(fold(word) in models for word in words[nodes + 1 :])
    elif letter == "X":
        fits = len(words) > 2 and last in {fold(definition.name) for definition in netlist.top.definitions}
        nodes = len(words) - 2
    else:
        return ""
    if not fits or not all(fold(word) in draft.numbers for word in words[1 : nodes + 1]):
        return ""
    said = OWN.get(letter) or MODELLED[letter].words
    return f"{'an' if said[0] in 'aeiou' else 'a'} {said}"
