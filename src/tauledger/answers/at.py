"""Gain and phase at the frequencies that were asked for, with what moves them most."""

from __future__ import annotations

import math

import numpy as np

from tauledger.answers.answer import Subject
from tauledger.answers.elements import elements, size, worth_a_row
from tauledger.answers.simulated_unity import midband_phasor
from tauledger.compose.helps import LESS
from tauledger.errors import InputError
from tauledger.network.midband import HIGHEST_HZ
from tauledger.network.solve import response
from tauledger.network.targets import PERCENT, gain_moves
from tauledger.numbers import Numbers
from tauledger.quantity import engineering
from tauledger.record import AtElement, AtFacts
from tauledger.simulated import Simulated

# How many frequencies at most say how often lines have turned the phase.
MOST_FOLLOWED = 100_000


def at_facts(subject: Subject, at_hz: tuple[float, ...]) -> tuple[AtFacts, ...]:
    """Give gain and phase at each frequency in Hz, simulated by a run of its own and exact.

    Raises InputError for 0 Hz and for more than 1 THz.
    """
    for hz in at_hz:
        if not 0.0 < hz <= HIGHEST_HZ:
            raise InputError(
                f"--at {engineering(hz, 'Hz', 4)}: no frequency to look at",
                "give one above 0 Hz up to 1 THz, e.g. 10meg",
            )
    return tuple(_at(subject, hz) for hz in at_hz)


def _at(subject: Subject, hz: float) -> AtFacts:
    numbers = subject.numbers
    exact = complex(response(numbers.network, np.array([hz]))[0]) if numbers.trusted else None
    beyond = None if exact is None else _beyond_midband(numbers, hz, exact)
    run = run_beyond = run_deg = None
    if subject.engine is not None and numbers.simulated is not None:
        run = complex(subject.engine.sweep(np.array([hz])).response[0])
        run_beyond = _simulated_beyond(numbers.simulated, hz, run, beyond)
        run_deg = run_beyond + _degrees(midband_phasor(numbers.simulated))
    return AtFacts(
        hz=hz,
        simulated_db=None if run is None else _db(run),
        simulated_deg=run_deg,
        simulated_beyond_deg=run_beyond,
        exact_db=None if exact is None else _db(exact),
        exact_deg=None if beyond is None else beyond + _degrees(numbers.midband.gain),
        exact_beyond_deg=beyond,
        elements=_elements(numbers, hz) if exact is not None else (),
    )


def _db(h: complex) -> float:
    return 20.0 * math.log10(abs(h))


def _degrees(h: complex) -> float:
    return math.degrees(math.atan2(h.imag, h.real))


def _beyond_midband(numbers: Numbers, hz: float, h: complex) -> float:
    angle = numbers.edges.angle
    if numbers.network.lines and angle is not None:
        from tauledger.network.ripple import followed

        angle, end_hz = followed(numbers.network, angle, hz, MOST_FOLLOWED)
        angle = angle if hz <= end_hz else None
    if angle is None:
        return float(np.angle(h / numbers.midband.gain, deg=True))
    return angle.beyond_midband(hz, h)


def _simulated_beyond(simulated: Simulated, hz: float, h: complex, exact_deg: float | None) -> float:
    """Give ngspice's phase beyond its mid-band; the whole turns are the network's, or those of the sweep nearby."""
    reference = midband_phasor(simulated)
    deg = float(np.angle(h / reference, deg=True))
    near = exact_deg
    if near is None:
        frequency = simulated.sweep.frequency_hz
        turned = np.degrees(np.unwrap(np.angle(simulated.sweep.response / reference)))
        start = simulated.midband.frequency_hz or float(frequency[0])
        there, here = (turned[np.argmin(np.abs(np.log(frequency / place)))] for place in (hz, start))
        near = float(there - 360.0 * np.round(here / 360.0))
    return deg + 360.0 * round((near - deg) / 360.0)


def _elements(numbers: Numbers, hz: float) -> tuple[AtElement, ...]:
    moves = gain_moves(numbers.network, numbers.midband, hz)
    rows = [
        AtElement(
            name=one.name,
            owner=one.owner,
            nodes=one.nodes,
            value=one.value,
            unit=one.unit,
            gain=one.sign * moves[one.name].gain,
            phase_deg=one.sign * PERCENT * moves[one.name].phase_deg,
        )
        for one in elements(numbers)
    ]
    rows = [row for row in rows if worth_a_row(LESS * row.gain, LESS / PERCENT * row.phase_deg)]
    rows.sort(key=lambda row: -size(row.gain, row.phase_deg / PERCENT))
    return tuple(rows)
