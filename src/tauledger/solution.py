"""What the engine answered: the operating point with its readings, and the AC sweep of the output."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct, field
from numpy.typing import NDArray


class Observation(Struct, frozen=True):
    """What a device family wants to know of one element: readings by ngspice's own parameter names.

    readings: those that every version has. optional: those that some versions have; the others leave them out.
    """

    element: str
    readings: tuple[str, ...]
    optional: tuple[str, ...] = ()


class Isolation(Struct, frozen=True):
    """One instance to be measured alone: every terminal held by a voltage source, unit AC on one after the other.

    voltages: of its terminals, V (n_terminals,), in the order of `circuit.terminals_of`. currents: through the sources
    that it refers to, A (n_references,). frequency_hz: where, Hz (n_freq,). inner: suffixes of ngspice's inner nodes to
    record ("collCX"); those that the instance does not have are left out. parameters: instance parameters set
    otherwise than on its card. each_node: every place of a node on the card is a terminal of its own, even where two
    are one node; voltages are in that order then. driven: which terminals, by place, where not all are needed.
    grounded: place of one at 0 V that needs no source, where nothing inside the instance leads to ground: its current
    is what the others leave.
    """

    element: str
    voltages: tuple[float, ...]
    frequency_hz: tuple[float, ...]
    currents: tuple[float, ...] = ()
    inner: tuple[str, ...] = ()
    parameters: tuple[tuple[str, float], ...] = ()
    each_node: bool = False
    driven: tuple[int, ...] = ()
    grounded: int | None = None


class Samples(Struct, frozen=True):
    """What one instance alone answered.

    terminals: names of the circuit's nodes (n_terminals,). frequency_hz: (n_freq,). admittance: current into terminal i
    per volt on terminal j, S (n_freq, n_terminals, n_terminals), NaN where j was not driven. current_gain: current into
    terminal i per ampere through the source referred to, A/A (n_freq, n_terminals, n_references). inner: suffixes of
    the inner nodes that exist (n_inner,). inner_gain: their voltage per volt on terminal j, V/V (n_freq, n_inner,
    n_terminals).
    """

    element: str
    terminals: tuple[str, ...]
    frequency_hz: NDArray[np.float64]
    admittance: NDArray[np.complex128]
    current_gain: NDArray[np.complex128]
    inner: tuple[str, ...]
    inner_gain: NDArray[np.complex128]


class EngineIdentity(Struct, frozen=True):
    """Which engine answered: its name and version, e.g. "ngspice", "39"."""

    name: str
    version: str


class Bias(Struct, frozen=True):
    """The operating point.

    voltages: of every node in the circuit's order, V (n_nodes,). currents: through each voltage source and inductor,
    A, by element name, positive into the first node. readings: per element, by reading name, SI units.
    stepped: the engine needed gmin or source stepping. warnings: the engine's lines worth telling, with the user's
    names. samples: of the instances that were measured alone, by element name.
    """

    voltages: NDArray[np.float64]
    currents: Mapping[str, float]
    readings: Mapping[str, Mapping[str, float]]
    engine: EngineIdentity
    stepped: bool = False
    warnings: tuple[str, ...] = ()
    samples: Mapping[str, Samples] = field(default_factory=dict)


class Sweep(Struct, frozen=True):
    """The engine's AC answer at the circuit's output: frequency in Hz (n_freq,), complex response (n_freq,)."""

    frequency_hz: NDArray[np.float64]
    response: NDArray[np.complex128]
