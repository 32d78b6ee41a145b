"""The flat circuit while it grows: nodes by number, passives in rows, and which changes have found their place."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from itertools import chain, groupby

from msgspec import Struct, field

from tauledger.circuit import (
    GROUND,
    Change,
    Circuit,
    Drive,
    Element,
    Instance,
    Model,
    Passives,
    Port,
    ReadingNote,
    fold,
)
from tauledger.errors import Diagnostic, InputError
from tauledger.netlist.diagnostics import nearest, visible
from tauledger.netlist.scopes import Scope

MOST_ELEMENTS = 250_000
MOST_INSTANCES = 20_000
MOST_NESTED_INSTANCES = 60


class Row(Struct, frozen=True):
    """One plain R, C or L."""

    kind: str
    name: str
    a: int
    b: int
    value: float
    card: int
    path: int


class Block(Struct, frozen=True):
    """Plain R, C and L of one instance as columns; values with all m worked in."""

    kind: str
    names: list[str]
    a: list[int]
    b: list[int]
    values: list[float]
    cards: Sequence[int]
    path: int


class Draft(Struct):
    """What elaboration has gathered so far.

    numbers: node number by folded flat name. taken: by flat element name the number of its card. changed: values of a
    Change by folded name that have not been used yet; used ones are taken out. refusals: what can be read but not
    reviewed. nodesets: volt by node number. scale: `.options scale`. scopes: of all instances but the netlist itself.
    contexts: per instance the lines that say where it stands. pins: node number, path and card of every node on an X
    card. full: a limit on the size of the circuit has been reached, nothing more is read. divided: by folded flat
    name the m of each inductor that has one.
    """

    nodes: list[str] = field(default_factory=lambda: [GROUND])
    numbers: dict[str, int] = field(default_factory=lambda: {GROUND: 0, "gnd": 0})
    rows: list[Row | Block] = field(default_factory=list)
    elements: list[Element] = field(default_factory=list)
    models: dict[str, Model] = field(default_factory=dict)
    instances: list[Instance] = field(default_factory=lambda: [Instance("", "", -1, -1, -1)])
    taken: dict[str, int] = field(default_factory=dict)
    changed_elements: dict[str, tuple[str, float]] = field(default_factory=dict)
    changed_models: dict[tuple[str, str], tuple[str, str, float]] = field(default_factory=dict)
    changed_given: dict[tuple[str, str], tuple[str, str, float]] = field(default_factory=dict)
    fixed: set[str] = field(default_factory=set)
    refusals: list[Diagnostic] = field(default_factory=list)
    nodesets: dict[int, float] = field(default_factory=dict)
    scale: float = 1.0
    scopes: list[Scope] = field(default_factory=list)
    contexts: list[tuple[str, ...]] = field(default_factory=lambda: [()])
    pins: list[tuple[int, int, int]] = field(default_factory=list)
    full: bool = False
    divided: dict[str, float] = field(default_factory=dict)


def check_finite(name: str, value: float) -> None:
    """Raise InputError for a value of a Change that is no number."""
    if not math.isfinite(value):
        raise InputError(f"{visible(name)}: {value} is not a finite number")


def draft_for(change: Change) -> Draft:
    """Begin a circuit that a Change will alter; raises InputError for a value that is not finite."""
    draft = Draft()
    for name, value in (*change.elements, *((p, value) for _, p, value in (*change.models, *change.given))):
        check_finite(name, value)
    draft.changed_elements = {fold(name): (name, value) for name, value in change.elements}
    draft.changed_given = {(fold(of), fold(p)): (of, p, value) for of, p, value in change.given}
    draft.changed_models = {(fold(m), fold(p)): (m, p, value) for m, p, value in change.models}
    return draft


def node_number(draft: Draft, flat: str) -> int:
    """Give the number of a node by its flat name; the first spelling is kept."""
    key = fold(flat)
    number = draft.numbers.get(key)
    if number is None:
        number = len(draft.nodes)
        draft.numbers[key] = number
        draft.nodes.append(flat)
    return number


def check_all_used(draft: Draft) -> None:
    """Raise InputError for a change that found no element or model of its name."""
    for name, _value in draft.changed_elements.values():
        if fold(name) in draft.fixed:
            raise InputError(f"{visible(name)} has no single value that could be set", "set a parameter of its model")
        known = [*passives(draft).name] + [e.name for e in draft.elements if e.letter in "VIEFGH"]
        raise InputError(
            f"no element is called {visible(name)!r}", nearest(name, known, otherwise=f"there are {_listed(known)}")
        )
    for name, parameter, _value in draft.changed_given.values():
        known = [*(instance.name for instance in draft.instances[1:]), *(element.name for element in draft.elements)]
        if fold(name) not in draft.taken:
            otherwise = f"there are {_listed(known)}"
            raise InputError(f"nothing is called {visible(name)!r}", nearest(name, known, otherwise=otherwise))
        raise InputError(f"{visible(name)} has no parameter {visible(parameter)!r} that could be set")
    for name, parameter, _value in draft.changed_models.values():
        known = [model.name for model in draft.models.values()]
        if fold(name) not in {fold(model) for model in known}:
            raise InputError(
                f"no model in use is called {visible(name)!r}",
                nearest(name, known, otherwise=f"there are {_listed(known)}"),
            )
        raise InputError(f"model {visible(name)} has no parameter {visible(parameter)!r}")


def _listed(names: list[str]) -> str:
    return (", ".join(names[:12]) + (", .." if len(names) > 12 else "")) or "none"


def passives(draft: Draft) -> Passives:
    """Turn rows and blocks into columns."""
    import numpy as np

    blocks = _blocks(draft.rows)
    return Passives(
        kind="".join(block.kind for block in blocks),
        name=tuple(chain.from_iterable(block.names for block in blocks)),
        a=np.fromiter(chain.from_iterable(block.a for block in blocks), dtype=np.int32),
        b=np.fromiter(chain.from_iterable(block.b for block in blocks), dtype=np.int32),
        value=np.fromiter(chain.from_iterable(block.values for block in blocks), dtype=np.float64),
        card=np.fromiter(chain.from_iterable(block.cards for block in blocks), dtype=np.int32),
        path=np.repeat([block.path for block in blocks], [len(block.kind) for block in blocks]).astype(np.int32),
    )


def _blocks(rows: list[Row | Block]) -> list[Block]:
    """Put single rows in a row into blocks; a block has one path."""
    blocks: list[Block] = []
    for path, group in groupby(rows, key=lambda row: (isinstance(row, Block), row.path)):
        if path[0]:
            blocks += [block for block in group if isinstance(block, Block)]
            continue
        single = [row for row in group if isinstance(row, Row)]
        blocks.append(
            Block(
                kind="".join(row.kind for row in single),
                names=[row.name for row in single],
                a=[row.a for row in single],
                b=[row.b for row in single],
                values=[row.value for row in single],
                cards=[row.card for row in single],
                path=path[1],
            )
        )
    return blocks


def inductors(draft: Draft) -> Iterator[tuple[str, int, int]]:
    """Run through the plain inductors: name and node numbers."""
    for row in draft.rows:
        if isinstance(row, Row):
            if row.kind == "L":
                yield row.name, row.a, row.b
            continue
        at = row.kind.find("L")
        while at >= 0:
            yield row.names[at], row.a[at], row.b[at]
            at = row.kind.find("L", at + 1)


def finished(
    draft: Draft,
    *,
    title: str,
    elements: tuple[Element, ...],
    drive: tuple[Drive, ...],
    output: Port,
    temperature_c: float,
    tnom_c: float,
    options: tuple[tuple[str, float], ...],
    notes: tuple[ReadingNote, ...],
    nodesets: tuple[tuple[int, float], ...] = (),
) -> Circuit:
    """Freeze the draft; models that were read but are not used stay behind."""
    used = {element.model for element in elements}
    return Circuit(
        title=title,
        nodes=tuple(draft.nodes),
        passives=passives(draft),
        elements=elements,
        models=tuple(model for model in draft.models.values() if model.name in used),
        drive=drive,
        output=output,
        temperature_c=temperature_c,
        tnom_c=tnom_c,
        options=options,
        instances=tuple(draft.instances),
        notes=notes,
        nodesets=nodesets,
    )
