"""What a source sees beyond its own resistor, and what a load sees looking back into the output, exact."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np
from msgspec import Struct

from tauledger.circuit import GROUND, Port
from tauledger.devices.parts import Part, current_source
from tauledger.network.assemble import Network, incidence
from tauledger.network.solve import Complex, Real, on_axis, response, solve

# No netlist can hold an element of this name.
TEST_CURRENT = "test current"
# What rounding leaves of nodes that sources hold: no board has a picoohm.
HELD_OHM = 1e-12


class SourcePort(Struct, frozen=True):
    """Where a source enters the circuit: plus is where its current goes in, minus where it comes back.

    series: the one resistor between the source and plus, None where there is none. source_plus, source_minus: the
    source's own nodes, in the same sense.
    """

    source: Part
    plus: str
    minus: str
    series: Part | None
    source_plus: str
    source_minus: str


def source_port(network: Network, source: Part) -> SourcePort:
    """Find where a source enters: at its own nodes, or beyond the lone resistor in series with it.

    A voltage source (a, b) drives its current out of a; a current source pushes it from a through itself into b.
    """
    plus, minus = source.nodes if source.kind == "voltage source" else source.nodes[::-1]
    for node in (plus, minus):
        if node == GROUND:
            continue
        beside = [part for part in network.parts if node in part.nodes and part is not source]
        if len(beside) == 1 and beside[0].kind == "conductance" and not beside[0].label:
            far = beside[0].nodes[1] if beside[0].nodes[0] == node else beside[0].nodes[0]
            if far in (plus, minus):
                continue
            ends = (far, minus) if node == plus else (plus, far)
            return SourcePort(source, *ends, beside[0], plus, minus)
    return SourcePort(source, plus, minus, None, plus, minus)


def input_admittance(network: Network, port: SourcePort, frequency_hz: Real, *, series: bool) -> Complex:
    """Give i/v in S at the source with all sources driven as they are, (k,), at frequencies (k,) in Hz.

    series: with the series resistor, else beyond it. An admittance, for a gate at DC has no finite impedance.
    Raises NetworkError where Y is singular.
    """
    x = solve(network, on_axis(frequency_hz)).x
    ends = (port.source_plus, port.source_minus) if series else (port.plus, port.minus)
    v = x @ incidence(network, *ends)
    if port.source.kind == "voltage source":
        return admittance_between(-x[:, network.branch(port.source.owner)], v)
    return admittance_between(network.amplitude(port.source), v)


def admittance_between(current: Complex | complex, voltage: Complex) -> Complex:
    """Give i/v in S, (k,), infinite where sources hold the two nodes: |v/i| is nothing but rounding."""
    held = np.abs(voltage) <= HELD_OHM * np.abs(current)
    return np.asarray(np.where(held, np.inf, current / np.where(held, 1.0, voltage)), dtype=np.complex128)


def output_impedance(network: Network, frequency_hz: Real, *, without: Collection[str] = ()) -> Complex:
    """Give the impedance in ohm between the two nodes of the output, all sources at rest, (k,), at (k,) in Hz.

    without: names of parts that are taken away first.
    Raises NetworkError where Y is singular; the output must be a voltage.
    """
    assert network.port.kind == "voltage"
    kept = [part for part in network.parts if part.name not in without]
    probe = current_source(TEST_CURRENT, network.port.minus, network.port.plus, 1.0)
    at_rest = dict.fromkeys(network.amplitudes, 0j)
    return response(Network.from_parts([*kept, probe], output=network.port, drive=at_rest), frequency_hz)


def across(network: Network, plus: str, minus: str) -> tuple[str, ...]:
    """Give the names of the plain resistors, capacitors and inductors straight between two nodes, in order."""
    kinds = ("conductance", "capacitance", "inductance")
    return tuple(
        part.name
        for part in network.parts
        if part.kind in kinds and not part.label and set(part.nodes) == {plus, minus}
    )


def admittance_of(network: Network, names: Collection[str], frequency_hz: Real) -> Complex:
    """Give the admittance in S of plain parts in parallel, (k,), at frequencies (k,) in Hz above 0."""
    s = on_axis(frequency_hz)
    total = np.zeros_like(s)
    for part in network.parts:
        if part.name not in names:
            continue
        if part.kind == "inductance":
            total = total + 1.0 / (s * part.value)
        else:
            total = total + (s * part.value if part.kind == "capacitance" else part.value)
    return total


def voltage_port(port: SourcePort) -> Port:
    """Give the output whose voltage is that beyond the series resistor; plus and minus change places for ground."""
    return Port(port.minus, GROUND) if port.plus == GROUND else Port(port.plus, port.minus)
