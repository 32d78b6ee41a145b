"""Differential and common-mode gain of two sources and their ratio, and the further outputs of the same run."""

from __future__ import annotations

from tauledger.quantity import decibel_unit
from tauledger.record import OutputRow, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, number

BALANCED = "no common-mode gain: both halves are equal in the netlist, on the board their difference makes it"


def modes(review: Review) -> Section:
    """Give differential gain, common-mode gain and CMRR at mid-band and at f_H, simulated and exact."""
    facts = review.modes
    if facts is None:
        return Section(())
    rows = tuple(Row(cells) for cells in mode_rows(review))
    head = (f"MODES of {facts.plus} and {facts.minus}", "", "differential", "common", "CMRR")
    blocks: list[Block] = [Table("llrrr", head, rows)]
    if balanced(review):
        blocks.append(Prose(BALANCED, lead="  "))
    return Section(tuple(blocks))


def balanced(review: Review) -> bool:
    """Whether nothing at all comes through in common mode."""
    return review.modes is not None and all(row.common_db is None for row in review.modes.rows)


def mode_rows(review: Review) -> tuple[tuple[str, ...], ...]:
    """Give the rows: frequency, source of the numbers, differential and common-mode gain, CMRR."""
    facts = review.modes
    assert facts is not None
    unit = decibel_unit(facts.unit)
    rows: list[tuple[str, ...]] = []
    for row in facts.rows:
        at = f"{row.at}, {'DC' if row.hz == 0.0 else number(row.hz, 'Hz')}"
        if row.differential_simulated_db is not None:
            values = (row.differential_simulated_db, row.common_simulated_db, row.cmrr_simulated_db)
            rows.append((at, "simulated", *_decibels(*values, unit)))
            at = ""
        rows.append((at, "exact", *_decibels(row.differential_db, row.common_db, row.cmrr_db, unit)))
    return tuple(rows)


def _decibels(differential: float, common: float | None, ratio: float | None, unit: str) -> tuple[str, str, str]:
    return (
        f"{differential:.2f} {unit}",
        "none" if common is None else f"{common:.2f} {unit}",
        NO_NUMBER if ratio is None else f"{ratio:.1f} dB",
    )


def further_outputs(review: Review) -> Section:
    """Give mid-band gain and both band edges of every further output, simulated and exact."""
    if not review.outputs:
        return Section(())
    rows = tuple(Row(cells) for one in review.outputs for cells in output_rows(one))
    return Section((Table("llrrrr", ("FURTHER OUTPUTS", "", "gain", "at", "f_L", "f_H"), rows),))


def output_rows(one: OutputRow) -> tuple[tuple[str, ...], ...]:
    """Give the rows of one output: name, source of the numbers, gain, where, f_L, f_H."""
    unit = decibel_unit(one.unit)
    at = "DC" if one.frequency_hz == 0.0 else number(one.frequency_hz, "Hz")
    rows: list[tuple[str, ...]] = []
    if one.simulated_db is not None:
        edges = (_edge(one.f_low_simulated_hz), _edge(one.f_high_simulated_hz))
        rows.append((one.name, "simulated", f"{one.simulated_db:.2f} {unit}", at, *edges))
    edges = (_edge(one.f_low_exact_hz), _edge(one.f_high_exact_hz))
    rows.append(("" if rows else one.name, "exact", f"{one.gain_db:.2f} {unit}", "" if rows else at, *edges))
    return tuple(rows)


def _edge(hz: float | None) -> str:
    return "none" if hz is None else number(hz, "Hz")
