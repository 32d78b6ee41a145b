"""The upper edge by hand, continued: inductors that are short at mid-band count L/R beside the nodes' R·C.

A leakage inductance, a peaking coil or a lead opens above the band. R is what faces it with it taken out and all other
inductors short; Σ R·C + Σ L/R is then b1, the sum −Σ 1/p of the whole upper network.

Source: Hajimiri, "Generalized time- and transfer-constant circuit analysis", IEEE Trans. Circuits Syst. I 57(6), 2010
(the zero-value time constant of an inductor).
"""

from __future__ import annotations

import math

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.errors import NetworkError
from tauledger.hand.budget import resistance_across
from tauledger.hand.equivalent import EquivalentCircuit, equivalent_circuit, joined
from tauledger.hand.estimate import InductorRow
from tauledger.hand.nodes import MOMENT_IN_PATH, node_name, node_title
from tauledger.network.bands import Bands
from tauledger.network.constants import OpenConstant, OpenConstants
from tauledger.network.transformers import LEAKAGE, MAGNETISING

WORDS = {LEAKAGE: "leakage inductance", MAGNETISING: "magnetising inductance"}


def inductor_rows(bands: Bands, devices: tuple[Device, ...], constants: OpenConstants) -> tuple[InductorRow, ...]:
    """Give one row per inductor that is short at mid-band and faces a resistance, in the order of the file.

    constants: of `open_constants`. A row counts where its part of Σ|w·τ| is 2 % or more, and not where the plateau goes
    on beyond its R/(2π·L): a choke that has opened inside the band makes no edge of it. None where capacitors set the
    gain, whose circuit is complex.
    """
    if bands.s_mid:
        return ()
    whole = math.fsum(abs(part.delay_s) for part in constants.parts)
    to_hz = bands.midband.to_hz or 0.0
    found = [
        _row(
            bands,
            devices,
            part,
            abs(part.delay_s) >= MOMENT_IN_PATH * whole and 2.0 * math.pi * to_hz * abs(part.time_constant_s) < 1.0,
        )
        for part in constants.parts
        if part.kind == "inductance" and part.time_constant_s != 0.0
    ]
    return tuple(row for row in found if row is not None)


def _row(bands: Bands, devices: tuple[Device, ...], part: OpenConstant, in_path: bool) -> InductorRow | None:
    try:
        opened, at = joined(bands.upper, (), {part.name})
        merged = {node: at[upper] for node, upper in bands.merged.items() if upper in at}
        circuit = equivalent_circuit(opened, merged, devices, bands.network)
    except NetworkError:
        return None
    ends = [circuit.at.get(node, GROUND) for node in part.nodes]
    if ends[0] == ends[1] or circuit.floating.intersection(ends):
        return None
    seen = resistance_across(circuit, ends[0], ends[1])
    label = part.name.partition(".")[2]
    return InductorRow(
        part=part.name,
        title=f"{part.name}, {WORDS.get(label, 'inductor')} at {_place(circuit, ends)}",
        henry=part.value,
        resistance=seen,
        resistance_exact_ohm=part.resistance_ohm,
        time_constant_s=part.value / seen.ohm if seen.ohm else 0.0,
        time_constant_exact_s=part.time_constant_s,
        in_path=in_path,
    )


def _place(circuit: EquivalentCircuit, ends: list[str]) -> str:
    """Name the end that the signal moves more, but none inside a transformer."""
    live = [node for node in ends if node != GROUND]
    outer = [node for node in live if "'" not in node_name(circuit, node)] or live
    return node_title(circuit, max(outer, key=lambda node: abs(circuit.voltage[circuit.row[node]])))
