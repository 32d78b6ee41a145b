"""The tables of a review as one CSV file after RFC 4180: one number or text a line, plain SI numbers.

Every line has five fields: table, name, quantity, value, unit. Tables and quantities are called as in the JSON document
("nodes", "resistance_hand_ohm"); what lies deeper has its way written with points and slashes ("share.f_high"; name
"b/Q1.c_mu" for a capacitance at node b). An empty value means that there is none. The curves are left to JSON.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from typing import Any

import msgspec

from tauledger.record import Review

HEADER = ("table", "name", "quantity", "value", "unit")
LEFT_OUT = ("curves", "miller", "loop_curves")
UNITS = {
    "hz": "Hz", "s": "s", "ohm": "ohm", "f": "F", "farad": "F", "db": "dB", "deg": "degree", "c": "degree Celsius",
    "a": "A", "v": "V", "henry": "H", "siemens": "S",
}  # fmt: skip
PER_FARAD = "Hz/F"
VOLT_PER_SECOND = ("v_per_s", "V/s")
# What tells the rows of a table apart; rows without any of these are counted.
IDENTITY = (
    "loop",
    "edge",
    "method",
    "step",
    "name",
    "source",
    "node",
    "part",
    "symbol",
    "cause",
    "note",
    "file",
    "line",
)
# A spreadsheet takes a cell that begins so for a formula.
FORMULA = ("=", "+", "-", "@", "\t", "\r")


def to_csv(review: Review) -> bytes:
    """Give the tables of a review as CSV in UTF-8; equal reviews give equal bytes.

    A text that a spreadsheet would take for a formula has an apostrophe before it.
    """
    page = io.StringIO()
    writer = csv.writer(page, lineterminator="\r\n")
    writer.writerow(HEADER)
    for table, content in msgspec.to_builtins(review).items():
        if table not in LEFT_OUT:
            writer.writerows(_rows(table, "", content))
    return page.getvalue().encode(errors="backslashreplace")


def _rows(table: str, name: str, content: Any) -> Iterator[tuple[str, ...]]:
    if isinstance(content, dict):
        for quantity, value in _quantities("", content):
            if isinstance(value, list | tuple):
                yield from _list(table, name, quantity, value)
            else:
                yield (table, _safe(name), quantity, _text(value), _unit(quantity, value))
    elif isinstance(content, list | tuple):
        yield from _list(table, name, "", content)
    else:
        yield (table, _safe(name), table, _text(content), _unit(table, content))


def _list(table: str, name: str, quantity: str, entries: Any) -> Iterator[tuple[str, ...]]:
    """Give rows of records one by one, and a list of words as one text."""
    if not entries:
        return
    if not isinstance(entries[0], dict):
        yield (table, _safe(name), quantity or table, _text("; ".join(map(str, entries))), "")
        return
    for k, entry in enumerate(entries, start=1):
        own = "/".join(str(entry[key]) for key in IDENTITY if entry.get(key) not in (None, "")) or str(k)
        below = f"{table}.{quantity}" if quantity else table
        yield from _rows(below, f"{name}/{own}" if name else own, entry)


def _quantities(before: str, content: dict[str, Any]) -> Iterator[tuple[str, Any]]:
    for key, value in content.items():
        quantity = f"{before}.{key}" if before else key
        if isinstance(value, dict):
            yield from _quantities(quantity, value)
        else:
            yield quantity, value


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, float | int):
        return repr(value)
    return _safe(str(value))


def _safe(text: str) -> str:
    return f"'{text}" if text.startswith(FORMULA) else text


def _unit(quantity: str, value: Any) -> str:
    if isinstance(value, bool) or not isinstance(value, float | int):
        return ""
    if quantity.startswith("per_farad"):
        return PER_FARAD
    if quantity.endswith(VOLT_PER_SECOND[0]):
        return VOLT_PER_SECOND[1]
    last = quantity.rsplit("_", 1)[-1]
    # a single letter is a unit only behind a name
    return UNITS.get(last, "") if len(last) > 1 or last != quantity else ""
