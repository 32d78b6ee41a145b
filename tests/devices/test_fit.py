"""The fit finds the network from which samples were made, with as many states as that has, and refuses a delay."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.devices.fit import Fit, fit, frequencies, states
from tauledger.devices.parts import Part
from tauledger.devices.reduced import hybrid_pi, quasi_static, with_remainder
from tauledger.errors import ElementError
from tauledger.solution import Samples

few = settings(max_examples=20, deadline=None, derandomize=True)
TERMINALS = ("c", "b", "e")


def sampled(g: np.ndarray, c: np.ndarray, terminals: int = 3, copies: int = 0) -> Samples:
    """Measure G + s·C as the engine does; `copies` inner nodes are told twice."""
    frequency = np.array(frequencies())
    y = g + 2j * np.pi * frequency[:, None, None] * c
    n = terminals
    inner = -np.linalg.solve(y[:, n:, n:], y[:, n:, :n])
    told = np.concatenate([inner, inner[:, :copies]], axis=1)
    return Samples(
        element="Q1",
        terminals=TERMINALS[:terminals],
        frequency_hz=frequency,
        admittance=y[:, :n, :n] + y[:, :n, n:] @ inner,
        current_gain=np.zeros((len(frequency), n, 0), dtype=complex),
        inner=tuple(f"inner{k}" for k in range(told.shape[1])),
        inner_gain=told,
    )


@st.composite
def instances(draw: st.DrawFn) -> tuple[np.ndarray, np.ndarray]:
    """G and C of a transistor with r_b, r_c, r_e between its three terminals (c, b, e) and three inner nodes."""
    siemens = st.floats(1e-3, 1.0)
    farad = st.floats(1e-14, 1e-11)
    g, c = np.zeros((6, 6)), np.zeros((6, 6))
    for k in range(3):
        stamp(g, k, k + 3, k, k + 3, draw(siemens))
    stamp(g, 3, 5, 4, 5, draw(st.floats(1e-3, 0.5)))
    stamp(g, 4, 5, 4, 5, draw(st.floats(1e-6, 1e-3)))
    stamp(g, 3, 5, 3, 5, draw(st.floats(1e-7, 1e-4)))
    for a, b in ((4, 5), (4, 3), (1, 3)):
        stamp(c, a, b, a, b, draw(farad))
    stamp(c, 4, 5, 4, 3, 0.2 * draw(farad))
    return g, c


def stamp(matrix: np.ndarray, p: int, m: int, cp: int, cm: int, value: float) -> None:
    out, control = np.zeros(len(matrix)), np.zeros(len(matrix))
    out[p], out[m] = 1.0, -1.0
    control[cp], control[cm] = 1.0, -1.0
    matrix += value * np.outer(out, control)


def inner_poles(found: Fit) -> np.ndarray:
    n = found.terminals
    mu = np.linalg.eigvals(np.linalg.solve(found.conductance[n:, n:], found.capacitance[n:, n:]))
    return np.sort_complex(-1.0 / mu[np.abs(mu) > 1e-9 * np.abs(mu).max()])


@few
@given(instances())
def test_response_of_the_fit_is_that_of_the_instance(instance: tuple[np.ndarray, np.ndarray]) -> None:
    samples = sampled(*instance)
    found = fit(samples)
    error = np.abs(found.admittance(samples.frequency_hz) - samples.admittance).max(axis=(1, 2))
    assert np.all(error <= 1e-10 * np.abs(samples.admittance).max(axis=(1, 2)))
    assert found.error <= 1e-10


@few
@given(instances())
def test_nodes_that_move_together_add_no_state_and_no_pole(instance: tuple[np.ndarray, np.ndarray]) -> None:
    plain, doubled = sampled(*instance), sampled(*instance, copies=2)
    assert states(doubled).shape == states(plain).shape
    assert inner_poles(fit(doubled)) == pytest.approx(inner_poles(fit(plain)), rel=1e-6, abs=0.0)


@few
@given(instances())
def test_poles_do_not_move_with_the_frequencies_that_are_used(instance: tuple[np.ndarray, np.ndarray]) -> None:
    samples = sampled(*instance)
    half = np.arange(0, len(samples.frequency_hz), 2)
    thinned = Samples(
        samples.element,
        samples.terminals,
        samples.frequency_hz[half],
        samples.admittance[half],
        samples.current_gain[half],
        samples.inner,
        samples.inner_gain[half],
    )
    assert inner_poles(fit(thinned)) == pytest.approx(inner_poles(fit(samples)), rel=1e-6, abs=0.0)


@few
@given(instances())
def test_states_rest_at_dc_so_that_the_terminals_matrices_are_the_first_two_terms(
    instance: tuple[np.ndarray, np.ndarray],
) -> None:
    g, c = instance
    n = 3
    down, back = np.linalg.solve(g[n:, n:], g[n:, :n]), np.linalg.solve(g[n:, n:].T, g[:n, n:].T).T
    g0 = g[:n, :n] - g[:n, n:] @ down
    c0 = c[:n, :n] - c[:n, n:] @ down - back @ c[n:, :n] + back @ c[n:, n:] @ down
    found = fit(sampled(g, c))
    assert found.at_rest()[0] == pytest.approx(g0, rel=1e-6, abs=1e-9 * np.abs(g0).max())
    assert found.at_rest()[1] == pytest.approx(c0, rel=1e-6, abs=1e-6 * np.abs(c0).max())
    assert not np.any(found.conductance[:n, n:])
    assert not np.any(found.conductance[n:, :n])


@few
@given(instances())
def test_textbook_elements_and_the_remainder_are_the_instance(instance: tuple[np.ndarray, np.ndarray]) -> None:
    samples = sampled(*instance)
    found = fit(samples)
    for elements in (
        hybrid_pi("Q1", TERMINALS, found, ("c", "b", "e", None)),
        quasi_static("Q1", TERMINALS, found, ("c", "b", "e", None)),
    ):
        parts = with_remainder("Q1", TERMINALS, found, elements)
        assert parts[-1].name == "Q1.inside"
        rebuilt = stamped(parts, samples.frequency_hz)
        error = np.abs(rebuilt - samples.admittance).max(axis=(1, 2))
        assert np.all(error <= 1e-10 * np.abs(samples.admittance).max(axis=(1, 2)))


def stamped(parts: tuple[Part, ...], frequency_hz: np.ndarray) -> np.ndarray:
    rest = parts[-1]
    place = {node: k for k, node in enumerate(rest.nodes)}
    g, c = np.array(rest.conductances), np.array(rest.capacitances)
    for part in parts[:-1]:
        p, m, cp, cm = (place[node] for node in (*part.nodes[:2], *part.nodes[-2:]))
        stamp(c if part.kind == "capacitance" else g, p, m, cp, cm, part.value)
    return Fit(3, g, c, 0.0).admittance(frequency_hz)


def test_an_instance_without_inner_nodes_is_its_own_real_and_imaginary_part() -> None:
    g, c = np.zeros((3, 3)), np.zeros((3, 3))
    stamp(g, 0, 2, 1, 2, 40e-3)
    stamp(c, 1, 2, 1, 2, 3e-12)
    stamp(c, 0, 2, 1, 2, -0.4e-12)
    found = fit(sampled(g, c))
    assert found.states == 0
    assert found.conductance == pytest.approx(g, rel=1e-12, abs=1e-18)
    assert found.capacitance == pytest.approx(c, rel=1e-9, abs=1e-24)


def test_a_delay_is_refused_with_the_instance_s_name() -> None:
    g, c = np.zeros((3, 3)), np.zeros((3, 3))
    stamp(g, 0, 2, 1, 2, 40e-3)
    stamp(g, 1, 2, 1, 2, 1e-3)
    stamp(c, 1, 2, 1, 2, 3e-12)
    samples = sampled(g, c)
    late = samples.admittance.copy()
    late[:, 0] *= np.exp(-2j * np.pi * samples.frequency_hz * 5e-12)[:, None]
    with pytest.raises(ElementError, match="Q1 could not be fitted within 1e-08"):
        fit(
            Samples(
                samples.element,
                samples.terminals,
                samples.frequency_hz,
                late,
                samples.current_gain,
                samples.inner,
                samples.inner_gain,
            )
        )
