"""Where the circuit is driven and where the response is taken: from the options, else from the netlist itself."""

from __future__ import annotations

import cmath
import math
import re
from collections.abc import Mapping, Sequence

from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import GROUND, Circuit, Drive, Element, Port, PortKind, fold
from tauledger.errors import InputError
from tauledger.netlist.diagnostics import Site, nearest, visible
from tauledger.netlist.hints import Asked, foremost

OUTPUT_NAMES = ("out", "vout", "output")
MOST_CANDIDATES = 12

_VOLTAGE = re.compile(r"v\s*\(\s*([^(),\s]+)\s*(?:,\s*([^(),\s]+)\s*)?\)", re.IGNORECASE)
_CURRENT = re.compile(r"i\s*\(\s*([^(),\s]+)\s*\)", re.IGNORECASE)


class Driven(Struct, frozen=True):
    """The elements with the AC values that count, and the sources that are driven."""

    elements: tuple[Element, ...]
    drive: tuple[Drive, ...]


def choose_drive(elements: Sequence[Element], wanted: str | None, *, supplied: frozenset[int] = frozenset()) -> Driven:
    """Drive every source with an AC value, or those that are wanted and no other: one with 1, a pair with ½ and −½.

    wanted: "VIN", or "VP,VN" for the difference of two.
    supplied: numbers of the nodes that feed collectors and drains; a source there is a supply.
    Raises InputError where no source has an AC value, and where the wanted one does not exist or is no source.
    """
    sources = [element for element in elements if element.letter in "VI"]
    names = ", ".join(element.name for element in sources[:MOST_CANDIDATES])
    if wanted is not None:
        chosen = [_source(sources, name.strip(), names) for name in wanted.split(",")]
        sizes = {element.name: size for element, size in zip(chosen, _sizes(wanted, chosen), strict=True)}
        elements = [_with_ac(element, sizes.get(element.name, 0.0)) for element in elements]
        return Driven(tuple(elements), tuple(Drive(one.name, _kind(one), complex(sizes[one.name])) for one in chosen))
    driven = driven_as_written(elements)
    if not driven.drive:
        signals = [element for element in sources if supplied.isdisjoint(element.nodes)]
        first = min(signals, key=lambda element: element.parameter("dc", 0.0) != 0.0).name if signals else "SOURCE"
        raise InputError(
            "no source has an AC value",
            f"write AC 1 on the card of the source that carries the signal, or name it: --input {first}"
            + (f" (there are: {names})" if sources else ""),
        )
    return driven


def _source(sources: Sequence[Element], wanted: str, names: str) -> Element:
    for element in sources:
        if fold(element.name) == fold(wanted):
            return element
    raise InputError(
        f"no voltage or current source is called {visible(wanted)!r}",
        nearest(wanted, [element.name for element in sources], otherwise=f"there are: {names or 'none'}"),
    )


def _sizes(wanted: str, chosen: Sequence[Element]) -> tuple[float, ...]:
    if len(chosen) == 1:
        return (1.0,)
    if len(chosen) > 2:
        raise InputError(f"--input {visible(wanted)}: {len(chosen)} sources", "name one, or the two of a pair: VP,VN")
    if chosen[0] is chosen[1]:
        raise InputError(f"--input {visible(wanted)}: twice the same source", "name the two of a pair: VP,VN")
    if chosen[0].letter != chosen[1].letter:
        raise InputError(f"--input {visible(wanted)}: a voltage and a current", "name two sources of one kind")
    return 0.5, -0.5


def driven_as_written(elements: Sequence[Element]) -> Driven:
    """Drive every source with an AC value; there may be none."""
    drive = tuple(
        Drive(element.name, _kind(element), amplitude(element))
        for element in elements
        if element.letter in "VI" and element.parameter("acmag", 0.0) != 0.0
    )
    return Driven(tuple(elements), drive)


def amplitude(element: Element) -> complex:
    """Give a source's AC value as a complex number; the quarter turns come out exactly."""
    magnitude, phase = element.parameter("acmag", 0.0), element.parameter("acphase", 0.0)
    quarter, rest = divmod(phase, 90.0)
    if rest == 0.0:
        turns = (1.0 + 0.0j, 1.0j, -1.0 + 0.0j, -1.0j)
        return magnitude * turns[int(quarter) % 4]
    return cmath.rect(magnitude, math.radians(phase))


def _kind(element: Element) -> PortKind:
    return "voltage" if element.letter == "V" else "current"


def _with_ac(element: Element, magnitude: float) -> Element:
    if element.letter not in "VI":
        return element
    kept = tuple(pair for pair in element.parameters if pair[0] not in ("acmag", "acphase"))
    return replace(element, parameters=(*kept, ("acmag", magnitude), ("acphase", 0.0)))


class Chosen(Struct, frozen=True):
    """Where the response is taken. how: why there, empty where the user or a single hint names it.

    at: the card that asks for it, None where none does.
    """

    port: Port
    how: str = ""
    at: Site | None = None


def choose_output(
    wanted: str | None,
    hinted: Sequence[Asked],
    nodes: Sequence[str],
    currents: Mapping[str, Port],
    drive: Sequence[Port],
) -> Chosen:
    """Choose where the response is taken: as wanted, else as hinted, else the only node called out, vout or output.

    nodes: all nodes. currents: where the elements stand whose current can be read. drive: what the sources force; a
    hint at that is none. Raises InputError that lists candidates, NetlistError at the hint where nothing but a hint at
    what does not exist is there.
    """
    if wanted is not None:
        return Chosen(parse_port(wanted, nodes, currents))
    ports: dict[Port, Asked] = {}
    failed: list[tuple[Asked, InputError]] = []
    for hint in foremost(hinted):
        try:
            port = parse_port(hint.name, nodes, currents)
        except InputError as error:
            failed.append((hint, error))
            continue
        if port not in drive:
            ports.setdefault(port, hint)
    if len(ports) == 1:
        return Chosen(next(iter(ports)))
    named = [port for port in ports if fold(port.plus) in OUTPUT_NAMES and port.minus == GROUND]
    if not ports:
        named = [Port(node) for node in nodes if fold(node) in OUTPUT_NAMES]
    if len(named) == 1 and ports:
        words = " and ".join(dict.fromkeys(hint.word for hint in ports.values()))
        how = f"output {named[0]}: of {_listed(list(map(str, ports)))} asked for in {words}, the one called so"
        return Chosen(named[0], how, ports[named[0]].site)
    if len(named) == 1:
        return Chosen(named[0], f"output {named[0]}: the only node called {', '.join(OUTPUT_NAMES[:-1])} or output")
    if not ports and not named and failed:
        hint, cause = failed[0]
        raise hint.site.fault(hint.at, cause.message, cause.hint, wide=hint.width)
    candidates = [str(port) for port in ports] or [f"v({node})" for node in nodes if node != GROUND]
    message = "the netlist names several outputs" if ports else "the netlist does not say where the output is"
    raise InputError(
        message, f"name one: --output 'v(node)', 'v(node,node)' or 'i(source)'; there are {_listed(candidates)}"
    )


def _listed(names: Sequence[str]) -> str:
    return ", ".join(names[:MOST_CANDIDATES]) + (", .." if len(names) > MOST_CANDIDATES else "")


def parse_port(text: str, nodes: Sequence[str], currents: Mapping[str, Port]) -> Port:
    """Read an output: out, v(out), v(a,b) or i(vload); names are compared folded and come back as first written.

    Raises InputError for an unknown name, with the nearest one, and for an output that is zero by definition.
    """
    stripped = text.strip()
    current = _CURRENT.fullmatch(stripped)
    if current is not None:
        name = _known(current.group(1), tuple(currents), "voltage source or inductor")
        return Port(currents[name].plus, currents[name].minus, "current", name)
    voltage = _VOLTAGE.fullmatch(stripped)
    if voltage is None and ("(" in stripped or ")" in stripped or "," in stripped or not stripped):
        raise InputError(
            f"{visible(text)!r} is not an output", "write a node, 'v(node)', 'v(node,node)' or 'i(source)'"
        )
    plus, minus = voltage.groups() if voltage is not None else (stripped, None)
    first = _known(plus, nodes, "node")
    second = _known(minus, nodes, "node") if minus else GROUND
    if first == second:
        raise InputError(f"the output {visible(text)} is always 0", "name a node other than ground")
    return Port(first, second)


def port_of(circuit: Circuit, text: str) -> Port:
    """Read an output of a flat circuit as `parse_port` does, any node and the current of any source or inductor.

    Raises InputError as that does.
    """
    passives, nodes = circuit.passives, circuit.nodes
    ends = zip(passives.kind, passives.name, passives.a.tolist(), passives.b.tolist(), strict=True)
    currents = {name: Port(nodes[a], nodes[b]) for kind, name, a, b in ends if kind == "L"}
    for element in circuit.elements:
        if element.letter in "VL":
            currents[element.name] = Port(nodes[element.nodes[0]], nodes[element.nodes[1]])
    return parse_port(text, nodes, currents)


def _known(name: str, names: Sequence[str], words: str) -> str:
    key = GROUND if words == "node" and fold(name) == "gnd" else fold(name)
    for candidate in names:
        if fold(candidate) == key:
            return candidate
    listed = ", ".join(candidate for candidate in names[:MOST_CANDIDATES] if candidate != GROUND)
    raise InputError(
        f"no {words} is called {visible(name)!r}", nearest(name, names, otherwise=f"there are {listed or 'none'}")
    )
