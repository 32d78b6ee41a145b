"""TABLE: straight between its points, flat beyond its ends, in the engine as in the rebuilt network."""

from __future__ import annotations

import pytest
from msgspec.structs import replace

from agreement import IN_BAND, disagreement, rebuilt
from circuits import board
from tauledger.circuit import Apply, Element, Number, Voltage
from tauledger.engine.client import Engine

POINTS = (-1.0, -5.0, 0.5, 1.0, 2.0, 4.0)


@pytest.mark.parametrize(("volt", "slope"), [(-3.0, 0.0), (0.0, 4.0), (1.0, 2.0), (5.0, 0.0)])
@pytest.mark.parametrize("letter", ["E", "G"])
def test_table_is_flat_beyond_its_ends(letter: str, volt: float, slope: float, engine: Engine) -> None:
    cards = (f"VIN in 0 {volt}", "RX x 0 1", "RL x out 1k", "CL out 0 1n", "RY in out 100k")
    circuit = board(*cards, drive={"VIN": 1.0})
    table = Apply("table", (Voltage(1, 0), *map(Number, POINTS)))
    nodes = (2, 0) if letter == "E" else (0, 2)
    source = Element(letter, f"{letter}9", nodes, "", (), 9, 0, formula=table, quantity="v" if letter == "E" else "i")
    network, _ = rebuilt(replace(circuit, elements=(*circuit.elements, source)), engine)
    assert disagreement(network, engine, IN_BAND) < 1e-9
    gain = abs(engine.sweep([1.0]).response[0])
    assert gain == pytest.approx(slope * 100e3 / 101e3 + 1e3 / 101e3, rel=2e-3)
