"""Published figures of a follower, reached by way of its return ratio."""

from __future__ import annotations

import pytest

from tauledger.circuit import Port
from tauledger.devices.parts import Part, current_source, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.return_ratio import asymptotic, at_source, return_ratio
from tauledger.network.solve import on_axis, response

# Gray, Hurst, Lewis and Meyer, 5th ed., 2009, section 7.2.3.1: I_C = 1 mA, V_T = 26 mV, β = 100, R_S = 50 Ω, r_b =
# 150 Ω, R_L = 2 kΩ; figures to two or three digits.
GM, R_PI = 1e-3 / 26e-3, 2.6e3
FOLLOWER: list[Part] = [
    resistance("RS", "s", "b", 50.0 + 150.0),
    resistance("RPI", "b", "out", R_PI),
    transconductance("Q1", ("0", "out"), ("b", "out"), GM, "gm"),
]


def test_the_gain_of_the_follower_is_that_of_its_loop() -> None:
    """Published: 0.986. A∞ = 1, feedthrough by way of r_π alone."""
    driven = [voltage_source("VS", "s", "0", 1.0), *FOLLOWER, resistance("RL", "out", "0", 2e3)]
    network = Network.from_parts(driven, output=Port("out"))
    found = asymptotic(at_source(network, [network.part("Q1.gm")]), on_axis(0.0))
    assert complex(found.closed[0]).real == pytest.approx(0.986, abs=0.0005)
    assert complex(found.ideal[0]).real == pytest.approx(1.0, rel=1e-12)
    assert complex(found.feedthrough[0]).real == pytest.approx(2e3 / (2e3 + R_PI + 200.0), rel=1e-12)


def test_the_output_resistance_follows_from_two_return_ratios() -> None:
    """Published: R1 = 28 Ω, without R_L; T is 0 with the output shorted, β·… with it open. Blackman, 1943."""
    silent = [voltage_source("VS", "s", "0"), *FOLLOWER]

    def t(*more: Part) -> float:
        network = Network.from_parts([*silent, *more], output=Port("b"))
        return complex(return_ratio(at_source(network, [network.part("Q1.gm")]), on_axis(0.0))[0]).real

    shorted, opened = t(voltage_source("VT", "out", "0")), t()
    assert shorted == pytest.approx(0.0, abs=1e-12)
    assert opened == pytest.approx(GM * R_PI, rel=1e-9)
    z = (200.0 + R_PI) * (1.0 + shorted) / (1.0 + opened)
    assert z == pytest.approx(28.0, rel=0.02)
    measured = Network.from_parts([*silent, current_source("IT", "0", "out", 1.0)], output=Port("out"))
    assert z == pytest.approx(complex(response(measured, on_axis(0.0).imag)[0]).real, rel=1e-9)
