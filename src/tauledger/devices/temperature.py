"""The temperature of one device, and by what factor its series or own resistance has grown there."""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, Model


def device_temperature(circuit: Circuit, element: Element) -> float:
    """Give the temperature in °C: temp= of the card, else the circuit's with dtemp= added."""
    given = dict(element.parameters)
    return given["temp"] if "temp" in given else circuit.temperature_c + given.get("dtemp", 0.0)


def nominal_temperature(circuit: Circuit, model: Model | None) -> float:
    """Give the temperature in °C at which the model's parameters hold: its own tnom or tref, else the circuit's."""
    if model is None:
        return circuit.tnom_c
    return model.parameter("tnom", model.parameter("tref", circuit.tnom_c))


def temperature_rise(circuit: Circuit, element: Element, model: Model | None) -> float:
    """Give device minus nominal temperature in K."""
    return device_temperature(circuit, element) - nominal_temperature(circuit, model)


def polynomial_factor(tc1: float, tc2: float, rise_k: float) -> float:
    """1 + tc1·ΔT + tc2·ΔT²."""
    return 1.0 + tc1 * rise_k + tc2 * rise_k**2
