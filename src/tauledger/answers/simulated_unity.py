"""Unity gain as ngspice alone has it: bracketed in the sweep, then narrowed by runs at single frequencies."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.engine.grid import decades
from tauledger.network.follower import polarity, polarity_offset_deg
from tauledger.network.midband import HIGHEST_HZ
from tauledger.network.solve import Complex, Real
from tauledger.network.unity import HALF_TURN_DEG, Unity
from tauledger.numbers import POINTS_PER_DECADE
from tauledger.simulated import RunSweep, Simulated
from tauledger.solution import Sweep

BEYOND = 1.1
# ngspice keeps 1e-12; a miss this small moves no digit that is shown.
SMALL = 1e-9
ROUNDS = 40

Miss = Callable[[complex], float]


class SimulatedUnity(Struct, frozen=True):
    """f_u and both margins by ngspice: None where polarity is not clear, or −180° is not reached in the sweep."""

    hz: float
    phase_margin_deg: float | None
    gain_margin_db: float | None
    gain_margin_at_hz: float | None


def simulate_unity(
    run: RunSweep, simulated: Simulated, *, reach_hz: float = 0.0, near: Unity | None = None
) -> SimulatedUnity | None:
    """Find the first |H| = 1 beyond mid-band; None where the sweep, carried on to 1 THz at most, holds none.

    run: asks the engine for the response at any frequencies. reach_hz: carry the sweep on to there at least.
    The phase is followed along the sweep from mid-band. near: the exact figures, which say where of several places the
    smallest margins are; without them the first counts.
    """
    frequency, h = _outwards(run, simulated, reach_hz)
    reference = midband_phasor(simulated)
    turned = np.degrees(np.unwrap(np.angle(h / reference)))
    below = np.flatnonzero(np.abs(h) < 1.0)
    if not len(below) or below[0] == 0:
        return None

    def level(at: complex) -> float:
        return float(np.log(abs(at)))

    def half_turn(at: complex) -> float:
        return float(np.angle(-at * polarity(reference)))

    k = int(below[0])
    hz, there = _narrowed(run, level, frequency[k - 1 : k + 1], h[k - 1 : k + 1])
    offset = polarity_offset_deg(reference)
    if offset is None:
        return SimulatedUnity(hz, None, None, None)
    if near is not None and near.margin_at_hz != near.hz:
        over = np.abs(h) >= 1.0
        k = _nearest(frequency, np.flatnonzero(over[1:] != over[:-1]) + 1, near.margin_at_hz)
        _, there = _narrowed(run, level, frequency[k - 1 : k + 1], h[k - 1 : k + 1])
    phase = float(np.degrees(np.angle(there / reference)))
    phase += 360.0 * round((float(turned[k]) - phase) / 360.0)
    margin = HALF_TURN_DEG + offset + phase
    turn = np.floor((turned + offset - HALF_TURN_DEG) / 360.0)
    opposed = np.flatnonzero(turn[1:] != turn[:-1]) + 1
    if not len(opposed):
        return SimulatedUnity(hz, margin, None, None)
    k = int(opposed[0])
    if near is not None and near.gain_margin_at_hz is not None:
        k = _nearest(frequency, opposed, near.gain_margin_at_hz)
    turned_hz, left = _narrowed(run, half_turn, frequency[k - 1 : k + 1], h[k - 1 : k + 1])
    left_db = float(-20.0 * np.log10(abs(left)))
    if near is not None and near.gain_margin_db is not None:
        # of a margin by which the gain may fall, or must rise, the sign says whether it is stable
        left_db = float(np.copysign(left_db, near.gain_margin_db))
    return SimulatedUnity(hz, margin, left_db, turned_hz)


def _nearest(frequency: Real, ends: NDArray[np.intp], hz: float) -> int:
    """Give of the upper ends of brackets, indices into frequency (k,), that of the one nearest to hz."""
    return int(min(ends, key=lambda k: abs(np.log(np.sqrt(frequency[k - 1] * frequency[k]) / hz))))


def midband_phasor(simulated: Simulated) -> complex:
    """Give exp(jφ) with the phase of ngspice's mid-band; of a plateau from DC on, the phase that the sweep tends to.

    ngspice has no AC at 0 Hz; the phase is odd in f, so that two points tell it there but for the cube of f.
    """
    midband, sweep = simulated.midband, simulated.sweep
    phase = float(np.angle(midband.gain))
    if midband.frequency_hz == 0.0:
        (f0, f1), (h0, h1) = sweep.frequency_hz[:2], sweep.response[:2]
        phase = float(np.angle(h0) - np.angle(h1 / h0) * f0 / (f1 - f0))
    return complex(np.exp(1j * phase))


def _outwards(run: RunSweep, simulated: Simulated, reach_hz: float) -> tuple[Real, Complex]:
    """Give the sweep from mid-band upwards, frequency (k,) and H (k,), carried on while |H| exceeds 1 at its end."""
    sweep, midband = simulated.sweep, simulated.midband
    above = sweep.frequency_hz > midband.frequency_hz
    frequency, h = sweep.frequency_hz[above], sweep.response[above]
    if midband.frequency_hz > 0.0:
        frequency, h = np.concatenate([[midband.frequency_hz], frequency]), np.concatenate([[midband.gain], h])
    while frequency[-1] < HIGHEST_HZ and (abs(h[-1]) >= 1.0 or frequency[-1] < reach_hz):
        stop = min(max(10.0 * float(frequency[-1]), BEYOND * reach_hz), HIGHEST_HZ)
        more: Sweep = run(decades(float(frequency[-1]), stop, POINTS_PER_DECADE))
        frequency = np.concatenate([frequency, more.frequency_hz[1:]])
        h = np.concatenate([h, more.response[1:]])
    return frequency, h


def _narrowed(
    run: RunSweep, miss: Miss, bracket_hz: NDArray[np.float64], response: NDArray[np.complex128]
) -> tuple[float, complex]:
    """Find where `miss` of H passes zero in a bracket, over ln f, and give the frequency in Hz and H there.

    Source: Dowell and Jarratt, "A modified regula falsi method for computing the root of an equation", BIT 11, 1971.
    """
    a, b = (float(u) for u in np.log(bracket_hz))
    over_a, over_b = miss(complex(response[0])), miss(complex(response[1]))
    u, there = b, complex(response[1])
    falls = over_a > over_b
    last = 0
    for _ in range(ROUNDS):
        u = (a * over_b - b * over_a) / (over_b - over_a)
        there = complex(run(np.array([np.exp(u)])).response[0])
        over = miss(there)
        if abs(over) <= SMALL:
            break
        if (over > 0.0) == falls:
            a, over_a = u, over
            over_b = over_b / 2.0 if last > 0 else over_b
            last = 1
        else:
            b, over_b = u, over
            over_a = over_a / 2.0 if last < 0 else over_a
            last = -1
    return float(np.exp(u)), there
