"""What a change does to the headline: every figure before and after, from two reviews of one netlist."""

from __future__ import annotations

from tauledger.circuit import Change
from tauledger.quantity import decibel_unit
from tauledger.record import AddedPart, EdgeFacts, MovedFigure, Review, SetValue, UnityFacts


def set_values(change: Change) -> tuple[SetValue, ...]:
    """List what a change sets: temperature, parameters, elements, parameters of models."""
    named = [("temp", change.temperature_c)] if change.temperature_c is not None else []
    named += [*change.parameters, *change.elements]
    named += [(f"{model}.{parameter}", value) for model, parameter, value in (*change.models, *change.given)]
    return tuple(SetValue(name, value) for name, value in named)


def added_parts(change: Change) -> tuple[AddedPart, ...]:
    """List what a change adds from a node to ground."""
    return tuple(AddedPart(load.plus, load.kind, load.value) for load in change.loads)


def moved_figures(before: Review, after: Review) -> tuple[MovedFigure, ...]:
    """Set the figures of the headline side by side: mid-band, both edges, unity gain.

    What neither review has is left out, and of unity gain what only one has.
    """
    rows = [
        MovedFigure("gain", decibel_unit(after.midband.unit), before.midband.gain_db, after.midband.gain_db),
        MovedFigure("plateau from", "Hz", before.midband.from_hz, after.midband.from_hz),
        MovedFigure("plateau to", "Hz", before.midband.to_hz, after.midband.to_hz),
    ]
    for name, old, new in (("f_L", before.f_low, after.f_low), ("f_H", before.f_high, after.f_high)):
        rows += _edge(name, old, new)
    if before.f_unity is not None and after.f_unity is not None:
        rows += _unity_gain(before.f_unity, after.f_unity)
    return tuple(row for row in rows if row.before is not None or row.after is not None)


def _edge(name: str, old: EdgeFacts | None, new: EdgeFacts | None) -> list[MovedFigure]:
    figures = (
        ("simulated", "Hz", "simulated_hz"),
        ("exact", "Hz", "exact_hz"),
        ("by hand", "Hz", "hand_hz"),
        ("phase shift", "deg", "phase_deg"),
        ("peak", "dB", "peaking_db"),
        ("rise time", "s", "rise_time_s"),
    )
    return [
        MovedFigure(
            f"{name} {words}",
            unit,
            None if old is None else getattr(old, field),
            None if new is None else getattr(new, field),
        )
        for words, unit, field in figures
    ]


def _unity_gain(old: UnityFacts, new: UnityFacts) -> list[MovedFigure]:
    return [
        row
        for row in (
            MovedFigure("f_u simulated", "Hz", old.simulated_hz, new.simulated_hz),
            MovedFigure("f_u exact", "Hz", old.exact_hz, new.exact_hz),
            MovedFigure("phase margin simulated", "deg", old.phase_margin_deg, new.phase_margin_deg),
            MovedFigure("phase margin exact", "deg", old.phase_margin_exact_deg, new.phase_margin_exact_deg),
        )
        if row.before is not None and row.after is not None
    ]
