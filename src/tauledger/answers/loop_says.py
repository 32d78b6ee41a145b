"""What is said of a loop beside its figures: what its T may be taken for, and why a step to f_H misses."""

from __future__ import annotations

import math

import numpy as np

from tauledger.answers.loop_places import Place
from tauledger.network.loop_shape import LoopShape, opposes
from tauledger.network.return_ratio import phase_of_delays
from tauledger.quantity import engineering
from tauledger.record import LoopFacts

NO_LOOP = 1e-9
REAL_DEG = 179.0
WORTH_TELLING = 0.02
# A phase that is not told from that of one pole.
QUARTER_TURN_DEG, FEW_DEG = 0.5, 2.0


def says(facts: LoopFacts, place: Place, shape: LoopShape) -> tuple[str, ...]:
    """Say what this T is where a reader may take it for another one."""
    told = []
    t = shape.at_reference
    if facts.kind == "wire" and abs(t) <= NO_LOOP:
        return ("no loop through this wire: nothing comes back but rounding",)
    if t and not opposes(t):
        angle = float(np.angle(t, deg=True))
        size = "negative" if abs(angle) > REAL_DEG else f"at {angle:.0f}°"
        told.append(f"T is {size} at mid-band: what comes back helps, positive feedback")
    if facts.crossover_hz is None:
        told.append("|T| does not fall through 1 above mid-band")
    if facts.further_hz:
        several = ", ".join(
            f"{engineering(one.hz, 'Hz', 4)} ({'falls' if one.falling else 'rises'}, {one.phase_margin_deg:.1f}°)"
            for one in shape.above
        )
        told.append(f"|T| = 1 several times: {several}; the fall with the least margin stands above")
    if not facts.flat and t:
        told.append("T is not flat between mid-band and its edge: edge of T · (1 + T) does not hold, and is not given")
    if facts.kind == "admittance":
        told.append(
            "the return ratio of an admittance: A0 is the gain with the element taken out, A∞ with a short in its "
            "place; 1 + T is what it does to the network, not what comes back round a loop"
        )
    elif facts.kind == "source" and place.device:
        told.append(
            f"it counts every loop through {place.device}, its own emitter or source resistor and what bridges it "
            f"included; no wire carries it alone; --loop {place.device}.{place.control} is what ngspice tells there"
        )
    elif facts.kind == "wire" and not facts.found:
        told.append("double injection: of what passes the wire both ways T is the part that is not reciprocal")
    return tuple(told)


def why(
    facts: LoopFacts, place: Place, shape: LoopShape, steps: tuple[float | None, float | None, float | None, float]
) -> tuple[str, ...]:
    """Say what each step from one pole to the closed loop rests on, where it moves by more than 2 %."""
    first, loop, ideal, exact = steps
    told = []
    nearer = ideal is not None and (loop is None or abs(ideal / exact - 1.0) < abs(loop / exact - 1.0))
    if ideal is not None and nearer and ideal < 0.5 * (first or facts.crossover_hz or math.inf):
        return ("elements around the amplifier set f_H: with T → ∞ the gain would fall there by itself",)
    left = _bandwidth_left(facts)
    if left is not None and left < 1.0 - WORTH_TELLING:
        told.append(f"what loads the amplifier on the board leaves {100.0 * left:.0f} % of its gain-bandwidth product")
    if loop is not None and (first is None or abs(loop / first - 1.0) > WORTH_TELLING):
        told += _not_one_pole(place, shape)
    if loop is not None and abs(exact / loop - 1.0) > WORTH_TELLING:
        if ideal is not None and ideal < 4.0 * exact:
            told.append(
                f"the ideal gain falls too, 3 dB at {engineering(ideal, 'Hz', 4)}: what bridges the amplifier, source "
                "and load"
            )
        else:
            told.append("what the loop does not hold adds poles and zeros of its own: source, load, feedthrough")
    return tuple(told)


def _bandwidth_left(facts: LoopFacts) -> float | None:
    """Give what the board leaves of the gain of a one-pole amplifier at |T| = 1: noise gain over its own gain there."""
    own, hz = facts.amplifier, facts.crossover_hz
    if facts.noise_gain_edge_hz is None or own is None or hz is None or facts.noise_gain is None or own.loaded:
        return None
    if own.open_loop_gain is None or own.first_pole_hz is None:
        return None
    return facts.noise_gain * math.hypot(1.0, hz / own.first_pole_hz) / abs(own.open_loop_gain)


def _not_one_pole(place: Place, shape: LoopShape) -> list[str]:
    """Say what makes the phase at |T| = 1 another one than that of one pole: a zero, the delay of a line, a pole."""
    crossover = shape.crossover
    if crossover is None or abs(crossover.angle_deg + 90.0) < (QUARTER_TURN_DEG if shape.flat else FEW_DEG):
        return []
    lag = crossover.angle_deg
    if lag > -90.0:
        more = "a zero lifts it"
    else:
        late = -phase_of_delays(place.opening, crossover.hz)
        more = "a line delays it" if late > 0.5 * (-90.0 - lag) else "a second pole is near"
    return [f"T has not one pole alone: {more}, where |T| = 1 its phase is {lag:.0f}° instead of -90°"]
