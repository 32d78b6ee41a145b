"""Transistors that signal reaches, but that do not amplify: saturated, triode, off, in reverse."""

from __future__ import annotations

import numpy as np

from tauledger.causes.cause import Note
from tauledger.causes.evidence import Evidence
from tauledger.devices.family import Device
from tauledger.network.assemble import Network
from tauledger.network.midband import MidBand
from tauledger.network.solve import on_axis, solve

NOT_AMPLIFYING = ("saturated", "triode", "off", "reversed")
# Signal between control and common terminal below this part of the drive, or gain that depends on gm less: idle.
REACHED = 0.01
PASSES = 0.05


def region_where_signal_passes(evidence: Evidence) -> Note | None:
    """Transistors in the signal path that are saturated, in triode, off or reversed."""
    return region_note(evidence.bands.network, evidence.bands.midband, evidence.devices)


def region_note(network: Network, midband: MidBand, devices: tuple[Device, ...]) -> Note | None:
    """Word the note on the transistors that `not_amplifying` finds; None where there are none."""
    found = not_amplifying(network, midband, devices)
    if not found:
        return None
    names = ", ".join(device.name for device in found)
    told = ", ".join(f"{device.name} is {in_words(device.region)}" for device in found)
    return Note(
        "region",
        names,
        f"{told}, where signal passes: check the bias before any figure by hand, for it does not work there as an "
        "amplifier does",
    )


def not_amplifying(network: Network, midband: MidBand, devices: tuple[Device, ...]) -> tuple[Device, ...]:
    """Give the transistors that signal reaches and that are saturated, in triode, off or reversed.

    Signal reaches one where its voltage between control and common terminal is at least 1 % of the largest drive, or
    where the mid-band gain depends on its gm: |∂ln H/∂ln gm| ≥ 0.05.
    Raises NetworkError where the network has no unique solution at mid-band.
    """
    suspects = [d for d in devices if d.cell is not None and any(word in d.region for word in NOT_AMPLIFYING)]
    if not suspects:
        return ()
    at = solve(network, on_axis(midband.frequency_hz))
    x, adjoint = at.x[0], at.adjoint[0]
    drive = max((abs(amplitude) for amplitude in network.amplitudes.values()), default=0.0)
    largest = drive if _driven_by_voltage(network) else float(np.abs(x[: network.n_nodes]).max(initial=0.0))

    def of(vector: np.ndarray, node: str) -> complex:
        row = network.index(node)
        return 0j if row is None else complex(vector[row])

    found = []
    for device in suspects:
        cell = device.cell
        assert cell is not None
        signal = of(x, cell.control) - of(x, cell.common)
        reached = abs(signal) >= REACHED * largest
        moved = cell.gm * signal * (of(adjoint, cell.output) - of(adjoint, cell.common)) / midband.gain
        if reached or abs(moved) >= PASSES:
            found.append(device)
    return tuple(found)


def in_words(region: str) -> str:
    """Write a region behind "is": "in triode", "saturated", "off", "reversed"."""
    return f"in {region}" if region.startswith(("triode", "saturation")) else region


def _driven_by_voltage(network: Network) -> bool:
    return all(p.kind == "voltage source" for p in network.parts if p.kind.endswith("source") and network.amplitude(p))
