"""The contract of a device family: what it is called, what to observe, and its small-signal parts.

A family knows what ngspice calls a thing, not how to ask for it. It gives labelled parts, a hand model
(`Transconductor`) and the figures of its operating point; nothing downstream knows which family a part came from.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping

from msgspec import Struct

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.parts import Part
from tauledger.solution import Bias, Isolation, Observation

# S across every junction, where `.options gmin` does not say otherwise.
GMIN = 1e-12
# Letters of devices that may have nodes of their own behind series resistances.
WITH_INNER_NODES = frozenset("QDJMZ")


class Transconductor(Struct, frozen=True):
    """The hand model of one transistor: a current gm·v(control, common) from output to common, with r_pi and r_o.

    control, common, output: nodes of the network, the inner ones where series resistances exist.
    body: node of the second control, or None; g_mb in S acts on v(body, common).
    gm in S (negative where the device inverts). r_pi, r_o in ohm; None where there is none.
    """

    owner: str
    control: str
    common: str
    output: str
    gm: float
    r_pi: float | None = None
    r_o: float | None = None
    body: str | None = None
    g_mb: float = 0.0


class Terminal(Struct, frozen=True):
    """One terminal of a device: its word ("base"), the netlist's node, and the inner node behind its series
    resistance.

    inner equals outer where there is no series resistance.
    """

    word: str
    outer: str
    inner: str


class Device(Struct, frozen=True):
    """One transistor (or diode) as linearised at its operating point.

    kind: "npn", "pnp", … region: in whole words ("active", "saturated", "off", "reversed").
    figures: (symbol, value in SI units) in the order in which a table shows them: i_c, v_ce, gm, r_pi, r_o,
    c_pi, c_mu, f_t.
    without_charge: the model gives this device no capacitance at all. remarks: what a reader must know about how it was
    rebuilt, in whole sentences.
    """

    name: str
    kind: str
    region: str
    figures: tuple[tuple[str, float], ...]
    terminals: tuple[Terminal, ...]
    cell: Transconductor | None
    parts: tuple[Part, ...]
    without_charge: bool = False
    remarks: tuple[str, ...] = ()


class Refusal(Struct, frozen=True):
    """Why an element or its model cannot be rebuilt, and what would help; `parameter` names the culprit on the
    model card."""

    parameter: str
    reason: str
    hint: str = ""


def as_on_the_card(element: Element, _model: Model | None) -> tuple[tuple[str, float], ...]:
    """The `as_written` of a family whose card the engine takes as it is."""
    return element.parameters


def never_isolated(_circuit: Circuit, _element: Element, _bias: Bias) -> Isolation | None:
    """The `isolate` of a family that is rebuilt from its readings or its card alone."""
    return None


class Family(Struct, frozen=True):
    """One device family, as its file in devices/ describes it.

    letter: element letter. model_types: types of `.model` that belong to it, e.g. ("npn", "pnp"), empty without
    model.
    levels: model levels it knows. terminals: words in card order, optional ones last. optional_terminals: how many of
    those may be missing. instance_parameters, model_parameters: names (folded) that ngspice accepts on the card and
    on the model.
    observe: what to read from the engine, or None for nothing. linearise: element at its bias → parts and figures.
    refuse: a Refusal where this element or model cannot be rebuilt, else None. isolate: how the instance must be
    measured alone, once the readings are there, or None. model_optional: the element may stand without a model.
    as_written: the parameters that the engine is given in the place of those on the card. flags: model parameters
    that stand without a value.
    """

    letter: str
    words: str
    terminals: tuple[str, ...]
    linearise: Callable[[Circuit, Element, Bias], Device]
    observe: Callable[[Element], Observation | None]
    refuse: Callable[[Element, Model | None], Refusal | None]
    optional_terminals: int = 0
    model_types: tuple[str, ...] = ()
    levels: tuple[int, ...] = ()
    instance_parameters: frozenset[str] = frozenset()
    model_parameters: frozenset[str] = frozenset()
    isolate: Callable[[Circuit, Element, Bias], Isolation | None] = never_isolated
    model_optional: bool = False
    as_written: Callable[[Element, Model | None], tuple[tuple[str, float], ...]] = as_on_the_card
    flags: frozenset[str] = frozenset()


class Linearised(Struct, frozen=True):
    """The whole circuit linearised at its operating point: every part of the network, and the devices among
    them."""

    parts: tuple[Part, ...]
    devices: tuple[Device, ...]


def inner_node(owner: str, terminal: str) -> str:
    """Name the node behind a series resistance; the quote cannot stand in a netlist's node name, so it never
    collides."""
    return f"{owner}'{terminal}"


def readings_of(bias: Bias, element: Element) -> Mapping[str, float]:
    """Give the readings of one element, by ngspice's parameter name."""
    return bias.readings[element.name]


def names(text: str) -> frozenset[str]:
    """Give the set of parameter names in a blank-separated list."""
    return frozenset(text.split())


def observe_nothing(_element: Element) -> Observation | None:
    """The `observe` of a family whose parts follow from the card alone."""
    return None


def never_refused(_element: Element, _model: Model | None) -> Refusal | None:
    """The `refuse` of a family that is always rebuilt exactly."""
    return None
