"""How full the pages of a PDF are: reads those that Chromium prints, by the places of their texts."""

from __future__ import annotations

import itertools
import re
import zlib
from collections.abc import Iterator
from dataclasses import dataclass

Matrix = tuple[float, float, float, float, float, float]

_STEP = re.compile(rb"(?:((?:-?[\d.]+ ){6})(cm|Tm)|(?<![\w/])(q|Q))\b")


@dataclass(frozen=True)
class Printed:
    """One page in pt: its size, and where the texts on it begin, from its top left corner."""

    width: float
    height: float
    texts: tuple[tuple[float, float], ...]

    @property
    def fill(self) -> float:
        """How far down the page the last line stands."""
        return max((y for _, y in self.texts), default=0.0) / self.height


def printed(pdf: bytes) -> list[Printed]:
    """Give the pages in their order."""
    objects = _objects(pdf)
    pages = []
    for body in objects.values():
        if not re.search(rb"/Type /Page\b(?!s)", body):
            continue
        width, height = (float(size) for size in _only(rb"/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]", body))
        (content,) = _only(rb"/Contents (\d+) 0 R", body)
        stream = objects[int(content)].partition(b"stream\n")[2]
        # what follows the stream is left aside
        pages.append(Printed(width, height, tuple(_places(zlib.decompressobj().decompress(stream), height))))
    return pages


def _only(pattern: bytes, body: bytes) -> tuple[bytes, ...]:
    found = re.search(pattern, body)
    assert found is not None
    return found.groups()


def _objects(pdf: bytes) -> dict[int, bytes]:
    """Give every object by its number, from the table of offsets at the end of the file."""
    table = pdf[int(pdf[pdf.rindex(b"startxref") :].split()[1]) :]
    offsets = [int(line[:10]) for line in re.findall(rb"\d{10} \d{5} [nf]", table)]
    ends = dict(itertools.pairwise(sorted((*offsets, len(pdf)))))
    return {k: pdf[start : ends[start]] for k, start in enumerate(offsets) if k}


def _places(content: bytes, height: float) -> Iterator[tuple[float, float]]:
    now: Matrix = (1.0, 0.0, 0.0, 1.0, 0.0, 0.0)
    kept: list[Matrix] = []
    for numbers, operator, stack in _STEP.findall(content):
        if stack == b"q":
            kept.append(now)
        elif stack == b"Q":
            now = kept.pop()
        else:
            a, b, c, d, e, f = (float(number) for number in numbers.split())
            moved = _times((a, b, c, d, e, f), now)
            if operator == b"cm":
                now = moved
            else:
                yield moved[4], height - moved[5]


def _times(first: Matrix, second: Matrix) -> Matrix:
    a, b, c, d, e, f = first
    p, q, r, s, t, u = second
    return (a * p + b * r, a * q + b * s, c * p + d * r, c * q + d * s, e * p + f * r + t, e * q + f * s + u)
