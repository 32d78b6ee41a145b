"""Peaking: the highest gain above mid-band on either side, and what makes it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec.structs import replace

from tauledger.answers.answer import Subject
from tauledger.answers.elements import PROVED, Element, elements
from tauledger.compose.helps import LESS
from tauledger.network.edges import Edge, find_edges
from tauledger.network.midband import in_changed
from tauledger.network.recompute import scaled
from tauledger.network.targets import PERCENT, peaking_moves
from tauledger.numbers import Numbers
from tauledger.record import PeakElement, PeakFacts
from tauledger.simulated import RunSweep, Simulated

# Below this there is nothing to see, nor by 10 % of an element.
WORTH_TELLING_DB = 0.01
WORTH_A_ROW_DB = 0.005
REFINING_POINTS = 33
REFINING_ROUNDS = 3


def peak_facts(subject: Subject) -> tuple[PeakFacts, ...]:
    """Give the peaking of each side that has 0.01 dB of it or more, simulated and exact, with who makes it.

    Nothing where the network is not trusted.
    """
    numbers = subject.numbers
    if not numbers.trusted:
        return ()
    facts = []
    for name, edge in (("f_high", numbers.edges.f_high), ("f_low", numbers.edges.f_low)):
        if edge is None or edge.peaking_at_hz is None or edge.peaking_db < WORTH_TELLING_DB:
            continue
        db, at_hz = None, None
        if subject.engine is not None and numbers.simulated is not None:
            db, at_hz = _simulated_peak(subject.engine.sweep, numbers.simulated, edge.peaking_at_hz)
        moves = peaking_moves(numbers.network, numbers.midband, edge.peaking_at_hz)
        facts.append(
            PeakFacts(
                edge=name,
                simulated_db=db,
                simulated_at_hz=at_hz,
                exact_db=edge.peaking_db,
                exact_at_hz=edge.peaking_at_hz,
                elements=_elements(numbers, name, moves),
            )
        )
    return tuple(facts)


def _simulated_peak(run: RunSweep, simulated: Simulated, near_hz: float) -> tuple[float, float]:
    """Give ngspice's peak in dB above its mid-band and where, in Hz: the highest point of ever finer runs around."""
    frequency = simulated.sweep.frequency_hz
    k = int(np.argmin(np.abs(np.log(frequency / near_hz))))
    low, high = float(frequency[max(k - 1, 0)]), float(frequency[min(k + 1, len(frequency) - 1)])
    peak, at = 0.0, near_hz
    for _ in range(REFINING_ROUNDS):
        grid = np.geomspace(low, high, REFINING_POINTS)
        gain = np.abs(run(grid).response)
        top = int(np.argmax(gain))
        peak, at = float(gain[top]), float(grid[top])
        low, high = float(grid[max(top - 1, 0)]), float(grid[min(top + 1, REFINING_POINTS - 1)])
    return float(20.0 * np.log10(peak / abs(simulated.midband.gain))), at


def _elements(numbers: Numbers, edge: str, moves: Mapping[str, float]) -> tuple[PeakElement, ...]:
    rows = [(one, _element(one, moves[one.name])) for one in elements(numbers)]
    rows = [pair for pair in rows if LESS / PERCENT * abs(pair[1].peaking_db) >= WORTH_A_ROW_DB]
    rows.sort(key=lambda pair: -abs(pair[1].peaking_db))
    proven = [replace(row, rerun_db=_again(numbers, edge, one)) for one, row in rows[:PROVED]]
    return (*proven, *(row for _, row in rows[PROVED:]))


def _element(one: Element, move: float) -> PeakElement:
    return PeakElement(one.name, one.owner, one.nodes, one.value, one.unit, one.sign * PERCENT * move)


def _again(numbers: Numbers, edge: str, one: Element) -> float | None:
    changed = scaled(numbers.network, {one.name: one.ten_percent_less})
    edges = find_edges(changed, in_changed(changed, numbers.midband))
    found: Edge | None = edges.f_high if edge == "f_high" else edges.f_low
    return None if found is None else found.peaking_db
