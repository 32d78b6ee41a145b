"""What the commands share: numbers as options, colour, standard output, files written whole."""

from __future__ import annotations

import math
import os
import re
import shutil
import sys
from pathlib import Path

from tauledger.errors import InputError

NARROWEST, WIDEST = 40, 80


def hertz(option: str, text: str) -> float:
    """Read a frequency in Hz as a netlist writes it, e.g. 10k.

    Raises InputError where it is none, and for M, which is milli in SPICE.
    """
    from tauledger.netlist.numbers import read_number

    number = read_number(text.strip())
    if number is None or number.tail or not 0.0 <= number.value < math.inf:
        raise InputError(f"{option} {text}: not a frequency", "give hertz as a netlist would, e.g. 10k or 2.2meg")
    if re.fullmatch(r"[^a-zA-Z]*M(Hz)?", text.strip()):
        raise InputError(f"{option} {text}: M is milli in SPICE", "write 10meg for 10 MHz, or 10m for 10 mHz")
    return number.value


def colored(choice: str) -> bool:
    """Let --color rule over NO_COLOR, that over FORCE_COLOR, and that over whether a terminal reads it."""
    if choice != "auto":
        return choice == "always"
    if os.environ.get("NO_COLOR"):
        return False
    if os.environ.get("FORCE_COLOR"):
        return True
    return sys.stdout.isatty() and os.environ.get("TERM") != "dumb"


def page_width() -> int:
    """Give the columns of the page: those of the terminal or of $COLUMNS between 40 and 80, 80 where neither tells."""
    return min(max(shutil.get_terminal_size((WIDEST, 24)).columns, NARROWEST), WIDEST)


def can_show_symbols(encoding: str) -> bool:
    """Whether an encoding has µ, Ω, π and their like."""
    from tauledger.report.layout import SYMBOLS

    try:
        SYMBOLS.encode(encoding)
    except UnicodeEncodeError:
        return False
    return True


def print_bytes(data: bytes) -> None:
    """Write to standard output; a reader that has gone away is no fault and gets no message."""
    try:
        sys.stdout.buffer.write(data)
        sys.stdout.flush()
    except BrokenPipeError:
        # The interpreter flushes once more when it ends; that must not fail either.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except OSError as error:
        raise InputError(f"standard output cannot be written: {error.strerror}") from error


def writable(option: str, target: Path) -> Path:
    """Refuse a target that cannot be written before the review is made, not after."""
    if target.is_dir():
        raise InputError(f"{option} {target}: this is a folder", "give the name of a file")
    if not target.absolute().parent.is_dir():
        raise InputError(f"{option} {target}: there is no folder {target.parent}")
    return target


def write(option: str, target: Path, document: bytes) -> None:
    """Write beside the target and rename, so that nobody ever reads half a document; a pipe or device directly."""
    place = target.resolve()
    try:
        if place.exists() and not place.is_file():
            place.write_bytes(document)
            return
        beside = place.with_name(f".{place.name}.{os.getpid()}.part")
        try:
            beside.write_bytes(document)
            beside.replace(place)
        finally:
            beside.unlink(missing_ok=True)
    except OSError as error:
        raise InputError(f"{option} {target}: cannot be written: {error.strerror}") from error
