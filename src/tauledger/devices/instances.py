"""Which elements stand inside a subcircuit instance, and which instances are macromodels."""

from __future__ import annotations

from collections.abc import Iterable

from tauledger.circuit import Circuit, Instance, fold
from tauledger.errors import InputError

TRANSISTORS = frozenset("QMJZ")
CONTROLLED = frozenset("EFGHB")


def chosen(circuit: Circuit, names: Iterable[str]) -> tuple[Instance, ...]:
    """Give the instances of these names, "XU1" or "U1", in the netlist's order.

    Raises InputError where there is none of a name.
    """
    found: list[Instance] = []
    for name in names:
        wanted = {fold(name), "x" + fold(name)}
        hits = [one for one in circuit.instances[1:] if fold(one.name) in wanted]
        if not hits:
            known = ", ".join(one.name for one in circuit.instances[1:]) or "none"
            raise InputError(f"--fold {name}: there is no such subcircuit instance", f"instances: {known}")
        found += hits
    return tuple(one for one in circuit.instances if one in found)


def macromodels(circuit: Circuit) -> tuple[Instance, ...]:
    """Give the outermost instances that hold controlled sources but no transistor, in the netlist's order."""
    inside: dict[int, set[str]] = {number: set() for number in range(len(circuit.instances))}
    for element in circuit.elements:
        for number in _around(circuit, element.path):
            inside[number].add(element.letter)
    found: list[int] = []
    for number in range(1, len(circuit.instances)):
        modelled = inside[number] & CONTROLLED and not inside[number] & TRANSISTORS
        if modelled and not any(outer in found for outer in _around(circuit, circuit.instances[number].parent)):
            found.append(number)
    return tuple(circuit.instances[number] for number in found)


def elements_inside(circuit: Circuit, instance: Instance) -> frozenset[str]:
    """Give the folded names of all elements inside an instance, those of its own instances included."""
    number = circuit.instances.index(instance)
    passives = circuit.passives
    paths = [
        *zip(passives.name, map(int, passives.path), strict=True),
        *((element.name, element.path) for element in circuit.elements),
    ]
    return frozenset(fold(name) for name, path in paths if number in _around(circuit, path))


def _around(circuit: Circuit, path: int) -> list[int]:
    """Give the numbers of the instances around an item, from the inside out."""
    found = []
    while path > 0:
        found.append(path)
        path = circuit.instances[path].parent
    return found
