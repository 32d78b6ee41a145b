"""Instances alone: the circuit in which they are measured, and their answers put together.

Every terminal stands on a voltage source of its own, ground included; a source that the instance refers to carries a
forced current. The engine is asked with unit AC on one of them after the other, of all instances at once: they do not
touch each other. One terminal may be ground itself: a thousand sources less for a thousand transistors.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.circuit import (
    GROUND,
    Apply,
    Circuit,
    Drive,
    Element,
    Formula,
    Passives,
    Port,
    Voltage,
    fold,
    terminals_of,
)
from tauledger.devices.catalogue import shunt_siemens
from tauledger.engine.deck import Deck, write_deck
from tauledger.engine.grid import GRID_TOLERANCE, plan
from tauledger.engine.protocol import Message
from tauledger.engine.verdict import judge
from tauledger.errors import EngineError
from tauledger.solution import Isolation, Samples

Complex = NDArray[np.complex128]

# Lines of the engine that an error repeats.
TOLD = 6


class Alone(Struct, frozen=True):
    """One instance in the circuit of several: its name there, its terminals, and its sources.

    terminals: names of the user's nodes. holders, forced: voltage sources at the terminals, forced currents. driven:
    places of the terminals that are driven. grounded: place of the terminal without a holder, or None.
    """

    isolation: Isolation
    name: str
    terminals: tuple[str, ...]
    holders: tuple[str, ...]
    forced: tuple[str, ...]
    driven: tuple[int, ...]
    grounded: int | None = None

    @property
    def held(self) -> tuple[int, ...]:
        """Places of the terminals with a holder, in the order of the holders."""
        return tuple(place for place in range(len(self.terminals)) if place != self.grounded)

    @property
    def sources(self) -> tuple[str, ...]:
        """What is driven, one after the other."""
        return (*(self.holders[self.held.index(place)] for place in self.driven), *self.forced)


class Bench(Struct, frozen=True):
    """A circuit of instances that do not touch each other."""

    circuit: Circuit
    instances: tuple[Alone, ...]
    deck: Deck

    @property
    def frequency_hz(self) -> NDArray[np.float64]:
        """What is asked, Hz (n_freq,): the same for all."""
        return np.array(self.instances[0].isolation.frequency_hz, dtype=float)

    def made(self, name: str) -> str:
        """Give the name that an element has in the deck."""
        return self.deck.elements[fold(name)]


def bench(circuit: Circuit, isolations: Sequence[Isolation]) -> Bench:
    """Build the circuit of instances with their terminals held and their controlling currents forced.

    isolations: with the same frequencies.
    Raises EngineError where the circuit has no such element, ValueError where voltages or currents do not fit to it.
    """
    nodes = [GROUND]
    elements: list[Element] = []
    instances: list[Alone] = []
    named = {fold(element.name): element for element in circuit.elements}
    for isolation in isolations:
        element = named.get(fold(isolation.element))
        if element is None:
            raise EngineError(f"no element is called {isolation.element}")
        ends = element.nodes if isolation.each_node else terminals_of(element)
        if len(ends) != len(isolation.voltages) or len(element.references) != len(isolation.currents):
            raise ValueError(
                f"{element.name} has {len(ends)} terminals and {len(element.references)} controlling currents"
            )
        grounded = isolation.grounded
        first = len(nodes)
        places = [place for place in range(len(ends)) if place != grounded]
        behind = first + len(places)
        at = [0 if place == grounded else first + places.index(place) for place in range(len(ends))]
        number = dict(zip(ends, at, strict=True))
        held = [_source("V", f"{element.name}'held{at[k]}", (at[k], 0), isolation.voltages[k]) for k in places]
        forced = [
            _source("I", f"{element.name}'forced{k}", (0, k), ampere)
            for k, ampere in enumerate(isolation.currents, behind)
        ]
        sensors = [_source("V", f"{element.name}'sensor{k}", (k, 0), 0.0) for k in range(behind, behind + len(forced))]
        instance = replace(
            element,
            nodes=tuple(at) if isolation.each_node else tuple(number[node] for node in element.nodes),
            formula=_renumbered(element.formula, number),
            references=tuple(sensor.name for sensor in sensors),
            parameters=tuple({**dict(element.parameters), **dict(isolation.parameters)}.items()),
        )
        nodes += [f"{element.name}'{k}" for k in range(first, behind + len(forced))]
        elements += [instance, *held, *forced, *sensors]
        instances.append(
            Alone(
                isolation,
                element.name,
                tuple(circuit.nodes[node] for node in ends),
                tuple(source.name for source in held),
                tuple(source.name for source in forced),
                isolation.driven or tuple(range(len(ends))),
                grounded,
            )
        )
    used = {element.model for element in elements}
    nothing = np.array([], dtype=np.int32)
    made = Circuit(
        title=circuit.title,
        nodes=tuple(nodes),
        passives=Passives("", (), nothing, nothing, np.array([], dtype=float), nothing, nothing),
        elements=tuple(elements),
        models=tuple(model for model in circuit.models if model.name in used),
        drive=tuple(Drive(instance.sources[0], "voltage", 1.0) for instance in instances),
        output=Port(GROUND),
        temperature_c=circuit.temperature_c,
        tnom_c=circuit.tnom_c,
        options=circuit.options,
    )
    return Bench(made, tuple(instances), write_deck(made))


def question(asked: Bench) -> Message:
    """Give the request to the worker: k-th source of every instance driven at once, one k after the other.

    The first is driven by the deck itself.
    """
    vectors = [name for instance in asked.instances for name in _vectors(asked, instance)]
    most = max(len(instance.sources) for instance in asked.instances)
    driven = [[asked.made(i.sources[k]) for i in asked.instances if k < len(i.sources)] for k in range(most)]
    grids = [(grid.points, grid.start_hz, grid.stop_hz, grid.count) for grid in plan(asked.frequency_hz)]
    return {"do": "isolate", "deck": asked.deck.text, "vectors": vectors, "grids": grids, "sources": driven}


def answered(asked: Bench, answer: Message) -> list[Samples]:
    """Give what each instance answered.

    Raises EngineError where the engine has no AC response of them, or one at other frequencies.
    """
    frequency = asked.frequency_hz
    counts = [len(_vectors(asked, instance)) for instance in asked.instances]
    columns: list[Complex] = []
    for runs in answer["driven"]:
        for run in runs:
            verdict = judge(answer["load"], run["run"], has_result=bool(run["frequency"]), names=asked.deck.says)
            if verdict.state not in ("sound", "stepped"):
                names = ", ".join(instance.name for instance in asked.instances)
                raise EngineError(f"ngspice gave no AC response of {names} alone", engine_says=verdict.says[:TOLD])
        frequency = np.concatenate([np.array(run["frequency"]).view(complex).real for run in runs])
        wanted = asked.frequency_hz
        if len(frequency) != len(wanted) or np.max(np.abs(frequency / wanted - 1.0)) > GRID_TOLERANCE:
            raise EngineError("ngspice solved other frequencies than those asked for")
        column = [np.concatenate([_column(run, k) for run in runs]) for k in range(sum(counts))]
        columns.append(np.array(column, dtype=complex))
    found: list[Samples] = []
    first = 0
    for instance, count in zip(asked.instances, counts, strict=True):
        own = [column[first : first + count] for column in columns[: len(instance.sources)]]
        found.append(samples(instance, frequency, own, shunt_siemens(asked.circuit)))
        first += count
    return found


def _vectors(asked: Bench, instance: Alone) -> list[str]:
    """List the engine's names of what is recorded: currents of the holders, voltages of the inner nodes."""
    inner = [f"{asked.made(instance.name)}#{suffix}" for suffix in instance.isolation.inner]
    return [*(f"{asked.made(name)}#branch" for name in instance.holders), *inner]


def _column(run: Message, k: int) -> Complex:
    """Give one vector of an AC run, or NaN where the engine has none of that name."""
    values = run["vectors"][k]
    if values is None:
        return np.full(len(run["frequency"]) // 2, np.nan + 0j)
    return np.array(values).view(complex)


def samples(
    instance: Alone, frequency_hz: NDArray[np.float64], answers: Sequence[Complex], shunt: float = 0.0
) -> Samples:
    """Put the answers of one instance to unit AC together.

    answers: for each driven terminal, then each forced current, the currents through the holders (from the terminal
    into ground) and the inner nodes' voltages, (n_holders + n_inner, n_freq); an inner node that does not exist is NaN.
    shunt: what stands from every node to ground, S.
    Raises EngineError where an answer is not finite.
    """
    isolation, n = instance.isolation, len(instance.terminals)
    driven = np.stack(answers, axis=-1).transpose(1, 0, 2)
    if instance.grounded is not None:
        left = -driven[:, : n - 1].sum(axis=1)
        driven = np.insert(driven, instance.grounded, left, axis=1)
    count, places = len(instance.driven), list(instance.driven)
    exists = [k for k in range(len(isolation.inner)) if not np.all(np.isnan(driven[:, n + k, 0]))]
    for array in (driven[:, :n], driven[:, [n + k for k in exists], :count]):
        if not np.all(np.isfinite(array)):
            raise EngineError(f"ngspice's AC response of {isolation.element} alone is not finite")
    admittance = np.full((len(frequency_hz), n, n), np.nan + 0j)
    inner_gain = np.full((len(frequency_hz), len(exists), n), np.nan + 0j)
    admittance[:, :, places] = -driven[:, :n, :count]
    for place in {*instance.held} & {*places}:
        # what `.options rshunt` puts at the terminal is no part of the instance; at its inner nodes it is
        admittance[:, place, place] -= shunt
    inner_gain[:, :, places] = driven[:, [n + k for k in exists], :count]
    return Samples(
        element=isolation.element,
        terminals=instance.terminals,
        frequency_hz=frequency_hz,
        admittance=admittance,
        current_gain=-driven[:, :n, count:],
        inner=tuple(isolation.inner[k] for k in exists),
        inner_gain=inner_gain,
    )


def _source(letter: str, name: str, nodes: tuple[int, int], dc: float) -> Element:
    return Element(letter, name, nodes, "", (("dc", dc),), 0, 0)


def _renumbered(formula: Formula | None, number: dict[int, int]) -> Formula | None:
    match formula:
        case Voltage(plus=plus, minus=minus):
            return Voltage(number[plus], number[minus])
        case Apply(function=function, arguments=arguments):
            return Apply(function, tuple(made for a in arguments if (made := _renumbered(a, number)) is not None))
    return formula
