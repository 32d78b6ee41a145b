"""`tauledger review`: one netlist, reviewed."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tauledger.commands.console import can_show_symbols, colored, hertz, page_width, print_bytes, writable, write
from tauledger.commands.questions import questions
from tauledger.commands.reports import for_formats, report_files, review_each, write_report
from tauledger.errors import ExitCode, InputError
from tauledger.report.progress import progress

if TYPE_CHECKING:
    from tauledger.asked import Asked
    from tauledger.paper.page import Page
    from tauledger.record import NodeRow, Review

_COLOR_CHOICES = ("auto", "always", "never")
_EXIT_CODES = (
    "Exit codes: 0 reviewed; 1 the rebuilt network and ngspice differ by more than 1e-3; 2 netlist or option cannot be "
    "used; 3 ngspice failed or is missing; 4 a fault of tauledger; 130 interrupted."
)


@click.command("review", short_help="Review one netlist, or several.", epilog=_EXIT_CODES)
@click.argument("netlists", metavar="NETLIST...", nargs=-1, required=True)
@click.option("--input", "drive", metavar="SRC", help="Drive source SRC with 1, or a pair VP,VN in opposite phase.")
@click.option(
    "--output",
    "outputs",
    metavar="V",
    multiple=True,
    help="Take the response at: out, 'v(a,b)' or 'i(vload)'; further ones get a row each.",
)
@click.option("--midband", metavar="HZ", help="Refer band edges to the gain at HZ, e.g. 10k.")
@click.option("--json", "json_file", metavar="FILE", help="Write the review as JSON; '-': alone on standard output.")
@click.option("--report", metavar="FILE", multiple=True, help="Write .html, .md or .csv; folder/: a page per netlist.")
@click.option("--timeout", metavar="S", type=float, default=60.0, show_default=True, help="Seconds ngspice may take.")
@click.option("--library", metavar="PATH", help="Use this ngspice library.")
@click.option("--color", type=click.Choice(_COLOR_CHOICES), default="auto", show_default=True, help="Colour the text.")
@click.option("--paper", metavar="PAGE", help="Set your own figures in PAGE (TOML) beside hand and exact.")
@click.option("--working", metavar="NODE", multiple=True, help="Work a signal node out, line by line; repeatable.")
@click.option(
    "--set",
    "settings",
    metavar="NAME=VALUE",
    multiple=True,
    help="Set a .param, an element, model.parameter, X1.parameter or Q1.area.",
)
@click.option("--add", metavar="NODE=R,C", multiple=True, help="Add a probe to ground: out=12p, out=10meg,12p.")
@click.option("--allow-include", "allow", metavar="DIR", multiple=True, help="Include files from DIR too; repeatable.")
@click.option("--fold", metavar="INSTANCE", multiple=True, help="Show a subcircuit instance as one part; none: no one.")
@questions
@click.option("--verbose", is_flag=True, help="Show every node, part, pole and zero, and the working.")
def review_command(
    netlists: tuple[str, ...],
    drive: str | None,
    outputs: tuple[str, ...],
    midband: str | None,
    json_file: str | None,
    report: tuple[str, ...],
    timeout: float,
    library: str | None,
    color: str,
    paper: str | None,
    working: tuple[str, ...],
    settings: tuple[str, ...],
    add: tuple[str, ...],
    allow: tuple[str, ...],
    fold: tuple[str, ...],
    verbose: bool,
    asked: Asked,
) -> ExitCode:
    """Review the amplifier in NETLIST: does paper agree with the simulation, where not, and why?"""
    from msgspec.structs import replace

    if "-" in netlists:
        raise InputError("the netlist must be a file", "files that it includes are looked up beside it")
    if not timeout > 0.0:
        raise InputError(f"--timeout {timeout:g}: no time to run in", "give seconds above 0, e.g. --timeout 60")
    midband_hz = None if midband is None else hertz("--midband", midband)
    if json_file is not None and len(netlists) > 1:
        raise InputError(f"--json {json_file}: one document holds one review", "give one netlist")
    if paper is not None and len(netlists) > 1:
        raise InputError(f"--paper {paper}: one page is for one netlist", "give one netlist")
    if asked.curve is not None and len(netlists) > 1:
        raise InputError(f"--curve {asked.curve.path}: one curve is for one netlist", "give one netlist")
    asked = replace(asked, outputs=outputs[1:])
    page = None if paper is None else _page(paper)
    target = None if json_file in (None, "-") else writable("--json", Path(str(json_file)))
    files, folder = report_files(report, netlists=len(netlists)) if report else ([], None)
    asked = for_formats(asked, json_file, files, folder)

    def one(netlist: str) -> Review:
        from tauledger.engine.client import start_engine

        # ngspice comes up in its own process while the rest of this one is imported.
        with start_engine(library=library, timeout_s=timeout) as engine:
            from tauledger.pipeline import review

            return review(
                netlist,
                engine=engine,
                drive=drive,
                output=outputs[0] if outputs else None,
                midband_hz=midband_hz,
                page=page,
                settings=settings,
                add=add,
                allow=allow,
                fold=fold,
                asked=asked,
            )

    def show(found: Review) -> None:
        from tauledger.report.terminal import render

        encoding = sys.stdout.encoding
        text = render(
            found,
            color=colored(color),
            unicode=can_show_symbols(encoding),
            width=page_width(),
            verbose=verbose,
            working=_nodes(found, working),
        )
        print_bytes(text.encode(encoding, errors="backslashreplace"))

    if len(netlists) > 1 or folder is not None:
        return review_each(netlists, folder, one=one, show=show, verdict=_verdict)
    with progress(sys.stderr) as tell:
        tell(f"reviewing {netlists[0]}")
        found = one(netlists[0])
        for file in files:
            write_report(file, found, tell)
    if json_file is not None:
        from tauledger.report.json import to_json

        document = to_json(found)
        if target is None:
            print_bytes(document)
            return _verdict(found)
        write("--json", target, document)
    show(found)
    return _verdict(found)


def _page(paper: str) -> Page:
    from tauledger.paper.page import read_page

    try:
        text = Path(paper).read_bytes().decode("utf-8")
    except OSError as error:
        raise InputError(
            f"--paper {paper}: cannot be read: {error.strerror}", "`tauledger paper` writes one"
        ) from error
    except UnicodeDecodeError as error:
        raise InputError(f"--paper {paper}: is not UTF-8 text", "save the page as UTF-8") from error
    return read_page(text, paper)


def _nodes(found: Review, working: tuple[str, ...]) -> list[NodeRow]:
    from tauledger.report.working import find_nodes

    nodes: list[NodeRow] = []
    for wanted in working:
        named = find_nodes(found, wanted)
        if not named:
            there = ", ".join(node.name for node in found.nodes) or "none: the notes say why"
            raise InputError(f"--working {wanted}: no signal node of that name", f"signal nodes here: {there}")
        nodes += [node for node in named if node not in nodes]
    return nodes


def _verdict(found: Review) -> ExitCode:
    from tauledger.report.wording import network_rejected

    return ExitCode.CHECK_FAILED if network_rejected(found) else ExitCode.OK
