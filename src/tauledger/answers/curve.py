"""A measured curve beside ngspice: where it leaves it, its own band edges, and the stray that would explain it."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from msgspec import Struct

from tauledger.answers.answer import Subject
from tauledger.answers.stray import READABLE_DB, Mask, Stray, Target, decibels, find_strays, rms_db
from tauledger.answers.stray_rerun import proven
from tauledger.asked import MeasuredCurve
from tauledger.network.midband import MidBand
from tauledger.network.solve import Complex, Real, response
from tauledger.network.unity import is_ratio
from tauledger.record import (
    CurveFacts,
    CurveFigure,
    CurveLeaves,
    CurvePoint,
    EdgeFacts,
    Review,
    StrayFacts,
    known_hz,
)

# Common practice: a probe and its calibration are good for so much.
LEAVES_DB, LEAVES_DEG = 1.0, 5.0
HALF_POWER_DB = 10.0 * np.log10(2.0)
# The level is that of the points within half a decade of mid-band.
LEVEL_DECADES = 0.5
# Lower than this below mid-band a bench sees its own leakage and noise.
FITTED_DB = 40.0
FEWEST_FITTED = 3
BETWEEN_POINTS = 33

Run = Callable[[Real], Complex]


class _Beside(Struct, frozen=True):
    """The curve beside its reference: frequency (k,) Hz, measured and reference in dB and degrees (k,) each, and the
    differences with the level taken out; phases None where none was measured."""

    frequency_hz: Real
    measured_db: Real
    reference: Complex
    level: Mask
    offset_db: float
    difference_db: Real
    offset_deg: float | None
    difference_deg: Real | None


def compare_curve(found: Review, subject: Subject, curve: MeasuredCurve) -> CurveFacts:
    """Set the curve beside ngspice (beside the exact response where there is no engine).

    found: the review with its simulated band edges. The engine holds the deck of the numbers, and does so again
    afterwards. The level, in dB and in degrees, is the mean difference over the points within half a decade of mid-band
    (at DC: up to a tenth of f_H), or that of the nearest point. A stray is looked for from mid-band upwards, down to 40
    dB below it, where the curve is off by more than can be read.
    Raises EngineError, NetworkError.
    """
    numbers, engine = subject.numbers, subject.engine

    def run(frequency_hz: Real) -> Complex:
        return engine.sweep(frequency_hz).response if engine is not None else response(numbers.network, frequency_hz)

    midband = numbers.midband if numbers.trusted or numbers.simulated is None else numbers.simulated.midband
    frequency = np.array(curve.frequency_hz)
    reference = run(frequency)
    beside = _beside(curve, reference, midband, found.f_high)
    level_db = decibels(np.array([midband.gain]))[0] + beside.offset_db
    fitted = (frequency >= midband.frequency_hz) & (beside.measured_db >= level_db - FITTED_DB)
    target = Target(frequency, beside.measured_db, fitted, beside.level)
    enough = int(fitted.sum()) >= FEWEST_FITTED
    before = rms_db(target, decibels(reference)) if enough else None
    strays: tuple[Stray, ...] = ()
    if before is not None and before > READABLE_DB and numbers.trusted:
        strays = find_strays(target, numbers, subject.explanation)
    facts = [_stray_facts(stray) for stray in strays]
    explained: Real | None = None
    if facts:
        facts[0], explained = proven(facts[0], target, numbers, engine)
        explained = explained + beside.offset_db
    at_db = int(np.argmax(np.abs(beside.difference_db)))
    at_deg = int(np.argmax(np.abs(beside.difference_deg))) if beside.difference_deg is not None else None
    measured_at = frequency[beside.level]
    return CurveFacts(
        file=curve.path,
        against="simulated" if engine is not None else "exact",
        offset_db=beside.offset_db,
        offset_deg=beside.offset_deg,
        level_from_hz=float(measured_at[0]),
        level_to_hz=float(measured_at[-1]),
        largest_db=float(beside.difference_db[at_db]),
        largest_db_at_hz=float(frequency[at_db]),
        largest_deg=float(beside.difference_deg[at_deg])
        if at_deg is not None and beside.difference_deg is not None
        else None,
        largest_deg_at_hz=None if at_deg is None else float(frequency[at_deg]),
        figures=_figures(beside, found, midband, level_db, run, ratio=is_ratio(numbers.network)),
        leaves=_leaves(beside, midband),
        rms_db=before,
        fitted_points=int(fitted.sum()),
        explains=_verdict(before, facts, trusted=numbers.trusted),
        strays=tuple(facts),
        points=_points(curve, beside, explained),
    )


def _beside(curve: MeasuredCurve, reference: Complex, midband: MidBand, f_high: EdgeFacts | None) -> _Beside:
    frequency, measured = np.array(curve.frequency_hz), np.array(curve.gain_db)
    level = _level(frequency, midband, f_high)
    difference = measured - decibels(reference)
    offset = float(difference[level].mean())
    if curve.phase_deg is None:
        return _Beside(frequency, measured, reference, level, offset, difference - offset, None, None)
    turned = np.exp(1j * np.radians(np.array(curve.phase_deg))) * np.conj(reference) / np.abs(reference)
    mean = turned[level].mean()
    offset_deg = float(np.degrees(np.angle(mean)))
    off = np.degrees(np.angle(turned * np.exp(-1j * np.radians(offset_deg))))
    return _Beside(frequency, measured, reference, level, offset, difference - offset, offset_deg, off)


def _level(frequency: Real, midband: MidBand, f_high: EdgeFacts | None) -> Mask:
    if midband.frequency_hz > 0.0:
        away = np.abs(np.log10(frequency / midband.frequency_hz))
        near: Mask = away <= LEVEL_DECADES
    else:
        edge = known_hz(f_high)
        away = frequency
        near = frequency <= (edge / 10.0 if edge is not None else np.inf)
    return near if near.any() else np.asarray(away == away.min())


def _leaves(beside: _Beside, midband: MidBand) -> tuple[CurveLeaves, ...]:
    """Find on either side, going outwards, where the difference first exceeds 1 dB or 5°."""
    found = []
    f_mid = midband.frequency_hz
    quantities: list[tuple[str, Real, float]] = [("gain", beside.difference_db, LEAVES_DB)]
    if beside.difference_deg is not None:
        quantities.append(("phase", beside.difference_deg, LEAVES_DEG))
    below = np.flatnonzero(beside.frequency_hz < f_mid)[::-1]
    above = np.flatnonzero(beside.frequency_hz >= f_mid)
    for side, outwards in (("below", below), ("above", above)):
        places = []
        for name, difference, limit in quantities:
            hz = _crossing(beside.frequency_hz[outwards], limit - np.abs(difference[outwards]))
            if hz is not None:
                places.append(CurveLeaves(side, name, hz))
        if places:
            first = min(
                places,
                key=lambda place: abs(np.log(place.frequency_hz / (f_mid or 1.0))) if f_mid else place.frequency_hz,
            )
            found.append(first)
    return tuple(found)


def _crossing(frequency: Real, inside: Real) -> float | None:
    """Give where `inside` (k,) first falls below 0, between two points straight over ln f; None where it does not."""
    beyond = np.flatnonzero(inside < 0.0)
    if not len(beyond):
        return None
    k = int(beyond[0])
    if k == 0:
        return float(frequency[0])
    part = inside[k - 1] / (inside[k - 1] - inside[k])
    return float(frequency[k - 1] * (frequency[k] / frequency[k - 1]) ** part)


def _figures(
    beside: _Beside, found: Review, midband: MidBand, level_db: float, run: Run, *, ratio: bool
) -> tuple[CurveFigure, ...]:
    """Set band edges and unity gain beside the simulated ones, the level taken out; those that the curve reaches."""
    figures = []
    edge_db = level_db - HALF_POWER_DB
    for name, edge, upwards in (("f_low", found.f_low, False), ("f_high", found.f_high, True)):
        hz = _falls_below(beside, midband, edge_db, run, upwards=upwards)
        if hz is not None:
            figures.append(CurveFigure(name, hz, known_hz(edge)))
    if ratio and level_db - beside.offset_db > HALF_POWER_DB:
        unity = _falls_below(beside, midband, beside.offset_db, run, upwards=True)
        if unity is not None:
            figures.append(CurveFigure("f_unity", unity, known_hz(found.f_unity)))
    return tuple(figures)


def _falls_below(beside: _Beside, midband: MidBand, level_db: float, run: Run, *, upwards: bool) -> float | None:
    """Find where the measured gain first falls below a level, going outwards from mid-band; None where it does not.

    Between two points it is taken as the reference with the difference straight over ln f.
    """
    frequency = beside.frequency_hz
    at = np.flatnonzero((frequency >= midband.frequency_hz) == upwards)
    at = at if upwards else at[::-1]
    beyond = np.flatnonzero(beside.measured_db[at] < level_db)
    if not len(beyond) or beyond[0] == 0:
        return None
    inside, outside = at[beyond[0] - 1], at[beyond[0]]
    part = np.linspace(0.0, 1.0, BETWEEN_POINTS)
    fine = frequency[inside] * (frequency[outside] / frequency[inside]) ** part
    off = beside.measured_db - decibels(beside.reference)
    return _crossing(fine, decibels(run(fine)) + off[inside] + part * (off[outside] - off[inside]) - level_db)


def _verdict(before: float | None, strays: Sequence[StrayFacts], *, trusted: bool) -> str:
    if before is None or not trusted:
        return "not sought"
    if before <= READABLE_DB:
        return "nothing to explain"
    return "stray" if strays else "no single capacitance"


def _stray_facts(stray: Stray) -> StrayFacts:
    return StrayFacts(stray.plus, stray.minus, stray.farad, stray.rms_db)


def _points(curve: MeasuredCurve, beside: _Beside, explained: Real | None) -> tuple[CurvePoint, ...]:
    reference_deg = np.degrees(np.unwrap(np.angle(beside.reference)))
    return tuple(
        CurvePoint(
            frequency_hz=hz,
            gain_db=curve.gain_db[k],
            phase_deg=None if curve.phase_deg is None else curve.phase_deg[k],
            reference_db=float(decibels(beside.reference[k : k + 1])[0]),
            reference_deg=float(reference_deg[k]),
            difference_db=float(beside.difference_db[k]),
            difference_deg=None if beside.difference_deg is None else float(beside.difference_deg[k]),
            explained_db=None if explained is None else float(explained[k]),
        )
        for k, hz in enumerate(curve.frequency_hz)
    )
