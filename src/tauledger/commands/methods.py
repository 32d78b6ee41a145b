"""`tauledger methods`: the rules and methods of the hand side, each with formula, validity and source."""

from __future__ import annotations

import sys

import click

from tauledger.commands.console import can_show_symbols, print_bytes
from tauledger.errors import ExitCode


@click.command("methods", short_help="List the rules and methods of the hand analysis.")
def methods_command() -> ExitCode:
    """List every looking-in rule and every method for a band edge with its formula, where it holds, and its source."""
    from tauledger.hand.catalogue import entries
    from tauledger.report.layout import HEADING, STRONG, Block, Prose, Section, lay_out

    sections: list[Section] = []
    group = ""
    for entry in entries():
        blocks: list[Block] = []
        if entry.group != group:
            group = entry.group
            blocks.append(Prose(group.upper(), style=HEADING))
        blocks += [
            Prose(entry.name, style=STRONG),
            Prose(entry.formula, lead="  "),
            *([Prose(entry.short, lead="  short   ")] if entry.short else []),
            Prose(entry.valid, lead="  holds   "),
            Prose(entry.source, lead="  source  "),
        ]
        sections.append(Section(tuple(blocks)))
    encoding = sys.stdout.encoding
    lines = lay_out(sections, width=80, unicode=can_show_symbols(encoding), page=len(sections) * 8)
    print_bytes("".join(f"{line.text}\n" for line in lines).encode(encoding, errors="backslashreplace"))
    return ExitCode.OK
