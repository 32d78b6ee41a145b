"""The command line: commands, and what becomes of their failures. Only what `--help` needs is imported here."""

from __future__ import annotations

import os
import sys
import traceback
from types import TracebackType

import click

from tauledger import __version__
from tauledger.commands.devices import devices_command
from tauledger.commands.methods import methods_command
from tauledger.commands.netlist import netlist_command
from tauledger.commands.paper import paper_command
from tauledger.commands.review import review_command
from tauledger.errors import ExitCode, NetlistError, NetworkError, TauledgerError

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


command.add_command(review_command)
command.add_command(methods_command)
command.add_command(devices_command)
command.add_command(netlist_command)
command.add_command(paper_command)


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
