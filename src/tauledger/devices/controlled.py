"""The controlled sources E, F, G, H: linear, or POLY differentiated at the operating point.

A lone voltage-controlled current source whose control shares a node with its output is a transistor's hand model.
"""

from __future__ import annotations

from collections.abc import Iterator

from tauledger.circuit import Circuit, Current, Element, Formula, Model, Voltage, fold
from tauledger.devices.family import Device, Family, Refusal, Transconductor, observe_nothing
from tauledger.devices.parts import Part, current_gain, transconductance, transresistance, voltage_gain
from tauledger.devices.polynomial import controls, gradient
from tauledger.solution import Bias

WORDS = {
    "E": "voltage-controlled voltage source",
    "F": "current-controlled current source",
    "G": "voltage-controlled current source",
    "H": "current-controlled voltage source",
}


def cell_of(part: Part) -> Transconductor | None:
    """Give a transconductance as a cell where one control node is one of its output nodes, else None.

    The shared node is the common one; the sign of gm follows from which ends are shared. A part that senses its own
    two ends is a conductance and no cell.
    """
    if part.kind != "transconductance":
        return None
    out_plus, out_minus, control_plus, control_minus = part.nodes
    if {out_plus, out_minus} == {control_plus, control_minus}:
        return None
    for output, common, out_sign in ((out_plus, out_minus, 1.0), (out_minus, out_plus, -1.0)):
        for control, reference, control_sign in (
            (control_plus, control_minus, 1.0),
            (control_minus, control_plus, -1.0),
        ):
            if reference == common and control != output:
                return Transconductor(part.owner, control, common, output, out_sign * control_sign * part.value)
    return None


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    parts = tuple(_parts(circuit, element, _gains(element, bias)))
    cell = cell_of(parts[0]) if len(parts) == 1 else None
    return Device(element.name, WORDS[element.letter], "", (), (), cell, parts)


def _gains(element: Element, bias: Bias) -> tuple[tuple[Formula, float], ...]:
    """Give each control with the gain from it."""
    by = controls(element)
    m = element.parameter("m", 1.0) if element.letter in "FG" else 1.0
    if not element.polynomial:
        return ((by[0], m * element.parameter("gain", 0.0)),)
    slopes = gradient(element.polynomial, [_at(control, bias) for control in by])
    # the same control may stand twice
    total: dict[Formula, float] = {}
    for control, slope in zip(by, slopes, strict=True):
        total[control] = total.get(control, 0.0) + m * slope
    return tuple(total.items())


def _at(control: Formula, bias: Bias) -> float:
    match control:
        case Voltage(plus=plus, minus=minus):
            return float(bias.voltages[plus] - bias.voltages[minus])
        case Current(source=source):
            return next(current for name, current in bias.currents.items() if fold(name) == fold(source))
    raise TypeError(control)


def _parts(circuit: Circuit, element: Element, gains: tuple[tuple[Formula, float], ...]) -> Iterator[Part]:
    """Give one part for each control; those of a voltage source stand in series, the others in parallel."""
    a, b = (circuit.nodes[node] for node in element.nodes[:2])
    several = len(gains) > 1
    for k, (control, gain) in enumerate(gains, start=1):
        label = f"gain_{k}" if several else ""
        owner = element.name if k == 1 else f"{element.name}'{k}"
        upper = a if k == 1 else f"{element.name}'{k - 1}"
        lower = b if k == len(gains) else f"{element.name}'{k}"
        match element.letter, control:
            case "G", Voltage(plus=plus, minus=minus):
                yield transconductance(element.name, (a, b), (circuit.nodes[plus], circuit.nodes[minus]), gain, label)
            case "E", Voltage(plus=plus, minus=minus):
                yield voltage_gain(owner, (upper, lower), (circuit.nodes[plus], circuit.nodes[minus]), gain)
            case "F", Current(source=source):
                yield current_gain(element.name, a, b, gain, source, label)
            case "H", Current(source=source):
                yield transresistance(owner, upper, lower, gain, source)


def _refuse(element: Element, _model: Model | None) -> Refusal | None:
    if element.formula is not None:
        return Refusal(
            "",
            f"a {WORDS[element.letter]} given by a formula cannot be rebuilt from ngspice's readings",
            "write it with a gain, or with POLY",
        )
    return None


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


VOLTAGE_GAIN = _family("E", ("plus", "minus", "control plus", "control minus"), frozenset({"gain"}))
CURRENT_GAIN = _family("F", ("plus", "minus"), frozenset({"gain", "m"}))
TRANSCONDUCTANCE = _family("G", ("plus", "minus", "control plus", "control minus"), frozenset({"gain", "m"}))
TRANSRESISTANCE = _family("H", ("plus", "minus"), frozenset({"gain"}))
