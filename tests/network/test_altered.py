"""A resistor in series with a capacitor, and parts of other value, in one changed network."""

from __future__ import annotations

import numpy as np
import pytest

from cells import near
from compensated import TwoStages, network_of
from tauledger.circuit import Port
from tauledger.network.altered import AddedCapacitor, SeriesResistor, altered, with_series
from tauledger.network.assemble import Network
from tauledger.network.solve import response

FREQUENCY = np.geomspace(1e2, 1e10, 41)


def test_resistor_in_series_is_what_the_netlist_would_have_there() -> None:
    put_in = with_series(network_of(TwoStages()), SeriesResistor("RZ", "K7", 700.0))
    written = network_of(TwoStages(r_z=700.0))
    assert response(put_in, FREQUENCY) == near(response(written, FREQUENCY), rel=1e-12)


def test_both_changes_act_together() -> None:
    both = altered(network_of(TwoStages()), {"K7": 1.5, "K3": 0.5}, SeriesResistor("RZ", "K7", 700.0))
    written = network_of(TwoStages(r_z=700.0, c_c=3e-12, r_1=200e3))
    assert response(both, FREQUENCY) == near(response(written, FREQUENCY), rel=1e-12)


def test_no_capacitor_of_that_name_is_a_key_error() -> None:
    with pytest.raises(KeyError):
        with_series(network_of(TwoStages()), SeriesResistor("RZ", "K77", 700.0))


def test_a_capacitor_that_is_put_in_is_scaled_like_any_other() -> None:
    bare = [part for part in network_of(TwoStages()).parts if part.name != "K7"]
    network = Network.from_parts(bare, output=Port("out"))
    put_in = altered(network, {"CX": 2.0}, None, AddedCapacitor("CX", "out", "x", 1e-12))
    assert response(put_in, FREQUENCY) == near(response(network_of(TwoStages(c_c=2e-12)), FREQUENCY), rel=1e-12)
