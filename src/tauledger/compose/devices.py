"""Devices at their operating point → the record of `tauledger devices`."""

from __future__ import annotations

from msgspec.structs import replace

from tauledger import __version__
from tauledger.causes.cause import note_facts
from tauledger.causes.region import region_note
from tauledger.circuit import GROUND, Circuit
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
    """Put the devices of a circuit into one record, each with gm/I, and note those that do not amplify."""
    network = Network.from_parts(linearised.parts, output=circuit.output)
    told: list[NoteFacts] = []
    try:
        note = region_note(network, find_midband(network), linearised.devices)
    except InputError as reason:
        why = "no source is driven, or no output is named" if circuit.output.plus == GROUND else reason.message
        told.append(NoteFacts("no-signal", "", f"which devices signal passes is not judged: {why}"))
    else:
        told += [note_facts(note)] if note is not None else []
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
    return replace(facts, figures=(*facts.figures, figure))
