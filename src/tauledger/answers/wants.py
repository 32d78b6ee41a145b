"""Wanted figures: met with how much to spare, or what it takes, each candidate computed again and run in ngspice."""

from __future__ import annotations

import math

from msgspec.structs import replace

from tauledger.answers.answer import Subject, restore
from tauledger.answers.changed_circuit import changed_circuit, is_plain_card
from tauledger.answers.figures import MARGINS, QUANTITIES, Figures, figures_of, simulated_figure
from tauledger.answers.phase_budget import paper_roots
from tauledger.answers.remedies import SMALLER_IS_BETTER, Found, attempt, shortfall, trials
from tauledger.asked import Want
from tauledger.circuit import Circuit
from tauledger.engine.client import Engine
from tauledger.errors import EngineError, InputError
from tauledger.network.unity import is_ratio
from tauledger.numbers import Numbers
from tauledger.record import Remedy, Review, WantChange, WantFacts

NOT_TRUSTED = "the rebuilt network is not the simulated circuit: nothing can be worked out on it"
# A best value that brings less than this part of what is missing is no way at all.
WORTH_A_ROW = 0.02
GAIN_TO_SPARE_DB = 3.0
JUMPED = 1e-3


def want_facts(found: Review, subject: Subject, wants: tuple[Want, ...]) -> tuple[WantFacts, ...]:
    """Answer every wanted figure; afterwards the engine holds the unchanged circuit again.

    Raises InputError where the circuit has no such figure at all; EngineError where ngspice fails on it.
    """
    numbers = subject.numbers
    if not numbers.trusted:
        return tuple(
            WantFacts(want.quantity, QUANTITIES[want.quantity], want.value, None, False, None, says=NOT_TRUSTED)
            for want in wants
        )
    now = figures_of(numbers.network, numbers.midband, chosen=numbers.midband_chosen)
    told = tuple(_answered(found, subject, want, now) for want in wants)
    if not all(one.met for one in told):
        restore(subject)
    return told


def _answered(found: Review, subject: Subject, want: Want, now: Figures) -> WantFacts:
    figure = now.of(want.quantity)
    if figure is None:
        raise InputError(
            f"--want {want.quantity}={want.value:g}: {_reason(now, found, subject.numbers)}", _instead(now)
        )
    facts = WantFacts(
        quantity=want.quantity,
        unit=QUANTITIES[want.quantity],
        wanted=want.value,
        now=figure if math.isfinite(figure) else None,
        met=shortfall(want.quantity, figure, want.value) <= 0.0,
        slack=_slack(want, figure),
        gain_db=found.midband.gain_db,
    )
    if facts.met:
        return facts
    remedies, jumps = _remedies(found, subject, want, figure)
    reached = any(one.reaches for one in remedies)
    says = "" if reached else "no single change of these reaches it" if remedies else "no element here changes it"
    if jumps and not remedies:
        says = "|H| is 1 several times with what would move it: f_u jumps, nothing is offered"
    return replace(facts, remedies=remedies, says=says)


def _reason(now: Figures, found: Review, numbers: Numbers) -> str:
    if not now.stable:
        return "the circuit is not stable, and no margin or band edge means anything"
    if not is_ratio(numbers.network):
        return f"a gain in {found.midband.unit} does not fall to 1"
    if now.f_unity_hz is not None:
        return "the phase at mid-band is more than 60° from 0° and 180°: no margin means anything"
    return "the gain does not fall through 1 above mid-band"


def _instead(now: Figures) -> str:
    return "f_h and f_l can be wanted here" if now.stable else "make it stable first: the poles are in the review"


def _slack(want: Want, figure: float) -> float | None:
    if not math.isfinite(figure):
        return None
    return want.value - figure if want.quantity in SMALLER_IS_BETTER else figure - want.value


def _remedies(found: Review, subject: Subject, want: Want, now: float) -> tuple[tuple[Remedy, ...], bool]:
    """Try the candidates; what comes after one that makes a combination needless is left out with it.

    Also tell whether any was dropped because |H| is 1 several times with it, so that f_u is no one frequency. One that
    costs more than 3 dB of gain goes where there is another.
    """
    numbers = subject.numbers
    paper = paper_roots(subject)
    remedies: list[Remedy] = []
    jumps = False
    missing = shortfall(want.quantity, now, want.value)
    for trial in trials(want.quantity, found, numbers, paper.bridged if not paper.halves else None):
        outcome = attempt(trial, want.quantity, want.value, numbers)
        if outcome is None:
            continue
        if want.quantity == "f_u" and _jumps(outcome, want):
            jumps = True
            continue
        left = shortfall(want.quantity, outcome.figures.of(want.quantity), want.value)
        if not outcome.reaches and missing - left < WORTH_A_ROW * missing:
            continue
        if trial.element is not None and trial.series is not None and outcome.factor == 1.0:
            # the resistor alone does it
            continue
        remedies.append(_remedy(outcome, want, subject))
    kept = [
        one for one in remedies if want.quantity in MARGINS or one.gain_db >= found.midband.gain_db - GAIN_TO_SPARE_DB
    ]
    return tuple(sorted(kept or remedies, key=lambda one: not one.reaches)), jumps


def _jumps(outcome: Found, want: Want) -> bool:
    """Whether |H| is 1 several times with this change, or no value in between has the wanted f_u."""
    if outcome.figures.further_unity_hz:
        return True
    hz = outcome.figures.f_unity_hz
    beyond = hz is not None and abs(math.log(hz / want.value)) > JUMPED
    return outcome.reaches and beyond and outcome.trial.element is not None


def _remedy(outcome: Found, want: Want, subject: Subject) -> Remedy:
    figures = outcome.figures
    element, series, added = outcome.trial.element, outcome.trial.series, outcome.trial.added
    changes: list[WantChange] = []
    if series is not None:
        changes.append(
            WantChange(
                series.name,
                "Ω",
                None,
                series.ohm,
                new=True,
                beside=series.capacitor,
                owner=series.name,
                over_gm=outcome.trial.over_gm,
            )
        )
    if element is not None:
        first = None if outcome.first_order is None else element.value * outcome.first_order
        changes += [
            WantChange(
                one.name,
                one.unit,
                None if added is not None else one.value,
                one.value * outcome.factor,
                first,
                new=added is not None,
                beside="" if added is None else f"{added.plus} to {added.minus}",
                owner=one.owner,
            )
            for one in (element, outcome.trial.twin)
            if one is not None
        ]
    figure = figures.of(want.quantity)
    simulated, says = _by_ngspice(outcome, want, subject)
    return Remedy(
        changes=tuple(changes),
        reaches=outcome.reaches,
        figure=figure if figure is not None and math.isfinite(figure) else None,
        simulated_figure=simulated,
        f_unity_hz=figures.f_unity_hz,
        phase_margin_deg=figures.phase_margin_deg,
        gain_margin_db=figures.gain_margin_db,
        f_high_hz=figures.f_high_hz,
        f_low_hz=figures.f_low_hz,
        gain_db=figures.gain_db,
        moves_bias=element is not None and element.moves_bias,
        says=says,
    )


def _by_ngspice(outcome: Found, want: Want, subject: Subject) -> tuple[float | None, str]:
    """Run the changed circuit where it can be written as cards and keeps its operating point, and say where not."""
    numbers, engine = subject.numbers, subject.engine
    element = outcome.trial.element
    if numbers.circuit is None or engine is None:
        return None, ""
    changed = [one for one in (element, outcome.trial.twin) if one is not None]
    added = outcome.trial.added
    if any(one.moves_bias or not (added or is_plain_card(numbers.circuit, one.name)) for one in changed):
        return None, "by algebra alone, all else held"
    values = {one.name: one.value * outcome.factor for one in changed}
    circuit = changed_circuit(numbers.circuit, values, outcome.trial.series, added)
    return _run(engine, circuit, outcome.figures, want)


def _run(engine: Engine, circuit: Circuit, figures: Figures, want: Want) -> tuple[float | None, str]:
    try:
        engine.bias(circuit, ())
        return simulated_figure(engine.sweep, want.quantity, figures), ""
    except EngineError as error:
        return None, f"ngspice: {error.message}"
