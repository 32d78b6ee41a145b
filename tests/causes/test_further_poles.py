"""More than two poles count."""

from __future__ import annotations

import math

import pytest

from by_algebra import evidence
from tauledger.causes.catalogue import find_causes
from tauledger.causes.further_poles import further_poles_above
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, resistance, transconductance, voltage_source
from tauledger.network.assemble import Network


def buffered(*seconds: float) -> Network:
    """Nodes of 1 kohm one behind the other, each driven by a transconductance of 1 mS: one pole each."""
    parts: list[Part] = [voltage_source("VIN", "in", "0", 1.0)]
    before = "in"
    for k, tau in enumerate(seconds, start=1):
        node = f"n{k}"
        parts += [
            transconductance(f"G{k}", (node, "0"), (before, "0"), 1e-3),
            resistance(f"R{k}", node, "0", 1e3),
            capacitance(f"C{k}", node, "0", tau / 1e3),
        ]
        before = node
    return Network.from_parts(parts, output=Port(before, "0", "voltage"))


def loop() -> Network:
    """Three nodes of 1 µs, 500 ns and 250 ns, in one loop with a gain of 1."""
    parts: list[Part] = [voltage_source("VIN", "in", "0", 1.0), resistance("RS", "in", "n3", 1e3)]
    before = "n3"
    for node, farad in (("n1", 0.5e-9), ("n2", 0.25e-9)):
        parts += [
            transconductance(f"G{node}", (node, "0"), (before, "0"), 1e-3),
            resistance(f"R{node}", node, "0", 1e3),
            capacitance(f"C{node}", node, "0", farad),
        ]
        before = node
    parts += [transconductance("GF", ("n3", "0"), (before, "0"), 1e-3), capacitance("C3", "n3", "0", 1e-9)]
    return Network.from_parts(parts, output=Port(before, "0", "voltage"))


def test_three_poles_in_a_loop_are_more_than_two_coefficients_hold() -> None:
    """(1 + sτ1)(1 + sτ2)(1 + sτ3) + 1 = 0 with τ = 1, 0.5 and 0.25 µs: both figures by closed form."""
    found = evidence(loop())
    cause = further_poles_above(found)
    assert cause is not None
    numbers = {number.name: 2e-6 * math.pi * number.value for number in cause.numbers}
    assert cause.effect == pytest.approx(numbers["all poles"] / numbers["before"] - 1)
    assert cause.effect == pytest.approx(0.2153, abs=1e-3)
    b1, b2, b3 = 1.75 / 2, 0.875 / 2, 0.125 / 2
    w = numbers["before"]
    assert abs(1 - b2 * w**2 + 1j * b1 * w) == pytest.approx(math.sqrt(2), rel=1e-6)
    w = numbers["all poles"]
    assert abs(1 - b2 * w**2 + 1j * (b1 * w - b3 * w**3)) == pytest.approx(math.sqrt(2), rel=1e-6)
    assert "further-poles" in [told.cause for told in find_causes(found)]
    assert cause.says.startswith("more than two poles count: the pair at 292 kHz and 759 kHz; b1 and b2 give 256 kHz")


def test_two_poles_or_a_far_third_or_independent_ones_are_not_told() -> None:
    assert further_poles_above(evidence(buffered(1e-6, 1.3e-6))) is None
    for network in (buffered(1e-6, 1.3e-6, 1e-8), buffered(1e-6, 1.3e-6, 0.8e-6, 1e-6)):
        assert "further-poles" not in [cause.cause for cause in find_causes(evidence(network))]
