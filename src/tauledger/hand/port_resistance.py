"""Input and output resistance as worked on paper: looking into the mid-band circuit where source or load was."""

from __future__ import annotations

from collections.abc import Collection

from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.devices.parts import current_source
from tauledger.errors import NetworkError
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.estimate import LookingIn
from tauledger.hand.looking_in import looking_in
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, merged_nodes, upper_network

PROBE = "looking in"


def port_resistance(
    bands: Bands,
    devices: tuple[Device, ...],
    *,
    node: str,
    without: Collection[str],
    label: str,
    opposite: str | None = None,
) -> LookingIn | None:
    """Give the resistance from a node to ground by hand at mid-band, with the named parts taken away.

    label: what stands in the brackets of R(…). opposite: a node that is driven in opposite phase; a balanced circuit is
    then worked as its half. None where the node is at AC ground, where capacitors set the gain, or where the circuit
    that is left cannot be drawn or, with an opposite node, has no halves.
    """
    if bands.gain_setting or not bands.sound:
        return None
    parts = [part for part in bands.network.parts if part.name not in without]
    parts.append(current_source(PROBE, GROUND, node, 1.0))
    if opposite is not None:
        parts.append(current_source(f"{PROBE}, opposite", GROUND, opposite, -1.0))
    try:
        network = Network.from_parts(parts, output=bands.network.port)
        merged = merged_nodes(network, bands.class_of)
        upper = upper_network(network, bands.class_of, merged)
        circuit = upper_circuit(replace(bands, network=network, merged=merged, upper=upper), devices)
    except NetworkError:
        return None
    at = circuit.at[node]
    if at == GROUND:
        return None
    if opposite is not None:
        mirror = find_mirror(circuit)
        if mirror is None or at in mirror.axis:
            return None
        circuit = half_circuit(circuit, mirror if at in mirror.image else mirror.other)
    return looking_in(circuit, at, label)
