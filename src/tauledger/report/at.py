"""Gain and phase at the frequencies that were asked for, and the peaking, with what moves them most."""

from __future__ import annotations

from tauledger.quantity import decibel_unit
from tauledger.record import AtElement, AtFacts, PeakElement, PeakFacts, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.unity import FIRST_ORDER, signed
from tauledger.report.wording import EDGE, NO_NUMBER, degrees, move, number, part_title, value_of

_MOST = 4


def gain_and_phase(review: Review, *, verbose: bool = False) -> Section:
    """Give gain and phase at every frequency that was asked for, simulated and exact, and the largest effects there."""
    if not review.at:
        return Section(())
    rows = [Row(cells) for one in review.at for cells in source_rows(one, review)]
    head = ("GAIN AND PHASE AT", "", "gain", "phase", "beyond mid-band")
    blocks: list[Block] = [Table("llrrr", head, tuple(rows))]
    for one in review.at:
        shown = one.elements if verbose else one.elements[:_MOST]
        if shown:
            less = tuple(Row(at_cells(element)) for element in shown)
            blocks.append(Table("lrrr", (f"10 % less of, at {number(one.hz, 'Hz')}", "value", "gain", "phase"), less))
    if any(one.elements for one in review.at):
        blocks.append(Prose(FIRST_ORDER, lead="  "))
    return Section(tuple(blocks), major=True)


def peaking(review: Review, *, verbose: bool = False) -> Section:
    """Give the peaking of either side, simulated and exact, and what 10 % less of an element does to it."""
    blocks: list[Block] = []
    for one in review.peaking:
        head = (f"PEAKING towards {EDGE[one.edge]}", "simulated", "exact")
        blocks.append(Table("lrr", head, tuple(Row(cells) for cells in peak_rows(one))))
        rows: list[Row] = []
        for element in one.elements if verbose else one.elements[:_MOST]:
            rows.append(Row(peak_cells(element)))
            if element.rerun_db is not None:
                rows.append(Row(("  recomputed", "", signed(element.rerun_db - one.exact_db, " dB"))))
        if rows:
            blocks.append(Table("lrr", ("10 % less of", "value", "peaking"), tuple(rows)))
            blocks.append(Prose(FIRST_ORDER, lead="  "))
    return Section(tuple(blocks), major=True)


def source_rows(one: AtFacts, review: Review) -> tuple[tuple[str, ...], ...]:
    """Give the rows of one frequency: frequency, source, gain in dB, phase, phase beyond mid-band."""
    unit = decibel_unit(review.midband.unit)
    at = number(one.hz, "Hz")
    rows = []
    if one.simulated_db is not None:
        simulated = (f"{one.simulated_db:.3f} {unit}", degrees(one.simulated_deg), degrees(one.simulated_beyond_deg))
        rows.append((at, "simulated", *simulated))
    if one.exact_db is not None:
        exact = (f"{one.exact_db:.3f} {unit}", degrees(one.exact_deg), degrees(one.exact_beyond_deg))
        rows.append(("" if rows else at, "exact", *exact))
    return tuple(rows)


def at_cells(one: AtElement) -> tuple[str, str, str, str]:
    """Give an element with what 10 % less of it does to gain and phase, to first order."""
    return (
        part_title(one.name, one.owner),
        value_of(one.name, one.owner, one.value, one.unit),
        move(-0.1 * one.gain),
        signed(-10.0 * one.phase_deg, "°"),
    )


def peak_rows(one: PeakFacts) -> tuple[tuple[str, str, str], ...]:
    """Give how high the peak is above mid-band and where."""
    simulated = NO_NUMBER if one.simulated_db is None else f"{one.simulated_db:.3g} dB"
    return (
        ("above mid-band", simulated, f"{one.exact_db:.3g} dB"),
        ("at", number(one.simulated_at_hz, "Hz"), number(one.exact_at_hz, "Hz")),
    )


def peak_cells(one: PeakElement) -> tuple[str, str, str]:
    """Give an element with what 10 % less of it does to the peaking, to first order."""
    value = value_of(one.name, one.owner, one.value, one.unit)
    return part_title(one.name, one.owner), value, signed(-10.0 * one.peaking_db, " dB")
