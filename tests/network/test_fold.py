"""A subcircuit as one part: the same response, sums and shares, its insides under one name."""

from __future__ import annotations

import numpy as np
import pytest

import amplifiers
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_gain,
    inductance,
    resistance,
    transconductance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import InputError
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.constants import open_constants
from tauledger.network.edges import find_edges
from tauledger.network.fold import folded, obstacle
from tauledger.network.identities import check, open_identities, share_identities
from tauledger.network.shares import find_shares
from tauledger.network.solve import response

# An amplifier of 100 dB with one pole, an inductance at its output, and a source that senses its own current.
MACROMODEL: tuple[Part, ...] = (
    resistance("XU1.RIN", "p", "n", 2e6),
    capacitance("XU1.CIN", "p", "n", 3e-12),
    transconductance("XU1.G1", ("0", "XU1.a"), ("p", "n"), 1e-3),
    resistance("XU1.RA", "XU1.a", "0", 100e6),
    capacitance("XU1.CA", "XU1.a", "0", 100e-12),
    voltage_gain("XU1.E1", ("XU1.b", "0"), ("XU1.a", "0"), 1.0),
    voltage_source("XU1.VS", "XU1.b", "XU1.c"),
    resistance("XU1.RO", "XU1.c", "XU1.d", 50.0),
    inductance("XU1.LO", "XU1.d", "out", 1e-6),
    current_gain("XU1.F1", "XU1.a", "0", 1e-6, "XU1.VS"),
)
AROUND: tuple[Part, ...] = (
    resistance("R1", "in", "p", 10e3),
    capacitance("C1", "p", "0", 1e-9),
    resistance("R2", "n", "0", 1e3),
    resistance("R3", "n", "out", 9e3),
    capacitance("CL", "out", "0", 100e-12),
)
INSIDE = frozenset(part.name for part in MACROMODEL)


@pytest.fixture(scope="module")
def networks() -> tuple[Network, Network]:
    plain = amplifiers.network(*AROUND, *MACROMODEL)
    return plain, Network.from_parts(folded(plain.parts, "XU1", INSIDE, plain.port), output=plain.port)


def test_response_is_the_same_to_rounding(networks: tuple[Network, Network]) -> None:
    frequency = np.geomspace(1.0, 1e9, 50)
    plain, one = (response(network, frequency) for network in networks)
    assert np.max(np.abs(one / plain - 1.0)) < 1e-11


def test_all_that_was_inside_is_one_part_with_the_sum_of_its_shares(networks: tuple[Network, Network]) -> None:
    plain, one = networks
    midband = find_midband(plain)
    edge = find_edges(plain, midband).f_high
    assert edge is not None
    assert edge.hz is not None
    found = [find_shares(n, find_midband(n), edge.hz, classify(n, find_midband(n)).class_of) for n in networks]
    check((*share_identities(found[1]), *open_identities(open_constants(classify(one, find_midband(one))))))
    inside = sum(share for name, share in found[0].parts.items() if name in INSIDE)
    assert found[1].parts["XU1.inside"] == pytest.approx(inside, rel=1e-6)
    assert {"R1", "C1", "R2", "R3", "CL", "XU1.inside", "VS"} == {part.name for part in one.parts}


def test_the_output_s_node_stays_outside_though_nothing_else_touches_it() -> None:
    port = Port("XU1.b")
    parts = folded((amplifiers.DRIVE, *AROUND, *MACROMODEL), "XU1", INSIDE, port)
    network = Network.from_parts(parts, output=port)
    plain = Network.from_parts((amplifiers.DRIVE, *AROUND, *MACROMODEL), output=port)
    assert response(network, np.array([1e3])) == pytest.approx(response(plain, np.array([1e3])), rel=1e-9)


@pytest.mark.parametrize(
    ("extra", "inside", "says"),
    [
        ((), INSIDE | {"VS"}, "driven source"),
        ((current_gain("F9", "n", "0", 1.0, "XU1.VS"),), INSIDE, "refers to a current inside"),
        ((), INSIDE - {"XU1.VS"}, "refers to a current outside"),
    ],
)
def test_what_keeps_an_instance_open_is_said(extra: tuple[Part, ...], inside: frozenset[str], says: str) -> None:
    parts = (amplifiers.DRIVE, *AROUND, *MACROMODEL, *extra)
    assert says in obstacle(parts, inside, Port("out"))
    with pytest.raises(InputError, match=f"XU1 cannot be folded: .*{says}"):
        folded(parts, "XU1", inside, Port("out"))
