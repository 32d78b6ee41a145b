"""Sources, resistors, capacitors and inductors given by a formula: linear in what the formula depends on.

A current i(v, …) is one transconductance per voltage and one current gain per current in it, a voltage one gain each in
series. A resistor r(v, …) carries v_ab/r. A capacitor c(v, …) or inductor l(v, …) has the value of its operating point
alone (that is what ngspice takes), a capacitor given by its charge q(v, …) the derivative of the charge.

ngspice makes B sources of all of them. Measured: tc1 and tc2 of such a resistor multiply r and those of an inductor l,
but those of a capacitor divide c or q; they count from the circuit's temperature, never from one of the card.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING

from tauledger.circuit import Apply, Circuit, Current, Element, Formula, Model, Variable, Voltage
from tauledger.devices.controlled import cell_of
from tauledger.devices.family import Device, Family, Refusal, names, observe_nothing
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    current_gain,
    inductance,
    transcapacitance,
    transconductance,
    transresistance,
    voltage_gain,
    voltage_source,
)
from tauledger.devices.temperature import polynomial_factor, temperature_rise
from tauledger.solution import Bias

if TYPE_CHECKING:
    from tauledger.devices.derivative import Control

WORDS = {
    "B": "behavioural source",
    "E": "voltage-controlled voltage source",
    "G": "voltage-controlled current source",
    "R": "resistor",
    "C": "capacitor",
    "L": "inductor",
}


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    from tauledger.devices.derivative import at_bias

    assert element.formula is not None
    found = at_bias(element.formula, circuit, bias, element.name)
    m = _factor(circuit, element)
    match _quantity(element):
        case "i":
            by = {control: m * slope for control, slope in found.by.items()}
            parts = tuple(_currents(circuit, element, by, ""))
        case "v":
            of_voltage = m if element.letter == "B" else 1.0
            by = {control: of_voltage * slope for control, slope in found.by.items()}
            parts = tuple(_voltages(circuit, element, by))
        case "r":
            across = Voltage(*element.nodes)
            volt = float(bias.voltages[element.nodes[0]] - bias.voltages[element.nodes[1]])
            m /= _warmth(circuit, element)
            slopes = {control: -m * volt * slope / found.value**2 for control, slope in found.by.items()}
            slopes[across] = slopes.get(across, 0.0) + m / found.value
            parts = tuple(_currents(circuit, element, slopes, "g_ab"))
        case "c":
            a, b = (circuit.nodes[node] for node in element.nodes)
            parts = (capacitance(element.name, a, b, m / _warmth(circuit, element) * found.value),)
        case "l":
            a, b = (circuit.nodes[node] for node in element.nodes)
            parts = (inductance(element.name, a, b, _warmth(circuit, element) / m * found.value),)
        case _:
            m /= _warmth(circuit, element)
            parts = tuple(_charges(circuit, element, {control: m * slope for control, slope in found.by.items()}))
    cell = cell_of(parts[0]) if len(parts) == 1 else None
    return Device(element.name, WORDS[element.letter], "", (), (), cell, parts)


def _factor(circuit: Circuit, element: Element) -> float:
    """Give m, for a B source times what its temperature makes of it."""
    m = element.parameter("m", 1.0)
    if element.letter != "B":
        return m
    rise = temperature_rise(circuit, element, None)
    return m * polynomial_factor(element.parameter("tc1", 0.0), element.parameter("tc2", 0.0), rise)


def _warmth(circuit: Circuit, element: Element) -> float:
    """1 + tc1·ΔT + tc2·ΔT² of a resistor, capacitor or inductor, ΔT that of the whole circuit."""
    rise = circuit.temperature_c - circuit.tnom_c
    return polynomial_factor(element.parameter("tc1", 0.0), element.parameter("tc2", 0.0), rise)


def _quantity(element: Element) -> str:
    return element.quantity or {"E": "v", "G": "i"}.get(element.letter, "")


def _currents(circuit: Circuit, element: Element, by: Mapping[Control, float], own: str) -> Iterator[Part]:
    """Give the parts of a current from the first node to the second; one across those two is a conductance."""
    a, b = (circuit.nodes[node] for node in element.nodes[:2])
    several = len(by) > 1
    for k, (control, slope) in enumerate(by.items(), start=1):
        label = f"gain_{k}" if several else ""
        match control:
            case Voltage(plus=plus, minus=minus) if {plus, minus} == set(element.nodes[:2]):
                sign = 1.0 if plus == element.nodes[0] else -1.0
                yield conductance(element.name, a, b, sign * slope, own if several else "")
            case Voltage(plus=plus, minus=minus):
                yield transconductance(element.name, (a, b), (circuit.nodes[plus], circuit.nodes[minus]), slope, label)
            case Current(source=source):
                yield current_gain(element.name, a, b, slope, source, label)


def _voltages(circuit: Circuit, element: Element, by: Mapping[Control, float]) -> Iterator[Part]:
    """Give the parts of a voltage: one gain after the other in series, a wire where nothing controls it."""
    a, b = (circuit.nodes[node] for node in element.nodes[:2])
    if not by:
        yield voltage_source(element.name, a, b)
    for k, (control, slope) in enumerate(by.items(), start=1):
        owner = element.name if k == 1 else f"{element.name}'{k}"
        upper = a if k == 1 else f"{element.name}'{k - 1}"
        lower = b if k == len(by) else f"{element.name}'{k}"
        match control:
            case Voltage(plus=plus, minus=minus):
                yield voltage_gain(owner, (upper, lower), (circuit.nodes[plus], circuit.nodes[minus]), slope)
            case Current(source=source):
                yield transresistance(owner, upper, lower, slope, source)


def _charges(circuit: Circuit, element: Element, by: Mapping[Control, float]) -> Iterator[Part]:
    """Give dq/dv of a charge between two nodes: a capacitance across them, a transcapacitance from elsewhere."""
    a, b = (circuit.nodes[node] for node in element.nodes[:2])
    several = len(by) > 1
    for k, (control, slope) in enumerate(by.items(), start=1):
        assert isinstance(control, Voltage)
        label = f"charge_{k}" if several else ""
        if {control.plus, control.minus} == set(element.nodes[:2]):
            sign = 1.0 if control.plus == element.nodes[0] else -1.0
            yield capacitance(element.name, a, b, sign * slope, label)
        else:
            ends = circuit.nodes[control.plus], circuit.nodes[control.minus]
            yield transcapacitance(element.name, (a, b), ends, slope, label)


def _refuse(element: Element, _model: Model | None) -> Refusal | None:
    if element.formula is None:
        return Refusal("", f"a {WORDS[element.letter]} without a formula is not one of these", "")
    if "hertz" in _names(element.formula):
        return Refusal(
            element.quantity,
            "a formula of the frequency (hertz) cannot be rebuilt: in ngspice it is a factor of the frequency without "
            "a phase, which no R, C, L and sources have",
            "build the frequency dependence from R, C and L",
        )
    if element.quantity == "q" and _depends_on_current(element.formula):
        return Refusal("q", "a charge that depends on a current cannot be rebuilt", "let it depend on voltages")
    return None


def _names(formula: Formula) -> Iterator[str]:
    match formula:
        case Variable(name=name):
            yield name
        case Apply(function=function, arguments=arguments):
            yield function
            for argument in arguments:
                yield from _names(argument)


def _depends_on_current(formula: Formula) -> bool:
    match formula:
        case Current():
            return True
        case Apply(arguments=arguments):
            return any(map(_depends_on_current, arguments))
    return False


def _family(letter: str, terminals: tuple[str, ...], parameters: frozenset[str]) -> Family:
    return Family(
        letter=letter,
        words=WORDS[letter],
        terminals=terminals,
        linearise=_linearise,
        observe=observe_nothing,
        refuse=_refuse,
        instance_parameters=parameters,
    )


ENDS = ("plus", "minus")
BEHAVIOURAL: tuple[Family, ...] = (
    _family("B", ENDS, names("m temp dtemp tc1 tc2")),
    _family("E", ENDS, frozenset({"gain"})),
    _family("G", ENDS, frozenset({"gain", "m"})),
    _family("R", ENDS, names("m tc1 tc2")),
    _family("C", ENDS, names("m tc1 tc2")),
    _family("L", ENDS, names("m tc1 tc2")),
)
