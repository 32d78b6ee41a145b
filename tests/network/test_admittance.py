"""Delays, controlled sources and coupled inductors: what they do to Y, to its slope, to shares and to poles."""

from __future__ import annotations

import numpy as np
import pytest

from amplifiers import DRIVE, network
from cells import near
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    current_gain,
    delayed_transconductance,
    inductance,
    mutual_inductance,
    resistance,
    transconductance,
    transresistance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import NetworkError
from tauledger.network.admittance import all_pass, slope_moment
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.constants import open_constants
from tauledger.network.edges import find_edges
from tauledger.network.first_order import sensitivities
from tauledger.network.identities import open_identities, response_identities, share_identities
from tauledger.network.poles import find_poles
from tauledger.network.recompute import each_scaled, edge_frequencies, scaled, without
from tauledger.network.shares import find_shares
from tauledger.network.solve import DENSE_LIMIT, log_slope, on_axis, response, solve
from tauledger.network.transformers import loose_couplings

TAU = 2e-9


def delayed(tau: float = TAU) -> Network:
    """A stage whose transconductance comes late by `tau`, with feedback around it."""
    return network(
        resistance("RS", "in", "b", 1e3),
        capacitance("CI", "b", "0", 5e-12),
        capacitance("CF", "b", "out", 1e-12),
        delayed_transconductance("G1", ("out", "0"), ("b", "0"), 20e-3, tau, "gm"),
        resistance("RL", "out", "0", 1e3),
        capacitance("CL", "out", "0", 2e-12),
    )


def transformer(coupling: float = 0.98) -> Network:
    """A source of 50 Ω, a 1 : 2 transformer with leakage, and a load."""
    l1, l2 = 1e-3, 4e-3
    m = coupling * np.sqrt(l1 * l2)
    return network(
        resistance("RS", "in", "p", 50.0),
        inductance("L1", "p", "0", l1),
        inductance("L2", "out", "0", l2),
        mutual_inductance("K1", "L1", "L2", ("p", "0", "out", "0"), m),
        resistance("RL", "out", "0", 300.0),
        capacitance("CL", "out", "0", 30e-12),
    )


def test_a_delay_turns_the_phase_and_leaves_the_magnitude() -> None:
    plain = [resistance("RL", "out", "0", 1e3), conductance("GI", "in", "0", 1e-3)]
    late = network(*plain, delayed_transconductance("G1", ("0", "out"), ("in", "0"), 1e-3, TAU))
    f = np.array([1e3, 1e7, 3e8])
    assert np.allclose(response(late, f), np.exp(-2j * np.pi * f * TAU), rtol=1e-12)


def test_dense_and_sparse_solution_are_the_same() -> None:
    few = delayed()
    many = Network.from_parts(
        [*few.parts, *(resistance(f"R{k}", f"x{k}", "0", 1e3) for k in range(DENSE_LIMIT))], output=few.port
    )
    f = np.geomspace(1e3, 1e9, 7)
    assert np.allclose(response(few, f), response(many, f), rtol=1e-12)
    a, b = solve(few, on_axis(f)), solve(many, on_axis(f))
    assert np.allclose(log_slope(few, a), log_slope(many, b), rtol=1e-10)


@pytest.mark.parametrize("made", [delayed(), transformer()], ids=["delay", "transformer"])
def test_slope_is_the_derivative_of_the_response(made: Network) -> None:
    f = np.geomspace(1e4, 1e8, 9)
    step = 1e-5
    ahead, behind = (np.log(response(made, f * (1.0 + sign * step))) for sign in (1.0, -1.0))
    numeric = (ahead - behind) / (2.0 * step)
    assert np.allclose(log_slope(made, solve(made, on_axis(f))), numeric, rtol=1e-6, atol=1e-9)


@pytest.mark.parametrize("made", [delayed(), transformer()], ids=["delay", "transformer"])
def test_shares_add_to_one_with_delays_and_mutual_inductances(made: Network) -> None:
    midband = find_midband(made)
    bands = classify(made, midband)
    high = find_edges(made, midband).f_high
    assert high is not None
    assert high.hz is not None
    shares = find_shares(made, midband, high.hz, bands.class_of)
    assert all(identity.holds for identity in share_identities(shares))
    assert all(identity.holds for identity in response_identities(made, midband))


def test_a_share_of_a_delay_is_what_a_longer_delay_does() -> None:
    made = delayed()
    midband = find_midband(made)
    edge = find_edges(made, midband).f_high
    assert edge is not None
    assert edge.hz is not None
    share = find_shares(made, midband, edge.hz, classify(made, midband).class_of).parts["G1.gm"]
    longer, shorter = (find_edges(delayed(TAU * (1.0 + d)), midband).f_high for d in (1e-4, -1e-4))
    assert longer is not None
    assert longer.hz is not None
    assert shorter is not None
    assert shorter.hz is not None
    assert np.log(longer.hz / shorter.hz) / 2e-4 == pytest.approx(-share, rel=1e-3)


def test_the_ledger_of_time_constants_leaves_the_delay_out() -> None:
    late, plain = delayed(), delayed(0.0)
    ledgers = [open_constants(classify(made, find_midband(made))) for made in (late, plain)]
    assert ledgers[0].sum_s == near(ledgers[1].sum_s, rel=1e-12)
    assert all(identity.holds for identity in open_identities(ledgers[0]))


def test_poles_take_the_delay_as_an_all_pass() -> None:
    made = delayed()
    rational = all_pass(made)
    assert not rational.delayed
    f = np.array([1e3, 1e6, 1e7])
    assert np.allclose(response(rational, f), response(made, f), rtol=2e-4)
    # the all-pass is right to (ωτ)³/12
    assert np.max(np.abs(response(rational, f[:2]) / response(made, f[:2]) - 1.0)) < 1e-6
    found = find_poles(made)
    for pole in found.poles:
        if pole.owners:
            assert sum(pole.owners.values()) == pytest.approx(1.0, rel=1e-6)
    assert all_pass(transformer()).parts == transformer().parts


def test_slope_moment_without_delays_is_that_of_c() -> None:
    made = transformer()
    at = solve(made, on_axis(np.array([1e5])))
    c = made.capacitance.dense(made.size)
    assert slope_moment(made, at)[0] == pytest.approx(complex(at.adjoint[0] @ c @ at.x[0]), rel=1e-12)


def test_perfect_coupling_is_the_turns_ratio() -> None:
    """v2/v1 = n = 2 with k = 1, between the magnetising and the capacitive end."""
    made = transformer(1.0)
    gain = response(made, np.array([1e6]))[0]
    assert abs(gain) == pytest.approx(2.0 * (300.0 / 4.0) / (50.0 + 300.0 / 4.0), rel=1e-3)


def test_current_gain_and_transresistance_sense_the_branch_they_name() -> None:
    parts = [
        resistance("R1", "in", "a", 1e3),
        voltage_source("VM", "a", "0"),
        current_gain("F1", "0", "x", 50.0, "vm"),
        resistance("R2", "x", "0", 100.0),
        transresistance("H1", "y", "0", 7e3, "VM"),
        voltage_gain("E1", ("out", "0"), ("y", "x"), -2.0),
        resistance("RL", "out", "0", 1e3),
    ]
    gain = response(network(*parts), np.array([1.0]))[0]
    # i(VM) = 1 mA per V: x at 5 V, y at 7 V, out = -2 · (7 - 5)
    assert gain == pytest.approx(-4.0, rel=1e-12)
    through = Network.from_parts([DRIVE, *parts], output=Port("out", kind="current", through="E1"))
    assert response(through, np.array([1.0]))[0] == pytest.approx(4e-3, rel=1e-12)


def test_what_refers_to_a_branch_that_is_gone_goes_with_it() -> None:
    parts: list[Part] = [
        resistance("R1", "in", "a", 1e3),
        voltage_source("VM", "a", "0"),
        current_gain("F1", "0", "out", 50.0, "VM"),
        transresistance("H1", "y", "0", 7e3, "VM"),
        resistance("R3", "y", "out", 1e3),
        transconductance("G1", ("0", "out"), ("in", "0"), 1e-3),
        resistance("RL", "out", "0", 1e3),
    ]
    left = without(network(*parts), frozenset({"VM"}))
    assert "F1" not in {part.name for part in left.parts}
    assert left.part("H1").kind == "voltage source"
    assert response(left, np.array([1.0]))[0] == pytest.approx(0.5, rel=1e-12)
    with pytest.raises(NetworkError, match="F1 refers to VX"):
        network(current_gain("F1", "0", "out", 50.0, "VX"), resistance("RL", "out", "0", 1e3))


def test_scaling_a_gain_scales_it() -> None:
    made = network(voltage_gain("E1", ("out", "0"), ("in", "0"), 3.0), resistance("RL", "out", "0", 1e3))
    assert response(scaled(made, {"E1": 2.0}), np.array([1.0]))[0] == pytest.approx(6.0, rel=1e-12)


def test_coupled_inductors_stay_in_both_networks() -> None:
    made = transformer()
    bands = classify(made, find_midband(made))
    assert {bands.class_of[name] for name in ("L1", "L2", "K1")} == {"tuned"}
    for kept in (bands.upper, bands.lower):
        assert {"L1", "L2", "K1"} <= {part.name for part in kept.parts}


def test_an_inductor_s_share_is_what_it_does_with_the_coupling_k_held() -> None:
    made = transformer(0.5)
    midband = find_midband(made)
    edges = find_edges(made, midband)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    shares = find_shares(made, midband, edges.f_high.hz, classify(made, midband).class_of)
    assert not [name for name in shares.parts if name.startswith("K")]
    moved = sensitivities(made, midband, edges, ())
    for name in ("L1", "L2", "K1"):
        up, down = (edge_frequencies(scaled(made, {name: 1.0 + step}), midband).f_high for step in (1e-4, -1e-4))
        assert up is not None
        assert down is not None
        effect = moved[name].f_high
        assert effect is not None
        assert effect == pytest.approx(np.log(up / down) / 2e-4, abs=1e-5)
        assert name == "K1" or shares.parts[name] == pytest.approx(-effect, rel=1e-9)


def test_scaling_an_inductor_takes_its_mutual_inductances_along() -> None:
    made = transformer(0.5)
    before = {part.name: part.value for part in made.parts}
    for factors in ({"L1": 0.81}, {"L1": 0.9, "L2": 0.9}, {"K1": 0.9}):
        assert scaled(made, factors).part("K1").value == pytest.approx(0.9 * before["K1"], rel=1e-15, abs=0)


def three_windings(k: float) -> Network:
    """A drive of 600 ohm on 1 H, with 10 mH at the output and 1 mH that feeds back into the drive's return."""
    henry = {"L1": 1.0, "L2": 10e-3, "L3": 1e-3}
    ends = {"L1": ("a", "0"), "L2": ("out", "0"), "L3": ("t", "0")}
    parts = [
        voltage_source("V1", "s", "0", 1.0),
        resistance("RS", "s", "a", 600.0),
        *(inductance(name, *ends[name], henry[name]) for name in henry),
        *(
            mutual_inductance(f"K{n}", x, y, (*ends[x], *ends[y]), k * np.sqrt(henry[x] * henry[y]))
            for n, (x, y) in enumerate((("L1", "L2"), ("L1", "L3"), ("L2", "L3")), start=1)
        ),
        resistance("RL", "out", "0", 50.0),
        resistance("RT", "t", "0", 10.0),
        capacitance("CL", "out", "0", 100e-12),
    ]
    return Network.from_parts(parts, output=Port("out", "0"))


def test_three_close_windings_have_shares_of_a_network_that_exists() -> None:
    made = three_windings(0.999)
    midband = find_midband(made)
    edges = find_edges(made, midband)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    shares = find_shares(made, midband, edges.f_high.hz, classify(made, midband).class_of)
    assert max(map(abs, shares.parts.values())) < 2.0
    less = each_scaled(made, midband, edges, 0.9)
    assert not [name for name in less if name.startswith("K")]
    for name in ("L1", "L2", "L3"):
        f_high = less[name].f_high
        assert f_high is not None
        assert f_high / edges.f_high.hz == pytest.approx(0.9 ** -shares.parts[name], rel=0.02)


def test_only_couplings_that_may_be_ten_per_cent_less_are_loose() -> None:
    assert loose_couplings(transformer(0.5)) == {"K1"}
    assert loose_couplings(transformer(0.95)) == frozenset()
    assert loose_couplings(three_windings(0.5)) == {"K1", "K2", "K3"}
    assert loose_couplings(three_windings(0.999)) == frozenset()
