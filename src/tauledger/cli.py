"""The command line: options → review → report. Only what `--help` needs is imported here."""

from __future__ import annotations

import math
import os
import re
import sys
import traceback
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING

import click

from tauledger import __version__
from tauledger.errors import ExitCode, InputError, NetlistError, NetworkError, TauledgerError

if TYPE_CHECKING:
    from tauledger.record import Review

_COLOR_CHOICES = ("auto", "always", "never")
_EXIT_CODES = (
    "Exit codes: 0 reviewed; 1 the rebuilt network and ngspice differ by more than 1e-3; 2 netlist or option cannot be "
    "used; 3 ngspice failed or is missing; 4 a fault of tauledger; 130 interrupted."
)
_PLEASE_REPORT = (
    "tauledger failed where it should not: this is a fault of the program, not of your netlist.\n"
    "Please report it with the lines above and, if you may share it, the netlist."
)


def main(arguments: list[str] | None = None) -> None:
    """Run the command line and leave with its exit code; None takes the arguments of the process."""
    # Small matrices gain nothing from a pool of threads, and its start-up costs more than the whole review.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    with _Unexpected():
        code = _outcome(arguments)
    sys.exit(code)


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, message="%(prog)s %(version)s")
def command() -> None:
    """Reconcile the hand analysis of a transistor amplifier with its SPICE simulation."""


@command.command("review", short_help="Review one netlist.", epilog=_EXIT_CODES)
@click.argument("netlist")
@click.option("--input", "drive", metavar="SRC", help="Drive source SRC with 1, all others with 0.")
@click.option("--output", metavar="V", help="Take the response at: out, 'v(a,b)' or 'i(vload)'.")
@click.option("--midband", metavar="HZ", help="Refer band edges to the gain at HZ, e.g. 10k.")
@click.option("--json", "json_file", metavar="FILE", help="Write the review as JSON; '-': alone on standard output.")
@click.option("--timeout", metavar="S", type=float, default=60.0, show_default=True, help="Seconds ngspice may take.")
@click.option("--library", metavar="PATH", help="Use this ngspice library.")
@click.option("--color", type=click.Choice(_COLOR_CHOICES), default="auto", show_default=True, help="Colour the text.")
@click.option("--verbose", is_flag=True, help="Show every node, part, pole and zero, and the working.")
def review_command(
    netlist: str,
    drive: str | None,
    output: str | None,
    midband: str | None,
    json_file: str | None,
    timeout: float,
    library: str | None,
    color: str,
    verbose: bool,
) -> ExitCode:
    """Review the amplifier in NETLIST: does paper agree with the simulation, where not, and why?"""
    if netlist == "-":
        raise InputError("the netlist must be a file", "files that it includes are looked up beside it")
    if not timeout > 0.0:
        raise InputError(f"--timeout {timeout:g}: no time to run in", "give seconds above 0, e.g. --timeout 60")
    midband_hz = None if midband is None else _hertz(midband)
    target = None if json_file in (None, "-") else _writable(Path(str(json_file)))

    from tauledger.engine.client import start_engine

    # ngspice comes up in its own process while the rest of this one is imported.
    with start_engine(library=library, timeout_s=timeout) as engine:
        from tauledger.pipeline import review

        found = review(netlist, engine=engine, drive=drive, output=output, midband_hz=midband_hz)
    if json_file is not None:
        from tauledger.report.json import to_json

        document = to_json(found)
        if target is None:
            _print(document)
            return _verdict(found)
        _write(target, document)

    from tauledger.report.terminal import render

    encoding = sys.stdout.encoding
    text = render(found, color=_colored(color), unicode=_can_show_symbols(encoding), verbose=verbose)
    _print(text.encode(encoding, errors="backslashreplace"))
    return _verdict(found)


def _verdict(found: Review) -> ExitCode:
    from tauledger.report.wording import network_rejected

    return ExitCode.CHECK_FAILED if network_rejected(found) else ExitCode.OK


def _hertz(text: str) -> float:
    from tauledger.netlist.numbers import read_number

    number = read_number(text.strip())
    if number is None or number.tail or not 0.0 <= number.value < math.inf:
        raise InputError(f"--midband {text}: not a frequency", "give hertz as a netlist would, e.g. 10k or 2.2meg")
    if re.fullmatch(r"[^a-zA-Z]*M(Hz)?", text.strip()):
        raise InputError(f"--midband {text}: M is milli in SPICE", "write 10meg for 10 MHz, or 10m for 10 mHz")
    return number.value


def _colored(choice: str) -> bool:
    """Let --color rule over NO_COLOR, that over FORCE_COLOR, and that over whether a terminal reads it."""
    if choice != "auto":
        return choice == "always"
    if os.environ.get("NO_COLOR"):
        return False
    if os.environ.get("FORCE_COLOR"):
        return True
    return sys.stdout.isatty() and os.environ.get("TERM") != "dumb"


def _can_show_symbols(encoding: str) -> bool:
    from tauledger.report.layout import SYMBOLS

    try:
        SYMBOLS.encode(encoding)
    except UnicodeEncodeError:
        return False
    return True


def _print(data: bytes) -> None:
    """Write to standard output; a reader that has gone away is no fault and gets no message."""
    try:
        sys.stdout.buffer.write(data)
        sys.stdout.flush()
    except BrokenPipeError:
        # The interpreter flushes once more when it ends; that must not fail either.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except OSError as error:
        raise InputError(f"standard output cannot be written: {error.strerror}") from error


def _writable(target: Path) -> Path:
    """Refuse a target that cannot be written before the review is made, not after."""
    if target.is_dir():
        raise InputError(f"--json {target}: this is a folder", "give the name of a file")
    if not target.absolute().parent.is_dir():
        raise InputError(f"--json {target}: there is no folder {target.parent}")
    return target


def _write(target: Path, document: bytes) -> None:
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
        raise InputError(f"--json {target}: cannot be written: {error.strerror}") from error


def _outcome(arguments: list[str] | None) -> int:
    """Run the command and turn expected failures into one message on standard error and their exit code."""
    try:
        code = command.main(arguments, prog_name="tauledger", standalone_mode=False)
    except click.exceptions.Abort:
        return ExitCode.INTERRUPTED
    except click.ClickException as error:
        error.show()
        return ExitCode.UNUSABLE_INPUT
    except NetlistError as error:
        click.echo(str(error), err=True)
        return error.exit_code
    except NetworkError as error:
        click.echo(f"tauledger: {error}\n{_PLEASE_REPORT}", err=True)
        return error.exit_code
    except TauledgerError as error:
        click.echo(f"tauledger: {error}", err=True)
        return error.exit_code
    return int(code or ExitCode.OK)


class _Unexpected:
    """Ends the process with a plain traceback and exit code 4 where something happens that nobody expected."""

    def __enter__(self) -> None:
        return None

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if error is None or isinstance(error, SystemExit):
            return
        if isinstance(error, KeyboardInterrupt):
            sys.exit(ExitCode.INTERRUPTED)
        traceback.print_exception(kind, error, trace)
        sys.stderr.write(f"\n{_PLEASE_REPORT}\n")
        sys.exit(ExitCode.INTERNAL)
