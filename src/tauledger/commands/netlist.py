"""`tauledger netlist`: what was understood of a netlist, as a clean flat deck, as a tree, or name by name."""

from __future__ import annotations

import sys
from pathlib import Path

import click

from tauledger.commands.console import print_bytes, writable, write
from tauledger.errors import ExitCode, InputError


@click.command("netlist", short_help="Show what was understood of a netlist.")
@click.argument("netlist")
@click.option("--hierarchy", "tree", is_flag=True, help="Show the tree of instances with counts of elements.")
@click.option(
    "--origin", metavar="NAME", help="Tell where an element, model or parameter stands and how its value came."
)
@click.option("--output", metavar="FILE", help="Write to FILE instead of standard output.")
@click.option(
    "--set",
    "settings",
    metavar="NAME=VALUE",
    multiple=True,
    help="Set a .param, an element, model.parameter, X1.parameter or Q1.area.",
)
@click.option("--allow-include", "allow", metavar="DIR", multiple=True, help="Include files from DIR too; repeatable.")
@click.option("--verbose", is_flag=True, help="List what was read past.")
def netlist_command(
    netlist: str,
    tree: bool,
    origin: str | None,
    output: str | None,
    settings: tuple[str, ...],
    allow: tuple[str, ...],
    verbose: bool,
) -> ExitCode:
    """Write NETLIST as a flat SPICE deck that ngspice reads to the same operating point and AC response.

    Elements, nodes and models inside instances keep their hierarchical names. Notes on how the netlist was read go to
    standard error. Nothing is simulated.
    """
    if netlist == "-":
        raise InputError("the netlist must be a file", "files that it includes are looked up beside it")
    if tree and origin is not None:
        raise InputError("--hierarchy and --origin: one at a time", "run once for each")
    target = None if output in (None, "-") else writable("--output", Path(str(output)))

    from tauledger.netlist import read
    from tauledger.netlist.elaborate import elaborated
    from tauledger.netlist.settings import change_of

    found = read(netlist, allow=allow)
    understood = elaborated(found, change_of(found, settings), purpose="reading")
    if tree:
        from tauledger.netlist.hierarchy import hierarchy

        text = hierarchy(found, understood.circuit)
    elif origin is not None:
        from tauledger.netlist.origin import origin as told

        text = told(found, understood, origin)
    else:
        from tauledger.netlist.writer import flat_netlist

        text = flat_netlist(understood.circuit)
    for note in understood.circuit.notes:
        click.echo(f"{note.where}: note: {note.says}", err=True)
    if verbose:
        from tauledger.netlist.hints import read_past_places

        for where, what in read_past_places(found):
            click.echo(f"{where}: read past: {what}", err=True)
    if target is None:
        print_bytes(text.encode(sys.stdout.encoding, errors="backslashreplace"))
    else:
        write("--output", target, text.encode("utf-8"))
    return ExitCode.OK
