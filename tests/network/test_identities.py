"""Random amplifiers obey the identities that every run checks on itself."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from msgspec.structs import replace

from strategies import networks
from tauledger.circuit import Port
from tauledger.devices.parts import capacitance, current_source, resistance, transconductance, voltage_source
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.bands import classify, find_midband
from tauledger.network.constants import open_constants
from tauledger.network.edges import find_edges
from tauledger.network.identities import (
    Identity,
    check,
    open_identities,
    response_identities,
    rounding,
    share_identities,
    short_identities,
)
from tauledger.network.lower import short_constants
from tauledger.network.shares import find_shares
from tauledger.network.solve import on_axis, solve
from tauledger.network.spectrum import pole_frequencies, zero_frequencies

few = settings(max_examples=25, deadline=None, derandomize=True)


@few
@given(networks())
def test_open_circuit_time_constants_add_to_the_inverse_poles_and_weighted_to_the_group_delay(network: Network) -> None:
    bands = classify(network, find_midband(network))
    check(open_identities(open_constants(bands)))


@few
@given(networks())
def test_group_delay_at_dc_is_the_inverse_zeros_less_the_inverse_poles(network: Network) -> None:
    bands = classify(network, find_midband(network))
    constants = open_constants(bands)
    poles = pole_frequencies(bands.upper)
    zeros = zero_frequencies(bands.upper, poles)
    scale = float(np.sum(1.0 / np.abs(poles)) + np.sum(1.0 / np.abs(zeros)))
    expected = float((np.sum(1.0 / zeros) - np.sum(1.0 / poles)).real)
    assert constants.weighted_sum_s == pytest.approx(expected, abs=1e-6 * scale)


@few
@given(networks())
def test_short_circuit_edges_add_to_the_poles_of_the_lower_network(network: Network) -> None:
    bands = classify(network, find_midband(network))
    constants = short_constants(bands)
    assert constants.sum_hz is not None
    check(short_identities(constants))


@few
@given(networks())
def test_shares_add_to_one_less_the_defect_at_both_edges(network: Network) -> None:
    midband = find_midband(network)
    bands = classify(network, midband)
    edges = find_edges(network, midband)
    check(response_identities(network, midband))
    for edge in (edges.f_low, edges.f_high):
        if edge is not None and edge.hz is not None:
            check(share_identities(find_shares(network, midband, edge.hz, bands.class_of)))


def test_a_failing_identity_is_raised_with_both_numbers() -> None:
    right = Identity("apples = apples", 2.0, 2.0, 1e-9, 2.0)
    wrong = replace(right, name="apples = pears", right=3.0)
    assert check([right]) == (right,)
    with pytest.raises(NetworkError, match="apples = pears: 2 against 3"):
        check([right, wrong])


def test_an_identity_with_a_number_that_is_not_finite_fails() -> None:
    assert not Identity("nothing = one", float("nan"), 1.0, 1e-9, 1.0).holds


def test_what_rounding_leaves_of_held_capacitors_is_no_failure() -> None:
    """A capacitor between two sources has a time constant of nothing, however its rounding comes out."""
    held = voltage_source("V1", "a", "0", 1.0), voltage_source("V2", "b", "0")
    parts = (
        *held,
        resistance("R1", "a", "out", 1e3),
        resistance("R2", "out", "0", 3e3),
        capacitance("C1", "a", "b", 1e-9),
    )
    network = Network.from_parts(parts, output=Port("out"))
    constants = open_constants(classify(network, find_midband(network)))
    check(open_identities(replace(constants, sum_s=-3.2e-28, b1_s=-3.2e-28)))
    with pytest.raises(NetworkError, match=r"sum of time constants = -sum of 1/p"):
        check(open_identities(replace(constants, sum_s=1e-15, b1_s=1e-15)))


def test_rounding_is_taken_for_as_large_as_what_cancels_in_the_output() -> None:
    """1 A into R: |λ||Y||x| is the output itself; the difference of two equal gains G leaves 1 of 2·G."""
    ohm, gain = 7.0, 1e6
    alone = Network.from_parts([current_source("I", "0", "a", 1.0), resistance("R", "a", "0", ohm)], output=Port("a"))
    eps = float(np.finfo(float).eps)
    assert rounding(alone, solve(alone, on_axis(1.0))) == pytest.approx(eps * ohm, rel=1e-12, abs=0.0)
    parts = [
        current_source("I", "0", "a", 1.0),
        resistance("RA", "a", "0", 1.0),
        transconductance("GP", ("0", "out"), ("a", "0"), gain + 1.0),
        transconductance("GM", ("out", "0"), ("a", "0"), gain),
        resistance("RO", "out", "0", 1.0),
    ]
    cancelling = Network.from_parts(parts, output=Port("out"))
    assert rounding(cancelling, solve(cancelling, on_axis(1.0))) > gain * eps
