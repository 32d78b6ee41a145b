"""Input and output impedance: exact, ngspice's own, and at mid-band by hand; as R ‖ C and as a curve.

The exact ones are algebra on the rebuilt network. ngspice gives the input impedance as voltage over current of the run
as it is, the output impedance as the voltage of 1 A AC into the output with all sources at rest; where the load is
taken away its known admittance is taken off, for removing a resistor from ngspice's circuit would move the bias.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Collection

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.answer import Subject, restore
from tauledger.answers.modes import in_opposite_phase
from tauledger.circuit import ADDED, GROUND, Circuit, Drive, Element, Port, fold
from tauledger.engine.grid import decades
from tauledger.errors import NetworkError
from tauledger.hand.estimate import LookingIn
from tauledger.hand.figures import plain
from tauledger.hand.port_resistance import port_resistance
from tauledger.network.port_impedance import (
    TEST_CURRENT,
    SourcePort,
    across,
    admittance_between,
    admittance_of,
    input_admittance,
    output_impedance,
    source_port,
    voltage_port,
)
from tauledger.network.solve import Complex, Real
from tauledger.numbers import Numbers
from tauledger.record import ImpedanceCurvePoint, ImpedanceFacts, ImpedancePoint

# So far below f_H the gain is that of mid-band within 0.1 %, and the aids are as far away as may be.
FAR_FROM_AIDS = 30.0
MIDBAND, UPPER_EDGE = "mid-band", "f_H"


def impedances(subject: Subject) -> tuple[ImpedanceFacts, ...]:
    """Give the impedance that every driven source sees, beyond its series resistor and with it, and that at the output,
    with the load and without; an output that is a current has none of its own.

    Raises NetworkError where the network has no solution.
    """
    numbers = subject.numbers
    network = numbers.network
    found: list[ImpedanceFacts] = []
    ports = [source_port(network, source) for source in network.driving]
    opposite = len(ports) == 2 and in_opposite_phase(network, *network.driving)
    for k, port in enumerate(ports):
        found += _inputs(subject, port, ports[1 - k] if opposite else None, alone=len(ports) == 1)
    if network.port.kind == "voltage":
        found += _outputs(subject)
    restore(subject)
    return tuple(found)


class _Curve(Struct, frozen=True):
    """An admittance in S at the points and over the grid: (2,) or (1,), and (k,)."""

    points: Complex
    grid: Complex


class _Frequencies(Struct, frozen=True):
    """Where an impedance is wanted, Hz: mid-band and f_H by name, and the grid of the curve (k,)."""

    names: tuple[str, ...]
    points: Real
    grid: Real


def _inputs(subject: Subject, port: SourcePort, other: SourcePort | None, *, alone: bool) -> list[ImpedanceFacts]:
    """Give what one source sees; other: the one that drives in opposite phase, None where there is none."""
    network, at = subject.numbers.network, _frequencies(subject.numbers)
    beside = "" if alone else ", the other sources driving too" if other is None else f", {other.source.owner} opposite"
    beyond, whole = (
        _Curve(*(input_admittance(network, port, hz, series=series) for hz in (at.points, at.grid)))
        for series in (False, True)
    )
    simulated = _simulated_inputs(subject, port, at)
    name = port.source.owner
    without = [part.name for one in (port, other) if one is not None for part in (one.source, one.series) if part]
    label = "seen by " + name if port.series is None else f"beyond {port.series.name}"
    hand = _hand(subject, (port.plus, port.minus), without, label, other) if alone or other is not None else None
    if port.series is None:
        return [_facts("input", name, "no resistor in series", (), at, whole, simulated[1], hand, beside)]
    series = port.series.name
    found = [_facts("input", name, f"beyond {series}", (series,), at, beyond, simulated[0], hand, beside)]
    if port.source.kind == "voltage source":
        summed = None
        if hand is not None and hand.source != "solved":
            text = f"R(with {series}) = {series} + {plain(hand.ohm)} = {plain(1.0 / port.series.value + hand.ohm)}"
            summed = replace(hand, ohm=1.0 / port.series.value + hand.ohm, text=text)
        found.append(_facts("input", name, f"with {series}", (), at, whole, simulated[1], summed, beside))
    return found


def _outputs(subject: Subject) -> list[ImpedanceFacts]:
    network, at = subject.numbers.network, _frequencies(subject.numbers)
    port = network.port
    load = across(network, port.plus, port.minus)
    simulated = _simulated_output(subject, at)
    found: list[ImpedanceFacts] = []
    cases: list[tuple[tuple[str, ...], str]] = [((), f"with {', '.join(load)}" if load else "no load beside it")]
    if load:
        cases.append((load, f"without {', '.join(load)}"))
    for without, says in cases:
        try:
            exact = _Curve(
                *(
                    admittance_between(1.0, output_impedance(network, hz, without=without))
                    for hz in (at.points, at.grid)
                )
            )
        except NetworkError:
            # nothing but the load gave the output a path for direct current
            continue
        of_load = [admittance_of(network, without, hz) for hz in (at.points, at.grid)]
        ngspice = None
        if simulated is not None:
            ngspice = _Curve(simulated.points - of_load[0], simulated.grid - of_load[1])
        hand = _hand(subject, (port.plus, port.minus), without, f"{port.plus} {says}" if load else port.plus)
        found.append(_facts("output", str(port), says, without, at, exact, ngspice, hand))
    return found


def _frequencies(numbers: Numbers) -> _Frequencies:
    """Give mid-band and f_H and the frequencies of the curve; of a band from DC on the lowest is taken, above 0 Hz.

    With measuring aids it is taken further up on the plateau: at its lower end the aids are still part of an impedance.
    """
    high = numbers.edges.f_high
    points = []
    if high is not None and high.hz is not None:
        points.append((UPPER_EDGE, high.hz))
    grid = numbers.simulated.sweep.frequency_hz if numbers.simulated is not None else numbers.edges.frequency_hz
    grid = grid if len(grid) else decades(1.0, 1e9, 10)
    middle = numbers.midband.frequency_hz or float(grid[0])
    if numbers.midband.aids and high is not None and high.hz is not None:
        middle = max(middle, high.hz / FAR_FROM_AIDS)
    points.insert(0, (MIDBAND, middle))
    return _Frequencies(tuple(name for name, _ in points), np.array([hz for _, hz in points]), grid)


def _simulated_inputs(subject: Subject, port: SourcePort, at: _Frequencies) -> tuple[_Curve | None, _Curve | None]:
    """Give ngspice's admittance beyond the series resistor, and with it: current over voltage of the run as it is."""
    circuit = subject.numbers.circuit
    if subject.engine is None or circuit is None:
        return None, None
    amplitude = subject.numbers.network.amplitude(port.source)
    voltage = _run(subject, replace(circuit, output=voltage_port(port)), at)
    sign = 1.0 if port.plus != GROUND else -1.0
    if port.source.kind == "current source":
        beyond = _Curve(*(admittance_between(amplitude, sign * one) for one in (voltage.points, voltage.grid)))
        return beyond, beyond
    through = Port(port.source.nodes[0], port.source.nodes[1], "current", port.source.owner)
    current = _run(subject, replace(circuit, output=through), at)
    whole = _Curve(-current.points / amplitude, -current.grid / amplitude)
    if port.series is None:
        return whole, whole
    pairs = ((current.points, voltage.points), (current.grid, voltage.grid))
    return _Curve(*(admittance_between(-passing, sign * held) for passing, held in pairs)), whole


def _simulated_output(subject: Subject, at: _Frequencies) -> _Curve | None:
    """Give ngspice's admittance at the output: 1 A AC into it over its voltage, all other sources at rest."""
    circuit = subject.numbers.circuit
    if subject.engine is None or circuit is None:
        return None
    number = {fold(node): k for k, node in enumerate(circuit.nodes)}
    ends = (number[fold(circuit.output.minus)], number[fold(circuit.output.plus)])
    probe = Element("I", TEST_CURRENT, ends, "", (("dc", 0.0),), ADDED, 0)
    drive = (Drive(TEST_CURRENT, "current", 1.0 + 0.0j),)
    voltage = _run(subject, replace(circuit, elements=(*circuit.elements, probe), drive=drive), at)
    return _Curve(*(admittance_between(1.0, one) for one in (voltage.points, voltage.grid)))


def _run(subject: Subject, circuit: Circuit, at: _Frequencies) -> _Curve:
    """Load a circuit into ngspice and sweep it."""
    assert subject.engine is not None
    subject.engine.bias(circuit, ())
    return _Curve(subject.engine.sweep(at.points).response, subject.engine.sweep(at.grid).response)


def _hand(
    subject: Subject,
    ends: tuple[str, str],
    without: Collection[str],
    label: str,
    other: SourcePort | None = None,
) -> LookingIn | None:
    numbers, live = subject.numbers, [node for node in ends if node != GROUND]
    opposite = [node for node in (other.plus, other.minus) if node != GROUND] if other is not None else []
    if subject.explanation.hand is None or len(live) != 1 or len(opposite) > 1:
        return None
    return port_resistance(
        numbers.bands,
        numbers.devices,
        node=live[0],
        without=without,
        label=label,
        opposite=opposite[0] if opposite else None,
    )


def _facts(
    side: str,
    of: str,
    says: str,
    left_out: tuple[str, ...],
    at: _Frequencies,
    exact: _Curve,
    simulated: _Curve | None,
    hand: LookingIn | None,
    beside: str = "",
) -> ImpedanceFacts:
    by_rule = hand is not None and hand.source != "solved" and math.isfinite(hand.ohm)
    sizes, angles = _sizes(exact.grid), _angles(exact.grid)
    none = (None,) * len(at.grid)
    their_sizes, their_angles = (
        (_sizes(simulated.grid), _angles(simulated.grid)) if simulated is not None else (none, none)
    )
    return ImpedanceFacts(
        name=f"{of} {says}",
        side=side,
        of=of,
        says=says + beside,
        left_out=left_out,
        points=tuple(
            ImpedancePoint(name, hz, *_parted(_at(exact, k), hz), *_parted(_at(simulated, k), hz))
            for k, (name, hz) in enumerate(zip(at.names, at.points.tolist(), strict=True))
        ),
        hand_ohm=hand.ohm if hand is not None and by_rule else None,
        hand_text=hand.text if hand is not None else "",
        curve=tuple(map(ImpedanceCurvePoint, at.grid.tolist(), sizes, angles, their_sizes, their_angles)),
    )


def _at(curve: _Curve | None, k: int) -> complex | None:
    return None if curve is None else complex(curve.points[k])


def _parted(y: complex | None, hz: float) -> tuple[float | None, float | None, float | None, float | None]:
    """Give real and imaginary part of 1/Y in ohm, and R and C of R ‖ C: Y = 1/R + jωC; 0 Ω where Y is infinite."""
    if y is None or y == 0.0:
        return None, None, None, None
    if not np.isfinite(y):
        return 0.0, 0.0, 0.0, None
    z = 1.0 / y
    omega = 2.0 * math.pi * hz
    return z.real, z.imag, 1.0 / y.real if y.real else None, y.imag / omega if omega else None


def _sizes(y: Complex) -> tuple[float | None, ...]:
    return tuple(1.0 / abs(one) if one and np.isfinite(one) else None for one in y.tolist())


def _angles(y: Complex) -> tuple[float | None, ...]:
    return tuple(-math.degrees(cmath.phase(one)) if one and np.isfinite(one) else None for one in y.tolist())
