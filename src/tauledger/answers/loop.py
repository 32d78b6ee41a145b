"""Loop gain without cutting the loop: return ratio, margins, ideal gain and closed loop, exact beside ngspice.

T is taken where the user names it, or at the loop that is found around the amplifier: at the wire by which feedback
enters its first transistor, or at the input source of a macromodel. `loop_places.py` says which place a name means.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.answer import Subject, restore
from tauledger.answers.double_injection import injected_ratio
from tauledger.answers.loop_places import Place, closing_source, find_places, input_source, named_place
from tauledger.answers.loop_says import NO_LOOP, says, why
from tauledger.answers.macromodel import amplifier, noise_gain, where_noise_gain_tells
from tauledger.compose.setting import unit_of
from tauledger.errors import NetworkError
from tauledger.hand.feedback import hand_loop
from tauledger.hand.ideal_gain import ideal_gain
from tauledger.hand.open_loop import open_loop
from tauledger.network.loop_shape import (
    Crossing,
    LoopShape,
    Turn,
    edge_above,
    loop_grid,
    loop_shape,
    margins_near,
    single_frequency,
    turn_near,
)
from tauledger.network.return_ratio import Opening, asymptotic, checked, return_ratio
from tauledger.network.solve import Real, on_axis, response
from tauledger.network.spectrum import pole_frequencies
from tauledger.numbers import Numbers
from tauledger.record import (
    AmplifierFacts,
    LoopCurve,
    LoopEstimate,
    LoopFacts,
    LoopNodeFacts,
    LoopStageFacts,
    Review,
    known_hz,
)

AROUND = np.array([0.97, 0.985, 1.0, 1.015, 1.03])
CHECKED_AT = np.array([0.1, 1.0, 10.0])
CURVE_POINTS = 240
OPEN_BELOW = 1e4
# T by hand and T at the wire are the same loop, or one of them counts others too.
SAME_LOOP = 0.1
COARSE = 4
# An edge by hand that is off by more than this factor misses what makes it, and is none.
NO_ESTIMATE = 3.0


class _Simulated(Struct, frozen=True):
    """What the double injection gives: |T| at mid-band, crossover and gain margin; None where it is not."""

    ratio: complex | None = None
    crossing: Crossing | None = None
    turn: Turn | None = None


def with_loops(found: Review, subject: Subject, asked: Sequence[str]) -> Review:
    """Give the review with the loops that were asked for, or with the one found around the amplifier.

    Raises InputError where a name is no place at which a return ratio can be taken.
    """
    numbers = subject.numbers
    places = find_places(numbers, subject.explanation)
    if asked:
        # what is known of the loop around the amplifier holds where a user names the same wire
        known = {place.name: replace(place, found=False) for place in places}
        named = [named_place(numbers, name) for name in asked]
        places = [known.get(place.name, place) for place in named]
    if not places:
        return found
    taken = [_loop(found, subject, place, alone=len(places) == 1) for place in places]
    restore(subject)
    return replace(
        found,
        loops=(*found.loops, *(facts for facts, _ in taken)),
        loop_curves=(*found.loop_curves, *(curve for _, curve in taken)),
    )


def _loop(found: Review, subject: Subject, place: Place, *, alone: bool) -> tuple[LoopFacts, LoopCurve]:
    numbers = subject.numbers
    opening = place.opening
    # the network of a wire is closed: a pole of T lies lower than all of its own, by 1 + T
    below = OPEN_BELOW if opening.kind == "wire" else 1.0
    grid = loop_grid(
        pole_frequencies(opening.whole) / below, pole_frequencies(opening.whole), pole_frequencies(opening.network)
    )
    at_hz = _reference(numbers, opening, float(grid[0]))
    shape = loop_shape(lambda hz: return_ratio(opening, on_axis(hz)), grid, at_hz)
    simulated = _simulate(subject, place, shape)
    crossover, lower, turn = shape.crossover, shape.lower_crossover, shape.gain_margin
    t = shape.at_reference
    facts = LoopFacts(
        loop=place.name,
        kind=opening.kind,
        where=place.where,
        found=place.found,
        through=place.path,
        at_hz=at_hz,
        return_ratio_real=t.real,
        return_ratio_imag=t.imag,
        return_ratio_simulated=None if simulated.ratio is None else abs(simulated.ratio),
        return_ratio_simulated_deg=None if simulated.ratio is None else float(np.angle(simulated.ratio, deg=True)),
        crossover_hz=crossover.hz if crossover else None,
        phase_margin_deg=crossover.phase_margin_deg if crossover else None,
        crossover_simulated_hz=simulated.crossing.hz if simulated.crossing else None,
        phase_margin_simulated_deg=simulated.crossing.phase_margin_deg if simulated.crossing else None,
        gain_margin_db=-turn.gain_db if turn else None,
        gain_margin_at_hz=turn.hz if turn else None,
        gain_margin_simulated_db=-simulated.turn.gain_db if simulated.turn else None,
        lower_crossover_hz=lower.hz if lower else None,
        lower_phase_margin_deg=None if lower is None else lower.phase_margin_deg,
        open_edge_hz=shape.f_high_hz if shape.flat else None,
        further_hz=tuple(one.hz for one in shape.above if one is not crossover),
        flat=shape.flat,
        unit=unit_of(numbers),
    )
    facts = _with_gains(facts, numbers, place, at_hz)
    facts = _with_hand(facts, subject, place)
    several = place.found and not alone
    facts = _with_noise_gain(facts, place, whole=not several)
    tells = place.found or place.amplifier is not None or opening.kind == "wire"
    if not several and tells and abs(t) > NO_LOOP:
        facts = _with_estimates(facts, found, numbers, place, shape)
    return replace(facts, says=says(facts, place, shape)), _curve(place, shape)


def _reference(numbers: Numbers, opening: Opening, lowest_hz: float) -> float:
    """Give mid-band; where that is DC and T is not defined there, the lowest frequency looked at."""
    at_hz = numbers.midband.frequency_hz
    if at_hz > 0.0:
        return at_hz
    try:
        t = complex(return_ratio(opening, on_axis(0.0))[0])
    except NetworkError:
        return lowest_hz
    return 0.0 if math.isfinite(abs(t)) and abs(t) < 1e15 else lowest_hz


def _simulate(subject: Subject, place: Place, shape: LoopShape) -> _Simulated:
    """Run the double injection where its T is the one here, at mid-band and around crossover and turn."""
    circuit, engine = subject.numbers.circuit, subject.engine
    if circuit is None or engine is None or place.cut is None:
        return _Simulated()
    crossover, turn = shape.crossover, shape.gain_margin
    opening = place.opening
    # ngspice has no AC at DC: far below all that moves T it is what it is there
    reference = shape.at_hz or single_frequency(
        lambda hz: return_ratio(opening, on_axis(hz)), shape.at_reference, float(shape.frequency_hz[0])
    )
    groups = [np.array([] if reference is None else [reference])]
    groups += [one.hz * AROUND for one in (crossover, turn) if one is not None]
    hz = np.concatenate(groups)
    if not len(hz):
        return _Simulated()
    order = np.argsort(hz)
    ratio = np.empty(len(hz), dtype=complex)
    ratio[order] = injected_ratio(circuit, place.cut, engine, hz[order])
    rest = ratio[len(groups[0]) :].reshape(-1, len(AROUND))
    found = _Simulated() if reference is None else _Simulated(complex(ratio[0]))
    k = 0
    if crossover is not None:
        found = replace(found, crossing=margins_near(rest[0], groups[1], crossover))
        k = 1
    if turn is not None:
        found = replace(found, turn=turn_near(rest[k], groups[1 + k]))
    return found


def _with_gains(facts: LoopFacts, numbers: Numbers, place: Place, at_hz: float) -> LoopFacts:
    """Add ideal gain, feedthrough and closed loop, of the source itself or of the one that closes a wire's loop."""
    opening, source = closing_source(numbers, place)
    if opening is None:
        return facts
    try:
        at = asymptotic(opening, on_axis(at_hz))
    except NetworkError:
        return facts
    beside = (at_hz or float(abs(facts.crossover_hz or 1e3))) * CHECKED_AT
    error = checked(opening, on_axis(beside), response(opening.whole, beside))
    ideal, through, t = complex(at.ideal[0]), complex(at.feedthrough[0]), complex(at.return_ratio[0])
    return replace(
        facts,
        closing_source=source,
        closing_return_ratio=t.real,
        closing_return_ratio_imag=t.imag,
        ideal_gain=ideal.real if math.isfinite(abs(ideal)) else None,
        feedthrough=through.real,
        closed_gain=complex(at.closed[0]).real,
        identity_error=error,
    )


def _with_hand(facts: LoopFacts, subject: Subject, place: Place) -> LoopFacts:
    """Add T₀ by hand where a transistor closes the loop and rules lead all the way round, and the ideal gain."""
    numbers, hand = subject.numbers, subject.explanation.hand
    if not place.device:
        return facts
    worked = hand_loop(numbers.bands, numbers.devices, place.device)
    if worked is not None:
        rows = tuple(LoopStageFacts(stage.node, float(stage.hand), float(stage.exact)) for stage in worked.stages)
        facts = replace(facts, hand_return_ratio=float(worked.t0), hand_siemens=float(worked.siemens), hand_stages=rows)
    if place.loop is None or hand is None:
        return facts
    ideal = ideal_gain(numbers.bands, numbers.devices, hand.stages, place.loop)
    if ideal is not None:
        facts = replace(facts, hand_ideal_gain=float(ideal.value), hand_ideal_text=ideal.text)
    if facts.open_edge_hz is None:
        return facts
    opened = open_loop(numbers.bands, numbers.devices, place.loop, facts.open_edge_hz)
    if opened is None or not 1.0 / NO_ESTIMATE < opened.edge_hz / facts.open_edge_hz < NO_ESTIMATE:
        return facts
    if opened.t0 is not None:
        # the same opening as that of T itself, and not every loop through one transistor
        rows = tuple(LoopStageFacts(stage.node, float(stage.hand), float(stage.exact)) for stage in opened.stages)
        facts = replace(facts, hand_return_ratio=float(opened.t0), hand_siemens=None, hand_stages=rows)
    nodes = tuple(LoopNodeFacts(one.node, float(one.ohm), float(one.farad), float(one.seconds)) for one in opened.nodes)
    return replace(facts, hand_open_edge_hz=float(opened.edge_hz), hand_open_nodes=nodes)


def _with_noise_gain(facts: LoopFacts, place: Place, *, whole: bool) -> LoopFacts:
    """Add what the amplifier is by itself, its noise gain, and the f_H that follows from the two where it does."""
    one = place.amplifier
    if one is None:
        return facts
    ratio = noise_gain(place.opening, one, facts.at_hz)
    if one.output in one.control:
        # a follower: its output cannot be told from its input, so that it is taken as it stands
        gain = abs(complex(facts.return_ratio_real, facts.return_ratio_imag)) * (ratio or 1.0)
        edge = facts.open_edge_hz
        own = AmplifierFacts(one.name, gain, edge, None if edge is None else gain * edge, None, loaded=True)
    else:
        own = amplifier(one)
    facts = replace(facts, noise_gain=ratio, amplifier=own)
    if not own.gain_bandwidth_hz or not ratio or facts.crossover_hz is None:
        return facts
    told = where_noise_gain_tells(place.opening, one, own, (facts.at_hz, facts.crossover_hz), whole=whole)
    return replace(facts, noise_gain_edge_hz=None if told else own.gain_bandwidth_hz / ratio, not_f_high=told)


def _with_estimates(facts: LoopFacts, found: Review, numbers: Numbers, place: Place, shape: LoopShape) -> LoopFacts:
    """Add what T says of f_H, one idea at a time, and why they part."""
    high, reference = found.f_high, known_hz(found.f_high)
    if high is None or high.exact_hz is None or reference is None or shape.f_high_hz is None:
        return facts
    t = abs(shape.at_reference)
    opening = place.opening

    def closed(hz: Real) -> Real:
        ratio = return_ratio(opening, on_axis(hz))
        return np.asarray(np.abs(ratio / (1.0 + ratio)), dtype=np.float64)

    first = shape.f_high_hz * (1.0 + t) if shape.flat else None
    loop = edge_above(
        closed,
        shape.frequency_hz,
        shape.at_hz,
        abs(shape.at_reference / (1.0 + shape.at_reference)),
        np.abs(shape.ratio / (1.0 + shape.ratio)),
    )
    ideal = None
    source = input_source(numbers, place)
    if source is not None and facts.ideal_gain:
        ideal = edge_above(
            lambda hz: np.abs(asymptotic(source, on_axis(hz)).ideal),
            shape.frequency_hz[::COARSE],
            shape.at_hz,
            abs(complex(asymptotic(source, on_axis(shape.at_hz)).ideal[0])),
        )
    steps: list[tuple[str, float | None]] = []
    if facts.noise_gain_edge_hz is not None:
        steps.append(("gain-bandwidth over noise gain", facts.noise_gain_edge_hz))
    if facts.hand_open_edge_hz is not None and facts.hand_return_ratio is not None and _one_loop(facts):
        steps.append(("by hand, edge of T times 1 + T", facts.hand_open_edge_hz * (1.0 + facts.hand_return_ratio)))
    if first is not None:
        steps.append(("edge of T times 1 + T", first))
    steps.append(("loop alone", loop))
    if ideal is not None:
        steps.append(("ideal gain alone", ideal))
    steps.append(("closed loop, exact", high.exact_hz))
    estimates = tuple(LoopEstimate(name, hz, None if hz is None else hz / reference - 1.0) for name, hz in steps)
    return replace(facts, estimates=estimates, why=why(facts, place, shape, (first, loop, ideal, high.exact_hz)))


def _one_loop(facts: LoopFacts) -> bool:
    """Whether T₀ by hand is that of the place itself, and not of all loops through one transistor."""
    exact, own = facts.closing_return_ratio, facts.return_ratio_real
    return (
        facts.kind == "source"
        or facts.hand_siemens is None
        or (exact is not None and abs(exact - own) <= SAME_LOOP * abs(own))
    )


def _curve(place: Place, shape: LoopShape) -> LoopCurve:
    """Thin the curve out to what a picture shows, over the range in which T matters."""
    size = 20.0 * np.log10(np.maximum(np.abs(shape.ratio), 1e-30))
    kept = np.flatnonzero(size > -60.0)
    if len(kept) < 2:
        kept = np.arange(len(size))
    first, last = int(kept[0]), int(kept[-1])
    if shape.f_high_hz is not None and shape.at_hz == 0.0:
        first = max(first, int(np.searchsorted(shape.frequency_hz, shape.f_high_hz / 100.0)) - 1)
    every = max(1, (last - first) // CURVE_POINTS)
    at = [*range(first, last, every), last]
    return LoopCurve(
        place.name,
        tuple(float(shape.frequency_hz[k]) for k in at),
        tuple(float(size[k]) for k in at),
        tuple(float(shape.phase_deg[k]) for k in at),
    )
