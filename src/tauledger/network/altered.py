"""The network with elements of other value, a resistor in series with a capacitor, a capacitor put in; bias held."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct
from msgspec.structs import replace

from tauledger.devices.family import inner_node
from tauledger.devices.parts import capacitance, resistance
from tauledger.network.assemble import Network, assemble
from tauledger.network.recompute import scaled


class SeriesResistor(Struct, frozen=True):
    """A resistor of so many ohm that is put in series with a capacitor; name: its own."""

    name: str
    capacitor: str
    ohm: float


class AddedCapacitor(Struct, frozen=True):
    """A capacitor of so many farad that is put in between two nodes; name: its own."""

    name: str
    plus: str
    minus: str
    farad: float


def with_series(network: Network, series: SeriesResistor) -> Network:
    """Give the network with the resistor between the capacitor's first node and the capacitor.

    Raises KeyError where there is no such capacitor.
    """
    capacitor = network.part(series.capacitor)
    start, *others = capacitor.nodes
    between = inner_node(series.name, "c")
    parts = [
        replace(part, nodes=(between, *others)) if part.name == series.capacitor else part for part in network.parts
    ]
    parts.append(resistance(series.name, start, between, series.ohm))
    return assemble(tuple(parts), network.port, network.amplitudes)


def with_capacitor(network: Network, added: AddedCapacitor) -> Network:
    """Give the network with the capacitor between its two nodes."""
    part = capacitance(added.name, added.plus, added.minus, added.farad)
    return assemble((*network.parts, part), network.port, network.amplitudes)


def altered(
    network: Network, factors: Mapping[str, float], series: SeriesResistor | None, added: AddedCapacitor | None = None
) -> Network:
    """Give the network with resistor and capacitor put in and then the parts' values multiplied (S of a conductance).

    Raises KeyError where a name belongs to no part.
    """
    changed = network if series is None else with_series(network, series)
    if added is not None:
        changed = with_capacitor(changed, added)
    return scaled(changed, factors) if factors else changed
