"""What the engine answered: the operating point with its readings, and the AC sweep of the output."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray


class Observation(Struct, frozen=True):
    """What a device family wants to know of one element: readings by ngspice's own parameter names."""

    element: str
    readings: tuple[str, ...]


class EngineIdentity(Struct, frozen=True):
    """Which engine answered: its name and version, e.g. "ngspice", "39"."""

    name: str
    version: str


class Bias(Struct, frozen=True):
    """The operating point.

    voltages: of every node in the circuit's order, V (n_nodes,). currents: through each voltage source and
    inductor, A,
    by element name, positive into the first node. readings: per element, by reading name, SI units.
    stepped: the engine needed gmin or source stepping. warnings: the engine's lines worth telling, with the
    user's names.
    """

    voltages: NDArray[np.float64]
    currents: Mapping[str, float]
    readings: Mapping[str, Mapping[str, float]]
    engine: EngineIdentity
    stepped: bool = False
    warnings: tuple[str, ...] = ()


class Sweep(Struct, frozen=True):
    """The engine's AC answer at the circuit's output: frequency in Hz (n_freq,), complex response (n_freq,)."""

    frequency_hz: NDArray[np.float64]
    response: NDArray[np.complex128]
