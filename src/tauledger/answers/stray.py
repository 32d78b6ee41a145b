"""The stray capacitance that would explain a measured curve best: every place tried, each refitted exactly."""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.explain import Explanation
from tauledger.network.added import Places, places, response_with
from tauledger.network.solve import Complex, Real
from tauledger.numbers import Numbers

SMALLEST_F, LARGEST_F = 1e-15, 10e-9
# An error that still falls at the end of the range has its least value beyond: that is no stray.
AT_THE_END = 0.99
STEPS_PER_DECADE = 6
GOLDEN = (np.sqrt(5.0) - 1.0) / 2.0
NARROWINGS = 45
MOST_PAIRED = 12
MOST_POINTS = 200
# Common practice: what a bench reads, and a hand-held probe repeats.
READABLE_DB = 0.1
AS_GOOD = 1.2
HALF = 0.5

Mask = NDArray[np.bool_]


class Target(Struct, frozen=True):
    """What is to be explained: gain_db (k,) over frequency_hz (k,), judged at the points `fitted` (k,), the level taken
    from the points `level` (k,)."""

    frequency_hz: Real
    gain_db: Real
    fitted: Mask
    level: Mask


class Stray(Struct, frozen=True):
    """A capacitance between two nodes (minus "0": to ground) and the rms difference in dB that is left with it."""

    plus: str
    minus: str
    farad: float
    rms_db: float


def decibels(h: Complex) -> Real:
    """Give 20·log10 of |H|, of any shape."""
    return np.asarray(20.0 * np.log10(np.maximum(np.abs(h), np.finfo(float).tiny)))


def rms_db(target: Target, model_db: Real) -> float:
    """Give the rms difference over the fitted points in dB, the mean difference over the level's points taken out.

    model_db: (k,).
    """
    return float(_rms(target, model_db[:, None])[0])


def find_strays(target: Target, numbers: Numbers, explanation: Explanation) -> tuple[Stray, ...]:
    """Give the best single capacitance, and after it the runner-up where that is as good; empty where none explains.

    Tried: from every node of the netlist to ground, and between any two signal nodes. One between two nodes is taken
    before one to ground only where its error is a fifth smaller. None explains where the error does not fall by half.
    As good: an error less than a fifth larger, or too small to be read.
    Raises NetworkError where the network has no unique solution.
    """
    target = _thinned(target)
    pairs = _pairs(numbers, explanation)
    if not pairs or not target.fitted.any():
        return ()
    found = places(numbers.network, pairs, target.frequency_hz)
    before = float(_rms(target, decibels(response_with(found, np.zeros(len(pairs)))))[0])
    farad, error = _best(target, found)
    strays = [Stray(*pair, float(f), float(e)) for pair, f, e in zip(pairs, farad, error, strict=True)]
    inside = (s for s in strays if s.rms_db <= HALF * before and s.farad < AT_THE_END * LARGEST_F)
    strays = sorted(inside, key=lambda s: s.rms_db)
    if not strays:
        return ()
    to_ground = next((s for s in strays if s.minus == GROUND), None)
    best = strays[0] if to_ground is None or not _as_good(to_ground, strays[0]) else to_ground
    places_of = _groups(numbers)
    others = (s for s in strays if _group(s, places_of) != _group(best, places_of) and _as_good(s, best))
    return (best, *list(others)[:1])


def _as_good(one: Stray, best: Stray) -> bool:
    return one.rms_db <= max(AS_GOOD * best.rms_db, READABLE_DB)


def _groups(numbers: Numbers) -> dict[str, str]:
    """Give each node of the netlist, by the node that it is at mid-band; those at AC ground have no place."""
    network, merged = numbers.network, numbers.bands.merged
    known = set(numbers.circuit.nodes) if numbers.circuit is not None else set(network.unknowns)
    outer = [node for node in network.unknowns[: network.n_nodes] if node in known and "'" not in node]
    return {node: merged.get(node, node) for node in outer if merged.get(node, node) != GROUND}


def _group(stray: Stray, groups: dict[str, str]) -> frozenset[str]:
    return frozenset(groups.get(node, node) for node in (stray.plus, stray.minus))


def _pairs(numbers: Numbers, explanation: Explanation) -> list[tuple[str, str]]:
    groups = _groups(numbers)
    pairs = [(node, GROUND) for node in groups]
    nodes = explanation.hand.nodes if explanation.hand is not None else ()
    crossed = [node.name for node in nodes if node.in_path and node.name in groups][:MOST_PAIRED]
    return pairs + [
        (one, other) for k, one in enumerate(crossed) for other in crossed[k + 1 :] if groups[one] != groups[other]
    ]


def _thinned(target: Target) -> Target:
    """Keep at most 200 of the fitted points and of those of the level, evenly spread over the list."""
    kept = np.zeros(len(target.frequency_hz), dtype=bool)
    for mask in (target.fitted, target.level):
        at = np.flatnonzero(mask)
        kept[at[np.unique(np.linspace(0, len(at) - 1, min(len(at), MOST_POINTS)).astype(int))]] = True
    return Target(target.frequency_hz[kept], target.gain_db[kept], target.fitted[kept], target.level[kept])


def _rms(target: Target, model_db: Real) -> Real:
    """Give the rms difference (m,) to models (k, m)."""
    difference = target.gain_db[:, None] - model_db
    level = difference[target.level].mean(axis=0)
    return np.asarray(np.sqrt(np.mean((difference[target.fitted] - level) ** 2, axis=0)))


def _best(target: Target, found: Places) -> tuple[Real, Real]:
    """Minimise the error of every place over its capacitance: a scan, then the golden section in ln C."""
    many = found.own.shape[1]
    decades = np.log10(LARGEST_F / SMALLEST_F)
    grid = np.log(np.geomspace(SMALLEST_F, LARGEST_F, round(decades * STEPS_PER_DECADE) + 1))

    def error(log_farad: Real) -> Real:
        return _rms(target, decibels(response_with(found, np.exp(log_farad))))

    scanned = np.array([error(np.full(many, at)) for at in grid])
    k = np.clip(np.argmin(scanned, axis=0), 1, len(grid) - 2)
    low, high = grid[k - 1], grid[k + 1]
    for _ in range(NARROWINGS):
        first, second = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        falls = error(first) < error(second)
        low, high = np.where(falls, low, first), np.where(falls, second, high)
    middle = 0.5 * (low + high)
    return np.exp(middle), error(middle)
