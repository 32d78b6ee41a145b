"""The review with the answers to what was asked beyond the band edges."""

from __future__ import annotations

from msgspec import Struct
from msgspec.structs import replace

from tauledger.asked import Asked
from tauledger.circuit import Change
from tauledger.engine.client import Engine
from tauledger.explain import Explanation
from tauledger.netlist import Netlist
from tauledger.network.unity import is_ratio
from tauledger.numbers import Numbers
from tauledger.record import Review


class Subject(Struct, frozen=True):
    """What an answer is taken from: numbers and explanation, and netlist, change and engine (None: a network alone).

    The engine holds the deck of these numbers, so that `engine.sweep` runs it.
    """

    numbers: Numbers
    explanation: Explanation
    netlist: Netlist | None = None
    change: Change | None = None
    engine: Engine | None = None


def answer(found: Review, subject: Subject, asked: Asked) -> Review:
    """Give the review with its answers; nothing that rests on the network is added where that is not trusted.

    Raises InputError for a question that this circuit cannot answer.
    """
    if subject.numbers.trusted and (asked.loops or may_have_a_loop(subject)):
        from tauledger.answers.loop import with_loops

        found = with_loops(found, subject, asked.loops)
    found = with_unity_gain(found, subject, asked=asked.unity)
    unity = found.f_unity
    if unity is not None and unity.elements:
        from tauledger.answers.phase_budget import phase_budget

        budget = phase_budget(found, subject)
        found = replace(found, phase_budget=budget)
        if budget is not None:
            from tauledger.answers.unity import with_formula

            found = replace(found, f_unity=with_formula(unity, budget.by_hand))
    if asked.at_hz:
        from tauledger.answers.at import at_facts

        found = replace(found, at=at_facts(subject, asked.at_hz))
    if asked.peaking:
        from tauledger.answers.peaking import peak_facts

        found = replace(found, peaking=peak_facts(subject))
    if asked.curve is not None:
        from tauledger.answers.curve import compare_curve

        found = replace(found, curve=compare_curve(found, subject, asked.curve))
    if asked.miller:
        from tauledger.answers.miller import miller_curves

        found = replace(found, miller=miller_curves(subject))
    if len(found.drive) == 2 and subject.numbers.trusted:
        from tauledger.answers.modes import mode_facts

        found = replace(found, modes=mode_facts(found, subject))
    if asked.outputs and subject.numbers.trusted:
        from tauledger.answers.outputs import output_rows

        found = replace(found, outputs=output_rows(subject, asked.outputs))
    if asked.impedances and subject.numbers.trusted:
        from tauledger.answers.impedances import impedances

        found = replace(found, impedances=impedances(subject))
    if subject.explanation.hand is not None:
        from tauledger.answers.large_signal import with_large_signal

        found = with_large_signal(found, subject, asked.swing_v)
    if asked.wants:
        from tauledger.answers.wants import want_facts

        found = replace(found, wants=want_facts(found, subject, asked.wants))
    return found


def restore(subject: Subject) -> None:
    """Load the circuit of these numbers into the engine again, after runs of others; nothing without an engine."""
    if subject.engine is not None and subject.numbers.circuit is not None:
        subject.engine.bias(subject.numbers.circuit, ())


def with_unity_gain(found: Review, subject: Subject, *, asked: bool) -> Review:
    """Add f_u and its margins where the gain is a plain ratio above 1.

    asked: who sets them is wanted wherever there is one, and the reason where there is none.
    """
    if not asked and not (is_ratio(subject.numbers.network) and found.midband.gain_db > 0.0):
        return found
    from tauledger.answers.unity import unity_facts

    return replace(found, f_unity=unity_facts(found, subject, asked=asked))


def may_have_a_loop(subject: Subject) -> bool:
    """Whether it is worth to look for a feedback loop: plain rules do not reach some node, or a source is an amplifier.

    A cheap question before a dear one: most amplifiers have no loop, and paper reaches all of their nodes.
    """
    hand = subject.explanation.hand
    if hand is None:
        return False
    if any(part.kind in ("block", "voltage gain", "transresistance") for part in subject.numbers.network.parts):
        return True
    return any(line.resistance.source != "rule" for node in hand.nodes for line in node.lines)
