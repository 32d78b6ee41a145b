"""Switches S and W: in ngspice's AC analysis always R_OFF, whatever the operating point has.

Where the operating point has the switch on, the device says so: the sweep is that of an open switch.
"""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, fold
from tauledger.devices.family import Device, Family, names, never_refused, observe_nothing
from tauledger.devices.parts import conductance
from tauledger.solution import Bias

WORDS = {"S": "voltage-controlled switch", "W": "current-controlled switch"}
# ngspice's own R_OFF is the inverse of gmin.
GMIN = 1e-12


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    a, b = (circuit.nodes[node] for node in element.nodes[:2])
    default = 1.0 / dict(circuit.options).get("gmin", GMIN)
    part = conductance(element.name, a, b, 1.0 / model.parameter("roff", default))
    region = "on" if _is_on(element, circuit, bias) else "off"
    remark = f"{element.name} is on at the operating point, but ngspice's AC analysis takes every switch as off (ROFF)"
    return Device(
        name=element.name,
        kind=WORDS[element.letter],
        region=region,
        figures=(),
        terminals=(),
        cell=None,
        parts=(part,),
        remarks=(remark,) if region == "on" else (),
    )


def _is_on(element: Element, circuit: Circuit, bias: Bias) -> bool:
    """Say whether the control is above threshold plus hysteresis, or, within the hysteresis, whether it starts on."""
    model = circuit.model(element.model)
    if element.letter == "S":
        plus, minus = element.nodes[2:4]
        control, threshold, width = float(bias.voltages[plus] - bias.voltages[minus]), "vt", "vh"
    else:
        through = fold(element.references[0])
        control = next(current for name, current in bias.currents.items() if fold(name) == through)
        threshold, width = "it", "ih"
    level, hysteresis = model.parameter(threshold, 0.0), model.parameter(width, 0.0)
    if abs(control - level) <= abs(hysteresis):
        return "on" in dict(element.parameters)
    return control > level


def _family(letter: str, terminals: tuple[str, ...], kind: str, thresholds: str) -> Family:
    return Family(
        letter=letter,
        words=WORDS[letter],
        terminals=terminals,
        linearise=_linearise,
        observe=observe_nothing,
        refuse=never_refused,
        model_types=(kind,),
        levels=(1,),
        instance_parameters=names("on off"),
        model_parameters=names(f"ron roff {thresholds}"),
    )


VOLTAGE_SWITCH = _family("S", ("plus", "minus", "control plus", "control minus"), "sw", "vt vh")
CURRENT_SWITCH = _family("W", ("plus", "minus"), "csw", "it ih")
