"""Explained numbers → the Review record; nothing is calculated here but units, differences and phase."""

from __future__ import annotations

import math

from tauledger import __version__
from tauledger.causes.cause import cause_facts, note_facts
from tauledger.compose.aids import aid_notes
from tauledger.compose.helps import helps
from tauledger.compose.rows import budget_facts, inductor_facts, node_rows, part_rows, pole_facts, zero_facts
from tauledger.compose.setting import cautions, curves, device_facts, drive_facts, output_facts, source_lines, unit_of
from tauledger.explain import Explanation
from tauledger.hand.estimate import Edge as EdgeName
from tauledger.hand.steps import factors
from tauledger.netlist import Netlist, read_past, read_past_places
from tauledger.network.edges import Edge
from tauledger.network.midband import MidBand
from tauledger.numbers import Numbers
from tauledger.quantity import engineering
from tauledger.record import (
    SCHEMA,
    AgreementFacts,
    EdgeFacts,
    EngineFacts,
    Estimate,
    MidbandFacts,
    NetlistFacts,
    NoMethod,
    NoteFacts,
    Review,
    Stage,
    Step,
    known_hz,
)

# ln 9 / 2π: 10-90 % rise time of one pole times its -3 dB frequency
RISE_TIME_BANDWIDTH = math.log(9.0) / (2.0 * math.pi)
PEAKS = 0.1
STEP_HOLDS = 10.0
# ngspice and the network agree to 1e-9; a last step smaller than this says nothing.
WORTH_A_STEP = 1e-4
# rounding leaves less
DIFFERS = 1e-6


def compose(numbers: Numbers, explanation: Explanation, *, netlist: Netlist | None = None, title: str = "") -> Review:
    """Put numbers and explanation into one record.

    netlist: what was read; None for a network built from parts, which has `title` instead.
    """
    simulated, hand = numbers.simulated, explanation.hand
    midband = numbers.midband if numbers.trusted or simulated is None else simulated.midband
    high, low = _edge_facts("f_high", numbers, explanation), _edge_facts("f_low", numbers, explanation)
    return Review(
        schema=SCHEMA,
        tauledger=__version__,
        engine=EngineFacts(numbers.bias.engine.name, numbers.bias.engine.version) if numbers.bias else None,
        netlist=netlist_facts(netlist, title),
        temperature_c=numbers.circuit.temperature_c if numbers.circuit else 27.0,
        drive=drive_facts(numbers),
        output=output_facts(numbers),
        midband=_midband_facts(midband, unit_of(numbers), chosen=numbers.midband_chosen),
        agreement=(
            AgreementFacts(numbers.agreement.max_relative_error, numbers.agreement.at_hz, numbers.agreement.points)
            if numbers.agreement
            else None
        ),
        f_high=high,
        f_low=low,
        estimates=(*_estimates("f_high", high, explanation), *_estimates("f_low", low, explanation)),
        steps=(*_steps("f_high", high, explanation), *_steps("f_low", low, explanation)),
        nodes=node_rows(explanation),
        parts=part_rows(numbers, explanation),
        budget=budget_facts(explanation),
        poles=pole_facts(numbers, explanation),
        zeros=zero_facts(numbers),
        stages=tuple(
            Stage(
                row.node,
                row.role,
                row.owner,
                row.gain_hand,
                row.gain_exact,
                row.elements,
                row.around,
                row.why,
                row.image,
            )
            for row in (hand.stages if hand else ())
        ),
        devices=device_facts(numbers.devices),
        curves=curves(numbers, explanation),
        lines=source_lines(numbers, explanation, netlist),
        causes=tuple(cause_facts(cause) for cause in explanation.causes),
        notes=_notes(numbers, explanation, netlist),
        cautions=cautions(numbers),
        helps=helps(numbers),
        inductors=inductor_facts(explanation),
        no_method=tuple(NoMethod(edge, why) for edge, why in (hand.no_method.items() if hand else ())),
    )


def netlist_facts(netlist: Netlist | None, title: str) -> NetlistFacts:
    """Say which netlist it was; a network built from parts has a title alone."""
    if netlist is None:
        return NetlistFacts("", title, "")
    passed = tuple(f"{where}: {what}" for where, what in read_past_places(netlist))
    return NetlistFacts(netlist.path, netlist.title, netlist.sha256, read_past(netlist), passed)


def _midband_facts(midband: MidBand, unit: str, *, chosen: bool) -> MidbandFacts:
    to_hz = midband.to_hz if midband.to_hz is not None and math.isfinite(midband.to_hz) else None
    gain_db = 20.0 * math.log10(abs(midband.gain))
    return MidbandFacts(
        midband.frequency_hz, midband.from_hz, to_hz, midband.gain.real, midband.gain.imag, gain_db, unit, chosen
    )


def _edge_facts(name: EdgeName, numbers: Numbers, explanation: Explanation) -> EdgeFacts | None:
    """Give one edge; None where neither the network nor the sweep falls 3 dB on that side."""
    exact: Edge | None = numbers.edges.f_high if name == "f_high" else numbers.edges.f_low
    simulated = None
    if numbers.simulated is not None:
        simulated = numbers.simulated.f_high_hz if name == "f_high" else numbers.simulated.f_low_hz
    hand = None
    if explanation.hand is not None:
        hand = explanation.hand.hand_f_high_hz if name == "f_high" else explanation.hand.hand_f_low_hz
    if not numbers.trusted:
        exact = None
    exact_hz = exact.hz if exact is not None else None
    reference = simulated if numbers.simulated is not None else exact_hz
    if reference is None:
        return None
    # 0.35/f_H holds for a response that falls like one pole; one that peaks is faster and overshoots
    like_one_pole = (exact is None or exact.peaking_db < PEAKS) and _has_a_step(numbers, reference)
    return EdgeFacts(
        simulated_hz=simulated,
        exact_hz=exact_hz,
        hand_hz=hand,
        difference=_difference(hand, reference),
        slope=exact.slope if exact else None,
        phase_deg=exact.phase_deg if exact else None,
        peaking_db=exact.peaking_db if exact else 0.0,
        peaking_at_hz=exact.peaking_at_hz if exact else None,
        rise_time_s=RISE_TIME_BANDWIDTH / reference if name == "f_high" and like_one_pole else None,
    )


def _has_a_step(numbers: Numbers, f_high_hz: float) -> bool:
    """Whether a step of the drive is a step at the output: there is a plateau, and f_L a decade below f_H or more."""
    simulated, edges = numbers.simulated, numbers.edges
    if simulated is not None:
        return simulated.midband.plateau and (simulated.f_low_hz or 0.0) <= f_high_hz / STEP_HOLDS
    low = edges.f_low.hz if edges.f_low is not None else None
    return numbers.midband.plateau and (low or 0.0) <= f_high_hz / STEP_HOLDS


def _estimates(name: EdgeName, edge: EdgeFacts | None, explanation: Explanation) -> tuple[Estimate, ...]:
    reference = known_hz(edge)
    methods = explanation.hand.methods if explanation.hand else ()
    estimates = [
        Estimate(name, row.method, row.hz, _difference(row.hz, reference), row.recommended)
        for row in methods
        if row.edge == name
    ]
    if edge is not None and edge.simulated_hz is not None:
        estimates.append(Estimate(name, "simulated", edge.simulated_hz, 0.0))
    return tuple(estimates)


def _steps(name: EdgeName, edge: EdgeFacts | None, explanation: Explanation) -> tuple[Step, ...]:
    told = [step for step in (explanation.hand.steps if explanation.hand else ()) if step.edge == name]
    steps = [Step(name, step.step, step.hz, factor, step.why) for step, factor in zip(told, factors(told), strict=True)]
    if steps and edge is not None and edge.simulated_hz is not None and steps[-1].hz is not None:
        factor = edge.simulated_hz / steps[-1].hz
        if abs(factor - 1.0) > WORTH_A_STEP:
            steps.append(Step(name, "simulated", edge.simulated_hz, factor, "ngspice itself"))
    return tuple(steps)


def _difference(hz: float | None, reference: float | None) -> float | None:
    return hz / reference - 1.0 if hz is not None and reference is not None else None


def _notes(numbers: Numbers, explanation: Explanation, netlist: Netlist | None) -> tuple[NoteFacts, ...]:
    notes = [*(note_facts(note) for note in explanation.notes), *aid_notes(numbers)]
    notes += _differs_far_off(numbers)
    notes += [NoteFacts("engine-warning", "", line) for line in (numbers.bias.warnings if numbers.bias else ())]
    read = (*(netlist.notes if netlist else ()), *(numbers.circuit.notes if numbers.circuit else ()))
    return (*notes, *(NoteFacts("how-read", note.where, note.says) for note in dict.fromkeys(read)))


def _differs_far_off(numbers: Numbers) -> list[NoteFacts]:
    """Say how far network and sweep differ beyond the range on which the page rests, where that is worth a word."""
    agreed = numbers.agreement
    if agreed is None or agreed.beyond <= DIFFERS:
        return []
    at_hz = engineering(agreed.beyond_at_hz, "Hz", 3)
    return [
        NoteFacts(
            "differs-far-off",
            "",
            f"beyond the range that counts here ngspice and the rebuilt network differ by up to {agreed.beyond:.1e}, "
            f"at {at_hz}",
        )
    ]
