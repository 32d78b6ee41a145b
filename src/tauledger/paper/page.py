"""A designer's page as read: figures with the line they stand on. TOML v1.0, with tables and keys of our own.

f_high = "690k"            # Hz; f_low and gain (V/V, or the unit of the gain; "61.5 dB") likewise
[node.b]                   # a signal node by its name in the netlist
resistance = 605           # ohm; capacitance F, time_constant s, miller_gain (v at the far end over v here)
[device.Q1]                # a device by its name; keys are those of its operating point
gm = "42m"
"""

from __future__ import annotations

import math
import re
import tomllib
from typing import Any

from msgspec import Struct

from tauledger.errors import Diagnostic, InputError, NetlistError
from tauledger.netlist.numbers import read_number
from tauledger.paper.keys import SIGNED_PREFIXES

WHOLE = ("f_high", "f_low", "gain")
AT_NODE = ("resistance", "capacitance", "time_constant", "miller_gain")
TABLES = ("node", "device")
GAINS = ("gain", "miller_gain")

MOST_DECIBEL = 1000.0

_HEADER = re.compile(r"\s*\[([^\[\]]+)\]\s*(?:#.*)?$")
_KEY = re.compile(r"""\s*((?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*=""")
_PART = re.compile(r"""[A-Za-z0-9_-]+|"[^"]*"|'[^']*'""")
_SPACED = re.compile(r"([+-]?[\d.]+(?:[eE][+-]?\d+)?)\s+(?=[^\s\d])")
_DECIBEL = re.compile(r"(.*[\d.])\s*dB", re.IGNORECASE)
_RATIO = re.compile(r"(?:\s+1|\s*[VA])?\s*/\s*[VA]")
_MEGA = re.compile(r"[^A-Za-z]*M(Hz|ohm|Ω)?")
_FARAD = re.compile(r"[\d.]+(?:[eE][+-]?\d+)?\s*F")
_WHERE = re.compile(r"\(at line (\d+), column (\d+)\)")


class Place(Struct, frozen=True):
    """Where something stands on the page: line and column from 1, the line's text."""

    line: int
    column: int
    text: str


class Claim(Struct, frozen=True):
    """One figure of the page.

    kind: "whole", "node" or "device". name: node or device as written, empty for the whole. key: what it is.
    value: in SI units. place: where it stands, owner: where its table's name stands.
    """

    kind: str
    name: str
    key: str
    value: float
    place: Place


class Page(Struct, frozen=True):
    """A page: its path as typed and its figures in the order in which they stand there."""

    path: str
    claims: tuple[Claim, ...]


def read_page(text: str, path: str) -> Page:
    """Read a page.

    Raises NetlistError, with file, line and column, for what is no TOML, an unknown table or key, or a value that is no
    number; InputError for a page without any figure.
    """
    try:
        tables = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise NetlistError(_not_toml(text, path, error)) from error
    lines = text.splitlines()
    claims = [claim for key, value in tables.items() for claim in _top(lines, path, key, value)]
    if not claims:
        raise InputError(
            f"{path}: there is no figure on this page", "take the # from a line and write the figure there"
        )
    return Page(path, tuple(sorted(claims, key=lambda claim: claim.place.line)))


def is_signed(key: str) -> bool:
    """Tell whether a figure may be negative: gains, currents and voltages."""
    return key in GAINS or key.startswith(SIGNED_PREFIXES)


def problem(path: str, place: Place, message: str, hint: str) -> NetlistError:
    """Give the error that points at a place on the page."""
    width = len(place.text[place.column - 1 :].split("=")[0].split("#")[0].rstrip()) or 1
    return NetlistError(Diagnostic(path, place.line, place.column, place.text, message, hint, width))


def _top(lines: list[str], path: str, key: str, value: Any) -> list[Claim]:
    place = _find(lines, (key,))
    if key in TABLES:
        if not isinstance(value, dict) or not all(isinstance(table, dict) for table in value.values()):
            raise problem(path, place, f"{key} is a table of tables", f"write [{key}.NAME] and the figures below it")
        return [claim for name, table in value.items() for claim in _table(lines, path, key, name, table)]
    if key not in WHOLE:
        raise problem(
            path, place, f"no such figure: {key}", f"there are {', '.join(WHOLE)}, [node.NAME] and [device.NAME]"
        )
    return [Claim("whole", "", key, _value(path, place, key, value), place)]


def _table(lines: list[str], path: str, kind: str, name: str, table: dict[str, Any]) -> list[Claim]:
    claims = []
    for key, value in table.items():
        place = _find(lines, (kind, name, key))
        if kind == "node" and key not in AT_NODE:
            raise problem(path, place, f"no such figure of a node: {key}", f"there are {', '.join(AT_NODE)}")
        claims.append(Claim(kind, name, key, _value(path, place, key, value), place))
    return claims


def _value(path: str, place: Place, key: str, value: Any) -> float:
    """Take a number, or a text with a number as a netlist writes it."""
    hint = 'write a number, or a text as in a netlist: "2.2k", "690k", "33p"'
    number: float | None = None
    if isinstance(value, str):
        number = _text(path, place, key, value)
    elif isinstance(value, int | float) and not isinstance(value, bool):
        number = float(value)
    if number is None or not math.isfinite(number):
        raise problem(path, place, f"{key} is not a number", hint)
    if number == 0.0 or (number < 0.0 and not is_signed(key)):
        raise problem(path, place, f"{key} must be {'other than 0' if is_signed(key) else 'positive'}", hint)
    return number


def _text(path: str, place: Place, key: str, text: str) -> float | None:
    """Read a text as a netlist has it, its unit after a blank or not; a gain may be in dB. None: no number."""
    text = text.strip()
    if _MEGA.fullmatch(text):
        raise problem(path, place, f'{key} = "{text}": M is milli in SPICE', "write meg for 10^6, m for 10^-3")
    if _FARAD.fullmatch(text):
        raise problem(path, place, f'{key} = "{text}": F is femto in SPICE', 'write "33p" or 33e-12 for 33 pF')
    decibel = _DECIBEL.fullmatch(text)
    if decibel is not None:
        if key not in GAINS:
            raise problem(path, place, f'{key} = "{text}": only a gain is in dB', f"there are {', '.join(GAINS)}")
        level = read_number(decibel.group(1))
        return None if level is None or level.tail or abs(level.value) > MOST_DECIBEL else 10 ** (level.value / 20.0)
    if key in (*GAINS, "gm_over_i"):
        ratio = _RATIO.search(text)
        text = text[: ratio.start()] if ratio is not None and ratio.end() == len(text) else text
    read = read_number(_SPACED.sub(r"\1", text, count=1))
    return None if read is None or read.tail else read.value


def _find(lines: list[str], wanted: tuple[str, ...]) -> Place:
    """Find the line of a key: under its table's header, as a dotted key, or at the line that opens its table."""
    header: tuple[str, ...] = ()
    nearest: tuple[int, Place] | None = None
    for number, line in enumerate(lines, start=1):
        opened = _HEADER.fullmatch(line)
        key = None if opened else _KEY.match(line)
        found = opened or key
        if found is None:
            continue
        names = tuple(part.strip("\"'") for part in _PART.findall(found.group(1)))
        here = names if opened else header + names
        header = names if opened else header
        place = Place(number, found.start(1) + 1, line)
        if here == wanted:
            return place
        depth = len(here) if wanted[: len(here)] == here else 0
        if depth and (nearest is None or depth > nearest[0]):
            nearest = depth, place
    if nearest is not None:
        return nearest[1]
    return next(
        (
            Place(number, line.index(wanted[-1]) + 1, line)
            for number, line in enumerate(lines, 1)
            if wanted[-1] in line and not line.lstrip().startswith("#")
        ),
        Place(1, 1, lines[0] if lines else ""),
    )


def _not_toml(text: str, path: str, error: tomllib.TOMLDecodeError) -> Diagnostic:
    lines = text.splitlines() or [""]
    found = _WHERE.search(str(error))
    message = _WHERE.sub("", str(error)).strip()
    line, column = (int(found.group(1)), int(found.group(2))) if found else (len(lines), len(lines[-1]) + 1)
    line = min(line, len(lines))
    return Diagnostic(
        path,
        line,
        min(column, len(lines[line - 1]) + 1),
        lines[line - 1],
        f"this is no TOML: {message[:1].lower()}{message[1:]}",
        'write key = value; a value with a suffix stands in quotes: gm = "42m"',
    )
