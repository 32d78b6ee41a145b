"""What `--report` asks for: files by their ending, or a folder with one page per netlist and an index."""

from __future__ import annotations

import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tauledger.commands.console import print_bytes, writable, write
from tauledger.errors import ExitCode, InputError, NetlistError, TauledgerError
from tauledger.report.progress import progress

if TYPE_CHECKING:
    from tauledger.asked import Asked
    from tauledger.record import Review
    from tauledger.report.index import Entry

OPTION = "--report"
FORMATS = (".html", ".md", ".csv")


def report_files(wanted: Sequence[str], *, netlists: int) -> tuple[list[Path], Path | None]:
    """Sort what the option names into files and at most one folder, and refuse what cannot be written.

    Raises InputError for an unknown ending, for a second folder, and for a file where there are several netlists.
    """
    files, folders = [], []
    for name in wanted:
        target = Path(name)
        if name.endswith(("/", "\\")) or target.is_dir():
            folders.append(target)
        elif target.suffix.lower() not in FORMATS:
            hint = f"end it with {', '.join(FORMATS)}, or with / for a folder; for PDF, print the HTML from a browser"
            raise InputError(f"{OPTION} {name}: no such format", hint)
        else:
            files.append(writable(OPTION, target))
    if len(folders) > 1:
        raise InputError(f"{OPTION} {folders[1]}: one folder takes all the reports", "name only one")
    if files and netlists > 1:
        raise InputError(
            f"{OPTION} {files[0]}: {netlists} netlists do not fit into one file", f"name a folder: {OPTION} reports/"
        )
    folder = folders[0] if folders else None
    if folder is not None:
        _make(folder)
    return files, folder


def for_formats(asked: Asked, json_file: str | None, files: Sequence[Path], folder: Path | None) -> Asked:
    """Add what only the page and JSON can show, where one of them is wanted."""
    if json_file is None and folder is None and all(file.suffix.lower() != ".html" for file in files):
        return asked
    from msgspec.structs import replace

    return replace(asked, miller=True)


def write_report(target: Path, found: Review, tell: Callable[[str], None]) -> None:
    """Write a review in the format that the ending names."""
    write(OPTION, target, _document(target.suffix.lower(), found, tell))


def review_each(
    netlists: Sequence[str],
    folder: Path | None,
    *,
    one: Callable[[str], Review],
    show: Callable[[Review], None],
    verdict: Callable[[Review], ExitCode],
) -> ExitCode:
    """Review several netlists: their pages into the folder with an index, or each shown one after the other.

    one: reviews a netlist. show: prints a review. verdict: the exit code of a review. A netlist that cannot be reviewed
    gets its message, and the others are reviewed all the same; the exit code is the highest of all.
    """
    from tauledger.report.index import Entry, file_names

    entries = []
    worst = ExitCode.OK
    for netlist, file in zip(netlists, file_names(netlists), strict=True):
        try:
            with progress(sys.stderr) as tell:
                tell(f"reviewing {netlist}")
                found = one(netlist)
                if folder is not None:
                    write_report(folder / file, found, tell)
        except TauledgerError as error:
            click.echo(str(error) if isinstance(error, NetlistError) else f"tauledger: {error}", err=True)
            entries.append(Entry(netlist, file, None, str(error)))
            worst = max(worst, error.exit_code)
            continue
        entries.append(Entry(netlist, file, found))
        worst = max(worst, verdict(found))
        if folder is None:
            show(found)
        else:
            _say(f"{netlist}: {folder / file}")
    if folder is not None:
        _write_index(folder, entries)
    return worst


def _write_index(folder: Path, entries: Sequence[Entry]) -> None:
    from tauledger.report.index import INDEX, to_index

    write(OPTION, folder / INDEX, to_index(entries))
    _say(f"index: {folder / INDEX}")


def _say(line: str) -> None:
    print_bytes(f"{line}\n".encode(sys.stdout.encoding, errors="backslashreplace"))


def _document(suffix: str, found: Review, tell: Callable[[str], None]) -> bytes:
    if suffix == ".html":
        from tauledger.report.html import to_html

        return to_html(found, tell=tell)
    if suffix == ".md":
        from tauledger.report.markdown import to_markdown

        return to_markdown(found)
    from tauledger.report.csv import to_csv

    return to_csv(found)


def _make(folder: Path) -> None:
    try:
        folder.mkdir(exist_ok=True)
    except FileNotFoundError as error:
        raise InputError(f"{OPTION} {folder}/: there is no folder {folder.parent}") from error
    except OSError as error:
        raise InputError(f"{OPTION} {folder}/: the folder cannot be made: {error.strerror}") from error
