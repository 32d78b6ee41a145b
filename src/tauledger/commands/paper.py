"""`tauledger paper`: an empty page for a netlist, to be filled with the figures from paper."""

from __future__ import annotations

from pathlib import Path

import click

from tauledger.commands.console import hertz, print_bytes, writable, write
from tauledger.errors import ExitCode, InputError


@click.command("paper", short_help="Write an empty page for figures from paper.")
@click.argument("netlist")
@click.option("--input", "drive", metavar="SRC", help="Drive source SRC with 1, all others with 0.")
@click.option("--output", metavar="V", help="Take the response at: out, 'v(a,b)' or 'i(vload)'.")
@click.option("--midband", metavar="HZ", help="Refer band edges to the gain at HZ, e.g. 10k.")
@click.option("--to", "target", metavar="FILE", help="Write to FILE instead of standard output.")
@click.option("--allow-include", "allow", metavar="DIR", multiple=True, help="Include files from DIR too; repeatable.")
@click.option("--timeout", metavar="S", type=float, default=60.0, show_default=True, help="Seconds ngspice may take.")
@click.option("--library", metavar="PATH", help="Use this ngspice library.")
def paper_command(
    netlist: str,
    drive: str | None,
    output: str | None,
    midband: str | None,
    target: str | None,
    allow: tuple[str, ...],
    timeout: float,
    library: str | None,
) -> ExitCode:
    """Write a page for the amplifier in NETLIST that has a line for every figure `review --paper` can check."""
    if netlist == "-":
        raise InputError("the netlist must be a file", "files that it includes are looked up beside it")
    if not timeout > 0.0:
        raise InputError(f"--timeout {timeout:g}: no time to run in", "give seconds above 0, e.g. --timeout 60")
    midband_hz = None if midband is None else hertz("--midband", midband)
    file = None if target is None else writable("--to", Path(target))
    if file is not None and file.exists():
        raise InputError(f"--to {target}: is there already", "a page may hold somebody's work; give another name")

    from tauledger.engine.client import start_engine

    with start_engine(library=library, timeout_s=timeout) as engine:
        from tauledger.pipeline import page_for

        text = page_for(
            netlist,
            page=target or "page.toml",
            engine=engine,
            drive=drive,
            output=output,
            midband_hz=midband_hz,
            allow=allow,
        )
    document = text.encode("utf-8")
    if file is None:
        print_bytes(document)
    else:
        write("--to", file, document)
    return ExitCode.OK
