"""One answer whether solved dense in batches or sparse one by one."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

import amplifiers
from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_source,
    inductance,
    line,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.errors import NetworkError
from tauledger.network import solve as module
from tauledger.network.assemble import Network, incidence
from tauledger.network.solve import DENSE_LIMIT, log_slope, on_axis, response, solve, times

FREQUENCIES = np.geomspace(1.0, 1e9, 7)


@settings(max_examples=10, deadline=None, derandomize=True)
@given(networks())
def test_forward_and_adjoint_give_one_response(network: Network) -> None:
    at = solve(network, on_axis(FREQUENCIES))
    assert at.adjoint @ network.drive == pytest.approx(at.response, rel=1e-7)
    assert response(network, FREQUENCIES) == pytest.approx(at.response, rel=1e-12)


@settings(max_examples=10, deadline=None, derandomize=True)
@given(networks())
def test_slope_is_the_derivative_of_the_response(network: Network) -> None:
    slope = log_slope(network, solve(network, on_axis(FREQUENCIES)))
    step = 1e-5
    up, down = response(network, FREQUENCIES * (1.0 + step)), response(network, FREQUENCIES * (1.0 - step))
    assert np.log(up / down) / (2.0 * step) == pytest.approx(slope, abs=1e-4)


@pytest.fixture
def sparse(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "DENSE_LIMIT", 0)


def test_sparse_and_dense_give_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    for network in (amplifiers.coupled_stage(), amplifiers.choke_fed(), amplifiers.shunt_peaked()):
        dense = solve(network, on_axis(FREQUENCIES))
        slopes, direct = log_slope(network, dense), response(network, FREQUENCIES)
        moved = times(network.capacitance, dense.x)
        with monkeypatch.context() as patch:
            patch.setattr(module, "DENSE_LIMIT", 0)
            by_one = solve(network, on_axis(FREQUENCIES))
            assert by_one.x == pytest.approx(dense.x, rel=1e-8, abs=1e-12)
            assert by_one.adjoint == pytest.approx(dense.adjoint, rel=1e-8, abs=1e-9)
            assert log_slope(network, by_one) == pytest.approx(slopes, rel=1e-6, abs=1e-9)
            assert response(network, FREQUENCIES) == pytest.approx(direct, rel=1e-8)
            assert times(network.capacitance, dense.x) == pytest.approx(moved, rel=1e-9, abs=1e-20)


def test_a_ladder_beyond_the_dense_limit_is_solved_sparse() -> None:
    parts: list[Part] = []
    node = "in"
    for k in range(2 * DENSE_LIMIT):
        out = f"n{k}"
        parts += [resistance(f"R{k}", node, out, 1.0), capacitance(f"C{k}", out, "0", 1e-12)]
        node = out
    network = amplifiers.network(*parts, output=node)
    assert network.size > DENSE_LIMIT
    # a long uniform line: the mean delay of n sections is RC·n(n+1)/2
    at = solve(network, on_axis(1.0))
    n = 2 * DENSE_LIMIT
    delay = -float(log_slope(network, at)[0].imag) / (2.0 * np.pi)
    assert delay == pytest.approx(1e-12 * n * (n + 1) / 2.0, rel=1e-6)


@pytest.mark.usefixtures("sparse")
def test_a_floating_node_has_no_unique_solution_sparse() -> None:
    with pytest.raises(NetworkError, match="no unique solution"):
        response(floating(), np.zeros(1))


def test_a_floating_node_has_no_unique_solution_dense() -> None:
    with pytest.raises(NetworkError, match="no unique solution"):
        response(floating(), np.zeros(1))
    with pytest.raises(NetworkError, match="no unique solution"):
        solve(floating(), np.zeros(1, dtype=complex))


def floating() -> Network:
    return amplifiers.network(capacitance("C1", "in", "out", 1e-9), capacitance("C2", "out", "0", 1e-9))


def test_signs_follow_the_conventions_of_the_parts() -> None:
    pulled = Network.from_parts(
        [current_source("I", "0", "out", 1e-3), resistance("R", "out", "0", 1e3)], output=Port("out")
    )
    assert response(pulled, np.zeros(1))[0] == pytest.approx(1.0)
    through = Network.from_parts(
        [voltage_source("V", "a", "0", 1.0), inductance("L", "a", "b", 1e-3), resistance("R", "b", "0", 10.0)],
        output=Port("", kind="current", through="L"),
    )
    assert response(through, np.zeros(1))[0] == pytest.approx(0.1)
    source = Network.from_parts(through.parts, output=Port("", kind="current", through="v"))
    assert response(source, np.zeros(1))[0] == pytest.approx(-0.1)


def test_several_sources_drive_at_once_with_phase_and_may_be_given_by_name() -> None:
    parts = [
        voltage_source("V1", "a", "0", 1.0),
        voltage_source("V2", "b", "0", -1.0),
        resistance("R1", "a", "out", 1e3),
        resistance("R2", "b", "out", 1e3),
        resistance("R3", "out", "0", 1e3),
    ]
    together = Network.from_parts(parts, output=Port("out"))
    assert response(together, np.zeros(1))[0] == pytest.approx(0.0, abs=1e-15)
    one = Network.from_parts(parts, output=Port("out"), drive={"v2": 0.0, "V1": 3.0j})
    assert response(one, np.zeros(1))[0] == pytest.approx(1.0j)
    assert one.amplitude(parts[0]) == 3.0j


def test_difference_output_is_the_difference_of_two_outputs() -> None:
    network = amplifiers.coupled_stage()
    difference = Network.from_parts(network.parts, output=Port("out", "b"))
    b = Network.from_parts(network.parts, output=Port("b"))
    expected = response(network, FREQUENCIES) - response(b, FREQUENCIES)
    assert response(difference, FREQUENCIES) == pytest.approx(expected, rel=1e-9)
    assert incidence(network, "out", "b") == pytest.approx(difference.output)


def test_an_output_that_no_part_touches_and_a_name_used_twice_are_errors() -> None:
    r = resistance("R", "in", "0", 1e3)
    with pytest.raises(NetworkError, match="output node nowhere"):
        amplifiers.network(r, output="nowhere")
    with pytest.raises(NetworkError, match="no branch current"):
        Network.from_parts([r], output=Port("", kind="current", through="V9"))
    with pytest.raises(NetworkError, match="two parts of one name: R"):
        amplifiers.network(r, r, output="in")


def test_where_a_line_leaves_no_full_number_the_slope_is_without_end() -> None:
    parts = [
        voltage_source("VS", "in", "0", 1.0),
        line("T1", ("in", "0", "out", "0"), 2.84e-9, 0.0, 1e3),
        resistance("RL", "out", "0", 1e3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    # √(2π·f·RC/2) nepers: 670 at 50 THz, 733 at 60 THz, where e^-733 is no full number any more
    slope = log_slope(network, solve(network, on_axis(np.array([1e12, 5e13, 6e13, 1e15])))).real
    assert slope[:2] == pytest.approx(-np.sqrt(np.pi * np.array([1e12, 5e13]) * 2.84e-9) / 2.0, rel=0.02)
    assert np.all(slope[2:] == -np.inf)


BESIDE = 1e12


@pytest.mark.parametrize("limit", [DENSE_LIMIT, 0])
def test_a_row_of_huge_entries_takes_no_digits_from_the_output(limit: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """a + K·b = K and a + b = 2: pivots chosen by size alone leave 4 digits of a (Golub and Van Loan, section 3.4)."""
    monkeypatch.setattr(module, "DENSE_LIMIT", limit)
    parts = [
        resistance("RA", "a", "0", 1.0),
        transconductance("GA", ("a", "0"), ("b", "0"), BESIDE),
        resistance("RB", "b", "0", 1.0),
        transconductance("GB", ("b", "0"), ("a", "0"), 1.0),
        current_source("IA", "0", "a", BESIDE),
        current_source("IB", "0", "b", 2.0),
    ]
    network = Network.from_parts(parts, output=Port("a"))
    exact = 2.0 - (BESIDE - 2.0) / (BESIDE - 1.0)
    at = solve(network, on_axis(1.0))
    assert at.response[0] == pytest.approx(exact, rel=1e-14)
    assert at.adjoint[0] @ network.drive == pytest.approx(exact, rel=1e-3)
    assert response(network, np.array([1.0]))[0] == pytest.approx(exact, rel=1e-14)


def test_a_network_of_ground_alone_answers_with_nothing() -> None:
    network = Network.from_parts([resistance("R1", "0", "0", 1e3)], output=Port("0"))
    assert network.size == 0
    assert np.all(response(network, FREQUENCIES) == 0.0)
