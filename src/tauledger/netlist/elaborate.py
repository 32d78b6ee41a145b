"""From the netlist as read to the flat circuit: parameters, models and subcircuits get their values here.

Pure: the same netlist under another Change gives another circuit, and nothing is kept between two calls.
"""

from __future__ import annotations

import math
from typing import Literal

from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import ADDED, GROUND, NO_CHANGE, Change, Circuit, Element, Port, ReadingNote, fold
from tauledger.devices.family import WITH_INNER_NODES
from tauledger.errors import Diagnostic, ElementError, InputError, NetlistError
from tauledger.netlist.conditions import counts, define_all
from tauledger.netlist.diagnostics import Site, gather, nearest, visible
from tauledger.netlist.draft import Draft, Row, check_all_used, check_finite, draft_for, finished, inductors, passives
from tauledger.netlist.flatten import flatten
from tauledger.netlist.hints import asked, sweep_notes
from tauledger.netlist.items import Setting, Value, flattened
from tauledger.netlist.letters import PASSIVES
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.options import (
    EFFECTIVE,
    GEOMETRY,
    GEOMETRY_LEVELS,
    WITHOUT_EFFECT,
    option_settings,
    plain_value,
)
from tauledger.netlist.ports import (
    Chosen,
    Driven,
    choose_drive,
    choose_output,
    driven_as_written,
    parse_port,
)
from tauledger.netlist.references import check_references, coupling_notes
from tauledger.netlist.scopes import Scope, work_out_all
from tauledger.netlist.slips import first_place, forgotten_title, single_connections, strange_requests
from tauledger.netlist.surroundings import Surroundings

ABSOLUTE_ZERO_C = -273.15
ROOM_C = 27.0

# Models of these levels have nodes inside only behind a resistance of their own.
SIMPLE_LEVELS = frozenset({1, 2, 3, 6, 9})
INNER_RESISTANCES = ("rs", "rd", "rb", "rc", "re", "rsh", "rg")

Purpose = Literal["review", "reading"]


class Elaborated(Struct, frozen=True):
    """A circuit, and by number of the instance the scope in which its cards were read."""

    circuit: Circuit
    scopes: tuple[Scope, ...]


def elaborate(
    netlist: Netlist,
    change: Change = NO_CHANGE,
    *,
    drive: str | None = None,
    output: str | None = None,
    purpose: Purpose = "review",
) -> Circuit:
    """Give the flat circuit of a netlist under a change.

    drive: name of the one source to drive with 1, all others with 0; None drives every source with an AC value.
    output: "out", "v(out)", "v(a,b)" or "i(vload)"; None takes the netlist's hints, else the only node called out, vout
    or output. purpose "reading": elements that no device family rebuilds are kept, and drive and output may be missing
    (then the output is ground).
    Raises NetlistError (up to 20 diagnostics) where cards have no usable meaning, InputError where drive, output or
    change name what is not there.
    """
    return elaborated(netlist, change, drive=drive, output=output, purpose=purpose).circuit


def elaborated(
    netlist: Netlist,
    change: Change = NO_CHANGE,
    *,
    drive: str | None = None,
    output: str | None = None,
    purpose: Purpose = "review",
) -> Elaborated:
    """Do as `elaborate` and keep the parameters of every instance."""
    draft = draft_for(change)
    scope = Scope()
    faults: list[Diagnostic] = []
    _global_parameters(netlist, change, scope, faults)
    settings = _settings(netlist, change, scope, faults)
    draft.scale = settings.get("scale", 1.0)
    top = Surroundings(
        definition=netlist.top,
        scope=scope,
        prefix="",
        ports={},
        m=1.0,
        path=0,
        context=(),
        caller=None,
        lexical=None,
        models={},
        seen=[],
    )
    flatten(netlist, draft, top, faults)
    to_engine = ("gmin", *_add_shunts(netlist, draft, scope, settings))
    _default_geometry(draft, settings)
    faults.extend(draft.refusals if purpose == "review" else [])
    if faults:
        raise gather(faults, netlist.files)
    _check_ground(netlist, draft)
    check_all_used(draft)
    check_references(netlist, draft, faults)
    if faults:
        raise gather(faults, netlist.files)
    currents = _currents(draft)
    untitled = forgotten_title(netlist, draft)
    looked_at = asked(netlist)
    chosen = Chosen(Port(GROUND))
    if purpose == "reading" and drive is None and output is None:
        driven = driven_as_written(draft.elements)
    else:
        driven = _drive(draft, drive, untitled)
        forced = [currents[source.source] for source in driven.drive if source.kind == "voltage"]
        forced += [Port(port.minus, port.plus) for port in forced]
        chosen = choose_output(output, looked_at, draft.nodes, currents, forced)
    _add_loads(draft, change, currents)
    circuit = finished(
        draft,
        title=netlist.title,
        elements=driven.elements,
        drive=driven.drive,
        output=chosen.port,
        temperature_c=settings["temp"],
        tnom_c=settings["tnom"],
        options=tuple((name, settings[name]) for name in to_engine if name in settings),
        notes=(),
        nodesets=tuple(draft.nodesets.items()),
    )
    notes = [*netlist.notes, *([untitled] if untitled else []), *scope.notes, *sweep_notes(netlist)]
    notes += coupling_notes(netlist, draft)
    notes += strange_requests(draft, circuit, looked_at)
    if chosen.how:
        node = draft.numbers[fold(chosen.port.plus)]
        where = chosen.at.where if chosen.at else first_place(netlist, draft, circuit, node)
        notes.append(ReadingNote(where, chosen.how))
    spared = {fold(name) for hint in looked_at if hint.name[0] == "v" for name in hint.name[2:-1].split(",")}
    spared |= {fold(chosen.port.plus), fold(chosen.port.minus)}
    notes += single_connections(netlist, draft, circuit, [draft.numbers[n] for n in spared if n in draft.numbers])
    return Elaborated(replace(circuit, notes=tuple(dict.fromkeys(notes))), (scope, *draft.scopes))


def instance_context(netlist: Netlist, circuit: Circuit, path: int) -> tuple[str, ...]:
    """Word where an instance stands, innermost first: "in X3 (board.cir:41), subcircuit buffer (parts.lib:7)"."""
    lines = []
    while path > 0:
        instance = circuit.instances[path]
        at = Site(netlist.files, netlist.cards[instance.card]).where
        of = Site(netlist.files, netlist.cards[instance.definition]).where
        lines.append(f"in {instance.name} ({at}), subcircuit {instance.subcircuit} ({of})")
        path = instance.parent
    return tuple(lines)


def at_element(netlist: Netlist, circuit: Circuit, error: ElementError) -> NetlistError:
    """Give the error of one element at its card, with the instances around it."""
    element = next(one for one in circuit.elements if fold(one.name) == fold(error.element))
    card = netlist.cards[element.card]
    site = Site(netlist.files, card, instance_context(netlist, circuit, element.path))
    return site.fault(0, error.message, error.hint, wide=len(card.text.split(maxsplit=1)[0]))


def _global_parameters(netlist: Netlist, change: Change, scope: Scope, faults: list[Diagnostic]) -> None:
    for name, value in change.parameters:
        check_finite(name, value)
        scope.fixed[fold(name)] = value
    define_all(netlist, netlist.top, scope, ())
    for name, _value in change.parameters:
        if fold(name) not in scope.bindings:
            known = [binding.setting.name.text for binding in scope.bindings.values()]
            otherwise = f"there are {', '.join(known)}" if known else "the netlist has no .param"
            raise InputError(f"no parameter is called {visible(name)!r}", nearest(name, known, otherwise=otherwise))
    work_out_all(scope, faults)


def _settings(netlist: Netlist, change: Change, scope: Scope, faults: list[Diagnostic]) -> dict[str, float]:
    """Give temp and tnom in °C, gmin in S and scale where they are set; `.temp` wins over `.options temp`.

    Of several of one kind the last counts.
    """
    values = {"temp": ROOM_C, "tnom": ROOM_C}
    for number in netlist.options:
        site = Site(netlist.files, netlist.cards[number])
        for setting in option_settings(site, netlist.items[number]):
            name = fold(setting.name.text)
            if name in WITHOUT_EFFECT:
                scope.notes.append(ReadingNote(site.where, f"option {name}: {WITHOUT_EFFECT[name]}"))
            if name not in EFFECTIVE:
                continue
            try:
                values[name] = plain_value(site, setting.value, scope)
                if name == "gmin" and not values[name] >= 0.0:
                    raise site.fault(setting.value, "gmin must be 0 or more")
                if name in ("scale", "rshunt", "cshunt", *GEOMETRY) and not values[name] > 0.0:
                    raise site.fault(setting.value, f"{name} must be greater than 0")
                if name in ("temp", "tnom"):
                    _check_temperature(site, setting.value, values[name])
            except NetlistError as error:
                faults.extend(error.diagnostics)
    for number in netlist.temperatures:
        site = Site(netlist.files, netlist.cards[number])
        if not counts(netlist, number, scope):
            continue
        value = next(item for item in flattened(netlist.items[number][1:]) if not isinstance(item, Setting))
        try:
            values["temp"] = plain_value(site, value, scope)
            _check_temperature(site, value, values["temp"])
        except NetlistError as error:
            faults.extend(error.diagnostics)
    if change.temperature_c is not None:
        if not ABSOLUTE_ZERO_C < change.temperature_c < math.inf:
            raise InputError(f"{change.temperature_c:g} °C is no temperature", "absolute zero is -273.15 °C")
        values["temp"] = change.temperature_c
    return values


def _check_temperature(site: Site, item: Value, celsius: float) -> None:
    if not ABSOLUTE_ZERO_C < celsius < math.inf:
        raise site.fault(item, f"{celsius:g} °C is no temperature", "absolute zero is -273.15 °C")


def _check_ground(netlist: Netlist, draft: Draft) -> None:
    if not draft.rows and not draft.elements:
        raise InputError(
            f"{visible(netlist.path)} has no elements", "the first line is the title: is a card lost there?"
        )
    connected = any(0 in e.nodes for e in draft.elements) or any(
        0 in (row.a, row.b) if isinstance(row, Row) else 0 in row.a or 0 in row.b for row in draft.rows
    )
    if not connected:
        raise InputError("no element is connected to ground", "call one node 0: all voltages are taken against it")


def _drive(draft: Draft, wanted: str | None, untitled: ReadingNote | None) -> Driven:
    """Choose what is driven; where nothing is, a title that was forgotten may be why."""
    try:
        return choose_drive(draft.elements, wanted, supplied=_supplied(draft))
    except InputError as error:
        if untitled is None:
            raise
        raise InputError(error.message, f"{error.hint}\n  {untitled.where}: {untitled.says}") from error


def _supplied(draft: Draft) -> frozenset[int]:
    """Give the nodes that feed collectors and drains: directly, or through one resistor or inductor."""
    fed = {element.nodes[0] for element in draft.elements if element.letter in "QMJZ"}
    if any(element.parameter("acmag", 0.0) != 0.0 for element in draft.elements if element.letter in "VI"):
        return frozenset()
    through = passives(draft)
    ends = [(a, b) for k, a, b in zip(through.kind, through.a.tolist(), through.b.tolist(), strict=True) if k in "RL"]
    beyond = {b for a, b in ends if a in fed} | {a for a, b in ends if b in fed}
    return frozenset((fed | beyond) - {0})


def _currents(draft: Draft) -> dict[str, Port]:
    """Give the elements whose current can be an output, with the nodes between which they stand."""
    found = {
        element.name: Port(draft.nodes[element.nodes[0]], draft.nodes[element.nodes[1]])
        for element in draft.elements
        if element.letter == "V"
    }
    found |= {name: Port(draft.nodes[a], draft.nodes[b]) for name, a, b in inductors(draft)}
    return found


def _add_shunts(netlist: Netlist, draft: Draft, scope: Scope, settings: dict[str, float]) -> tuple[str, ...]:
    """Put what `.options rshunt` and cshunt ask for from every node to ground, as elements with names of their own.

    Gives the options that are left to the engine: rshunt where devices have nodes inside, which it loads as well.
    """
    left: list[str] = []
    for option, kind, words, unit in (("rshunt", "R", "a resistor", "Ω"), ("cshunt", "C", "a capacitor", "F")):
        if option not in settings:
            continue
        number, setting = _last_of(netlist, option)
        site = Site(netlist.files, netlist.cards[number])
        says = f"{words} of {settings[option]:.6g} {unit} stands from every node to ground: {kind}shunt.<node>"
        inside = [element for element in draft.elements if _has_inner_nodes(draft, element)]
        if option == "rshunt" and inside:
            left.append(option)
            says += f"; ngspice puts one to every node inside a device as well ({visible(inside[0].name)}), as here"
            unknown = [element.name for element in inside if element.letter not in WITH_INNER_NODES]
            if unknown:
                fault = site.fault(
                    setting,
                    f"rshunt loads the nodes inside {visible(unknown[0])} too, which is not supported",
                    f"write resistors from the nodes that need them, e.g. Rs1 node 0 {settings[option]:.6g}",
                )
                draft.refusals.extend(fault.diagnostics)
        else:
            for node, name in enumerate(draft.nodes[1:], 1):
                draft.rows.append(Row(kind, f"{kind}shunt.{name}", node, 0, settings[option], ADDED, 0))
        scope.notes.append(ReadingNote(site.where, says))
    return tuple(left)


def _default_geometry(draft: Draft, settings: dict[str, float]) -> None:
    """Give transistors what `.options defl`, defw and defad hold for those whose card does not."""
    given = {name: settings[option] for option, name in GEOMETRY.items() if option in settings}
    for k, element in enumerate(draft.elements):
        model = draft.models.get(fold(element.model)) if given and element.letter == "M" else None
        if model is not None and model.level in GEOMETRY_LEVELS and model.type in ("nmos", "pmos"):
            draft.elements[k] = replace(element, parameters=tuple({**given, **dict(element.parameters)}.items()))


def _last_of(netlist: Netlist, option: str) -> tuple[int, Setting]:
    """Find the card and the setting of an option that counts."""
    found = [
        (number, setting)
        for number in netlist.options
        for setting in option_settings(Site(netlist.files, netlist.cards[number]), netlist.items[number])
        if fold(setting.name.text) == option
    ]
    return found[-1]


def _has_inner_nodes(draft: Draft, element: Element) -> bool:
    """Say whether an element may have nodes inside.

    A line has, an R, C or L given by a formula, and a device whose model has a resistance or is none of the simple
    ones.
    """
    if element.letter in "TO" or (element.letter in PASSIVES and element.formula is not None):
        return True
    model = draft.models.get(fold(element.model))
    if model is None or element.letter not in WITH_INNER_NODES:
        return False
    return model.level not in SIMPLE_LEVELS or any(model.parameter(name, 0.0) for name in INNER_RESISTANCES)


def _add_loads(draft: Draft, change: Change, currents: dict[str, Port]) -> None:
    for load in change.loads:
        check_finite("load", load.value)
        if load.value < 0.0 or (load.kind == "R" and load.value == 0.0):
            raise InputError(f"a load of {load.value:g} is not possible", "give a value greater than 0")
        port = parse_port(f"v({load.plus},{load.minus})", draft.nodes, currents)
        ends = port.plus if port.minus == GROUND else f"{port.plus}, {port.minus}"
        name = f"{load.kind} added at {ends}"
        number = 1
        while fold(name) in draft.taken:
            number += 1
            name = f"{load.kind} added at {ends}, {number}"
        draft.taken[fold(name)] = ADDED
        a, b = draft.numbers[fold(port.plus)], draft.numbers[fold(port.minus)]
        draft.rows.append(Row(load.kind, name, a, b, load.value, ADDED, 0))
