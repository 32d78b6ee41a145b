"""A measured curve as a file: CSV (RFC 4180) in UTF-8 with the columns f_hz, gain_db and, where measured, phase_deg."""

from __future__ import annotations

import csv
import math

from tauledger.asked import MeasuredCurve
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import visible

REQUIRED, OPTIONAL = ("f_hz", "gain_db"), ("phase_deg",)
HEADER = "f_hz,gain_db,phase_deg"
MOST_POINTS = 5000
MOST_FAULTS = 10
LARGEST_DB = 1000.0
BYTE_ORDER_MARK = "\N{ZERO WIDTH NO-BREAK SPACE}"


def read_curve(data: bytes, path: str) -> MeasuredCurve:
    """Read a curve; `path` is its name in messages.

    The columns stand in any order; lines that are empty or begin with # are left out; points may stand in any order.
    Raises NetlistError with file, line and column for what is no UTF-8, for a header other than that, for a field that
    is no number, and for a frequency that is not above zero or stands there twice.
    """
    lines = _text(data, path).splitlines()
    written = [(number, line) for number, line in enumerate(lines, 1) if line.strip() and not _is_comment(line)]
    if not written:
        raise NetlistError(_fault(path, 1, 1, lines[0] if lines else "", "there is no curve in this file", _FORM))
    header, *rows = written
    columns = _columns(path, *header)
    faults: list[Diagnostic] = []
    points: dict[float, tuple[int, dict[str, float]]] = {}
    for number, line in rows:
        point = _point(path, number, line, columns)
        if isinstance(point, Diagnostic):
            faults.append(point)
        elif point["f_hz"] in points:
            before = points[point["f_hz"]][0]
            hint = "give one line for each frequency"
            start, text = _fields(line)[columns.index("f_hz")]
            message = f"{text} Hz stands in line {before} already"
            faults.append(_fault(path, number, start, line, message, hint, len(text)))
        else:
            points[point["f_hz"]] = number, point
        if len(faults) == MOST_FAULTS:
            break
    if faults:
        raise NetlistError(*faults)
    if not 2 <= len(points) <= MOST_POINTS:
        number, line = rows[-1] if rows else header
        message = f"{len(points)} point{'' if len(points) == 1 else 's'}: no curve that can be compared"
        raise NetlistError(_fault(path, number, 1, line, message, f"give 2 to {MOST_POINTS} points", len(line)))
    ordered = [points[hz][1] for hz in sorted(points)]
    return MeasuredCurve(
        path,
        tuple(point["f_hz"] for point in ordered),
        tuple(point["gain_db"] for point in ordered),
        tuple(point["phase_deg"] for point in ordered) if "phase_deg" in columns else None,
    )


_FORM = f"head it {HEADER} (the last is optional), then a line per point"
SEPARATORS = {";": "semicolons", "\t": "tabs"}


def _text(data: bytes, path: str) -> str:
    try:
        return data.decode("utf-8").removeprefix(BYTE_ORDER_MARK)
    except UnicodeDecodeError as error:
        before = data[: error.start]
        start = before.rfind(b"\n") + 1
        whole = data[start:].split(b"\n", 1)[0].decode("utf-8", errors="replace").rstrip("\r")
        column = len(data[start : error.start].decode("utf-8")) + 1
        message = f"byte 0x{data[error.start]:02x} is no UTF-8"
        line = before.count(b"\n") + 1
        raise NetlistError(_fault(path, line, column, whole, message, "save the file as UTF-8")) from error


def _is_comment(line: str) -> bool:
    return line.lstrip().startswith("#")


def _fields(line: str) -> list[tuple[int, str]]:
    """Give the fields of a line, each with the column from 1 at which it starts; quotes around one are taken away."""
    fields, start = [], 1
    for raw in next(csv.reader([line], quoting=csv.QUOTE_NONE)):
        text = raw.strip()
        lead = len(raw) - len(raw.lstrip())
        if len(text) > 1 and text[0] == text[-1] == '"':
            text, lead = text[1:-1].strip(), lead + 1
        fields.append((start + lead, text))
        start += len(raw) + 1
    return fields


def _columns(path: str, number: int, line: str) -> tuple[str, ...]:
    """Read the header: which column holds what."""
    other = next((mark for mark in SEPARATORS if mark in line and "," not in line), None)
    if other is not None:
        what = f"the columns stand apart by {SEPARATORS[other]}, not by commas"
        hint = "put commas between them, and a point in each number"
        raise NetlistError(_fault(path, number, line.index(other) + 1, line, what, hint))
    names: list[str] = []
    for start, text in _fields(line):
        name = text.casefold()
        if name not in (*REQUIRED, *OPTIONAL) or name in names:
            what = f"the column {text} stands there twice" if name in names else f"no such column: {text or 'no name'}"
            raise NetlistError(_fault(path, number, start, line, what, _FORM, len(text)))
        names.append(name)
    missing = [name for name in REQUIRED if name not in names]
    if missing:
        what = f"the column {missing[0]} is missing"
        raise NetlistError(_fault(path, number, 1, line, what, _FORM, len(line)))
    return tuple(names)


def _point(path: str, number: int, line: str, columns: tuple[str, ...]) -> dict[str, float] | Diagnostic:
    fields = _fields(line)
    if len(fields) != len(columns):
        many = "1 field" if len(fields) == 1 else f"{len(fields)} fields"
        hint = f"give {', '.join(columns)}, a comma between them and a point in each number"
        start = fields[len(columns)][0] if len(fields) > len(columns) else len(line) + 1
        return _fault(path, number, start, line, f"{many} where the header names {len(columns)}", hint)
    point: dict[str, float] = {}
    for name, (start, text) in zip(columns, fields, strict=True):
        value = _number(text)
        if value is None:
            hint = "write a plain number, e.g. 2.2e6"
            return _fault(path, number, start, line, f"{name} is no number: {text or 'nothing'}", hint, len(text))
        if name == "f_hz" and value <= 0.0:
            hint = "leave the point out: a band edge has no place there"
            return _fault(path, number, start, line, "the frequency must be above 0 Hz", hint, len(text))
        if name == "gain_db" and abs(value) > LARGEST_DB:
            hint = "give 20·log10 of the gain"
            return _fault(path, number, start, line, f"{text} dB is no gain", hint, len(text))
        point[name] = value
    return point


def _number(text: str) -> float | None:
    # Python alone would take 1_000.
    try:
        value = float(text) if "_" not in text else math.nan
    except ValueError:
        return None
    return value if math.isfinite(value) else None


def _fault(path: str, line: int, column: int, text: str, message: str, hint: str, width: int = 1) -> Diagnostic:
    return Diagnostic(visible(path), line, column, visible(text), visible(message), hint, width)
