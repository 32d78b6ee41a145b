"""What paper often leaves out although the circuit has it: r_b, and degeneration.

The hand side here has both. Their effect is that of the exact f_H, recomputed with them shorted: it says how far off a
page is that leaves them out, so these causes come after those of the hand estimate itself.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import Evidence, hand_differs
from tauledger.circuit import GROUND
from tauledger.devices.family import Device, Terminal
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network
from tauledger.network.recompute import scaled
from tauledger.network.solve import response
from tauledger.quantity import engineering, percent
from tauledger.record import NamedNumber

SHORTED = 1e7
AT_BASE = "g_b"
REACH = 32.0
POINTS = 48


def base_resistance(evidence: Evidence) -> Cause | None:
    """Paper without r_b. Effect: exact f_H with every r_b shorted ÷ exact f_H."""
    series = [part for part in evidence.bands.network.parts if part.label == AT_BASE]
    effect = _without(evidence, series)
    if effect is None:
        return None
    named = _named(series)
    stands = "stands" if len(series) == 1 else "stand"
    return Cause(
        cause="base-resistance",
        quantity="f_H",
        effect=effect,
        where=named,
        says=f"{named} {stands} before the capacitances inside; paper without it comes out {_off(effect)}",
        instead="count C_π and C_μ from behind r_b, with R = r_b + what the base sees, beside r_π",
        numbers=tuple(NamedNumber(f"r_b of {part.owner}", 1.0 / part.value, "Ω") for part in series),
        on_paper=True,
    )


def degeneration_ignored(evidence: Evidence) -> Cause | None:
    """Paper with gm for G_m and C_π not bootstrapped. Effect: exact f_H with emitters (sources) at ground ÷ exact."""
    resistors = _degenerating(evidence)
    effect = _without(evidence, resistors)
    if effect is None:
        return None
    named = ", ".join(f"{part.owner} ({engineering(1.0 / part.value, 'Ω', 3)})" for part in resistors)
    degenerates = "degenerates" if len(resistors) == 1 else "degenerate"
    return Cause(
        cause="degeneration-ignored",
        quantity="f_H",
        effect=effect,
        where=named,
        says=f"{named} {degenerates}; paper with gm for gm/(1 + gm·R_E) and all of C_π comes out {_off(effect)}",
        instead="take the gain from G_m = gm/(1 + gm·R_E), and C_π divided by 1 + gm·R_E at the input",
        numbers=tuple(NamedNumber(part.owner, 1.0 / part.value, "Ω") for part in resistors),
        on_paper=True,
    )


def _without(evidence: Evidence, parts: Sequence[Part]) -> float | None:
    """Give f_H with the parts shorted ÷ f_H − 1; None where hand and exact agree within 2 %, or there is no f_H."""
    hz = evidence.upper.hz
    if not parts or hz is None or not hand_differs(evidence):
        return None
    bands = evidence.bands
    changed = scaled(bands.network, {part.name: SHORTED for part in parts})
    found = _edge_near(changed, bands.midband.frequency_hz, hz)
    return found / hz - 1.0 if found is not None else None


def _edge_near(network: Network, reference_hz: float, near_hz: float) -> float | None:
    """Give the first −3 dB frequency in Hz from near/32 to near·32 (or from the reference), None without one there."""
    level = abs(complex(response(network, np.array([reference_hz]))[0])) / math.sqrt(2.0)
    start, stop = max(near_hz / REACH, reference_hz), near_hz * REACH
    if not start < stop:
        return None
    for _ in range(3):
        grid = np.geomspace(start, stop, POINTS)
        size = np.abs(response(network, grid))
        below = np.flatnonzero(size <= level)
        if len(below) == 0 or below[0] == 0:
            return None
        first = int(below[0])
        start, stop = float(grid[first - 1]), float(grid[first])
    part = math.log(size[first - 1] / level) / math.log(size[first - 1] / size[first])
    return float(start * (stop / start) ** part)


def _degenerating(evidence: Evidence) -> list[Part]:
    """List the resistors from an emitter or source to AC ground that the signal passes with gm·R_E above 0.1."""
    bands = evidence.bands
    found: dict[str, Part] = {}
    for device in evidence.devices:
        cell = device.cell
        if cell is None:
            continue
        outer = next((t.outer for t in device.terminals if t.inner == cell.common), cell.common)
        collector = next((t.outer for t in device.terminals if t.inner == cell.output), cell.output)
        here = bands.merged.get(outer, outer)
        # a follower's collector rests, and a compound follower's second collector is its emitter: there R_E is the load
        leaves = {bands.merged.get(t.outer, t.outer) for other in evidence.devices for t in _output(other)}
        if (
            here == GROUND
            or here in {*leaves, *_port(evidence)}
            or not _passed(evidence, bands.merged.get(collector, collector))
        ):
            continue
        for part in bands.upper.parts:
            ends = set(part.nodes)
            grounded = part.kind == "conductance" and not part.label and ends == {here, GROUND}
            if grounded and cell.gm > 0.1 * part.value:
                found[part.name] = part
    return list(found.values())


def _output(device: Device) -> list[Terminal]:
    cell = device.cell
    return [] if cell is None else [t for t in device.terminals if t.inner == cell.output]


def _port(evidence: Evidence) -> set[str]:
    port = evidence.bands.network.port
    return {evidence.bands.merged.get(node, node) for node in (port.plus, port.minus)}


def _passed(evidence: Evidence, node: str) -> bool:
    return any(row.in_path and node in {line.at for line in row.lines} | {*row.members} for row in evidence.nodes)


def _named(series: Sequence[Part]) -> str:
    told = [f"r_b of {part.owner} ({engineering(1.0 / part.value, 'Ω', 3)})" for part in series[:2]]
    return ", ".join(told) + (f" and {len(series) - 2} more" if len(series) > 2 else "")


def _off(effect: float) -> str:
    return f"{percent(abs(effect)).removeprefix('+')} {'high' if effect > 0 else 'low'}"
