"""Resistors, capacitors and inductors: one part each.

A plain value is as the netlist room worked it out. With a model, temperature coefficients or `ac=` the engine is asked:
`resistance` and `ac` hold neither temperature nor m, `capacitance` holds both, `inductance` all but m.
"""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, names, readings_of
from tauledger.devices.parts import Part, capacitance, inductance, resistance
from tauledger.devices.temperature import polynomial_factor, temperature_rise
from tauledger.solution import Bias, Observation

TERMINALS = ("plus", "minus")
WORDS = {"R": "resistor", "C": "capacitor", "L": "inductor"}
READINGS = {"R": ("resistance", "ac"), "C": ("capacitance",), "L": ("inductance",)}
# The exponential law of SPICE resistors: tce in per cent per kelvin.
EXPONENTIAL_BASE = 1.01


def passive_part(letter: str, owner: str, a: str, b: str, value: float) -> Part:
    """Give the part of one R, C or L between nodes a and b; value in ohm, farad or henry, multiplicity included."""
    match letter:
        case "R":
            return resistance(owner, a, b, value)
        case "C":
            return capacitance(owner, a, b, value)
        case "L":
            return inductance(owner, a, b, value)
    raise ValueError(f"not a passive: {letter}")


def _is_plain(element: Element) -> bool:
    return not element.model and [name for name, _ in element.parameters] == ["value"]


def _observe(element: Element) -> Observation | None:
    return None if _is_plain(element) else Observation(element.name, READINGS[element.letter])


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    a, b = (circuit.nodes[node] for node in element.nodes)
    part = passive_part(element.letter, element.name, a, b, _value(circuit, element, bias))
    return Device(element.name, WORDS[element.letter], "", (), (), None, (part,))


def _value(circuit: Circuit, element: Element, bias: Bias) -> float:
    if _is_plain(element):
        return element.parameter("value", 0.0)
    read = readings_of(bias, element)
    if element.letter == "C":
        return read["capacitance"]
    m = element.parameter("m", 1.0)
    if element.letter == "L":
        return read["inductance"] / m
    return read["ac"] * element.parameter("scale", 1.0) * _resistance_factor(circuit, element) / m


def _resistance_factor(circuit: Circuit, element: Element) -> float:
    """1.01^(tce·ΔT) where tce is given, else 1 + tc1·ΔT + tc2·ΔT²; what the card gives wins over the model."""
    model = circuit.model(element.model) if element.model else None
    of_model = dict(model.parameters) if model is not None else {}
    given = {**of_model, **dict(element.parameters)}
    rise = temperature_rise(circuit, element, model)
    if "tce" in given:
        return float(EXPONENTIAL_BASE ** (given["tce"] * rise))
    return polynomial_factor(given.get("tc1", 0.0), given.get("tc2", 0.0), rise)


def _refuse(element: Element, _model: Model | None) -> Refusal | None:
    if element.formula is not None:
        return Refusal(
            element.quantity,
            f"a {WORDS[element.letter]} given by a formula cannot be rebuilt from ngspice's readings",
            "give its value at the operating point as a number",
        )
    return None


RESISTOR = Family(
    letter="R",
    words=WORDS["R"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    model_types=("r", "res"),
    levels=(1,),
    instance_parameters=names("value ac m scale tc1 tc2 tce temp dtemp l w"),
    model_parameters=names(
        "rsh narrow dw dlr dl short tc1 tc2 tce defw defl l w kf af tnom r res tc1r tc2r bv_max lf wf ef"
    ),
    model_optional=True,
)
CAPACITOR = Family(
    letter="C",
    words=WORDS["C"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    model_types=("c", "cap"),
    levels=(1,),
    instance_parameters=names("value m scale tc1 tc2 temp dtemp l w"),
    model_parameters=names("cap cj cjsw defw defl narrow short del tc1 tc2 tnom di thick l w scale m bv_max"),
    model_optional=True,
)
INDUCTOR = Family(
    letter="L",
    words=WORDS["L"],
    terminals=TERMINALS,
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    model_types=("l", "ind"),
    levels=(1,),
    instance_parameters=names("value m scale tc1 tc2 temp dtemp nt"),
    model_parameters=names("ind csect dia length tc1 tc2 tnom nt mu"),
    model_optional=True,
)
