"""What every element does to unity gain, margins, gain and phase: the adjoint against a changed network."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from msgspec.structs import replace

import amplifiers
import boards
from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import (
    capacitance,
    conductance,
    current_gain,
    inductance,
    resistance,
    transconductance,
    transresistance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.edges import find_edges
from tauledger.network.midband import MidBand, find_midband, in_changed
from tauledger.network.recompute import edge_frequencies, scaled
from tauledger.network.solve import log_slope, on_axis, response, solve
from tauledger.network.targets import (
    UnityMove,
    follow_unity,
    gain_moves,
    log_sensitivity,
    peaking_moves,
    unity_identities,
    unity_moves,
    with_capacitance,
)
from tauledger.network.unity import Unity, find_unity

STEP = 1e-5
# A central difference of this step is off by its square and by rounding over the step.
REL, ABS = 1e-6, 1e-6


def two_stages(c_c: float = 2.2e-12, r_z: float = 900.0) -> Network:
    """Two inverting stages, the second with a compensation capacitor and a resistor in series with it."""
    return Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            resistance("RS", "in", "g", 2e3),
            capacitance("CG", "g", "0", 0.3e-12),
            transconductance("M1", ("y", "0"), ("g", "0"), 4e-4, label="gm"),
            conductance("M1", "y", "0", 2e-6, label="g_o"),
            capacitance("M1", "g", "y", 0.02e-12, label="c_gd"),
            capacitance("CY", "y", "0", 0.35e-12),
            transconductance("M2", ("out", "0"), ("y", "0"), 1.2e-3, label="gm"),
            conductance("M2", "out", "0", 1e-5, label="g_o"),
            resistance("RZ", "y", "z", r_z),
            capacitance("CC", "z", "out", c_c),
            capacitance("CL", "out", "0", 6e-12),
        ],
        output=Port("out"),
    )


def unity_of(network: Network) -> tuple[MidBand, Unity]:
    midband = find_midband(network)
    found = find_unity(network, midband)
    assert found is not None
    return midband, found


def high_of(network: Network, midband: MidBand) -> float:
    edge = find_edges(network, midband).f_high
    assert edge is not None
    assert edge.hz is not None
    return edge.hz


def figures(network: Network, midband: MidBand) -> tuple[float, float, float, float]:
    """ln f_u, phase margin, gain margin and ln of the gain-bandwidth product, mid-band held at its frequency."""
    same = in_changed(network, midband)
    found = find_unity(network, same)
    high = edge_frequencies(network, midband).f_high
    assert found is not None
    assert found.gain_margin_db is not None
    assert high is not None
    return math.log(found.hz), found.phase_margin_deg or 0.0, found.gain_margin_db, math.log(abs(same.gain) * high)


def moved(move: UnityMove) -> tuple[float, float, float, float]:
    assert move.gain_margin_db is not None
    assert move.gain_bandwidth is not None
    return move.f_unity, move.phase_margin_deg, move.gain_margin_db, move.gain_bandwidth


def test_every_part_moves_unity_gain_and_margins_as_a_changed_network_does() -> None:
    network = two_stages()
    midband, unity = unity_of(network)
    found = unity_moves(network, midband, unity, high_of(network, midband)).parts
    assert set(found) == {part.name for part in network.parts} - {"VS"}
    for name, move in found.items():
        more, less = (figures(scaled(network, {name: math.exp(step)}), midband) for step in (STEP, -STEP))
        for exact, up, down in zip(moved(move), more, less, strict=True):
            assert exact == pytest.approx((up - down) / (2.0 * STEP), rel=REL, abs=ABS), name


def test_a_picofarad_to_ground_costs_what_the_network_with_it_says() -> None:
    """One-sided, for there is no negative capacitance to add: the step is so small that its square does not count."""
    network = two_stages()
    midband, unity = unity_of(network)
    found = unity_moves(network, midband, unity, high_of(network, midband)).nodes
    before = figures(network, midband)
    for node in ("g", "y", "z", "out"):
        farad = 1e-19
        after = figures(with_capacitance(network, node, farad), midband)
        for exact, one, other in zip(moved(found[node]), after, before, strict=True):
            assert exact * 1e-12 == pytest.approx((one - other) / farad * 1e-12, rel=1e-4, abs=1e-4), node


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_gain_and_phase_at_a_frequency_move_as_the_changed_network_says(network: Network) -> None:
    midband = find_midband(network)
    hz = 3.0 * (midband.frequency_hz or 1e3)
    found = gain_moves(network, midband, hz)
    frequencies = np.array([midband.frequency_hz, hz])
    for name, move in found.items():
        try:
            up, down = (response(scaled(network, {name: math.exp(step)}), frequencies) for step in (STEP, -STEP))
        except NetworkError:
            continue
        slope = np.log(up / down) / (2.0 * STEP)
        assert move.gain == pytest.approx(slope[1].real, rel=REL, abs=ABS), name
        assert math.radians(move.phase_deg) == pytest.approx(slope[1].imag, rel=REL, abs=ABS), name
        assert math.radians(move.beyond_midband_deg) == pytest.approx((slope[1] - slope[0]).imag, rel=REL, abs=ABS)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_scaling_all_reactive_values_scales_frequency_and_scaling_all_admittances_changes_nothing(
    network: Network,
) -> None:
    """Two identities of a voltage ratio: Σ over C, L = d ln H/d ln s; Σ over C, G, gm less that over L = 0."""
    frequencies = np.geomspace(1e2, 1e8, 5)
    found = log_sensitivity(network, frequencies)
    kinds = {part.name: part.kind for part in network.parts}
    charges = ("capacitance", "inductance", "transcapacitance")
    reactive = np.sum([found.parts[name] for name, kind in kinds.items() if kind in charges], axis=0)
    slope = log_slope(network, solve(network, on_axis(frequencies)))
    size = 1.0 + sum(np.abs(move) for move in found.parts.values())
    assert np.all(np.abs(reactive - slope) <= 1e-9 * size)
    signs = {name: -1.0 if kind == "inductance" else 1.0 for name, kind in kinds.items()}
    whole = sum(signs[name] * move for name, move in found.parts.items())
    assert np.all(np.abs(whole) <= 1e-9 * size)


def test_all_capacitances_together_move_f_u_as_its_inverse_and_leave_both_margins() -> None:
    network = two_stages()
    midband, unity = unity_of(network)
    found = unity_moves(network, midband, unity, high_of(network, midband)).parts
    kinds = {part.name: part.kind for part in network.parts}
    sums = np.sum([moved(found[name]) for name, kind in kinds.items() if kind == "capacitance"], axis=0)
    assert sums == pytest.approx([-1.0, 0.0, 0.0, -1.0], abs=1e-6)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(networks())
def test_the_shares_of_f_u_add_to_one_in_any_network(network: Network) -> None:
    midband = find_midband(network)
    unity = find_unity(network, midband)
    assume(unity is not None)
    assert unity is not None
    assert all(identity.holds for identity in unity_identities(network, unity_moves(network, midband, unity)))


def test_a_share_that_is_left_out_breaks_the_identity() -> None:
    network = two_stages()
    midband, unity = unity_of(network)
    moves = unity_moves(network, midband, unity)
    broken = replace(moves, parts={**moves.parts, "CC": replace(moves.parts["CC"], f_unity=0.0)})
    assert not all(identity.holds for identity in unity_identities(network, broken))


def test_controlled_sources_of_every_kind_are_taken_along() -> None:
    network = Network.from_parts(
        [
            voltage_source("VS", "in", "0", 1.0),
            resistance("RS", "in", "a", 1e3),
            voltage_source("VM", "a", "b"),
            resistance("RB", "b", "0", 2e3),
            capacitance("CB", "b", "0", 1e-9),
            voltage_gain("E1", ("e", "0"), ("b", "0"), 30.0),
            resistance("R1", "e", "x", 1e3),
            capacitance("C1", "x", "0", 2e-9),
            current_gain("F1", "x", "0", 3.0, "VM"),
            inductance("L1", "x", "y", 1e-3),
            transresistance("H1", "h", "0", 2e3, "VM"),
            resistance("R2", "h", "y", 5e3),
            resistance("R3", "y", "0", 5e3),
            capacitance("C2", "y", "0", 1e-10),
        ],
        output=Port("y"),
    )
    midband = find_midband(network)
    hz = 2e5
    found = gain_moves(network, midband, hz)
    assert {"E1", "F1", "H1", "L1"} <= set(found)
    for name, move in found.items():
        up, down = (response(scaled(network, {name: math.exp(step)}), np.array([hz]))[0] for step in (STEP, -STEP))
        slope = complex(np.log(up / down)) / (2.0 * STEP)
        assert move.gain == pytest.approx(slope.real, rel=REL, abs=ABS), name
        assert math.radians(move.phase_deg) == pytest.approx(slope.imag, rel=REL, abs=ABS), name


def test_peaking_moves_as_the_changed_network_says_though_its_frequency_moves_too() -> None:
    network = amplifiers.network(
        resistance("R", "in", "x", 100.0),
        inductance("L", "x", "out", 1e-4),
        capacitance("C", "out", "0", 1e-9),
        resistance("RP", "out", "0", 2e3),
    )
    midband = find_midband(network)
    edge = find_edges(network, midband).f_high
    assert edge is not None
    assert edge.peaking_at_hz is not None
    found = peaking_moves(network, midband, edge.peaking_at_hz)

    def peaking(changed: Network) -> float:
        high = find_edges(changed, in_changed(changed, midband)).f_high
        assert high is not None
        return high.peaking_db

    for name, exact in found.items():
        up, down = (peaking(scaled(network, {name: math.exp(step)})) for step in (1e-3, -1e-3))
        assert exact == pytest.approx((up - down) / 2e-3, rel=1e-5, abs=1e-7), name


@pytest.mark.parametrize("factor", [0.5, 0.9, 1.1, 2.0])
def test_a_followed_unity_gain_is_the_one_that_a_search_finds(factor: float) -> None:
    network = two_stages()
    midband, unity = unity_of(network)
    for name in ("CC", "CL", "RZ", "M2.gm", "M1.gm"):
        changed = scaled(network, {name: factor})
        found, searched = (
            follow_unity(changed, midband, unity),
            find_unity(changed, in_changed(changed, midband)),
        )
        assert found is not None
        assert searched is not None
        assert found.hz == pytest.approx(searched.hz, rel=1e-10)
        assert found.phase_margin_deg == pytest.approx(searched.phase_margin_deg, abs=1e-7)


def test_a_unity_gain_that_moves_far_is_searched_for_and_one_that_is_gone_is_none() -> None:
    network = boards.two_common_source_stages()
    midband, unity = unity_of(network)
    gm = next(part.name for part in network.parts if part.kind == "transconductance")
    far = follow_unity(scaled(network, {gm: 0.05}), midband, unity)
    searched = find_unity(changed := scaled(network, {gm: 0.05}), in_changed(changed, midband))
    assert (far is None) == (searched is None)
    if far is not None and searched is not None:
        assert far.hz == pytest.approx(searched.hz, rel=1e-10)
    assert follow_unity(scaled(network, {gm: 1e-6}), midband, unity) is None
