"""Unity gain: f_u with its margins from three sources."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec.structs import replace

from tauledger.answers.answer import Subject
from tauledger.answers.simulated_unity import SimulatedUnity, simulate_unity
from tauledger.network.edges import crossing
from tauledger.network.follower import is_follower_stable
from tauledger.network.midband import MidBand
from tauledger.network.unity import Unity, find_unity, is_ratio
from tauledger.numbers import Numbers
from tauledger.quantity import engineering
from tauledger.record import HalfTurnFacts, Review, UnityFacts, UnityStep

# From here on an amplifier is meant to be closed around: at less, unity gain is what lies beyond the band.
WORTH_A_SECTION = 10.0
# Gain times f_H further off than this says nothing of f_u: other poles and zeros lie in between.
MEANS_NOTHING = 3.0


def unity_facts(found: Review, subject: Subject, *, asked: bool) -> UnityFacts | None:
    """Give f_u and its margins; None where the response is no ratio above 1 at mid-band or does not fall to 1.

    asked: elements and nodes are wanted, and where there is no f_u the reason; they are given unasked where the plateau
    reaches down to DC with a gain of 10 or more, as of an amplifier that is meant to be closed around and has no loop
    around it yet. Nothing where a pole lies in the right half-plane: no margin means anything then. Where the network
    is not trusted ngspice's figures alone are given.
    """
    numbers = subject.numbers
    midband = numbers.midband if numbers.trusted or numbers.simulated is None else numbers.simulated.midband
    if not is_ratio(numbers.network) or abs(midband.gain) <= 1.0 or not numbers.poles.stable:
        return _without(found, numbers, midband) if asked else None
    unity = find_unity(numbers.network, numbers.midband, numbers.edges) if numbers.trusted else None
    simulated = _simulated(subject, unity)
    if unity is None and simulated is None:
        return _without(found, numbers, midband) if asked else None
    facts = _facts(found, numbers, unity, simulated)
    closed_already = any(loop.found for loop in found.loops)
    if unity is None or not (asked or (_is_open(midband) and not closed_already)):
        return facts
    from tauledger.answers.unity_shares import unity_shares

    shares = unity_shares(found, numbers, unity)
    closed = is_follower_stable(numbers.network, numbers.midband)
    return replace(facts, elements=shares.elements, nodes=shares.nodes, follower_stable=closed)


def _without(found: Review, numbers: Numbers, midband: MidBand) -> UnityFacts:
    """Say why there is no unity gain."""
    return UnityFacts(*(None,) * 13, none=_why_none(found, numbers, midband))


def _why_none(found: Review, numbers: Numbers, midband: MidBand) -> str:
    if not is_ratio(numbers.network):
        return f"a gain in {found.midband.unit} does not fall to 1"
    unstable = "the circuit is unstable as it is, and no margin means anything"
    if abs(midband.gain) > 1.0:
        return "the gain does not fall to 1 beyond mid-band" if numbers.poles.stable else unstable
    said = f"the gain at mid-band is {abs(midband.gain):.4g}, no more than 1"
    if not numbers.poles.stable:
        said = f"{said}; {unstable}"
    h = np.abs(numbers.edges.response)
    over = np.flatnonzero((h[1:] >= 1.0) != (h[:-1] >= 1.0))
    if not numbers.trusted or not len(over):
        return said
    bounds = [numbers.edges.frequency_hz[k : k + 2] for k in over]
    places = [engineering(crossing(numbers.network, 1.0, float(a), float(b)), "Hz", 4) for a, b in bounds]
    return f"{said}; it peaks above: |H| = 1 at {' and '.join(places)}"


def _is_open(midband: MidBand) -> bool:
    """Whether the amplifier passes DC (but for measuring aids) and has gain to spare for a loop around it."""
    return midband.from_hz == 0.0 and abs(midband.gain) >= WORTH_A_SECTION


def _simulated(subject: Subject, unity: Unity | None) -> SimulatedUnity | None:
    simulated = subject.numbers.simulated
    if simulated is None or subject.engine is None:
        return None
    reach = 0.0 if unity is None else max(unity.hz, unity.margin_at_hz, unity.gain_margin_at_hz or 0.0)
    return simulate_unity(subject.engine.sweep, simulated, reach_hz=reach, near=unity)


def _facts(found: Review, numbers: Numbers, unity: Unity | None, simulated: SimulatedUnity | None) -> UnityFacts:
    high = numbers.simulated.f_high_hz if numbers.simulated is not None else None
    # paper: one pole alone, at f_H by hand
    edge = found.f_high.hand_hz if found.f_high is not None else None
    hand_hz = None if edge is None else abs(numbers.midband.gain) * edge
    hz = simulated.hz if simulated is not None else unity.hz if unity is not None else None
    if hand_hz is not None and hz is not None and not 1.0 / MEANS_NOTHING < hand_hz / hz < MEANS_NOTHING:
        hand_hz = None
    return UnityFacts(
        simulated_hz=simulated.hz if simulated else None,
        exact_hz=unity.hz if unity else None,
        hand_hz=hand_hz,
        difference=hand_hz / hz - 1.0 if hand_hz is not None and hz is not None else None,
        slope=unity.slope if unity else None,
        phase_margin_deg=simulated.phase_margin_deg if simulated else None,
        phase_margin_exact_deg=unity.phase_margin_deg if unity else None,
        gain_margin_db=simulated.gain_margin_db if simulated else None,
        gain_margin_exact_db=unity.gain_margin_db if unity else None,
        gain_margin_at_hz=simulated.gain_margin_at_hz if simulated else None,
        gain_margin_exact_at_hz=unity.gain_margin_at_hz if unity else None,
        gain_bandwidth_hz=(
            abs(numbers.simulated.midband.gain) * high if numbers.simulated is not None and high is not None else None
        ),
        gain_bandwidth_exact_hz=unity.gain_bandwidth_hz if unity else None,
        further_hz=unity.further_hz if unity else (),
        margin_at_hz=unity.margin_at_hz if unity else None,
        half_turns=tuple(HalfTurnFacts(one.hz, -one.below_db) for one in unity.half_turns) if unity else (),
        midband_phase_deg=float(np.angle(numbers.midband.gain, deg=True)),
    )


def with_formula(facts: UnityFacts, steps: Sequence[UnityStep]) -> UnityFacts:
    """Give f_u by hand as the formulas of the amplifier have it, the last of them; as it was where there is none."""
    worked = [step for step in steps if step.figure == "f_u"]
    hz = facts.simulated_hz if facts.simulated_hz is not None else facts.exact_hz
    if not worked or hz is None:
        return facts
    last = worked[-1]
    formula = worked[0].formula + (", with further poles and zeros" if len(worked) > 1 else "")
    return replace(facts, hand_hz=last.hand, difference=last.hand / hz - 1.0, hand_formula=formula)
