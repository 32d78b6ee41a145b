"""Which subcircuit instances are shown as one part: those that the user names, and macromodels by themselves."""

from __future__ import annotations

from collections.abc import Sequence

from tauledger.circuit import Circuit, fold
from tauledger.devices.family import Linearised
from tauledger.devices.instances import chosen, elements_inside, macromodels
from tauledger.network.fold import folded, obstacle

NONE = "none"


def fold_instances(circuit: Circuit, linearised: Linearised, names: Sequence[str]) -> Linearised:
    """Put every chosen instance into one part, "inside XU1", and take its transistors from the devices.

    names: instances, "XU1" or "U1"; "none" leaves all open. Macromodels (controlled sources, no transistor) are folded
    where nothing keeps them from it.
    Raises InputError where a named instance is not there or cannot be taken together.
    """
    if [fold(name) for name in names] == [NONE]:
        return linearised
    named = chosen(circuit, names)
    parts, devices = linearised.parts, linearised.devices
    for instance in dict.fromkeys((*named, *macromodels(circuit))):
        elements = elements_inside(circuit, instance)
        inside = {part.name for part in parts if fold(part.owner.partition("'")[0]) in elements}
        if not inside:
            continue
        if instance not in named and obstacle(parts, inside, circuit.output):
            continue
        parts = folded(parts, instance.name, inside, circuit.output)
        devices = tuple(device for device in devices if fold(device.name) not in elements)
    return Linearised(parts, devices)
