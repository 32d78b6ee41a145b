"""The rebuilt network against the engine's own sweep: the one measure of every device family."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pytest

from tauledger.circuit import Circuit
from tauledger.devices.catalogue import linearise
from tauledger.devices.family import Device
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.errors import EngineError
from tauledger.network.assemble import Network
from tauledger.network.solve import response

# Plateaus of the stages in these tests reach from DC to some 10 MHz; far out only rounding of the engine is left.
IN_BAND = decades(1.0, 1e9, 4)
FAR_OUT = decades(1e9, 1e12, 4)


def rebuilt(circuit: Circuit, engine: Engine) -> tuple[Network, tuple[Device, ...]]:
    """Solve the operating point and rebuild the network; the engine keeps the circuit."""
    linearised = linearise(circuit, engine.operating_point(circuit))
    return Network.from_parts(linearised.parts, output=circuit.output), linearised.devices


def disagreement(network: Network, engine: Engine, frequency_hz: np.ndarray) -> float:
    """max |ΔH| / max(|H|, 1e-6·max|H|) between the rebuilt network and the engine's sweep."""
    sweep = engine.sweep(frequency_hz)
    size = np.abs(sweep.response)
    difference = np.abs(response(network, sweep.frequency_hz) - sweep.response)
    return float(np.max(difference / np.maximum(size, 1e-6 * size.max())))


def engine_says(circuit: Circuit, engine: Engine) -> str:
    """What the engine says of a circuit at its operating point, whether or not it takes it."""
    try:
        return "\n".join(engine.bias(circuit, ()).warnings)
    except EngineError as error:
        return "\n".join((*error.engine_says, error.message))


def reads_past(circuit: Circuit, engine: Engine) -> bool:
    """Whether the engine knows not every parameter of a circuit."""
    said = engine_says(circuit, engine)
    return "unrecognized parameter" in said or "unknown parameter" in said


def worst_of(
    families: Mapping[str, Sequence[Circuit]],
    engine: Engine,
    pytestconfig: pytest.Config,
    capsys: pytest.CaptureFixture[str],
) -> float:
    """The largest disagreement of all families up to 1 GHz: of their first circuits, of all with --write-tables.

    Then a row per family, with the number of circuits, is printed as DEVELOPERS.md keeps it.
    """
    whole = bool(pytestconfig.getoption("--write-tables"))
    error: dict[str, float] = {}
    for family, circuits in families.items():
        kept = circuits if whole else circuits[:1]
        error[family] = max(disagreement(rebuilt(c, engine)[0], engine, IN_BAND) for c in kept)
        if whole:
            with capsys.disabled():
                print(f"\n| {family} | {len(kept)} | {error[family]:.0e} |", end="")
    return max(error.values())
