"""Reading the files of a netlist: the one place of this room that touches the file system.

Includes are read only under the netlist's own folder (symbolic links resolved), with limits on number, depth and size.
"""

from __future__ import annotations

import codecs
import hashlib
import os
from pathlib import Path

from msgspec import Struct, field
from msgspec.structs import replace

from tauledger.circuit import ReadingNote
from tauledger.errors import Diagnostic, InputError, NetlistError
from tauledger.netlist.diagnostics import Site, visible
from tauledger.netlist.items import Word
from tauledger.netlist.lines import assemble
from tauledger.netlist.netlist import Card, Netlist, SourceFile
from tauledger.netlist.structure import structure

MOST_BYTES = 32 * 1024 * 1024
MOST_FILES = 200
MOST_NESTED_INCLUDES = 12
INCLUDES = (".include", ".incl", ".inc")


class _Reading(Struct):
    """What has been gathered so far; filled while files are read, in the order in which they are read."""

    folder: Path
    files: list[SourceFile] = field(default_factory=list)
    cards: list[Card] = field(default_factory=list)
    scripts: list[tuple[str, ...]] = field(default_factory=list)
    faults: list[Diagnostic] = field(default_factory=list)
    notes: list[ReadingNote] = field(default_factory=list)
    digest: hashlib._Hash = field(default_factory=hashlib.sha256)
    size: int = 0


def read(path: str | Path) -> Netlist:
    """Read a netlist and all that it includes.

    Raises InputError where the file itself cannot be used (missing, not text, too large), NetlistError with up to 20
    diagnostics where its cards cannot.
    """
    typed = str(path)
    main = Path(typed)
    data = _content(main, visible(typed), MOST_BYTES)
    reading = _Reading(folder=main.resolve().parent)
    lines = _decoded(data, visible(typed))
    _take(reading, SourceFile(typed, lines), data, start=1, real=(main.resolve(),))
    netlist = structure(
        path=typed,
        title=_title(lines[0]),
        files=tuple(reading.files),
        cards=tuple(reading.cards),
        scripts=tuple(reading.scripts),
        faults=tuple(reading.faults),
    )
    return replace(netlist, sha256=reading.digest.hexdigest(), notes=tuple(reading.notes) + netlist.notes)


def _take(reading: _Reading, source: SourceFile, data: bytes, *, start: int, real: tuple[Path, ...]) -> None:
    """Take one file into the reading, and depth first the files that it includes. real: this file and its includers."""
    number = len(reading.files)
    reading.files.append(source)
    reading.digest.update(data)
    reading.size += len(data)
    assembled = assemble(source.lines, file=number, path=source.path, start=start)
    reading.scripts.extend(assembled.scripts)
    reading.faults.extend(assembled.faults)
    for card in assembled.cards:
        if card.text.split(maxsplit=1)[0].lower() not in INCLUDES:
            reading.cards.append(card)
            continue
        try:
            _include(reading, card, number, real)
        except NetlistError as error:
            reading.faults.extend(error.diagnostics)


def _include(reading: _Reading, card: Card, number: int, real: tuple[Path, ...]) -> None:
    site = Site(tuple(reading.files), card)
    name = _file_name(site)
    including = reading.files[number]
    target = Path(os.path.normpath(Path(including.path).parent / name.text))
    resolved = _resolved(site, name, target, real[-1].parent)
    if not resolved.is_relative_to(reading.folder):
        raise site.fault(
            name,
            "a file outside the netlist's own folder is not read",
            f"copy it under {visible(str(Path(reading.files[0].path).parent))}{os.sep} and include it from there",
        )
    if resolved in real:
        raise site.fault(name, "this file includes itself", "take the .include out")
    if len(real) > MOST_NESTED_INCLUDES:
        raise site.fault(name, f"includes are nested more than {MOST_NESTED_INCLUDES} deep")
    if len(reading.files) >= MOST_FILES:
        raise site.fault(name, f"the netlist includes more than {MOST_FILES} files")
    try:
        data = _content(resolved, visible(str(target)), MOST_BYTES - reading.size)
        lines = _decoded(data, visible(str(target)))
    except InputError as error:
        raise site.fault(name, error.message, error.hint) from error
    _note_the_other(reading, site, name, resolved)
    source = SourceFile(str(target), lines, number, card.pieces[0].line)
    _take(reading, source, data, start=0, real=(*real, resolved))


def _file_name(site: Site) -> Word:
    text = site.card.text
    directive = text.split(maxsplit=1)[0]
    rest = text[len(directive) :]
    start = len(directive) + len(rest) - len(rest.lstrip())
    name = rest.strip()
    if len(name) >= 2 and name[0] in "'\"" and name[-1] == name[0]:
        name, start = name[1:-1], start + 1
    if not name:
        raise site.fault(len(text), "the name of a file is missing", f'write {directive} "file"')
    return Word(name, start)


def _resolved(site: Site, name: Word, target: Path, folder: Path) -> Path:
    """Follow symbolic links; the folder of the including file is where a name begins."""
    try:
        return Path(os.path.normpath(folder / name.text)).resolve(strict=True)
    except (OSError, RuntimeError, ValueError) as error:
        raise site.fault(name, f"there is no file {visible(str(target))}") from error


def _note_the_other(reading: _Reading, site: Site, name: Word, resolved: Path) -> None:
    """Say so where ngspice, started in the current folder, would take a file of the same name from there."""
    other = Path.cwd() / name.text
    if other.is_file() and other.resolve() != resolved:
        reading.notes.append(
            ReadingNote(
                site.where,
                f"{visible(name.text)} is read from the folder of the file that includes it; "
                "ngspice would take the file of that name in the current folder",
            )
        )


def _content(path: Path, shown: str, limit: int) -> bytes:
    try:
        if not path.is_file():
            problem = "is not a file" if path.exists() else "does not exist"
            raise InputError(f"{shown} {problem}")
        with path.open("rb") as stream:
            data = stream.read(limit + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else "not a usable name"
        raise InputError(f"{shown} cannot be read: {reason}") from error
    if len(data) > limit:
        raise InputError(
            f"{shown} is too large", f"a netlist with its includes has at most {MOST_BYTES // 1024 // 1024} MiB"
        )
    return data


def _decoded(data: bytes, shown: str) -> tuple[str, ...]:
    """Decode as UTF-8, else Latin-1, and split at line feeds only: no other character ends a line."""
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        raise InputError(f"{shown} is UTF-16 text", "save it as UTF-8")
    if b"\0" in data:
        raise InputError(f"{shown} is not a text file", "a netlist is plain text")
    if not data.strip():
        raise InputError(f"{shown} is empty", "the first line is the title, then one card per line")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    return tuple(line.removesuffix("\r") for line in text.removesuffix("\n").split("\n"))


def _title(line: str) -> str:
    """The first line, whatever it looks like, without comment star or the word .title; safe to print."""
    text = line.strip()
    text = text[6:] if text[:6].lower() == ".title" else text.lstrip("*")
    return visible(text).replace("\t", " ").strip()
