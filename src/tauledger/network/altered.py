"""The network with elements of other value and with resistors put in series with capacitors; the bias is held."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct
from msgspec.structs import replace

from tauledger.devices.family import inner_node
from tauledger.devices.parts import resistance
from tauledger.network.assemble import Network, assemble
from tauledger.network.recompute import scaled


class SeriesResistor(Struct, frozen=True):
    """A resistor of so many ohm that is put in series with a capacitor; name: its own."""

    name: str
    capacitor: str
    ohm: float


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


def altered(network: Network, factors: Mapping[str, float], series: SeriesResistor | None) -> Network:
    """Give the network with the parts' values multiplied (S of a conductance) and the resistor put in.

    Raises KeyError where a name belongs to no part.
    """
    changed = scaled(network, factors) if factors else network
    return changed if series is None else with_series(changed, series)
