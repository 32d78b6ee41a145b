"""Runs of plain R, C and L lines: found by one pattern, kept as they stand in the file, worked out column by column.

A line is plain where it is a name, two nodes and a number, without comment or continuation, in ASCII. The grammar reads
such a line to the same element; what is wrong in one (a name twice, an impossible value) is left to it to say.
"""

from __future__ import annotations

import re
from functools import lru_cache

from msgspec import Struct

from tauledger.netlist.items import Item, Word
from tauledger.netlist.numbers import read_number

# Shorter runs are not worth their own columns.
FEWEST = 8

_NAME = r"[RCLrcl][!#%&*+\-.\w:<>?@\[\]^|~]*+"
_NODE = r"[!#%&*+\-.\w:<>?@\[\]^|~]++"
_VALUE = r"[+-]?+(?:\d++\.?+\d*+|\.\d++)(?:[eE][+-]?+\d{1,9}+)?+[A-Za-z]*+"
_LINE = rf"{_NAME}[ \t]++{_NODE}[ \t]++{_NODE}[ \t]++{_VALUE}[ \t]*+(?:\n|\Z)"
_RUN = re.compile(rf"(?:(?=[RCLrcl]){_LINE})++", re.ASCII)

# A suffix at the end of a number; meg before its g.
_SCALES = {"meg\n": "e6\n", "k\n": "e3\n", "m\n": "e-3\n", "u\n": "e-6\n", "n\n": "e-9\n", "p\n": "e-12\n"}
_SCALES |= {"f\n": "e-15\n", "g\n": "e9\n", "t\n": "e12\n"}


class Run(Struct, frozen=True):
    """Plain lines in a row: number of their file, the first one's line from 1, their text and how many they are."""

    file: int
    line: int
    text: str
    count: int


class Columns(Struct, frozen=True):
    """The words of a run: names and nodes as written and folded, values in SI units."""

    names: list[str]
    a: list[str]
    b: list[str]
    folded_names: list[str]
    folded_a: list[str]
    folded_b: list[str]
    values: list[float]


def run_at(text: str, at: int, *, file: int, line: int) -> Run | None:
    """Give the run that begins at an offset of a file's text; None where the lines there are not plain or are few."""
    match = _RUN.match(text, at)
    if match is None:
        return None
    found = match.group()
    count = found.count("\n") + (not found.endswith("\n"))
    return Run(file, line, found, count) if count >= FEWEST else None


def without_last(run: Run) -> Run | None:
    """Leave the last line to the grammar: what follows continues it."""
    kept = run.text[: run.text.rstrip("\n").rfind("\n") + 1]
    return Run(run.file, run.line, kept, run.count - 1) if run.count > FEWEST else None


def columns(run: Run) -> Columns:
    """Take a run apart."""
    words, folded = run.text.split(), run.text.lower().split()
    return Columns(
        names=words[0::4],
        a=words[1::4],
        b=words[2::4],
        folded_names=folded[0::4],
        folded_a=folded[1::4],
        folded_b=folded[2::4],
        values=_values(folded[3::4]),
    )


def _values(texts: list[str]) -> list[float]:
    """Read numbers that the pattern has let pass: all at once where no unit stands behind a suffix."""
    joined = "\n".join([*texts, ""])
    for suffix, exponent in _SCALES.items():
        joined = joined.replace(suffix, exponent)
    try:
        return list(map(float, joined.split()))
    except ValueError:
        known = {text: read_number(text) for text in set(texts)}
        return [number.value for number in map(known.__getitem__, texts) if number is not None]


def row(run: Run, number: int) -> tuple[str, int]:
    """Give the text of one line of a run, blanks around it left out, and the column where it begins."""
    line = _lines(run)[number]
    return line.strip(), len(line) - len(line.lstrip()) + 1


def row_items(run: Run, number: int) -> tuple[Item, ...]:
    """Give the items of one line of a run."""
    return tuple(Word(word.group(), word.start()) for word in re.finditer(r"\S+", row(run, number)[0]))


@lru_cache(maxsize=4)
def _lines(run: Run) -> list[str]:
    return run.text.split("\n")
