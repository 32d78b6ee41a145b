"""The phase budget adds up: what poles and zeros use is all that the phase has turned since mid-band."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

from compensated import TwoStages, network_of, two_stages
from strategies import EVERYTHING, networks
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.edges import find_edges
from tauledger.network.identities import check
from tauledger.network.midband import find_midband
from tauledger.network.phase import phase_identities, phase_used
from tauledger.network.poles import find_poles
from tauledger.network.solve import response
from tauledger.network.unity import find_unity

FEW = settings(max_examples=25, deadline=None, derandomize=True)


@FEW
@given(networks(EVERYTHING), st.floats(-2.0, 4.0))
def test_degrees_of_poles_and_zeros_add_to_the_phase_at_any_frequency(network: Network, decades: float) -> None:
    """Random amplifiers of one to three stages, coupled or not; the phase itself is that of the solved network."""
    midband = find_midband(network)
    edges = find_edges(network, midband)
    assume(edges.f_high is not None and edges.f_high.hz is not None)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    assert edges.angle is not None
    hz = edges.f_high.hz * 10.0**decades
    h = complex(response(network, np.array([hz]))[0])
    used_deg = -edges.angle.beyond_midband(hz, h)
    used = phase_used(find_poles(network), midband_hz=midband.frequency_hz, hz=hz, used_deg=used_deg)
    check(phase_identities(used, used_deg, rational=True))
    # by the phase of H alone, whatever turn the angle chose
    turned = np.exp(-1j * np.radians(sum(one.degrees for one in (*used.poles, *used.zeros))))
    assert abs(turned - h / midband.gain * abs(midband.gain) / abs(h)) < 1e-4


@FEW
@given(two_stages(), st.just(0.0) | st.floats(0.05, 3.0))
def test_what_is_left_at_unity_gain_is_the_margin(one: TwoStages, nulling: float) -> None:
    network = network_of(replace(one, r_z=nulling / one.gm_2))
    midband = find_midband(network)
    unity = find_unity(network, midband)
    assume(unity is not None)
    assert unity is not None
    used = phase_used(find_poles(network), midband_hz=midband.frequency_hz, hz=unity.hz, used_deg=0.0)
    assert -used.rest == pytest.approx(180.0 - (unity.phase_margin_deg or 0.0), abs=1e-6)


def test_a_pole_uses_45_degrees_at_its_frequency_and_a_zero_of_the_right_half_plane_too() -> None:
    network = network_of(TwoStages())
    found = find_poles(network)
    for k, pole in enumerate(found.poles):
        hz = abs(pole.s) / (2.0 * np.pi)
        assert phase_used(found, midband_hz=0.0, hz=hz, used_deg=0.0).poles[k].degrees == pytest.approx(45.0, abs=1e-9)
    (zero,) = found.zeros
    at = abs(zero.s) / (2.0 * np.pi)
    assert zero.s.real > 0.0
    assert phase_used(found, midband_hz=0.0, hz=at, used_deg=0.0).zeros[0].degrees == pytest.approx(45.0, abs=1e-9)


def test_a_budget_that_does_not_add_up_ends_the_run() -> None:
    found = find_poles(network_of(TwoStages()))
    used_deg = -phase_used(found, midband_hz=0.0, hz=1e6, used_deg=0.0).rest
    used = phase_used(found, midband_hz=0.0, hz=1e6, used_deg=used_deg)
    check(phase_identities(used, used_deg, rational=True))
    with pytest.raises(NetworkError, match="degrees of poles and zeros"):
        check(phase_identities(used, used_deg + 0.01, rational=True))
    assert phase_identities(used, used_deg + 0.01, rational=False) == ()
