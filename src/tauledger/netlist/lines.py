"""Logical lines: comments out, continuations joined, `.control` blocks set apart; every character keeps its place.

What counts as a comment follows ngspice: `*`, `;`, `//` and `$` at the start of a line, `;` and `//` anywhere outside
quotes, `$` behind a blank or a comma.
"""

from __future__ import annotations

import re

from msgspec import Struct

from tauledger.errors import Diagnostic
from tauledger.netlist.diagnostics import diagnostic, unsafe
from tauledger.netlist.netlist import Card, Piece, Script
from tauledger.netlist.runs import Run, run_at, without_last

_MARK = re.compile(r"""'[^']*'|"[^"]*"|;|//|\$""")
_PLAIN = tuple("RCLrcl")
_COMMENT_START = ("*", ";", "//", "$")


class Assembled(Struct, frozen=True):
    """A file in logical lines, and its `.control` blocks."""

    cards: tuple[Card | Run, ...]
    scripts: tuple[Script, ...]
    faults: tuple[Diagnostic, ...]


def assemble(text: str, *, file: int, path: str, start: int = 0) -> Assembled:
    """Join the physical lines of a file from index `start` on to logical cards; plain ones come out as runs.

    Faults: a continuation with nothing before it, a control character in a card, a block without `.endc`.
    """
    lines = text.split("\n")
    cards: list[Card | Run] = []
    scripts: list[Script] = []
    faults: list[Diagnostic] = []
    texts: list[str] = []
    pieces: list[Piece] = []
    length = 0
    joined = False
    script: list[str] | None = None
    opened = 0

    def close() -> None:
        joint = "".join(texts)
        if joint.strip():
            cards.append(Card(joint, file, tuple(pieces)))
        texts.clear()
        pieces.clear()

    at = sum(len(line) + 1 for line in lines[:start])
    number = start
    while number < len(lines):
        line = lines[number]
        if line[:1] in _PLAIN and script is None and not joined:
            run = run_at(text, at, file=file, line=number + 1)
            if run is not None and _continued(lines, number + run.count):
                run = without_last(run)
            if run is not None:
                close()
                cards.append(run)
                number += run.count
                at += len(run.text)
                continue
        number += 1
        at += len(line) + 1
        content = line.strip()
        if script is not None:
            if content[:5].lower() == ".endc":
                scripts.append(Script(file, opened, tuple(script)))
                script = None
            else:
                script.append(content)
            continue
        if not content or content.startswith(_COMMENT_START):
            continue
        if content[:8].lower() == ".control":
            script, opened = [], number
            continue
        plain = without_comment(line)
        column = len(plain) - len(plain.lstrip())
        continues = joined
        if plain[column] == "+" and not joined:
            continues = True
            column += 1
            if not texts:
                message = "this continues nothing: no card stands before it"
                faults.append(diagnostic(path, number, column, line, message))
                continue
        body = plain[column:].rstrip()
        joined = body.endswith("\\\\")
        body = body.removesuffix("\\\\").rstrip()
        column += len(body) - len(body.lstrip())
        body = body.lstrip()
        control = None
        if not (body.isascii() and body.isprintable()):
            control = next((index for index, character in enumerate(body) if unsafe(character)), None)
        if control is not None:
            message = f"control character U+{ord(body[control]):04X} in a card"
            faults.append(diagnostic(path, number, column + control + 1, line, message, "delete it"))
        if not continues:
            close()
            length = 0
        if texts:
            texts.append(" ")
            length += 1
        texts.append(body)
        pieces.append(Piece(length, number, column + 1))
        length += len(body)
    close()
    if script is not None:
        fence = lines[opened - 1]
        column = len(fence) - len(fence.lstrip()) + 1
        faults.append(
            diagnostic(
                path, opened, column, fence, "this block is never closed", "close it with .endc", len(".control")
            )
        )
    return Assembled(tuple(cards), tuple(scripts), tuple(faults))


def _continued(lines: list[str], at: int) -> bool:
    """Say whether the line before index `at` is continued behind it: blank lines and comments may stand between."""
    while at < len(lines):
        content = lines[at].strip()
        if content and not content.startswith(_COMMENT_START):
            return content.startswith("+")
        at += 1
    return False


def without_comment(line: str) -> str:
    """Cut the comment at the end of a physical line; between quotes nothing is a comment."""
    if ";" not in line and "//" not in line and "$" not in line:
        return line
    for mark in _MARK.finditer(line):
        found = mark.group()
        start = mark.start()
        if found in (";", "//") or (found == "$" and (start == 0 or line[start - 1] in " \t,")):
            return line[:start]
    return line
