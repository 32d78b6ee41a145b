"""All device families, and the walk over a circuit that asks them: what to observe, and its parts at the bias."""

from __future__ import annotations

from tauledger.circuit import Circuit
from tauledger.devices.controlled import TRANSCONDUCTANCE
from tauledger.devices.family import Device, Family, Linearised
from tauledger.devices.gummel_poon import GUMMEL_POON
from tauledger.devices.parts import Part
from tauledger.devices.passives import CAPACITOR, INDUCTOR, RESISTOR, passive_part
from tauledger.devices.sources import CURRENT_SOURCE, VOLTAGE_SOURCE
from tauledger.solution import Bias, Observation

FAMILIES: tuple[Family, ...] = (
    RESISTOR,
    CAPACITOR,
    INDUCTOR,
    VOLTAGE_SOURCE,
    CURRENT_SOURCE,
    TRANSCONDUCTANCE,
    GUMMEL_POON,
)


def family_of(letter: str) -> Family | None:
    """Give the family of an element letter (either case), or None where no family has it."""
    return next((family for family in FAMILIES if family.letter == letter.upper()), None)


def observations(circuit: Circuit) -> tuple[Observation, ...]:
    """List what the engine must read at the operating point, in the order of the circuit's elements."""
    asked = (_family(element.letter).observe(element) for element in circuit.elements)
    return tuple(observation for observation in asked if observation is not None)


def linearise(circuit: Circuit, bias: Bias) -> Linearised:
    """Give every part of the small-signal network in netlist order, and the devices that have a cell or a region.

    Parts come in the order of their cards; those of one card in the order of its device file.
    """
    rows: list[tuple[tuple[int, int], tuple[Part, ...]]] = []
    passives = circuit.passives
    for k, name in enumerate(passives.name):
        a, b = circuit.nodes[passives.a[k]], circuit.nodes[passives.b[k]]
        part = passive_part(passives.kind[k], name, a, b, float(passives.value[k]))
        rows.append(((int(passives.path[k]), int(passives.card[k])), (part,)))
    devices: list[Device] = []
    for element in circuit.elements:
        device = _family(element.letter).linearise(circuit, element, bias)
        rows.append(((element.path, element.card), device.parts))
        if device.cell is not None or device.region:
            devices.append(device)
    rows.sort(key=lambda row: row[0])
    return Linearised(tuple(part for _, parts in rows for part in parts), tuple(devices))


def _family(letter: str) -> Family:
    family = family_of(letter)
    if family is None:
        raise KeyError(letter)
    return family
