"""Feedback that paper may pass over: a loop around a resistance, a capacitance whose far end follows.

Both are in the hand side here; the effect is that of all nodes together, by hand without it ÷ by hand with it.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import Evidence, hand_differs, in_words, rows_that_count
from tauledger.hand.combine import first_fall
from tauledger.hand.estimate import InnerLine, MillerTerm
from tauledger.quantity import engineering, percent
from tauledger.record import NamedNumber

FOLLOWS = 0.2


def loop_ignored(evidence: Evidence) -> Cause | None:
    """A resistance by looking in alone, where a loop lowers or raises it. Effect: all nodes without loops ÷ with."""
    found = [
        (row, line)
        for row in rows_that_count(evidence.nodes)
        for line in row.lines
        if line.resistance.source != "rule" and math.isfinite(line.resistance.rule_ohm or math.inf)
    ]
    effect = _effect(evidence, lambda line: line.resistance.rule_ohm or line.resistance.ohm, lambda term: term.factor)
    if not found or effect is None:
        return None
    row, line = max(found, key=lambda entry: abs(_changes(entry[1])))
    seen = line.resistance
    rule_ohm = seen.rule_ohm or math.nan
    loop = "" if seen.loop_gain is None else f", {seen.rule}, T = {seen.loop_gain:.3g}"
    return Cause(
        cause="loop-ignored",
        quantity="f_H",
        effect=effect,
        where=row.title,
        says=f"feedback makes R at {row.title} {_ohm(seen.ohm)} where looking in alone gives {_ohm(rule_ohm)}{loop}; "
        f"paper without it comes out {_off(effect)}",
        instead="divide the resistance without the loop by 1 + T, or take both poles from b1 and b2",
        numbers=(
            NamedNumber("R with the loop", seen.ohm, "Ω"),
            NamedNumber("R by looking in", rule_ohm, "Ω"),
        ),
        on_paper=True,
    )


def positive_gain_bridging(evidence: Evidence) -> Cause | None:
    """A capacitance to a node that follows, counted in full. Effect: all nodes with C in full ÷ with C·(1 − K)."""
    bridges = [
        (row, line, term)
        for row in rows_that_count(evidence.nodes)
        for line in row.lines
        for term in line.capacitances
        if term.gain.real > FOLLOWS
    ]
    effect = _effect(
        evidence, lambda line: line.resistance.ohm, lambda term: 1.0 if term.gain.real > FOLLOWS else term.factor
    )
    if not bridges or effect is None:
        return None
    row, _, term = max(bridges, key=lambda entry: entry[1].resistance.ohm * entry[2].farad)
    part = in_words(evidence.bands.network.part(term.part))
    counts = f"counts {term.factor:.3g} times" if term.factor >= 0.0 else f"acts as {term.factor:.3g} times itself"
    return Cause(
        cause="positive-gain-bridging",
        quantity="f_H",
        effect=effect,
        where=row.title,
        says=f"{part} leads from {row.title} to a node that follows it (K = {term.gain.real:.3g}) and {counts}; "
        f"paper with all of it comes out {_off(effect)}",
        instead="count C·(1 − K) with the signed gain K",
        numbers=(NamedNumber("K", term.gain.real, ""),),
        on_paper=True,
    )


def _changes(line: InnerLine) -> float:
    """Give how much longer the time constant of a line is by looking in alone, s."""
    rule_ohm = line.resistance.rule_ohm
    return 0.0 if rule_ohm is None else (rule_ohm - line.resistance.ohm) * line.capacitance_f


def _effect(
    evidence: Evidence, ohm: Callable[[InnerLine], float], factor: Callable[[MillerTerm], float]
) -> float | None:
    """Give all nodes together with other resistances or factors ÷ as they are, − 1; None where hand and exact agree."""
    if not hand_differs(evidence):
        return None
    edges = []
    for changed in (True, False):
        taus = [
            sum(
                (ohm(line) if changed else line.resistance.ohm)
                * sum(term.farad * (factor(term) if changed else term.factor) for term in line.capacitances)
                for line in row.lines
            )
            for row in rows_that_count(evidence.nodes)
        ]
        poles = np.array([-1.0 / tau for tau in taus if tau > 0.0 and math.isfinite(tau)], dtype=complex)
        edges.append(first_fall(poles, np.empty(0, dtype=complex)))
    without, with_it = edges
    return without / with_it - 1.0 if without is not None and with_it is not None else None


def _ohm(value: float) -> str:
    return engineering(value, "Ω", 3)


def _off(effect: float) -> str:
    return f"{percent(abs(effect)).removeprefix('+')} {'high' if effect > 0 else 'low'}"
