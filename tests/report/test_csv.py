"""CSV: five fields a line as RFC 4180 wants them, every number of the document, nothing a spreadsheet would run."""

from __future__ import annotations

import csv
import io
from typing import Any

import pytest
from msgspec import to_builtins
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import Review
from tauledger.report.csv import HEADER, LEFT_OUT, to_csv


def read(review: Review) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(to_csv(review).decode(), newline=""), strict=True))


def find(table: str, name: str, quantity: str) -> dict[str, str]:
    (row,) = [
        row for row in read(ECHO_PREAMP) if (row["table"], row["name"], row["quantity"]) == (table, name, quantity)
    ]
    return row


def test_lines_end_and_fields_count_as_rfc_4180_says() -> None:
    raw = to_csv(ECHO_PREAMP)
    assert raw.endswith(b"\r\n")
    assert raw.count(b"\n") == raw.count(b"\r\n")
    rows = list(csv.reader(io.StringIO(raw.decode(), newline=""), strict=True))
    assert tuple(rows[0]) == HEADER
    assert {len(row) for row in rows} == {len(HEADER)}


@pytest.mark.parametrize(
    ("table", "name", "quantity", "value", "unit"),
    [
        ("f_high", "", "simulated_hz", 580688.7, "Hz"),
        ("midband", "", "gain_db", 41.5282, "dB"),
        ("nodes", "b", "resistance_hand_ohm", 428.0, "ohm"),
        ("nodes", "b", "capacitance_f", 442.81e-12, "F"),
        ("nodes", "b", "per_farad.f_high", -6.3647e14, "Hz/F"),
        ("nodes.working.capacitances", "b/Q1.c_mu", "time_constant_s", 166.47e-9, "s"),
        ("nodes.working.capacitances", "b/Q1.c_mu", "farad", 2.16e-12, "F"),
        ("parts", "CL", "ten_percent_less.f_high_hz", 598156.8, "Hz"),
        ("estimates", "f_high/sum of time constants", "difference", -0.02685, ""),
        ("devices.figures", "Q1/gm", "value", 105.1e-3, ""),
    ],
)
def test_a_number_is_found_by_table_name_and_quantity(
    table: str, name: str, quantity: str, value: float, unit: str
) -> None:
    row = find(table, name, quantity)
    assert (float(row["value"]), row["unit"]) == (value, unit)


def numbers(value: Any) -> list[float]:
    if isinstance(value, dict):
        return [number for entry in value.values() for number in numbers(entry)]
    if isinstance(value, list | tuple):
        return [number for entry in value for number in numbers(entry)]
    return [float(value)] if isinstance(value, float) else []


def test_every_number_of_the_tables_is_there_once_and_exact() -> None:
    document = {name: value for name, value in to_builtins(ECHO_PREAMP).items() if name not in LEFT_OUT}
    told = []
    for row in read(ECHO_PREAMP):
        if any(sign in row["value"] for sign in ".en") and not row["value"].startswith(("t", "f")):
            try:
                told.append(float(row["value"]))
            except ValueError:
                continue
    assert sorted(told) == sorted(numbers(document))


@pytest.mark.parametrize("title", ["=HYPERLINK(1)", "+1", "-1", "@SUM(A1)"])
def test_a_text_is_no_formula_to_a_spreadsheet(title: str) -> None:
    review = replace(ECHO_PREAMP, netlist=replace(ECHO_PREAMP.netlist, title=title))
    (row,) = [row for row in read(review) if row["quantity"] == "title" and row["table"] == "netlist"]
    assert row["value"] == f"'{title}"


def test_commas_quotes_and_line_ends_come_through() -> None:
    title = 'two "bands", one\nboard'
    review = replace(ECHO_PREAMP, netlist=replace(ECHO_PREAMP.netlist, title=title))
    (row,) = [row for row in read(review) if row["quantity"] == "title" and row["table"] == "netlist"]
    assert row["value"] == title
