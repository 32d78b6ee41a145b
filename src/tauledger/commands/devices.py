"""`tauledger devices`: the transistors and diodes of one netlist at their operating point."""

from __future__ import annotations

import sys
from pathlib import Path

import click

from tauledger.commands.console import can_show_symbols, print_bytes, writable, write
from tauledger.errors import ExitCode, InputError


@click.command("devices", short_help="Show every transistor and diode at its operating point.")
@click.argument("netlist")
@click.option("--input", "drive", metavar="SRC", help="Drive source SRC with 1, all others with 0.")
@click.option("--output", metavar="V", help="Take the response at: out, 'v(a,b)' or 'i(vload)'.")
@click.option("--json", "json_file", metavar="FILE", help="Write the table as JSON; '-': alone on standard output.")
@click.option(
    "--set",
    "settings",
    metavar="NAME=VALUE",
    multiple=True,
    help="Set a .param, an element, model.parameter, X1.parameter or Q1.area.",
)
@click.option("--allow-include", "allow", metavar="DIR", multiple=True, help="Include files from DIR too; repeatable.")
@click.option("--timeout", metavar="S", type=float, default=60.0, show_default=True, help="Seconds ngspice may take.")
@click.option("--library", metavar="PATH", help="Use this ngspice library.")
def devices_command(
    netlist: str,
    drive: str | None,
    output: str | None,
    json_file: str | None,
    settings: tuple[str, ...],
    allow: tuple[str, ...],
    timeout: float,
    library: str | None,
) -> ExitCode:
    """Show bias, region and small-signal values of every transistor and diode in NETLIST, in textbook symbols."""
    if netlist == "-":
        raise InputError("the netlist must be a file", "files that it includes are looked up beside it")
    if not timeout > 0.0:
        raise InputError(f"--timeout {timeout:g}: no time to run in", "give seconds above 0, e.g. --timeout 60")
    target = None if json_file in (None, "-") else writable("--json", Path(str(json_file)))

    from tauledger.engine.client import start_engine

    with start_engine(library=library, timeout_s=timeout) as engine:
        from tauledger.pipeline import devices

        found = devices(netlist, engine=engine, drive=drive, output=output, settings=settings, allow=allow)

    from tauledger.report.devices import render, to_json

    if json_file is not None:
        if target is None:
            print_bytes(to_json(found))
            return ExitCode.OK
        write("--json", target, to_json(found))
    encoding = sys.stdout.encoding
    print_bytes(render(found, unicode=can_show_symbols(encoding)).encode(encoding, errors="backslashreplace"))
    return ExitCode.OK
