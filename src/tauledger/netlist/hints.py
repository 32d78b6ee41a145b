"""What analyses, outputs and `.control` blocks say about range and output; they are never run."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

from msgspec import Struct

from tauledger.circuit import ReadingNote
from tauledger.netlist.diagnostics import Site, nearest, visible
from tauledger.netlist.netlist import Card, Netlist, place
from tauledger.netlist.numbers import read_number

_REQUEST = re.compile(r"(?<![\w.])([vi])(?:db|m|p|r|i)?\s*\(\s*([^()\s,]+)\s*(?:,\s*([^()\s,]+)\s*)?\)", re.IGNORECASE)
_OF_AC = re.compile(r"(?<![\w.])[vi](?:db|m|p|r|i)\s*\(|(?<![\w.])(?:db|mag|ph|cph)\s*\(", re.IGNORECASE)
_OUTPUT_WORDS = frozenset(
    [".print", ".plot", ".save", ".probe", ".meas", ".measure", "print", "plot", "meas", "measure", "save", "hardcopy"]
)
_SWEEPS = ("dec", "oct", "lin")
_OTHER_ANALYSES = frozenset(["tran", "dc", "op", "noise", "disto", "sp"])


class Hints(Struct, frozen=True):
    """outputs: "v(out)", "v(a,b)", "i(vload)" in order, each once; those asked of an AC analysis where there are any.

    f_start_hz, f_stop_hz: range of the first `.ac` (or `ac` in a `.control` block), None where there is none.
    """

    outputs: tuple[str, ...] = ()
    f_start_hz: float | None = None
    f_stop_hz: float | None = None


class Asked(Struct, frozen=True):
    """One output that a card asks for: "v(out)", its card, where on it, how wide, and the card's word.

    rank: 0 where it is asked of an AC analysis, 1 of none in particular, 2 of another one.
    """

    name: str
    site: Site
    at: int
    width: int
    word: str
    rank: int


def hints(netlist: Netlist) -> Hints:
    """Gather the hints of a netlist."""
    spans = (_range(words) for _, words in _requests(netlist) if words[0] in (".ac", "ac"))
    span = next((span for span in spans if span is not None), (None, None))
    return Hints(tuple(dict.fromkeys(found.name for found in foremost(asked(netlist)))), *span)


def asked(netlist: Netlist) -> tuple[Asked, ...]:
    """Gather the outputs that are asked for, in order, with their places."""
    found: list[Asked] = []
    for card, words in _requests(netlist):
        if words[0] not in _OUTPUT_WORDS:
            continue
        rank, site = _rank(card.text, words), Site(netlist.files, card)
        for match in _REQUEST.finditer(card.text):
            kind, plus, minus = match.groups()
            name = f"{kind.lower()}({plus},{minus})" if minus else f"{kind.lower()}({plus})"
            found.append(Asked(name, site, match.start(), match.end() - match.start(), words[0], rank))
    return tuple(found)


def foremost(found: Sequence[Asked]) -> tuple[Asked, ...]:
    """Keep those of the foremost rank: of an AC analysis where there are any."""
    first = min((one.rank for one in found), default=0)
    return tuple(one for one in found if one.rank == first)


def sweep_notes(netlist: Netlist) -> list[ReadingNote]:
    """Note every `.ac` whose points are spread by a word that ngspice does not know."""
    notes: list[ReadingNote] = []
    for card, words in _requests(netlist):
        if words[0] in (".ac", "ac") and len(words) > 1 and words[1] not in _SWEEPS:
            meant = nearest(words[1], _SWEEPS, otherwise="ngspice knows dec, oct and lin")
            notes.append(ReadingNote(Site(netlist.files, card).where, f"{words[0]} {visible(words[1])}: {meant}"))
    return notes


def _requests(netlist: Netlist) -> Iterator[tuple[Card, list[str]]]:
    """Run through the requests with their words in lower case; a line of blanks is none."""
    for card in netlist.requests:
        words = card.text.lower().split()
        if words:
            yield card, words


def ac_range(netlist: Netlist) -> tuple[float, float] | None:
    """Give start and stop in Hz of the netlist's own AC analysis, or None where it has none."""
    found = hints(netlist)
    if found.f_start_hz is None or found.f_stop_hz is None:
        return None
    return (found.f_start_hz, found.f_stop_hz)


def _rank(text: str, words: list[str]) -> int:
    """Order requests: of an AC analysis first, of no analysis in particular next, of another one last."""
    of = words[1] if len(words) > 1 else ""
    if of == "ac" or _OF_AC.search(text):
        return 0
    return 2 if of in _OTHER_ANALYSES else 1


def _range(words: list[str]) -> tuple[float, float] | None:
    """Read `ac dec points start stop`; anything else is no hint."""
    if len(words) < 5:
        return None
    start, stop = read_number(words[3]), read_number(words[4])
    if start is None or stop is None or not 0.0 < start.value <= stop.value < float("inf"):
        return None
    return (start.value, stop.value)


def read_past(netlist: Netlist) -> str:
    """Say in one line what was read past, e.g. "2 analyses, 1 .print, .control block of 5 lines, 3 options"."""
    plural = {"analysis": "analyses", "noise switch": "noise switches"}
    words = []
    for what, count in sorted(netlist.past, key=lambda entry: _place_in_line(entry[0])):
        if what.startswith(".control"):
            words.append(what if count == 1 else f"{count} × {what}")
        elif count:
            many = plural.get(what, what if what.startswith(".") else f"{what}s")
            words.append(f"{count} {what if count == 1 else many}")
    return ", ".join(words)


def read_past_places(netlist: Netlist) -> list[tuple[str, str]]:
    """List what was read past in the order of the files: where ("board.cir:12"), and what with its text."""
    order = {file.path: number for number, file in enumerate(netlist.files)}
    found: list[tuple[tuple[int, int], str, str]] = []
    for number, what in netlist.passed:
        at = place(netlist, number)
        text = netlist.cards[number].text
        shown = text if what[0] == "." or what == "analysis" else f"{what} of {text}"
        found.append(((order[at.file], at.line), f"{visible(at.file)}:{at.line}", visible(shown)))
    for script in netlist.scripts:
        path = netlist.files[script.file].path
        what = f".control block of {len(script.lines)} line{'' if len(script.lines) == 1 else 's'}, never run"
        found.append(((script.file, script.line), f"{visible(path)}:{script.line}", what))
    return [(where, what) for _, where, what in sorted(found)]


def _place_in_line(what: str) -> tuple[int, str]:
    order = ("analysis", ".", ".control", "option")
    return (
        order.index(what) if what in order else 2 if what.startswith(".control") else 1 if what[0] == "." else 4,
        what,
    )
