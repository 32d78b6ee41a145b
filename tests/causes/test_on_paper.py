"""What paper may leave out: r_b and degeneration, each by the exact edge without it; a case and a near miss."""

from __future__ import annotations

import pytest

from by_algebra import evidence
from cells import bipolar, near
from tauledger.causes.catalogue import find_causes
from tauledger.causes.evidence import Evidence
from tauledger.causes.on_paper import base_resistance, degeneration_ignored
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.edges import find_edges
from tauledger.network.midband import find_midband


def network(device: Device, *parts: Part) -> Network:
    flat = [voltage_source("VS", "s", "0", 1.0), resistance("RS", "s", "b", 500.0), *device.parts, *parts]
    return Network.from_parts([*flat, capacitance("CL", "out", "0", 20e-12)], output=Port("out"))


def stage(*, r_b: float = 100.0, r_e: float = 0.0, follower: bool = False) -> Evidence:
    emitter = "out" if follower else "e" if r_e else "0"
    q = bipolar("Q1", ("0" if follower else "out", "b", emitter), r_b=r_b, c_pi=30e-12, c_mu=2e-12)
    load = [resistance("RL", "out", "0", 2e3)] + ([resistance("RE", "e", "0", r_e)] if r_e else [])
    return evidence(network(q, *load), devices=(q,))


def f_high(made: Network) -> float:
    edge = find_edges(made, find_midband(made, at_hz=None)).f_high
    assert edge is not None
    assert edge.hz is not None
    return edge.hz


def test_base_resistance_is_told_by_the_edge_of_the_network_built_without_it() -> None:
    cause = base_resistance(stage())
    assert cause is not None
    load = resistance("RL", "out", "0", 2e3)
    with_r_b, without = (
        f_high(network(bipolar("Q1", ("out", "b", "0"), r_b=r_b, c_pi=30e-12, c_mu=2e-12), load))
        for r_b in (100.0, 1e-5)
    )
    assert cause.effect == near(without / with_r_b - 1.0, rel=1e-4)
    assert cause.says == (
        f"r_b of Q1 (100 Ω) stands before the capacitances inside; paper without it comes out "
        f"{100 * cause.effect:.2g} % high"
    )
    assert cause in find_causes(stage())


def test_a_small_base_resistance_is_nothing_of_note() -> None:
    assert not any(cause.cause == "base-resistance" for cause in find_causes(stage(r_b=5.0)))
    assert base_resistance(stage(r_b=0.0)) is None


def test_degeneration_is_told_by_the_edge_with_the_emitter_at_ground() -> None:
    cause = degeneration_ignored(stage(r_e=100.0))
    assert cause is not None
    q = bipolar("Q1", ("out", "b", "e"), r_b=100.0, c_pi=30e-12, c_mu=2e-12)
    load = resistance("RL", "out", "0", 2e3)
    plain, shorted = (f_high(network(q, load, resistance("RE", "e", "0", ohm))) for ohm in (100.0, 1e-5))
    assert cause.effect == near(shorted / plain - 1.0, rel=1e-4)
    assert cause.effect < -0.3
    assert "degenerates" in cause.says


def test_without_degeneration_and_in_a_follower_there_is_nothing_to_ignore() -> None:
    assert degeneration_ignored(stage()) is None
    assert degeneration_ignored(stage(follower=True)) is None


def test_they_come_after_the_causes_of_the_estimate_itself() -> None:
    found = find_causes(stage(r_e=100.0))
    flags = [cause.on_paper for cause in found]
    assert True in flags
    assert flags == sorted(flags)


def test_where_hand_and_exact_agree_nothing_is_said() -> None:
    """A stage whose one capacitance is at the base: the lowest node alone is the edge itself."""
    q = bipolar("Q1", ("out", "b", "0"), r_b=100.0, c_pi=30e-12)
    parts = [voltage_source("VS", "s", "0", 1.0), resistance("RS", "s", "b", 500.0), *q.parts]
    made = Network.from_parts([*parts, resistance("RL", "out", "0", 2e3)], output=Port("out"))
    found = evidence(made, devices=(q,))
    assert found.upper.hz is not None
    assert found.upper.combined is not None
    assert found.upper.combined.lowest == pytest.approx(found.upper.hz, rel=1e-6)
    assert find_causes(found) == ()
