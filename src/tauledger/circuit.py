"""What was read from the netlist: the flat circuit, and the one record that says how to change it.

Nodes and elements keep the spelling in which the netlist first wrote them; two spellings that differ only in
case are the same thing (`fold`). Node 0 is ground. `card` and `path` are the two integers from which the netlist
room finds file, line and column again.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from msgspec import Struct, field
from numpy.typing import NDArray

GROUND = "0"

# `card` of what stands on no card: a load that a Change added.
ADDED = -1

PortKind = Literal["voltage", "current"]


def fold(name: str) -> str:
    """Give the key under which SPICE compares names: ASCII upper case folded to lower case."""
    if name.isascii():
        return name.lower()
    return "".join(chr(ord(c) + 32) if "A" <= c <= "Z" else c for c in name)


class Place(Struct, frozen=True):
    """A position in a file: path as typed, line and column from 1, and the physical line itself."""

    file: str
    line: int
    column: int
    text: str


class ReadingNote(Struct, frozen=True):
    """What the reader must know about how the netlist was read: where ("board.cir:12"), and a sentence."""

    where: str
    says: str


class Instance(Struct, frozen=True):
    """One instance of a subcircuit: `path` of an item is its number in `Circuit.instances`; number 0 is the netlist.

    name: hierarchical, "X1.X2". subcircuit: name of its `.subckt`. card: its X card. definition: the `.subckt` card.
    parent: number of the instance that holds it. Number 0 has empty names and -1 for the rest.
    """

    name: str
    subcircuit: str
    card: int
    definition: int
    parent: int


class Port(Struct, frozen=True):
    """Where a signal is taken: a node voltage, a difference of two, or the current through a voltage source.

    plus, minus: node names. through: name of the voltage source (or inductor) for a current.
    """

    plus: str
    minus: str = GROUND
    kind: PortKind = "voltage"
    through: str = ""

    def __str__(self) -> str:
        if self.kind == "current":
            return f"i({self.through})"
        return f"v({self.plus})" if self.minus == GROUND else f"v({self.plus},{self.minus})"


class Drive(Struct, frozen=True):
    """One driven source: its name, what it forces, and its complex AC amplitude in V or A."""

    source: str
    kind: PortKind
    amplitude: complex


class Passives(Struct, frozen=True):
    """All plain resistors, capacitors and inductors as columns of equal length.

    kind: one of R, C, L each. a, b: node numbers (n,). value: ohm, farad or henry (n,), multiplicity included.
    card, path: origin of each (n,).
    """

    kind: str
    name: tuple[str, ...]
    a: NDArray[np.int32]
    b: NDArray[np.int32]
    value: NDArray[np.float64]
    card: NDArray[np.int32]
    path: NDArray[np.int32]

    def __len__(self) -> int:
        return len(self.name)


class Number(Struct, frozen=True, tag=True):
    """A constant of a formula."""

    value: float


class Voltage(Struct, frozen=True, tag=True):
    """v(plus, minus) in a formula, by node numbers."""

    plus: int
    minus: int


class Current(Struct, frozen=True, tag=True):
    """i(source) in a formula: the current through a voltage source, by its flat name."""

    source: str


class Variable(Struct, frozen=True, tag=True):
    """A quantity of the analysis in a formula: temper (°C), hertz, time."""

    name: str


class Apply(Struct, frozen=True, tag=True):
    """Operator ("+", "-", "*", "/", "^", "<", "?:", …) or function ("exp", "pwl", …) of a formula and its arguments."""

    function: str
    arguments: tuple[Formula, ...]


Formula = Number | Voltage | Current | Variable | Apply


class Element(Struct, frozen=True):
    """One element that is not a plain R, C or L.

    letter: element letter in upper case. nodes: node numbers in the order of the card; of a controlled source with
    POLY(n) the output pair, then n control pairs. model: name of the model or empty. parameters: (name, value) pairs in
    SI units, names folded; a V or I source has dc, acmag, acphase (degrees).
    references: flat names of the elements that it depends on (F, H, W: voltage sources; K: the inductors).
    R, C and L that are no plain values have value (where there is one), their keywords, model or formula; E F G H have
    gain, K coupling, T z0 and td; m is left where it is not worked into these.
    polynomial: coefficients of POLY, in the order of the card. formula: of a B source or a behavioural element, with
    `quantity` what it gives: v, i, r, c, l or q.
    """

    letter: str
    name: str
    nodes: tuple[int, ...]
    model: str
    parameters: tuple[tuple[str, float], ...]
    card: int
    path: int
    references: tuple[str, ...] = ()
    polynomial: tuple[float, ...] = ()
    formula: Formula | None = None
    quantity: str = ""

    def parameter(self, name: str, default: float) -> float:
        """Give one parameter by its folded name, or `default` where the card does not set it."""
        return dict(self.parameters).get(name, default)


def terminals_of(element: Element) -> tuple[int, ...]:
    """Give the distinct nodes that an element touches or senses, by number, in the order in which they first stand.

    Those of the card come first, then those of the formula.
    """
    return tuple(dict.fromkeys((*element.nodes, *_sensed(element.formula))))


def _sensed(formula: Formula | None) -> tuple[int, ...]:
    match formula:
        case Voltage(plus=plus, minus=minus):
            return (plus, minus)
        case Apply(arguments=arguments):
            return tuple(node for argument in arguments for node in _sensed(argument))
    return ()


class Model(Struct, frozen=True):
    """One `.model` card: its flat name, type and level, and its parameters in SI units, names folded."""

    name: str
    type: str
    level: int
    parameters: tuple[tuple[str, float], ...]
    card: int
    path: int

    def parameter(self, name: str, default: float) -> float:
        """Give one parameter by its folded name, or `default` where the card does not set it."""
        return dict(self.parameters).get(name, default)


class Load(Struct, frozen=True):
    """A resistor (ohm) or capacitor (farad) added between two nodes, e.g. a probe."""

    kind: Literal["R", "C"]
    plus: str
    minus: str
    value: float


class Change(Struct, frozen=True):
    """How a circuit differs from its netlist: the one record behind every option and condition.

    temperature_c: analysis temperature in °C, or None. parameters: global `.param` values. elements: values of R, C,
    L (or the dc value of V, I; the gain of G) by flat name. models: (model, parameter, value). loads: added parts.
    given: (instance or element, parameter, value), of a subcircuit's parameters and of what a device's own card gives
    (area, m). Names are compared folded.
    """

    temperature_c: float | None = None
    parameters: tuple[tuple[str, float], ...] = ()
    elements: tuple[tuple[str, float], ...] = ()
    models: tuple[tuple[str, str, float], ...] = ()
    loads: tuple[Load, ...] = ()
    given: tuple[tuple[str, str, float], ...] = ()


NO_CHANGE = Change()


def joined(first: Change, second: Change) -> Change:
    """Give both changes in one; where they set the same thing the second counts."""
    models = {(fold(m), fold(p)): (m, p, value) for m, p, value in (*first.models, *second.models)}
    given = {(fold(of), fold(p)): (of, p, value) for of, p, value in (*first.given, *second.given)}
    return Change(
        temperature_c=first.temperature_c if second.temperature_c is None else second.temperature_c,
        parameters=tuple(
            {fold(name): (name, value) for name, value in (*first.parameters, *second.parameters)}.values()
        ),
        elements=tuple({fold(name): (name, value) for name, value in (*first.elements, *second.elements)}.values()),
        models=tuple(models.values()),
        loads=first.loads + second.loads,
        given=tuple(given.values()),
    )


class Circuit(Struct, frozen=True):
    """The flat circuit for operating point and AC: what the engine is given and the network is rebuilt from.

    nodes: node names by number; nodes[0] is "0". drive: the sources that are driven, with complex amplitude.
    temperature_c, tnom_c: analysis and nominal temperature in °C. options: (name, value) of those options that change
    the result (gmin). models: by flat name. instances: number 0 is the netlist itself. notes: how the netlist was
    read where that needs saying. nodesets: (node number, volt) from which the search for the operating point starts.
    """

    title: str
    nodes: tuple[str, ...]
    passives: Passives
    elements: tuple[Element, ...]
    models: tuple[Model, ...]
    drive: tuple[Drive, ...]
    output: Port
    temperature_c: float = 27.0
    tnom_c: float = 27.0
    options: tuple[tuple[str, float], ...] = field(default=())
    instances: tuple[Instance, ...] = ()
    notes: tuple[ReadingNote, ...] = ()
    nodesets: tuple[tuple[int, float], ...] = ()

    def model(self, name: str) -> Model:
        """Give the model with this flat name; KeyError where there is none."""
        for model in self.models:
            if model.name == name:
                return model
        raise KeyError(name)
