"""Devices at their operating point → the record of `tauledger devices`."""

from __future__ import annotations

from tauledger import __version__
from tauledger.causes.cause import note_facts
from tauledger.causes.region import region_note
from tauledger.circuit import Circuit
from tauledger.compose.review import netlist_facts
from tauledger.compose.setting import EFFICIENCY, device_facts, figure_unit
from tauledger.devices.family import Linearised
from tauledger.errors import InputError
from tauledger.netlist import Netlist
from tauledger.network.assemble import Network
from tauledger.network.midband import find_midband
from tauledger.record import DEVICES_SCHEMA, DeviceFacts, DevicesTable, EngineFacts, Figure, NoteFacts
from tauledger.solution import Bias


def devices_table(netlist: Netlist, circuit: Circuit, bias: Bias, linearised: Linearised) -> DevicesTable:
    """Put the devices of a circuit into one record, each with gm/I; where no signal passes there are no notes on it."""
    network = Network.from_parts(linearised.parts, output=circuit.output)
    try:
        note = region_note(network, find_midband(network), linearised.devices)
    except InputError:
        note = None
    told = [] if note is None else [note_facts(note)]
    told += [NoteFacts("engine-warning", "", line) for line in bias.warnings]
    return DevicesTable(
        schema=DEVICES_SCHEMA,
        tauledger=__version__,
        engine=EngineFacts(bias.engine.name, bias.engine.version),
        netlist=netlist_facts(netlist, ""),
        temperature_c=circuit.temperature_c,
        devices=tuple(_with_efficiency(facts) for facts in device_facts(linearised.devices)),
        notes=tuple(told),
    )


def _with_efficiency(facts: DeviceFacts) -> DeviceFacts:
    value = {figure.symbol: figure.value for figure in facts.figures}
    current = value.get("i_c", value.get("i_d", 0.0))
    if EFFICIENCY in value or "gm" not in value or not current:
        return facts
    figure = Figure(EFFICIENCY, value["gm"] / abs(current), figure_unit(EFFICIENCY))
    return DeviceFacts(facts.name, facts.kind, facts.region, (*facts.figures, figure))
