"""What surrounds the numbers: drive and load, devices, curves, the netlist's lines that matter, cautions."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable

import numpy as np
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.circuit import GROUND, Circuit, fold
from tauledger.devices.family import Device
from tauledger.explain import Explanation
from tauledger.netlist import Netlist, place
from tauledger.network.angle import Angle
from tauledger.network.solve import Complex, response
from tauledger.numbers import Numbers
from tauledger.record import Curves, DeviceFacts, DriveFacts, Figure, LoadFacts, OutputFacts, SourceLine
from tauledger.simulated import Simulated
from tauledger.solution import Sweep

# IEC 62368-1 ES1, IEC 61010-1: 60 V d.c. is the limit of what may be touched in dry conditions (from memory).
HAZARDOUS_VOLT = 60.0
LINES_FOR_SHARE = 0.01
MOST_OF_A_RIPPLE = 1500
MOST_TURNS = 8000
LIMITS = 0.005
WORD = re.compile(r"(?<![\w.])(?:\w+\.)*[rR]\w*(?![\w(.])")
# By the first letter of a figure's symbol: i_c, v_ce, gm, r_o, c_pi, f_t.
UNITS = {"i": "A", "v": "V", "g": "S", "r": "Ω", "c": "F", "f": "Hz"}
EFFICIENCY = "gm/I"


def drive_facts(numbers: Numbers) -> tuple[DriveFacts, ...]:
    """Give the driven sources, each with the one resistor in series with it if there is exactly one."""
    facts = []
    for part in numbers.network.driving:
        kind = "voltage" if part.kind == "voltage source" else "current"
        amplitude = numbers.network.amplitude(part)
        facts.append(DriveFacts(part.owner, kind, amplitude.real, amplitude.imag, _series(numbers, part.nodes)))
    return tuple(facts)


def output_facts(numbers: Numbers) -> OutputFacts:
    """Give the output with the passives that go from it straight to ground."""
    port = numbers.network.port
    letter = {"conductance": "R", "capacitance": "C", "inductance": "L"}
    load = tuple(
        LoadFacts(part.name, letter[part.kind], 1.0 / part.value if part.kind == "conductance" else part.value)
        for part in numbers.network.parts
        if port.kind == "voltage"
        and part.kind in letter
        and not part.label
        and set(part.nodes) in ({port.plus, GROUND}, {port.plus, port.minus})
    )
    return OutputFacts(port.plus, port.minus, port.kind, port.through, load)


def unit_of(numbers: Numbers) -> str:
    """Give the unit of H: V/V, ohm, S or A/A; drives of both kinds at once have none."""
    kinds = {fact.kind for fact in drive_facts(numbers)}
    if len(kinds) != 1:
        return ""
    out = "V" if numbers.network.port.kind == "voltage" else "A"
    into = "V" if kinds == {"voltage"} else "A"
    return {"VV": "V/V", "VA": "Ω", "AV": "S", "AA": "A/A"}[out + into]


def device_facts(devices: Iterable[Device]) -> tuple[DeviceFacts, ...]:
    """Give every device that has an operating point to speak of: transistors and diodes, no controlled sources."""
    return tuple(
        DeviceFacts(
            device.name,
            device.kind,
            device.region,
            tuple(
                Figure(symbol, float(value), figure_unit(symbol))
                for symbol, value in device.figures
                if math.isfinite(value)
            ),
            any(part.label == "c_bx" and part.value for part in device.parts),
        )
        for device in devices
        if device.region
    )


def figure_unit(symbol: str) -> str:
    """Give the unit of a figure of the operating point by its symbol."""
    return "1/V" if symbol == EFFICIENCY else UNITS[symbol[0]]


def curves(numbers: Numbers, explanation: Explanation) -> Curves | None:
    """Give the responses over the sweep's frequencies, or over the edge search where nothing was simulated."""
    swept = _drawn(numbers.simulated) if numbers.simulated is not None else None
    frequency = swept.frequency_hz if swept is not None else numbers.edges.frequency_hz
    if not len(frequency):
        return None
    angle: Angle | None = None
    if numbers.network.lines and numbers.trusted and numbers.edges.angle is not None:
        from tauledger.network.ripple import followed

        # beyond, nobody can say how often a line has turned the phase
        angle, end_hz = followed(numbers.network, numbers.edges.angle, float(frequency[-1]), MOST_TURNS)
        shown = frequency <= end_hz
        frequency = frequency[shown]
        swept = Sweep(frequency, swept.response[shown]) if swept is not None else None
    sweep = _polar(swept.response, frequency, angle) if swept is not None else (None, None)
    exact = _polar(response(numbers.network, frequency), frequency, angle) if numbers.trusted else (None, None)
    hand = _hand_response(numbers, explanation, frequency)
    by_hand = _polar(hand) if hand is not None else (None, None)
    return Curves(tuple(frequency.tolist()), *sweep, *exact, *by_hand)


def _drawn(simulated: Simulated) -> Sweep:
    """Give the sweep with as much of a line's ripple as a curve can show, its first periods."""
    ripple = simulated.ripple
    if ripple is None:
        return simulated.sweep
    first = np.argsort(ripple.frequency_hz, kind="stable")[:MOST_OF_A_RIPPLE]
    return replace(simulated, ripple=Sweep(ripple.frequency_hz[first], ripple.response[first])).all_of_it


def source_lines(numbers: Numbers, explanation: Explanation, netlist: Netlist | None) -> tuple[SourceLine, ...]:
    """Give the netlist's lines of the driven sources, the devices, the parts with a share of a band edge, and the
    resistors in the working of every node that takes half a per cent of the sum of time constants."""
    if netlist is None or numbers.circuit is None:
        return ()
    names = {fact.source for fact in drive_facts(numbers)} | {device.name for device in numbers.devices}
    owner_of = {part.name: part.owner for part in numbers.network.parts}
    for shares in (explanation.shares_high, explanation.shares_low):
        if shares is not None:
            names |= {owner_of[name] for name, share in shares.parts.items() if abs(share) >= LINES_FOR_SHARE}
    names |= _resistors(explanation)
    places = [place(netlist, card, path) for card, path in _cards(numbers.circuit, names) if card >= 0]
    lines = {(at.file, at.line): at.text for at in places}
    return tuple(SourceLine(file, line, text) for (file, line), text in sorted(lines.items()))


def cautions(numbers: Numbers) -> tuple[str, ...]:
    """Give the caution above 60 V DC, taken from the sources and from the operating point."""
    if numbers.circuit is None or numbers.bias is None:
        return ()
    sources = [abs(element.parameter("dc", 0.0)) for element in numbers.circuit.elements if element.letter == "V"]
    volts = numbers.bias.voltages
    highest = max([*sources, float(volts.max() - volts.min())], default=0.0)
    if highest <= HAZARDOUS_VOLT:
        return ()
    return (
        f"Hazardous voltage: {highest:.4g} V DC in this circuit, above 60 V. Local codes apply, and qualified people "
        "decide how it is built, touched and measured.",
    )


def _series(numbers: Numbers, nodes: tuple[str, ...]) -> float | None:
    """Give the resistance of the only part beside the source at its live node, None where that is no lone resistor."""
    for node in nodes:
        if node == GROUND:
            continue
        beside = [part for part in numbers.network.parts if node in part.nodes and part.nodes != nodes]
        if len(beside) == 1 and beside[0].kind == "conductance" and not beside[0].label:
            return 1.0 / beside[0].value
    return None


def _resistors(explanation: Explanation) -> set[str]:
    """Give the words of the limiting resistances; those that are no cards name nothing in a netlist."""
    nodes = [node for node in explanation.hand.nodes if node.in_path] if explanation.hand else []
    least = LIMITS * math.fsum(abs(node.time_constant_s) for node in nodes)
    limiting = [line for node in nodes if abs(node.time_constant_s) >= least for line in node.lines]
    return {word for line in limiting for term in line.resistance.resistances for word in WORD.findall(term.name)}


def _cards(circuit: Circuit, names: set[str]) -> list[tuple[int, int]]:
    wanted = {fold(name) for name in names}
    passives = circuit.passives
    found = [
        (int(passives.card[k]), int(passives.path[k])) for k, name in enumerate(passives.name) if fold(name) in wanted
    ]
    return found + [(element.card, element.path) for element in circuit.elements if fold(element.name) in wanted]


def _hand_response(numbers: Numbers, explanation: Explanation, frequency: NDArray[np.float64]) -> Complex | None:
    """gain_mid · Π 1/(1 + s·τ) over the nodes that count, and s·τ/(1 + s·τ) over the capacitors that count."""
    hand = explanation.hand
    if hand is None:
        return None
    s = 2j * np.pi * frequency
    gain = np.full(len(s), complex(numbers.midband.gain.real))
    for node in hand.nodes:
        if node.in_path and node.time_constant_s > 0.0:
            gain = gain / (1.0 + s * node.time_constant_s)
    for row in hand.lower:
        if row.in_path and row.edge_hand_hz > 0.0:
            s_tau = s / (2.0 * np.pi * row.edge_hand_hz)
            gain = gain * s_tau / (1.0 + s_tau)
    return gain


def _polar(
    h: Complex, frequency_hz: NDArray[np.float64] | None = None, angle: Angle | None = None
) -> tuple[tuple[float, ...], tuple[float, ...]]:
    magnitude = 20.0 * np.log10(np.maximum(np.abs(h), np.finfo(float).tiny))
    phase = np.degrees(np.unwrap(np.angle(h)))
    if angle is not None and frequency_hz is not None:
        phase = angle.along(frequency_hz, h) + float(np.angle(angle.midband.gain, deg=True))
    return tuple(magnitude.tolist()), tuple(phase.tolist())
