"""What a return ratio T(jω) says about its loop: where |T| = 1 with which margin, and where T would turn positive.

Phase is counted from negative feedback: arg T = 0 at mid-band, −180° where what comes back helps itself.

Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945, chapter XVIII (margins of phase and gain).
"""

from __future__ import annotations

import math
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
HELPS_DEG = 135.0
IN_PHASE_DEG = 10.0
RISES = 1.1
DECADES_DOWN = 9
AS_AT_DC = 1e-4


class Crossing(Struct, frozen=True):
    """|T| = 1 at `hz` in Hz. falling: |T| falls through 1 as f rises. angle_deg: arg T there, unwrapped.

    phase_margin_deg: how far T is from −1 there, within ±180°; negative where, on the stretch with |T| > 1 that ends
    there, arg T goes through half a turn.
    """

    hz: float
    phase_margin_deg: float
    falling: bool
    angle_deg: float


class Turn(Struct, frozen=True):
    """arg T = ±180° (or odd multiples of it) at `hz` in Hz, where |T| is gain_db."""

    hz: float
    gain_db: float


class LoopShape(Struct, frozen=True):
    """T over frequency: frequency_hz (k,), ratio (k,), phase_deg (k,) unwrapped, and its value at the reference at_hz.

    crossings, turns: from low to high. f_high_hz: first −3 dB of T above the reference, None where there is none.
    flat: T is in phase at the reference and does not rise before f_high_hz, as f_high_hz·(1 + T) supposes.
    """

    frequency_hz: Real
    ratio: Complex
    phase_deg: Real
    at_hz: float
    at_reference: complex
    crossings: tuple[Crossing, ...]
    turns: tuple[Turn, ...]
    f_high_hz: float | None
    flat: bool = True

    @property
    def above(self) -> tuple[Crossing, ...]:
        """All |T| = 1 above mid-band, from low to high."""
        return tuple(one for one in self.crossings if one.hz > self.at_hz)

    @property
    def crossover(self) -> Crossing | None:
        """Of the falls of |T| through 1 above mid-band that with the least margin; None where |T| stays below 1."""
        falls = [one for one in self.above if one.falling]
        return min(falls, key=lambda one: one.phase_margin_deg, default=None)

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
    crossings = _crossings(ratio_at, frequency_hz, size, phase, (at_hz, at_reference))
    f_high_hz = edge_above(lambda f: np.abs(ratio_at(f)), frequency_hz, at_hz, abs(at_reference), np.abs(ratio))
    return LoopShape(
        frequency_hz=frequency_hz,
        ratio=ratio,
        phase_deg=phase,
        at_hz=at_hz,
        at_reference=at_reference,
        crossings=crossings,
        turns=_turns(ratio_at, frequency_hz, phase),
        f_high_hz=f_high_hz,
        flat=_flat(frequency_hz, np.abs(ratio), (at_hz, at_reference), f_high_hz),
    )


def opposes(ratio: complex) -> bool:
    """Whether what comes back opposes what was sent: negative feedback.

    Far above the pole of an amplifier T lags a quarter of a turn, and more by what else there is: it opposes as long as
    |1 + T| ≥ 1 and T is nearer to a quarter of a turn than to half a turn.
    """
    return abs(1.0 + ratio) >= 1.0 and abs(float(np.angle(ratio, deg=True))) <= HELPS_DEG


def signed_size(ratio: complex) -> float:
    """Give |T|, negative where what comes back helps."""
    return abs(ratio) if opposes(ratio) else -abs(ratio)


def single_frequency(ratio_at: RatioAt, at_reference: complex, lowest_hz: float) -> float | None:
    """Give the highest frequency in Hz, by decades from lowest_hz down, at which T is what it is at DC; None for none.

    A simulator has no AC analysis at DC: this is where it tells the same T.
    """
    hz: Real = lowest_hz * 10.0 ** -np.arange(DECADES_DOWN, dtype=np.float64)
    same = np.abs(ratio_at(hz) - at_reference) <= AS_AT_DC * abs(at_reference)
    return float(hz[int(np.argmax(same))]) if bool(np.any(same)) else None


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


def margins_near(ratio: Complex, frequency_hz: Real, near: Crossing) -> Crossing | None:
    """Give where |T| = 1 in a few samples around it, by a polynomial through them; None where it is not among them.

    ratio, frequency_hz: (k,). near: the crossing to be expected, whose margin counts from the same side.
    """
    found = _root(np.log(np.abs(ratio)), frequency_hz)
    if found is None:
        return None
    u = np.log(frequency_hz)
    angle = np.degrees(np.unwrap(np.angle(ratio)))
    at = float(np.polyval(np.polyfit(u - u.mean(), angle, len(u) - 1), np.log(found) - u.mean()))
    at += 360.0 * round((near.angle_deg - at) / 360.0)
    # a margin grows with arg T where T lies below the real axis, and on a turn too far where it lies above
    side = -math.copysign(1.0, _wrapped(near.angle_deg)) * math.copysign(1.0, near.phase_margin_deg)
    margin = near.phase_margin_deg + side * (at - near.angle_deg)
    return Crossing(found, margin, bool(np.abs(ratio[0]) > np.abs(ratio[-1])), at)


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


def _crossings(
    ratio_at: RatioAt, frequency_hz: Real, size: Real, phase: Real, reference: tuple[float, complex]
) -> tuple[Crossing, ...]:
    """Give every |T| = 1 with its margin: the sheets tell whether T went round −1 on the stretch with |T| > 1."""
    at_hz, at_reference = reference
    places = []
    for low_k in np.flatnonzero((size[:-1] > 0.0) != (size[1:] > 0.0)):
        k = int(low_k)
        hz = _narrow(lambda f: _decibel(ratio_at(f)), float(frequency_hz[k]), float(frequency_hz[k + 1]))
        angle = _near(float(np.angle(ratio_at(np.array([hz]))[0], deg=True)), float(phase[k]), float(phase[k + 1]))
        places.append((hz, angle, bool(size[k] > 0.0)))
    crossings = []
    for k, (hz, angle, falling) in enumerate(places):
        before = places[k - 1] if k else None
        after = places[k + 1] if k + 1 < len(places) else None
        low, high = (before, places[k]) if falling else (places[k], after)
        other = low if falling else high
        start = angle if other is None else other[1]
        if (low is None or low[0] <= at_hz) and (high is None or at_hz <= high[0]):
            start = float(np.angle(at_reference, deg=True))
        margin = 180.0 - abs(_wrapped(angle))
        crossings.append(Crossing(hz, margin if _sheet(angle) == _sheet(start) else -margin, falling, angle))
    return tuple(crossings)


def _sheet(angle: float) -> int:
    """Count the half turns: 0 for what lies within ±180° of negative feedback."""
    return math.floor((angle + 180.0) / 360.0)


def _wrapped(angle: float) -> float:
    return angle - 360.0 * _sheet(angle)


def _flat(frequency_hz: Real, size: Real, reference: tuple[float, complex], f_high_hz: float | None) -> bool:
    at_hz, at_reference = reference
    if abs(float(np.angle(at_reference, deg=True))) > IN_PHASE_DEG:
        return False
    below = (frequency_hz > at_hz) & (frequency_hz < (math.inf if f_high_hz is None else f_high_hz))
    return not np.any(size[below] > RISES * abs(at_reference))


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
