"""Resistors, capacitors, inductors, sources and the controlled source: signs and values as the engine has them."""

from __future__ import annotations

import numpy as np
import pytest

from circuits import board
from tauledger.circuit import Circuit, Port
from tauledger.devices.catalogue import linearise, observations
from tauledger.devices.controlled import cell_of
from tauledger.devices.parts import conductance, transconductance
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.network.assemble import Network
from tauledger.network.solve import response

CIRCUITS = {
    "ladder": board(
        *("VIN in 0 0", "RS in a 50", "L1 a out 200n", "C1 out 0 150p", "RL out 0 10k"), drive={"VIN": 1.0}
    ),
    "current into a node": board(*("IIN 0 out 0", "R1 out 0 1k", "C1 out 0 1n"), drive={"IIN": 1.0}),
    "current, three of them": board(*("IIN 0 out 0 m=3", "R1 out 0 1k", "C1 out 0 1n"), drive={"IIN": 1.0}),
    "controlled source": board(
        *("VIN in 0 0", "R1 in a 1k", "C1 a 0 1n", "G1 out 0 a 0 20m", "RL out 0 1k", "C2 out a 5p"), drive={"VIN": 1.0}
    ),
    "controlled source, twofold": board(
        *("VIN in 0 0", "R1 in a 1k", "G1 0 out in a 20m m=2", "C1 a 0 1n", "RL out 0 1k"), drive={"VIN": 1.0}
    ),
    "two sources in quadrature": board(
        *("V1 a 0 0", "V2 0 b 0", "R1 a out 1k", "C2 b out 1n"), drive={"v1": 1.0, "V2": 0.5j}
    ),
    "current through a source": board(
        *("VIN in 0 0", "R1 in a 1k", "VM a b 0", "C1 b 0 1n"),
        drive={"VIN": 1.0},
        output=Port("a", "b", "current", "VM"),
    ),
    "current through an inductor": board(
        *("VIN in 0 0", "R1 in a 1k", "L1 a 0 1m"), drive={"VIN": 1.0}, output=Port("a", "0", "current", "l1")
    ),
}


def solved(circuit: Circuit, engine: Engine) -> Network:
    """Rebuild the network at the operating point the engine finds."""
    return Network.from_parts(
        linearise(circuit, engine.bias(circuit, observations(circuit))).parts, output=circuit.output
    )


@pytest.mark.parametrize("name", CIRCUITS)
def test_linear_networks_agree_with_the_engine_to_rounding(name: str, engine: Engine) -> None:
    """To 1e-11 up to 1 GHz; at 100 GHz the engine's own inductor current is 7e-11 off 1/(R + jωL), ours is not."""
    network = solved(CIRCUITS[name], engine)
    for stop_hz, tolerance in ((1e9, 1e-11), (1e11, 1e-10)):
        sweep = engine.sweep(decades(1.0, stop_hz, 4))
        assert np.allclose(response(network, sweep.frequency_hz), sweep.response, rtol=tolerance, atol=0.0)


@pytest.mark.parametrize(
    ("out", "control", "cell"),
    [
        (("c", "e"), ("b", "e"), ("b", "e", "c", 2.0)),
        (("e", "c"), ("b", "e"), ("b", "e", "c", -2.0)),
        (("c", "e"), ("e", "b"), ("b", "e", "c", -2.0)),
        (("e", "c"), ("e", "b"), ("b", "e", "c", 2.0)),
        (("c", "0"), ("b", "0"), ("b", "0", "c", 2.0)),
        (("c", "e"), ("b", "x"), None),
        (("c", "e"), ("c", "e"), None),
        (("c", "e"), ("e", "c"), None),
    ],
)
def test_a_controlled_source_whose_control_shares_a_node_with_its_output_is_a_cell(
    out: tuple[str, str], control: tuple[str, str], cell: tuple[str, str, str, float] | None
) -> None:
    found = cell_of(transconductance("G1", out, control, 2.0))
    assert (found and (found.control, found.common, found.output, found.gm)) == cell


def test_a_conductance_is_no_cell() -> None:
    assert cell_of(conductance("R1", "a", "b", 1.0)) is None
