"""Elements that others depend on: each must exist and be of the right kind; its name comes back as first written."""

from __future__ import annotations

import math
from collections.abc import Mapping

from msgspec.structs import replace

from tauledger.circuit import Apply, Current, Element, Formula, ReadingNote, fold
from tauledger.errors import Diagnostic
from tauledger.netlist.diagnostics import Site, nearest, visible
from tauledger.netlist.draft import Draft, inductors
from tauledger.netlist.netlist import Netlist

# What F, H, W and i() measure: the elements with a branch current of their own.
MEASURED = frozenset("VEHL")


def check_references(netlist: Netlist, draft: Draft, faults: list[Diagnostic]) -> None:
    """Replace each reference by the name of the element it means; a fault is added for one that means none."""
    coils = {fold(name): name for name, _, _ in inductors(draft)}
    formulas = [element for element in draft.elements if element.letter == "L" and element.formula is not None]
    coils |= {fold(e.name): e.name for e in draft.elements if e.letter == "L" and e not in formulas}
    sources = {fold(element.name): element.name for element in draft.elements if element.letter == "V"}
    measured = {fold(e.name): e.name for e in draft.elements if e.letter in MEASURED and e not in formulas} | coils
    for k, element in enumerate(draft.elements):
        if not element.references and element.formula is None:
            continue
        known, words = (coils, "inductor") if element.letter == "K" else (sources, "voltage source")
        resolved: list[str] = []
        for name in element.references:
            _resolve(netlist, draft, element, name, known, words, resolved, faults)
        formula = None if element.formula is None else _renamed(element.formula, measured, element.path)
        for name in _currents(formula):
            _resolve(netlist, draft, element, name, measured, "element with a current", [], faults)
        if len(resolved) == len(element.references):
            draft.elements[k] = replace(element, references=tuple(resolved), formula=formula)


def coupling_notes(netlist: Netlist, draft: Draft) -> list[ReadingNote]:
    """Say of each coupling between inductors with m which coupling ngspice has: its M is of the inductors without m."""
    notes = []
    for element in draft.elements:
        divided = math.prod(draft.divided.get(fold(name), 1.0) for name in element.references)
        if element.letter != "K" or divided == 1.0:
            continue
        coupling = element.parameter("coupling", 0.0)
        says = (
            f"{element.name} couples {' and '.join(element.references)}, their m worked in, with {coupling:g}; ngspice "
            f"takes the mutual inductance of both without m, a coupling of {coupling * math.sqrt(divided):.4g}"
        )
        site = Site(netlist.files, netlist.cards[element.card])
        notes.append(ReadingNote(site.where, says))
    return notes


def _resolve(
    netlist: Netlist,
    draft: Draft,
    element: Element,
    name: str,
    known: Mapping[str, str],
    words: str,
    resolved: list[str],
    faults: list[Diagnostic],
) -> None:
    found = _found(name, known, element.path)
    if found is not None:
        resolved.append(found)
        return
    site = Site(netlist.files, netlist.cards[element.card], draft.contexts[element.path])
    prefix = draft.instances[element.path].name
    local = name[len(prefix) + 1 :] if prefix else name
    beside = [other[len(prefix) + 1 :] if prefix else other for other in known.values() if other.startswith(prefix)]
    at = _at(site.card.text, local)
    message = f"no {words} is called {visible(local)!r}"
    hint = nearest(local, beside, otherwise="it must stand in the same subcircuit")
    faults.extend(site.fault(at, message, hint, wide=len(local)).diagnostics)


def _at(text: str, name: str) -> int:
    """Find a name on its card, behind the element's own name."""
    head = len(text.split(maxsplit=1)[0])
    found = text.lower().find(name.lower(), head)
    return 0 if found < 0 else found


def _found(name: str, known: Mapping[str, str], path: int) -> str | None:
    """Give an element by its flat name; from the netlist itself one inside an instance is v.x1.v1 as well."""
    found = known.get(fold(name))
    if found is None and path == 0 and name[1:2] == ".":
        return known.get(fold(name[2:]))
    return found


def _renamed(formula: Formula, names: Mapping[str, str], path: int) -> Formula:
    match formula:
        case Current(source=source):
            return Current(_found(source, names, path) or source)
        case Apply(function=function, arguments=arguments):
            return Apply(function, tuple(_renamed(part, names, path) for part in arguments))
    return formula


def _currents(formula: Formula | None) -> list[str]:
    match formula:
        case Current(source=source):
            return [source]
        case Apply(arguments=arguments):
            return [name for part in arguments for name in _currents(part)]
    return []
