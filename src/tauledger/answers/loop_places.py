"""Where a return ratio is taken: what a name means, and the loop that is found without being asked for.

"M6", "E2", "XU1.G1": the return ratio of that source. "R3": of its admittance. "Q1.base", "M1.g": the wire into that
terminal. "XU1", folded: the source inside it that its two inputs control.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.double_injection import Cut, cut_into, cut_out_of
from tauledger.circuit import GROUND, Circuit, Instance, fold
from tauledger.devices.catalogue import linearise
from tauledger.devices.family import Device
from tauledger.devices.instances import elements_inside, macromodels
from tauledger.devices.parts import Part, voltage_source
from tauledger.errors import InputError, NetworkError
from tauledger.explain import Explanation
from tauledger.hand.equivalent import joined_nodes
from tauledger.hand.feedback import LOOP_ABOVE, FoundLoop, find_loop
from tauledger.network.admittance import admittance
from tauledger.network.assemble import Network, assemble
from tauledger.network.loop_shape import signed_size
from tauledger.network.return_ratio import (
    BILATERAL,
    CONTROLLED,
    VOLTAGE_KINDS,
    Opening,
    at_admittance,
    at_source,
    at_wire,
    leaves_there,
    return_ratio,
)
from tauledger.network.solve import on_axis, solve
from tauledger.network.spectrum import is_regular
from tauledger.network.transformers import REFLECTED, TURNS
from tauledger.numbers import Numbers

FAR_BELOW = 1e6
NO_LOOP = 1e-9
DIES = 0.1
HELD = "loop'held"


class Amplifier(Struct, frozen=True):
    """An instance as an amplifier by itself: its parts, control pair and output pin, and the other pins."""

    name: str
    parts: tuple[Part, ...]
    control: tuple[str, str]
    output: str
    others: tuple[str, ...]


class Place(Struct, frozen=True):
    """One place at which T is taken.

    name: as the user gave it, or as they would. where: in words. cut: where ngspice injects to give the same T, None
    where no wire carries it alone. device: the transistor at which a wire's loop is worked out by hand. path: nodes.
    control: what its control terminal is called.
    """

    name: str
    where: str
    opening: Opening
    cut: Cut | None = None
    found: bool = False
    device: str = ""
    path: tuple[str, ...] = ()
    amplifier: Amplifier | None = None
    loop: FoundLoop | None = None
    control: str = ""


def named_place(numbers: Numbers, name: str) -> Place:
    """Give the place that a name means.

    Raises InputError where it means none.
    """
    network = open_network(numbers)
    device = next((one for one in numbers.devices if _is(one.name, name) and one.cell is not None), None)
    owner, dot, terminal = name.rpartition(".")
    if device is not None and device.terminals:
        parts = _controlled(network, device.name)
        return Place(
            device.name,
            f"gm of {device.name}",
            at_source(network, parts),
            device=device.name,
            control=_control_word(device),
        )
    parts = _controlled(network, name)
    if any(part.label == TURNS for part in parts):
        raise InputError(f"--loop {name}: a winding of a transformer is no single source", _known(numbers, network))
    if parts:
        return _at_controlled(numbers, network, parts)
    part = next((one for one in network.parts if _is(one.name, name) and one.kind in BILATERAL), None)
    if part is not None:
        opening = at_admittance(network, part)
        _require_reference(numbers, opening, name)
        return Place(part.name, f"admittance of {part.name}, against none", opening)
    instance = None if numbers.circuit is None else _instance(numbers.circuit, name)
    if instance is not None:
        return _at_instance(numbers, network, instance)
    transistor = next((one for one in numbers.devices if dot and _is(one.name, owner) and one.terminals), None)
    if transistor is not None:
        return _into_terminal(numbers, transistor, terminal)
    raise InputError(f"--loop {name}: no return ratio can be taken there", _known(numbers, network))


def _require_reference(numbers: Numbers, opening: Opening, name: str) -> None:
    """Raise InputError where the network has no solution without the element, at any frequency."""
    poles = [abs(pole.s) for pole in numbers.poles.poles if pole.s]
    between = float(np.exp(np.mean(np.log(poles)))) if poles else 1.0
    y = admittance(opening.network, np.array([between * np.exp(0.7j)]))[0]
    if not is_regular(y):
        raise InputError(
            f"--loop {name}: without {name} the network has no solution: nothing else holds one of its nodes",
            "name an element with others beside it",
        )


def find_places(numbers: Numbers, explanation: Explanation) -> list[Place]:
    """Find the loop around the amplifier, or those of its macromodels; none where there is none, or several."""
    instances = [] if numbers.circuit is None else _folded(numbers, macromodels(numbers.circuit))
    if instances:
        return _loops_of_instances(numbers, instances)
    hand = explanation.hand
    if hand is None:
        return []
    network, at_hz = numbers.network, numbers.midband.frequency_hz
    loop = find_loop(network, numbers.devices, hand.nodes, hand.stages, at_hz)
    if loop is None:
        return []
    if not loop.node:
        parts = _controlled(network, loop.owner)
        return [_found(_at_controlled(numbers, network, parts))]
    cut = None if numbers.circuit is None else cut_into(numbers.circuit, loop.owner, loop.node)
    return [
        Place(
            f"{loop.owner}.{loop.word}",
            f"wire into the {loop.word} of {loop.owner} ({loop.node})",
            at_wire(network, loop.owner, loop.node),
            cut,
            found=True,
            device=loop.device,
            path=(loop.node, *loop.path),
            loop=loop,
        )
    ]


def closing_source(numbers: Numbers, place: Place) -> tuple[Opening | None, str]:
    """Give the source for which the asymptotic gain formula is written: the place's own, or that of a wire's loop."""
    if place.opening.kind != "wire":
        return place.opening, place.where
    if not place.device:
        return None, ""
    return at_source(numbers.network, _controlled(numbers.network, place.device)), f"gm of {place.device}"


def input_source(numbers: Numbers, place: Place) -> Opening | None:
    """Give the source whose ideal gain is that of the feedback elements: of a wire, the transistor that it leads to."""
    if place.opening.kind != "wire":
        return place.opening if place.opening.kind == "source" else None
    parts = [] if place.loop is None else _controlled(numbers.network, place.loop.owner)
    return at_source(numbers.network, parts) if parts else None


def open_network(numbers: Numbers) -> Network:
    """Give the network with every instance open, so that what is inside a macromodel has a name."""
    folded = any(part.kind == "block" and part.label == "inside" for part in numbers.network.parts)
    if not folded or numbers.circuit is None or numbers.bias is None or len(numbers.circuit.instances) < 2:
        return numbers.network
    parts = linearise(numbers.circuit, numbers.bias).parts
    return Network.from_parts(parts, output=numbers.circuit.output)


def _found(place: Place) -> Place:
    return replace(place, found=True)


def _is(own: str, given: str) -> bool:
    return fold(own) == fold(given)


def _controlled(network: Network, owner: str) -> list[Part]:
    """Give the controlled parts of an owner, with those that stand in series for it ("E2'2")."""
    return [part for part in network.parts if part.kind in CONTROLLED and _is(part.owner.partition("'")[0], owner)]


def _at_controlled(numbers: Numbers, network: Network, parts: list[Part]) -> Place:
    owner = parts[0].owner.partition("'")[0]
    cut = None if numbers.circuit is None else cut_out_of(numbers.circuit, owner)
    return Place(owner, f"source {owner}", at_source(network, parts), cut, amplifier=_lone(parts))


def _lone(parts: list[Part]) -> Amplifier | None:
    """A controlled voltage source with two live inputs, alone, is an amplifier without a pole."""
    part = parts[0]
    if len(parts) > 1 or part.kind not in VOLTAGE_KINDS or part.references or part.nodes[1] != GROUND:
        return None
    return Amplifier(part.owner, (part,), (part.nodes[2], part.nodes[3]), part.nodes[0], ())


def _control_word(device: Device) -> str:
    assert device.cell is not None
    control = device.cell.control
    return next((t.word for t in device.terminals if t.inner == control), "control")


def _into_terminal(numbers: Numbers, device: Device, terminal: str) -> Place:
    words = [t for t in device.terminals if t.word.startswith(fold(terminal))] if terminal else []
    if len(words) != 1:
        known = ", ".join(f"{device.name}.{t.word}" for t in device.terminals if t.outer != GROUND)
        raise InputError(f"--loop {device.name}.{terminal}: no such terminal", f"wires there: {known}")
    at = words[0]
    cut = None if numbers.circuit is None else cut_into(numbers.circuit, device.name, at.outer)
    outward = leaves_there(numbers.network, device.name, at.outer, complex(on_axis(_reference(numbers))[0]))
    if outward and cut is not None:
        cut = replace(cut, source=True)
    where = f"wire {'out of' if outward else 'into'} the {at.word} of {device.name} ({at.outer})"
    opening = at_wire(numbers.network, device.name, at.outer, outward=outward)
    return Place(f"{device.name}.{at.word}", where, opening, cut)


def _instance(circuit: Circuit, name: str) -> Instance | None:
    wanted = {fold(name), "x" + fold(name)}
    return next((one for one in circuit.instances[1:] if fold(one.name) in wanted), None)


def _folded(numbers: Numbers, instances: Iterable[Instance]) -> list[Instance]:
    names = {part.owner for part in numbers.network.parts if part.kind == "block"}
    return [one for one in instances if one.name in names]


def _at_instance(numbers: Numbers, network: Network, instance: Instance) -> Place:
    """Give the source inside an instance that a pair of its pins controls."""
    assert numbers.circuit is not None
    elements = elements_inside(numbers.circuit, instance)
    inside = [part for part in network.parts if fold(part.owner.partition("'")[0]) in elements]
    names = {part.name for part in inside}
    outer = {node for part in network.parts if part.name not in names for node in part.nodes} - {GROUND}
    outer |= {numbers.network.port.plus, numbers.network.port.minus} - {GROUND, ""}
    touched = {node for part in inside for node in part.nodes}
    pins = tuple(node for node in network.unknowns[: network.n_nodes] if node in outer & touched)
    moved = _moved(network)
    sources = [part for part in inside if part.kind in CONTROLLED and not part.references]
    inputs = [
        part
        for part in sources
        if set(part.nodes[2:]) <= {*pins, GROUND} and part.nodes[2] != part.nodes[3] and set(part.nodes[2:]) & moved
    ]
    if not inputs:
        told = ", ".join(dict.fromkeys(part.owner.partition("'")[0] for part in sources)) or "none"
        raise InputError(
            f"--loop {instance.name}: no source inside is controlled by its inputs", f"sources inside: {told}"
        )
    # of several, as of differential and common-mode stages, the loop is closed by the one with the largest T
    at_hz = _reference(numbers)
    owners = dict.fromkeys(part.owner.partition("'")[0] for part in inputs)
    owner = max(owners, key=lambda one: abs(_ratio(network, one, at_hz)))
    if abs(_ratio(network, owner, at_hz)) < NO_LOOP:
        fed_back = _fed_back_current(network, inside, pins, at_hz)
        if fed_back:
            where = f"source {fed_back.removeprefix(instance.name + '.')} of {instance.name}"
            return Place(
                instance.name,
                where,
                at_source(network, _controlled(network, fed_back)),
                cut_out_of(numbers.circuit, fed_back),
            )
    part = next(part for part in inputs if part.owner.partition("'")[0] == owner)
    opening = at_source(network, _controlled(network, owner))
    control = (part.nodes[2], part.nodes[3])
    output = _output_pin(opening, pins, at_hz)
    others = tuple(pin for pin in pins if pin not in (*control, output))
    amplifier = Amplifier(instance.name, tuple(inside), control, output, others) if output else None
    where = f"input source {owner.removeprefix(instance.name + '.')} of {instance.name}"
    return Place(instance.name, where, opening, cut_out_of(numbers.circuit, owner), amplifier=amplifier)


def _fed_back_current(network: Network, inside: list[Part], pins: tuple[str, ...], at_hz: float) -> str:
    """Name the source inside with the largest T that dies when the pin which it moves most is held; empty for none.

    Feedback to a low-impedance input comes as a current: no source has it between its input pins.
    """
    owners = dict.fromkeys(
        part.owner.partition("'")[0]
        for part in inside
        if part.kind in CONTROLLED and part.label not in (TURNS, REFLECTED)
    )
    for owner in sorted(owners, key=lambda one: -abs(_ratio(network, one, at_hz))):
        output = _output_pin(at_source(network, _controlled(network, owner)), pins, at_hz)
        t = abs(_ratio(network, owner, at_hz))
        if t < NO_LOOP or not output:
            continue
        held = (*network.parts, voltage_source(HELD, output, GROUND))
        if abs(_ratio(assemble(held, network.port, network.amplitudes), owner, at_hz)) < DIES * t:
            return owner
    return ""


def _reference(numbers: Numbers) -> float:
    """Give mid-band; for that at DC, where an integrator opened has no answer, a frequency far below all poles."""
    at_hz = numbers.midband.frequency_hz
    if at_hz > 0.0:
        return at_hz
    moving = [abs(pole.s) for pole in numbers.poles.poles if pole.s != 0.0]
    return min(moving, default=2.0 * np.pi) / (2.0 * np.pi) / FAR_BELOW


def _ratio(network: Network, owner: str, at_hz: float) -> complex:
    return complex(return_ratio(at_source(network, _controlled(network, owner)), on_axis(at_hz))[0])


def _moved(network: Network) -> set[str]:
    """Name the nodes that no source holds still, as supplies are held."""
    still = {part.name for part in network.parts if part.kind == "voltage source" and not network.amplitude(part)}
    at = joined_nodes(network, still)
    return {node for node, held in at.items() if held != GROUND}


def _output_pin(opening: Opening, pins: Iterable[str], at_hz: float) -> str:
    """Name the pin that the source inside moves most."""
    network = opening.network
    driven = solve(replace(network, drive=opening.out.astype(complex)), on_axis(at_hz)).x[0]
    size = {pin: abs(complex(driven[row])) for pin in pins if (row := network.index(pin)) is not None}
    pin = max(size, key=lambda one: size[one], default="")
    return pin if pin and size[pin] > 0.0 else ""


def _loops_of_instances(numbers: Numbers, instances: list[Instance]) -> list[Place]:
    """Give every macromodel around which there is negative feedback with T above 1 at mid-band."""
    network = open_network(numbers)
    found = []
    for instance in instances:
        try:
            place = _at_instance(numbers, network, instance)
            t = signed_size(complex(return_ratio(place.opening, on_axis(_reference(numbers)))[0]))
        except (InputError, NetworkError):
            continue
        if t > LOOP_ABOVE:
            found.append(_found(place))
    return found


def _known(numbers: Numbers, network: Network) -> str:
    devices = [one.name for one in numbers.devices if one.cell is not None and one.terminals]
    sources = dict.fromkeys(
        part.owner.partition("'")[0]
        for part in network.parts
        if part.kind in CONTROLLED and part.owner not in devices and part.label not in (TURNS, REFLECTED)
    )
    named = [*devices, *sources]
    some = ", ".join(named[:8]) + (", …" if len(named) > 8 else "")
    first = next((one for one in numbers.devices if one.cell is not None and one.terminals), None)
    wire = f"{first.name}.{_control_word(first)}" if first is not None else ""
    also = f", a wire into a terminal ({wire})" if wire else ""
    return f"name a source ({some or 'none here'}), a resistor, capacitor or inductor{also}"
