"""Reading the files of a netlist: the one place of this room that touches the file system.

Includes are read only under the netlist's own folder and folders that the user allows (symbolic links resolved), with
limits on number, depth and size.
"""

from __future__ import annotations

import codecs
import hashlib
import os
from collections.abc import Sequence
from pathlib import Path

from msgspec import Struct, field
from msgspec.structs import replace

from tauledger.circuit import ReadingNote, fold
from tauledger.errors import Diagnostic, InputError, NetlistError
from tauledger.netlist.diagnostics import Site, visible
from tauledger.netlist.items import Word
from tauledger.netlist.lines import assemble
from tauledger.netlist.netlist import Card, Netlist, Script, SourceFile
from tauledger.netlist.runs import Run
from tauledger.netlist.sections import Call, library_call, no_such_section, take, words_behind
from tauledger.netlist.structure import structure

MOST_BYTES = 32 * 1024 * 1024
MOST_FILES = 200
MOST_NESTED_INCLUDES = 12
INCLUDES = (".include", ".incl", ".inc")


class _Reading(Struct):
    """What has been gathered so far; filled while files are read, in the order in which they are read."""

    folder: Path
    allowed: tuple[Path, ...] = ()
    files: list[SourceFile] = field(default_factory=list)
    cards: list[Card | Run] = field(default_factory=list)
    scripts: list[Script] = field(default_factory=list)
    faults: list[Diagnostic] = field(default_factory=list)
    notes: list[ReadingNote] = field(default_factory=list)
    digest: hashlib._Hash = field(default_factory=hashlib.sha256)
    size: int = 0


def read(path: str | Path, *, allow: Sequence[str | Path] = ()) -> Netlist:
    """Read a netlist and all that it includes.

    allow: folders beside the netlist's own from which files may be included.
    Raises InputError where the file itself cannot be used (missing, not text, too large) or a folder does not exist,
    NetlistError with up to 20 diagnostics where its cards cannot.
    """
    typed = str(path)
    main = Path(typed)
    data = _content(main, visible(typed), MOST_BYTES)
    reading = _Reading(folder=main.resolve().parent, allowed=tuple(map(_folder, allow)))
    text = _decoded(data, visible(typed))
    _take(reading, SourceFile(typed, text), data, start=1, above=((main.resolve(), ""),), section=None)
    netlist = structure(
        path=typed,
        title=_title(text.partition("\n")[0]),
        files=tuple(reading.files),
        cards=tuple(reading.cards),
        scripts=tuple(reading.scripts),
        faults=tuple(reading.faults),
    )
    return replace(netlist, sha256=reading.digest.hexdigest(), notes=tuple(reading.notes) + netlist.notes)


def _folder(path: str | Path) -> Path:
    folder = Path(path)
    if not folder.is_dir():
        raise InputError(f"{visible(str(path))} is not a folder", "files may be included from folders only")
    return folder.resolve()


def _take(
    reading: _Reading,
    source: SourceFile,
    data: bytes,
    *,
    start: int,
    above: tuple[tuple[Path, str], ...],
    section: Call | None,
) -> tuple[str, ...] | None:
    """Take one file into the reading, and depth first the files that it includes.

    above: this file and its includers, each with the section of it that is being read. section: which to take, None for
    what stands outside of sections. Gives the names of its sections where it does not have that one.
    """
    number = len(reading.files)
    reading.files.append(source)
    reading.digest.update(data)
    reading.size += len(data)
    assembled = assemble(source.text, file=number, path=source.path, start=start)
    taken = take(tuple(reading.files), assembled.cards, section.section.text if section else None)
    if taken.missing is not None:
        return taken.missing
    reading.scripts.extend(assembled.scripts)
    reading.faults.extend(assembled.faults)
    reading.faults.extend(taken.faults)
    for card in taken.cards:
        if isinstance(card, Run):
            reading.cards.append(card)
            continue
        call = library_call(card)
        if call is None and card.text.split(maxsplit=1)[0].lower() not in INCLUDES:
            reading.cards.append(card)
            continue
        try:
            _include(reading, card, number, above, call)
        except NetlistError as error:
            reading.faults.extend(error.diagnostics)
    return None


def _include(
    reading: _Reading, card: Card, number: int, above: tuple[tuple[Path, str], ...], call: Call | None
) -> None:
    site = Site(tuple(reading.files), card)
    name = call.file if call else _file_name(site)
    target, resolved = _found(reading, site, name, number, above[-1][0].parent)
    if not any(resolved.is_relative_to(folder) for folder in (reading.folder, *reading.allowed)):
        raise site.fault(
            name,
            "a file outside the netlist's own folder is not read",
            f"copy it under {visible(str(Path(reading.files[0].path).parent))}{os.sep}, "
            "or allow its folder with --allow-include",
        )
    key = (resolved, fold(call.section.text) if call else "")
    if key in above:
        raise site.fault(name, "this file includes itself", "take the .include out")
    if len(above) > MOST_NESTED_INCLUDES:
        raise site.fault(name, f"includes are nested more than {MOST_NESTED_INCLUDES} deep")
    if len(reading.files) >= MOST_FILES:
        raise site.fault(name, f"the netlist includes more than {MOST_FILES} files")
    try:
        data = _content(resolved, visible(target), MOST_BYTES - reading.size)
        text = _decoded(data, visible(target))
    except InputError as error:
        raise site.fault(name, error.message, error.hint) from error
    source = SourceFile(target, text, number, card.pieces[0].line)
    missing = _take(reading, source, data, start=0, above=(*above, key), section=call)
    if missing is not None:
        assert call is not None
        raise no_such_section(Site(tuple(reading.files), card), call, missing)


def _file_name(site: Site) -> Word:
    text = site.card.text
    directive = text.split(maxsplit=1)[0]
    words = words_behind(text)
    if not words or not words[0].text:
        raise site.fault(len(text), "the name of a file is missing", f'write {directive} "file"')
    if len(words) > 1:
        raise site.fault(words[1], "this is one too many", f'a name with blanks stands in quotes: {directive} "file"')
    return words[0]


def _found(reading: _Reading, site: Site, name: Word, number: int, folder: Path) -> tuple[str, Path]:
    """Find a file beside the one that includes it, else beside the netlist; give its name as typed and resolved."""
    spelt = name.text
    if spelt.startswith("~"):
        spelt = os.path.expanduser(spelt)  # noqa: PTH111 - Path.expanduser raises where there is no home
    places = [(Path(reading.files[number].path).parent, folder)]
    if folder != reading.folder:
        places.append((Path(reading.files[0].path).parent, reading.folder))
    found: list[tuple[str, Path]] = []
    for typed, real in places:
        resolved = _resolved(real / spelt)
        if resolved is not None:
            found.append((os.path.normpath(typed / spelt), resolved))
    if not found:
        shown = visible(os.path.normpath(places[0][0] / spelt))
        raise site.fault(name, f"there is no file {shown}")
    here = _resolved(Path.cwd() / spelt)
    others = [resolved for _, resolved in found[1:]] + ([here] if here is not None and here.is_file() else [])
    if any(other != found[0][1] for other in others):
        reading.notes.append(
            ReadingNote(
                site.where,
                f"{visible(name.text)} is read from the folder of the file that includes it; "
                "ngspice takes a file of that name in the folder in which it is started, if there is one",
            )
        )
    return found[0]


def _resolved(path: Path) -> Path | None:
    """Follow symbolic links; None where there is no such file."""
    try:
        return Path(os.path.normpath(path)).resolve(strict=True)
    except (OSError, RuntimeError, ValueError):
        return None


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


def _decoded(data: bytes, shown: str) -> str:
    """Decode as UTF-8, else Latin-1; line feeds end the lines, alone or behind a carriage return, and nothing else."""
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        raise InputError(f"{shown} is UTF-16 text", "save it as UTF-8")
    if b"\0" in data:
        raise InputError(f"{shown} is not a text file", "a netlist is plain text")
    if not data.strip():
        raise InputError(f"{shown} is empty", "the first line is the title, then one card per line")
    data = data.removeprefix(codecs.BOM_UTF8)
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    return text.removesuffix("\n").replace("\r\n", "\n").removesuffix("\r")


def _title(line: str) -> str:
    """The first line, whatever it looks like, without comment star or the word .title; safe to print."""
    text = line.strip()
    text = text[6:] if text[:6].lower() == ".title" else text.lstrip("*")
    return visible(text).replace("\t", " ").strip()
