"""The error tree; every expected failure is one of these leaves and none of them shows a traceback.

TauledgerError
├── InputError          exit 2   an option, a file or a request cannot be used
│   ├── NetlistError    exit 2   the netlist cannot be used: one or more diagnostics, each with its place
│   └── ElementError    exit 2   one element cannot be linearised at its operating point
├── EngineError         exit 3   ngspice answered, but not with a usable result
│   ├── EngineMissing   exit 3   the library is not there or is not ngspice
│   └── EngineTimeout   exit 3   the deadline passed and the worker was ended
└── NetworkError        exit 4   the rebuilt network has no solution: a fault of ours, never of the netlist
"""

from __future__ import annotations

from enum import IntEnum
from typing import NamedTuple


class ExitCode(IntEnum):
    """What the process tells its caller."""

    OK = 0
    CHECK_FAILED = 1
    UNUSABLE_INPUT = 2
    ENGINE_FAILED = 3
    INTERNAL = 4
    INTERRUPTED = 130


class TauledgerError(Exception):
    """Base of all expected failures; `exit_code` is what the command line returns for it."""

    exit_code: ExitCode = ExitCode.INTERNAL


class InputError(TauledgerError):
    """An option, a file or a request cannot be used.

    message: what is wrong, in the trade's words.
    hint: what would be right, or empty.
    """

    exit_code = ExitCode.UNUSABLE_INPUT

    def __init__(self, message: str, hint: str = "") -> None:
        super().__init__(message, hint)
        self.message = message
        self.hint = hint

    def __str__(self) -> str:
        return f"{self.message}\n  {self.hint}" if self.hint else self.message


class Diagnostic(NamedTuple):
    """One thing wrong with a netlist, where it stands, and what would be right.

    file: path as the user typed it. line, column: from 1. text: the physical line without its end.
    width: how many characters the caret underlines. context: lines such as "in X3 (board.cir:41)".
    """

    file: str
    line: int
    column: int
    text: str
    message: str
    hint: str = ""
    width: int = 1
    context: tuple[str, ...] = ()

    def __str__(self) -> str:
        caret = " " * (self.column - 1) + "^" * max(1, self.width)
        lines = [f"{self.file}:{self.line}:{self.column}: {self.message}", f"  {self.text.expandtabs(1)}", f"  {caret}"]
        if self.hint:
            lines.append(f"  {self.hint}")
        lines.extend(f"  {where}" for where in self.context)
        return "\n".join(lines)


class NetlistError(InputError):
    """The netlist cannot be used; `diagnostics` says where and why, in the order of the file."""

    def __init__(self, *diagnostics: Diagnostic) -> None:
        super().__init__("the netlist cannot be used")
        self.args = diagnostics
        self.diagnostics = diagnostics

    def __str__(self) -> str:
        return "\n".join(str(diagnostic) for diagnostic in self.diagnostics)


class ElementError(InputError):
    """One element cannot be linearised at its operating point; where the netlist is known it becomes a NetlistError.

    element: its name in the flat circuit. message, hint: as of InputError.
    """

    def __init__(self, element: str, message: str, hint: str = "") -> None:
        super().__init__(message, hint)
        self.args = (element, message, hint)
        self.element = element


class EngineError(TauledgerError):
    """ngspice gave no usable result.

    message: what happened. hint: what to do. engine_says: its own lines, translated to the user's names.
    """

    exit_code = ExitCode.ENGINE_FAILED

    def __init__(self, message: str, hint: str = "", engine_says: tuple[str, ...] = ()) -> None:
        super().__init__(message, hint, engine_says)
        self.message = message
        self.hint = hint
        self.engine_says = engine_says

    def __str__(self) -> str:
        lines = [self.message]
        if self.hint:
            lines.append(f"  {self.hint}")
        lines.extend(f"  ngspice: {line}" for line in self.engine_says)
        return "\n".join(lines)


class EngineMissing(EngineError):
    """The ngspice library is not installed, or the file found is not ngspice."""


class EngineTimeout(EngineError):
    """ngspice did not answer before the deadline; its process was ended."""


class NetworkError(TauledgerError):
    """The rebuilt network has no solution where one must exist."""
