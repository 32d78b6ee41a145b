"""How long reading all values of 1,000 devices takes beside the engine's own work: `pytest
tests/benchmarks/bench_engine.py -s --benchmark-enable`.

Bipolar transistors are set against ngspice's operating point, MOS transistors against load and operating point; the
ratios are printed. What a BSIM4 transistor takes to be measured alone, for its overlap, counts as reading. Never a
timed assertion: machines differ and are shared.
"""

from __future__ import annotations

import os
import statistics
import time

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from circuits import NPN, board
from tauledger.circuit import Circuit, Model
from tauledger.devices.catalogue import isolations, observations
from tauledger.engine.alone import bench, question
from tauledger.engine.client import TOGETHER, Engine
from tauledger.engine.deck import write_deck
from tauledger.engine.worker import Spice, find_library, isolate, readings

DEVICES = 1000
ROUNDS = 7
NMOS = Model("mx", "nmos", 1, (("vto", 0.7), ("kp", 6e-5), ("gamma", 0.5), ("tox", 2e-8), ("cgso", 2e-10)), 0, 0)
BSIM4 = Model("mx", "nmos", 54, (("version", 4.8), ("vth0", 0.6), ("cgso", 2e-10), ("cgdo", 2e-10)), 0, 0)


def stages(kind: str) -> Circuit:
    """1,000 stages on one supply, each with values of its own."""
    cards = ["VCC vcc 0 5", "VB b 0 1"]
    for k in range(DEVICES):
        device = f"Q{k} c{k} b e{k} qn" if kind == "bipolar" else f"M{k} c{k} b e{k} 0 mx w=1e-5 l=1e-6"
        cards += [f"RC{k} vcc c{k} {2000 + k}", device, f"RE{k} e{k} 0 {300 + k}"]
    return board(*cards, models=(NPN, BSIM4 if kind == "BSIM4" else NMOS))


@pytest.fixture(scope="module")
def spice() -> Spice:
    # as the worker has it
    os.environ["OMP_NUM_THREADS"] = "1"
    return Spice(find_library(""))


@pytest.mark.parametrize("kind", ["bipolar", "MOS", "BSIM4"])
def test_reading_every_value_against_the_engine(
    kind: str, spice: Spice, engine: Engine, benchmark: BenchmarkFixture
) -> None:
    circuit = stages(kind)
    deck = write_deck(circuit)
    asked = [
        (deck.elements[o.element.lower()], list(o.readings), list(o.optional), o.element[0])
        for o in observations(circuit)
    ]
    alone = isolations(circuit, engine.bias(circuit, observations(circuit)))
    benches = [question(bench(circuit, alone[k : k + TOGETHER])) for k in range(0, len(alone), TOGETHER)]

    def read_all() -> list[list[float | None]]:
        found = readings(spice, asked)
        for request in benches:
            isolate(spice, request)
        return found

    spent: tuple[list[float], ...] = ([], [], [])
    for _ in range(ROUNDS):
        spice.command("remcirc")
        spice.command("destroy all")
        times = [time.perf_counter()]
        for work in (lambda: spice.load(deck.text), lambda: spice.command("op"), read_all):
            work()
            times.append(time.perf_counter())
        for kept, start, stop in zip(spent, times, times[1:], strict=False):
            kept.append(stop - start)
    load, solved, read = (statistics.median(kept) for kept in spent)
    beside, words = (solved, "operating point") if kind == "bipolar" else (load + solved, "load and operating point")
    print(
        f"\n{DEVICES} {kind}: load {load * 1e3:.0f} ms, operating point {solved * 1e3:.0f} ms, "
        f"{sum(len(names) for _, names, _, _ in asked)} readings, {len(alone)} alone,"
        f" {read * 1e3:.0f} ms = {read / beside:.2f} × {words}"
    )
    spice.load(deck.text)
    spice.command("op")
    found = readings(spice, asked)
    benchmark(read_all)
    assert all(value is not None for row, values in zip(asked, found, strict=True) for value in values[: len(row[1])])
