"""One instance alone: its terminal admittance is the circuit's own, and the loaded circuit stays the one swept."""

from __future__ import annotations

import numpy as np
import pytest
from msgspec.structs import replace

from circuits import board, preamp
from tauledger.circuit import Circuit, Model, Port
from tauledger.devices.catalogue import linearise, observations
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.errors import EngineError
from tauledger.network.assemble import Network
from tauledger.network.solve import admittance, on_axis
from tauledger.solution import Bias, Isolation

GRID = decades(1e3, 1e9, 2)
BSIM = Model("mx", "nmos", 54, (("version", 4.8), ("vth0", 0.5), ("cgso", 2e-10)), 0, 0)


def isolation(circuit: Circuit, bias: Bias, **keywords: object) -> Isolation:
    held = [float(bias.voltages[node]) for node in circuit.elements[-1].nodes]
    return Isolation("Q1", tuple(held), tuple(GRID.tolist()), **keywords)  # type: ignore[arg-type]


def test_terminal_admittance_is_the_one_of_the_rebuilt_parts(engine: Engine) -> None:
    circuit = preamp()
    bias = engine.bias(circuit, observations(circuit))
    alone = engine.isolate(circuit, isolation(circuit, bias))
    assert alone.terminals == ("c", "b", "e")
    parts = linearise(circuit, bias).devices[0].parts
    network = Network.from_parts(parts, output=Port("c"))
    y = admittance(network, on_axis(alone.frequency_hz))
    outer = [network.unknowns.index(name) for name in alone.terminals]
    inner = [k for k in range(network.size) if k not in outer]
    y_oi, y_io = y[:, outer][:, :, inner], y[:, inner][:, :, outer]
    reduced = y[:, outer][:, :, outer] - y_oi @ np.linalg.solve(y[:, inner][:, :, inner], y_io)
    assert np.max(np.abs(reduced - alone.admittance) / np.abs(reduced).max(axis=(1, 2))[:, None, None]) < 1e-9


def test_inner_nodes_that_do_not_exist_are_left_out(engine: Engine) -> None:
    circuit = preamp()
    bias = engine.bias(circuit, observations(circuit))
    alone = engine.isolate(circuit, isolation(circuit, bias, inner=("base", "collCI", "collCX", "emitter")))
    assert alone.inner == ("base", "collCX", "emitter")
    assert alone.inner_gain.shape == (len(GRID), 3, 3)
    # The collector's current flows through R_C = 12 Ω, from the terminal to the inner node.
    across = np.array([1.0, 0.0, 0.0]) - alone.inner_gain[:, 1, :]
    assert np.allclose(across / 12.0, alone.admittance[:, 0, :], rtol=1e-7, atol=1e-12)


def test_the_loaded_circuit_is_swept_after_a_measurement(engine: Engine) -> None:
    circuit = preamp()
    bias = engine.bias(circuit, observations(circuit))
    before = engine.sweep(GRID).response
    engine.isolate(circuit, isolation(circuit, bias))
    assert np.array_equal(engine.sweep(GRID).response, before)
    assert np.array_equal(engine.sweep(GRID).response, before)


def test_terminals_that_are_not_driven_answer_to_those_that_are(engine: Engine) -> None:
    """One of them at 0 V may be ground itself; its current is what the others leave."""
    circuit = board("M1 d g s b mx w=1e-5 l=1e-6", "RD d 0 1", "RG g 0 1", "RS s 0 1", "RB b 0 1", models=(BSIM,))
    every = Isolation("M1", (1.0, 1.2, 0.0, -0.3), tuple(GRID.tolist()))
    whole = engine.isolate(circuit, every).admittance
    for grounded in (None, 2):
        some = engine.isolate(circuit, replace(every, driven=(1,), grounded=grounded))
        assert np.allclose(some.admittance[:, :, 1], whole[:, :, 1], rtol=1e-9, atol=1e-16)
        assert np.all(np.isnan(some.admittance[:, :, [0, 2, 3]]))
        assert some.current_gain.shape == (len(GRID), 4, 0)


def test_parameters_can_be_set_otherwise(engine: Engine) -> None:
    circuit = preamp()
    bias = engine.bias(circuit, observations(circuit))
    one, two = (engine.isolate(circuit, isolation(circuit, bias, parameters=(("m", m),))) for m in (1.0, 2.0))
    assert np.allclose(two.admittance, 2.0 * one.admittance, rtol=1e-9)


def test_what_does_not_fit_is_an_error(engine: Engine) -> None:
    circuit = preamp()
    with pytest.raises(EngineError, match="Q7"):
        engine.isolate(circuit, Isolation("Q7", (0.0,), (1e6,)))
    with pytest.raises(ValueError, match="3 terminals"):
        engine.isolate(circuit, Isolation("Q1", (0.0,), (1e6,)))


def test_an_instance_between_ground_and_ground_has_both_terminals(engine: Engine) -> None:
    circuit = board("V1 b 0 0.6", "Q1 b b 0 qn", output="b")
    alone = engine.isolate(circuit, Isolation("Q1", (0.6, 0.0), (1e6,)))
    assert alone.terminals == ("b", "0")
    assert alone.admittance[0, 0, 0] == pytest.approx(-alone.admittance[0, 1, 0], rel=1e-2)


def test_several_at_once_answer_as_one_by_one(engine: Engine) -> None:
    """With other numbers of terminals, and models of their own, beside each other."""
    cards = ("V1 c 0 5", "V2 b 0 0.7", "Q1 c b 0 qn", "Q2 c b 0 s qp", "F1 c 0 V2 40", "RS s 0 1k")
    circuit = board(*cards, output="c")
    asked = (
        Isolation("Q1", (5.0, 0.7, 0.0), (1e3, 1e9), inner=("base",)),
        Isolation("Q2", (-5.0, -0.7, 0.0, 0.1), (1e3, 1e9)),
        Isolation("F1", (5.0, 0.0), (1e3, 1e9), currents=(1e-3,)),
        Isolation("Q1", (5.0, 0.7, 0.0), (1e6,)),
    )
    together = engine.isolate_all(circuit, asked[:3])
    for isolation, found in zip(asked[:3], together, strict=True):
        alone = engine.isolate(circuit, isolation)
        assert np.array_equal(alone.admittance, found.admittance)
        assert np.array_equal(alone.current_gain, found.current_gain)
        assert alone.inner == found.inner
    assert np.allclose(together[2].current_gain[:, :, 0], [[40.0, -40.0]] * 2, rtol=1e-12)
    assert np.allclose(together[2].admittance, 0.0)


def test_one_without_an_answer_is_named_and_the_engine_goes_on(engine: Engine) -> None:
    circuit = board("V1 c 0 5", "Q1 c c 0 qn", "Q2 c c 0 qn", output="c")
    wrong = Isolation("Q2", (1e3, -1e3), (1e6,), parameters=(("area", 0.0),))
    with pytest.raises(EngineError, match="Q2"):
        engine.isolate_all(circuit, (Isolation("Q1", (0.6, 0.0), (1e6,)), wrong))
    assert engine.isolate(circuit, Isolation("Q1", (0.6, 0.0), (1e6,))).terminals == ("c", "0")


def test_each_place_of_a_node_can_be_a_terminal_of_its_own(engine: Engine) -> None:
    circuit = board("V1 c 0 0.6", "Q1 c c 0 qn", output="c")
    joined = engine.isolate(circuit, Isolation("Q1", (0.6, 0.0), (1e6,))).admittance[0]
    apart = engine.isolate(circuit, Isolation("Q1", (0.6, 0.6, 0.0), (1e6,), each_node=True))
    assert apart.terminals == ("c", "c", "0")
    assert apart.admittance[0, :2, :2].sum() == pytest.approx(joined[0, 0], rel=1e-9)
