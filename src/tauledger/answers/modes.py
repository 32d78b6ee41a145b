"""Differential and common mode of two sources: gain of each and their ratio, at mid-band and at f_H.

v_d = v_plus − v_minus and v_c = (v_plus + v_minus)/2: the differential gain is taken with ±½, the common-mode gain with
1 on both.
"""

from __future__ import annotations

import math

import numpy as np
from msgspec.structs import replace

from tauledger.answers.answer import Subject, restore
from tauledger.circuit import fold
from tauledger.devices.parts import Part
from tauledger.network.assemble import Network
from tauledger.network.solve import Complex, Real, response
from tauledger.record import ModeRow, ModesFacts, Review

EQUAL = 1e-9
# A common-mode gain this far below the differential one is rounding: the two halves are equal.
NONE_AT_ALL = 1e-9
MODES = {"differential": (0.5, -0.5), "common": (1.0, 1.0)}


def mode_facts(found: Review, subject: Subject) -> ModesFacts | None:
    """Give both gains where two sources of one kind drive with equal size, in phase or in opposite phase; else None.

    Raises NetworkError where the network has no solution.
    """
    pair = driven_pair(subject.numbers.network)
    if pair is None:
        return None
    numbers = subject.numbers
    plus, minus = (part.owner for part in pair)
    points = [("mid-band", numbers.midband.frequency_hz)]
    high = numbers.edges.f_high
    if high is not None and high.hz is not None:
        points.append(("f_H", high.hz))
    hz = np.array([at for _, at in points])
    exact = {name: _exact(numbers.network, pair, MODES[name], hz) for name in MODES}
    simulated = {name: _simulated(subject, pair, MODES[name], hz) for name in MODES}
    restore(subject)
    rows = tuple(
        ModeRow(
            name,
            float(hz[k]),
            *_decibels(complex(exact["differential"][k]), complex(exact["common"][k])),
            *_of(simulated, k),
        )
        for k, (name, _) in enumerate(points)
    )
    return ModesFacts(plus, minus, found.midband.unit, rows)


def driven_pair(network: Network) -> tuple[Part, Part] | None:
    """Give the two sources that drive with equal size, in phase or in opposite phase, plus first; None where not."""
    if len(network.driving) != 2:
        return None
    one, other = network.driving
    first, second = network.amplitude(one), network.amplitude(other)
    opposite = in_opposite_phase(network, one, other)
    if one.kind != other.kind or not (opposite or abs(first - second) <= EQUAL * abs(first)):
        return None
    return (other, one) if opposite and first.real < 0.0 else (one, other)


def in_opposite_phase(network: Network, one: Part, other: Part) -> bool:
    """Whether two sources drive with equal size and opposite sign."""
    first = network.amplitude(one)
    return abs(first + network.amplitude(other)) <= EQUAL * abs(first)


def _exact(network: Network, pair: tuple[Part, Part], amplitudes: tuple[float, float], hz: Real) -> Complex:
    drive = dict.fromkeys(network.amplitudes, 0j) | {
        fold(part.owner): complex(amplitude) for part, amplitude in zip(pair, amplitudes, strict=True)
    }
    return response(Network.from_parts(network.parts, output=network.port, drive=drive), hz)


def _simulated(subject: Subject, pair: tuple[Part, Part], amplitudes: tuple[float, float], hz: Real) -> Complex | None:
    circuit, swept = subject.numbers.circuit, subject.numbers.simulated
    if subject.engine is None or circuit is None or swept is None:
        return None
    amplitude_of = {fold(part.owner): complex(value) for part, value in zip(pair, amplitudes, strict=True)}
    drive = tuple(replace(one, amplitude=amplitude_of[fold(one.source)]) for one in circuit.drive)
    subject.engine.bias(replace(circuit, drive=drive), ())
    # ngspice has no AC at 0 Hz; far below the lowest edge the plateau has been reached
    return subject.engine.sweep(np.where(hz > 0.0, hz, swept.sweep.frequency_hz[0])).response


def _of(found: dict[str, Complex | None], k: int) -> tuple[float | None, float | None, float | None]:
    differential, common = found["differential"], found["common"]
    if differential is None or common is None:
        return None, None, None
    return _decibels(complex(differential[k]), complex(common[k]))


def _decibels(differential: complex, common: complex) -> tuple[float, float | None, float | None]:
    of_difference = 20.0 * math.log10(abs(differential))
    if abs(common) <= NONE_AT_ALL * abs(differential):
        return of_difference, None, None
    of_both = 20.0 * math.log10(abs(common))
    return of_difference, of_both, of_difference - of_both
