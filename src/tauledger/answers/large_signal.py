"""Large signal: slew rate and full-power bandwidth beside f_H, from the operating point and the exact network.

The full-power bandwidth SR/(2π·V_peak) is common practice: the frequency up to which a sine of that peak value has no
steeper slope than SR.
"""

from __future__ import annotations

import math

from msgspec.structs import replace

from tauledger.answers.answer import Subject
from tauledger.hand.slewing import Slew, slewing
from tauledger.numbers import Numbers
from tauledger.record import CauseFacts, LargeSignal, Review, SlewFacts, known_hz

SWING_V = 1.0


def with_large_signal(found: Review, subject: Subject, swing_v: float | None) -> Review:
    """Add the nodes that transistors move with their limits, and a cause where the lowest lies below f_H.

    swing_v: peak at the output in V, None for 1 V. Nothing is added where hand analysis is withheld, where the output
    is a current, or where no node can be judged.
    """
    hand = subject.explanation.hand
    if hand is None or not subject.numbers.trusted or subject.numbers.network.port.kind == "current":
        return found
    peak = SWING_V if swing_v is None else swing_v
    numbers = subject.numbers
    high = numbers.edges.f_high
    slews = slewing(
        numbers.bands,
        numbers.devices,
        hand.nodes,
        f_high_hz=high.hz if high is not None else None,
        lines=frozenset(node for part in numbers.network.parts if part.kind == "line" for node in part.nodes),
    )
    if not slews.nodes and not slews.may_be_slower:
        return found
    if slews.may_be_slower:
        # a rate that is not known to be the lowest is none
        return replace(found, large_signal=LargeSignal(peak, swing_v is not None, (), slews.may_be_slower))
    facts = LargeSignal(
        swing_v=peak,
        asked=swing_v is not None,
        nodes=tuple(_facts(slew, peak) for slew in slews.nodes),
        not_judged=slews.not_judged,
        supplies_v=_supplies(subject.numbers),
    )
    return replace(found, large_signal=facts, causes=_causes(found, slews.nodes[0], peak))


def _supplies(numbers: Numbers) -> tuple[float, float] | None:
    """Give the lowest and highest direct voltage to ground that sources hold, which the output stays within.

    None where there is no operating point, or where a coil stores energy and the output may swing beyond.
    """
    if numbers.bias is None or numbers.circuit is None:
        return None
    aids = set(numbers.midband.aids)
    if any(part.kind == "inductance" and part.name not in aids for part in numbers.network.parts):
        return None
    driving = {part.owner for part in numbers.network.driving}
    held = [0.0]
    for element in numbers.circuit.elements:
        if element.letter == "V" and element.name not in driving and 0 in element.nodes[:2]:
            held += [float(numbers.bias.voltages[node]) for node in element.nodes[:2]]
    return (min(held), max(held)) if len(held) > 1 else None


def _facts(slew: Slew, peak: float) -> SlewFacts:
    return SlewFacts(
        node=slew.node,
        title=slew.title,
        drivers=slew.drivers,
        current_a=slew.current_a,
        capacitance_f=slew.capacitance_f,
        behind=slew.behind,
        volt_per_output_volt=slew.ratio,
        slew_v_per_s=slew.current_a / slew.capacitance_f,
        output_slew_v_per_s=slew.output_slew_v_per_s,
        full_power_hz=slew.output_slew_v_per_s / (2.0 * math.pi * peak),
        cut_off_v=slew.cut_off_v if math.isfinite(slew.cut_off_v) else None,
    )


def _causes(found: Review, slowest: Slew, peak: float) -> tuple[CauseFacts, ...]:
    """Give the causes with this one behind those that tell paper from simulation, before what paper may leave out."""
    edge = known_hz(found.f_high)
    if edge is None:
        return found.causes
    from tauledger.causes.cause import cause_facts
    from tauledger.causes.slews_first import slews_first

    cause = slews_first(slowest, swing_v=peak, f_high_hz=edge)
    if cause is None:
        return found.causes
    differ = tuple(one for one in found.causes if not one.on_paper)
    return (*differ, cause_facts(cause), *found.causes[len(differ) :])
