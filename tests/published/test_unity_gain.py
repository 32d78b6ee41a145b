"""Phase margin as textbooks have it; each number stands beside its source and tolerance."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network
from tauledger.network.midband import find_midband
from tauledger.network.solve import response
from tauledger.network.unity import find_unity

DC_GAIN = 1e5


def two_poles(first_hz: float, second_hz: float, *, closed: bool) -> Network:
    """A gain of 100,000 with two poles; closed: all of the output is taken from the input."""

    def section(name: str, control: tuple[str, str], out: str, gain: float, hz: float) -> list[Part]:
        return [
            transconductance(f"G{name}", ("0", out), control, gain / 1e3, label="gm"),
            resistance(f"R{name}", out, "0", 1e3),
            capacitance(f"C{name}", out, "0", 1.0 / (2.0 * math.pi * hz * 1e3)),
        ]

    back = "out" if closed else "0"
    parts = [voltage_source("VS", "in", "0", 1.0), *section("1", ("in", back), "x", DC_GAIN, first_hz)]
    return Network.from_parts([*parts, *section("2", ("x", "0"), "out", 1.0, second_hz)], output=Port("out"))


@pytest.mark.parametrize(("second_pole", "margin"), [(1.0, 51.8), (2.0, 65.5), (3.0, 72.4)])
def test_margin_by_the_place_of_the_second_pole(second_pole: float, margin: float) -> None:
    """Second pole at so many times the gain-bandwidth product: common practice, from memory; to the last digit."""
    network = two_poles(10.0, second_pole * 1e6, closed=False)
    found = find_unity(network, find_midband(network))
    assert found is not None
    assert found.phase_margin_deg == pytest.approx(margin, abs=0.06)


@pytest.mark.parametrize(("margin", "peak"), [(30.0, 1.93), (45.0, 1.3), (60.0, 1.0), (90.0, 0.7)])
def test_gain_of_the_follower_at_f_u_by_its_margin_ghlm_9_4(margin: float, peak: float) -> None:
    """Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed. 2009, section 9.4
    (from memory): closed around with a gain of 1, relative to low frequencies; to the last printed digit."""
    # of two poles far apart the second takes 90° less the margin at f_u
    ratio = math.tan(math.radians(90.0 - margin)) or 1e-4
    f_u = 1e6
    first = f_u * math.sqrt(1.0 + ratio**2) / DC_GAIN
    opened, closed = (two_poles(first, f_u / max(ratio, 1e-4), closed=state) for state in (False, True))
    found = find_unity(opened, find_midband(opened))
    assert found is not None
    assert found.phase_margin_deg == pytest.approx(margin, abs=0.01)
    gain = abs(response(closed, np.array([found.hz]))[0])
    assert gain == pytest.approx(peak, abs=0.011)
