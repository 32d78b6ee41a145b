"""What a return ratio T(jω) says about its loop: where |T| = 1 with which margin, and where T would turn positive.

Phase is counted from negative feedback: arg T = 0 at mid-band, −180° where what comes back helps itself.

Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945, chapter XVIII (margins of phase and gain).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec import Struct

from tauledger.network.midband import frequency_range
from tauledger.network.solve import Complex, Real
from tauledger.network.spectrum import frequency_grid

RatioAt = Callable[[Real], Complex]

POINTS_PER_DECADE = 20
HIGHEST_HZ = 1e12
NARROWED_TO = 17
ROUNDS = 7
# Below this T is what rounding leaves, and its phase means nothing.
ROUNDING_DB = -180.0
HALF_POWER = 1.0 / np.sqrt(2.0)


class Crossing(Struct, frozen=True):
    """|T| = 1 at `hz` in Hz; phase_margin_deg = 180° + arg T there. falling: |T| falls through 1 as f rises."""

    hz: float
    phase_margin_deg: float
    falling: bool


class Turn(Struct, frozen=True):
    """arg T = ±180° (or odd multiples of it) at `hz` in Hz, where |T| is gain_db."""

    hz: float
    gain_db: float


class LoopShape(Struct, frozen=True):
    """T over frequency: frequency_hz (k,), ratio (k,), phase_deg (k,) unwrapped, and its value at the reference at_hz.

    crossings, turns: from low to high. f_high_hz: first −3 dB of T above the reference, None where there is none.
    """

    frequency_hz: Real
    ratio: Complex
    phase_deg: Real
    at_hz: float
    at_reference: complex
    crossings: tuple[Crossing, ...]
    turns: tuple[Turn, ...]
    f_high_hz: float | None

    @property
    def crossover(self) -> Crossing | None:
        """The last fall of |T| through 1, above which the loop does nothing; None where |T| stays below 1."""
        return next((one for one in reversed(self.crossings) if one.falling and one.hz > self.at_hz), None)

    @property
    def lower_crossover(self) -> Crossing | None:
        """Below mid-band, where |T| rises through 1 first; None where the loop works down to DC."""
        return next((one for one in self.crossings if not one.falling and one.hz < self.at_hz), None)

    @property
    def gain_margin(self) -> Turn | None:
        """The first turn above mid-band: −gain_db is the gain margin."""
        return next((one for one in self.turns if one.hz > self.at_hz), None)


def loop_grid(*roots: Complex) -> Real:
    """Give frequencies in Hz that show all that networks with these poles (rad/s) do."""
    together = np.concatenate(roots)
    low, high = frequency_range(together, together) or (1.0, 1e6)
    return frequency_grid(low, min(high, HIGHEST_HZ), POINTS_PER_DECADE, together)


def loop_shape(ratio_at: RatioAt, frequency_hz: Real, at_hz: float) -> LoopShape:
    """Give crossings, margins and band edge of T.

    ratio_at: T at any frequencies (k,) in Hz. frequency_hz: (k,) ascending. at_hz: the reference, 0 for DC.
    """
    ratio = ratio_at(frequency_hz)
    at_reference = complex(ratio_at(np.array([at_hz]))[0])
    size = _decibel(ratio)
    phase = _phase(frequency_hz, ratio, at_hz, at_reference)
    crossings = []
    for k in np.flatnonzero((size[:-1] > 0.0) != (size[1:] > 0.0)):
        hz = _narrow(lambda f: _decibel(ratio_at(f)), float(frequency_hz[k]), float(frequency_hz[k + 1]))
        angle = _near(float(np.angle(ratio_at(np.array([hz]))[0], deg=True)), float(phase[k]), float(phase[k + 1]))
        crossings.append(Crossing(hz, 180.0 + angle, bool(size[k] > 0.0)))
    return LoopShape(
        frequency_hz=frequency_hz,
        ratio=ratio,
        phase_deg=phase,
        at_hz=at_hz,
        at_reference=at_reference,
        crossings=tuple(crossings),
        turns=_turns(ratio_at, frequency_hz, phase),
        f_high_hz=edge_above(lambda f: np.abs(ratio_at(f)), frequency_hz, at_hz, abs(at_reference), np.abs(ratio)),
    )


def edge_above(
    size_at: Callable[[Real], Real], frequency_hz: Real, at_hz: float, reference: float, size: Real | None = None
) -> float | None:
    """Give the first frequency in Hz above at_hz where a magnitude falls 3 dB below `reference`; None where none.

    size_at: the magnitude at any frequencies (k,) in Hz. size: it at frequency_hz, where it is known.
    """
    over = frequency_hz > at_hz
    above = frequency_hz[over]
    low = (size_at(above) if size is None else size[over]) < HALF_POWER * reference
    if not np.any(low) or bool(low[0]):
        return None
    k = int(np.argmax(low))
    return _narrow(lambda f: size_at(f) / (HALF_POWER * reference) - 1.0, float(above[k - 1]), float(above[k]))


def margins_near(ratio: Complex, frequency_hz: Real, phase_near_deg: float) -> Crossing | None:
    """Give where |T| = 1 in a few samples around it, by a polynomial through them; None where it is not among them.

    ratio, frequency_hz: (k,). phase_near_deg: arg T to be expected, which chooses the turn.
    """
    found = _root(np.log(np.abs(ratio)), frequency_hz)
    if found is None:
        return None
    u = np.log(frequency_hz)
    angle = np.degrees(np.unwrap(np.angle(ratio)))
    at = float(np.polyval(np.polyfit(u - u.mean(), angle, len(u) - 1), np.log(found) - u.mean()))
    at += 360.0 * round((phase_near_deg - at) / 360.0)
    return Crossing(found, 180.0 + at, bool(np.abs(ratio[0]) > np.abs(ratio[-1])))


def turn_near(ratio: Complex, frequency_hz: Real) -> Turn | None:
    """Give where T is real and negative in a few samples around it, and its size there; None where it is not there."""
    # counted from −180°, the phase is near 0 and has no turn of its own
    found = _root(np.unwrap(np.angle(-ratio)), frequency_hz)
    if found is None:
        return None
    u = np.log(frequency_hz)
    size = np.polyfit(u - u.mean(), np.log(np.abs(ratio)), len(u) - 1)
    return Turn(found, float(np.polyval(size, np.log(found) - u.mean()) * 20.0 / np.log(10.0)))


def _root(value: Real, frequency_hz: Real) -> float | None:
    changes = np.flatnonzero((value[:-1] > 0.0) != (value[1:] > 0.0))
    if not len(changes):
        return None
    u = np.log(frequency_hz)
    coefficients = np.polyfit(u - u.mean(), value, len(u) - 1)
    low, high = u[changes[0]] - u.mean(), u[changes[0] + 1] - u.mean()
    for _ in range(60):
        middle = 0.5 * (low + high)
        same = (np.polyval(coefficients, middle) > 0.0) == bool(value[changes[0]] > 0.0)
        low, high = (middle, high) if same else (low, middle)
    return float(np.exp(0.5 * (low + high) + u.mean()))


def _phase(frequency_hz: Real, ratio: Complex, at_hz: float, at_reference: complex) -> Real:
    """Unwrap the phase so that it starts from that of the reference, which lies within ±180°."""
    phase = np.degrees(np.unwrap(np.angle(ratio)))
    nearest = int(np.argmin(np.abs(np.log(frequency_hz / at_hz)))) if at_hz > 0.0 else 0
    turns = round((float(np.angle(at_reference, deg=True)) - float(phase[nearest])) / 360.0)
    return np.asarray(phase + 360.0 * turns, dtype=np.float64)


def _turns(ratio_at: RatioAt, frequency_hz: Real, phase: Real) -> tuple[Turn, ...]:
    sheet = np.floor((phase + 180.0) / 360.0)
    found = []
    for k in np.flatnonzero(sheet[:-1] != sheet[1:]):
        hz = _narrow(lambda f: np.angle(-ratio_at(f)), float(frequency_hz[k]), float(frequency_hz[k + 1]))
        gain_db = float(_decibel(ratio_at(np.array([hz])))[0])
        if gain_db > ROUNDING_DB:
            found.append(Turn(hz, gain_db))
    return tuple(found)


def _decibel(ratio: Complex) -> Real:
    """Give |T| in dB; where it is nothing at all, very little."""
    return np.asarray(20.0 * np.log10(np.maximum(np.abs(ratio), np.finfo(float).tiny)), dtype=np.float64)


def _narrow(value_at: Callable[[Real], Real], low: float, high: float) -> float:
    """Find where a value changes its sign between two frequencies, a batch of points at a time, in ln f."""
    for _ in range(ROUNDS):
        points = np.geomspace(low, high, NARROWED_TO)
        value = value_at(points)
        positive = value > 0.0
        k = int(np.argmax(positive != positive[0]))
        if k == 0:
            # rounding has put the change beyond an end, which is the place itself
            return float(points[int(np.argmin(np.abs(value)))])
        low, high = float(points[k - 1]), float(points[k])
    return float(np.sqrt(low * high))


def _near(angle: float, first: float, second: float) -> float:
    middle = 0.5 * (first + second)
    return angle + 360.0 * round((middle - angle) / 360.0)
