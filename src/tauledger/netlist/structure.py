"""Sorting the logical cards: which belong to which subcircuit, which are hints, which are read past or wrong."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Iterator

from msgspec import Struct, field

from tauledger.circuit import ReadingNote, fold
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.assignments import parse_assignments, parse_functions, parse_nodesets
from tauledger.netlist.cards import parse_card, parse_element
from tauledger.netlist.diagnostics import Site, gather, nearest, visible
from tauledger.netlist.expressions import parse_formula
from tauledger.netlist.items import Item, Setting, Word, flattened
from tauledger.netlist.letters import READ, TIME_FUNCTIONS
from tauledger.netlist.netlist import (
    TOP,
    Card,
    Cards,
    Definition,
    ItemsOfCards,
    Netlist,
    Piece,
    Script,
    SourceFile,
    numbered,
)
from tauledger.netlist.options import EFFECTIVE, option_settings
from tauledger.netlist.runs import Run

ANALYSES = frozenset([".ac", ".dc", ".disto", ".noise", ".op", ".pss", ".pz", ".sens", ".sp", ".tf", ".tran"])
OUTPUTS = {".print": ".print", ".plot": ".plot", ".save": ".save", ".probe": ".probe", ".meas": ".meas"}
OUTPUTS |= {".measure": ".meas", ".four": ".four", ".width": ".width"}
WITHOUT_EFFECT = frozenset({".ic", ".csparam"})
OPTIONS = frozenset({".options", ".option", ".opt"})
STRUCTURE = frozenset([".subckt", ".macro", ".ends", ".eom", ".model", ".param", ".global", ".temp", ".end"])
STRUCTURE |= {".include", ".control", ".lib", ".endl", ".func", ".if", ".elseif", ".else", ".endif", ".nodeset"}
KNOWN = ANALYSES | set(OUTPUTS) | WITHOUT_EFFECT | OPTIONS | STRUCTURE
CONDITIONS = frozenset([".if", ".elseif", ".else", ".endif"])
# What ngspice collects before it looks at conditions.
UNCONDITIONAL = frozenset([".param", ".func", ".subckt", ".macro", ".global", ".options", ".option", ".opt"])
MOST_NESTED_DEFINITIONS = 40


class _Open(Struct):
    """A definition while its cards come in."""

    name: str
    card: int
    ports: tuple[Word, ...] = ()
    defaults: tuple[Setting, ...] = ()
    elements: list[int] = field(default_factory=list)
    parameters: list[int] = field(default_factory=list)
    models: list[int] = field(default_factory=list)
    definitions: list[Definition] = field(default_factory=list)
    nodesets: list[int] = field(default_factory=list)
    branches: list[tuple[int, int]] = field(default_factory=list)

    def closed(self) -> Definition:
        return Definition(
            self.name,
            self.card,
            self.ports,
            self.defaults,
            tuple(self.elements),
            tuple(self.parameters),
            tuple(self.models),
            tuple(self.definitions),
            tuple(self.nodesets),
        )


class _Sorting(Struct):
    """What has been sorted so far."""

    files: tuple[SourceFile, ...]
    open: list[_Open]
    globals: list[str] = field(default_factory=list)
    options: list[int] = field(default_factory=list)
    temperatures: list[int] = field(default_factory=list)
    requests: list[Card] = field(default_factory=list)
    past: Counter[str] = field(default_factory=Counter)
    notes: list[ReadingNote] = field(default_factory=list)
    passed: list[tuple[int, str]] = field(default_factory=list)
    ended: str = ""
    blocks: list[list[int]] = field(default_factory=list)
    within: dict[int, tuple[tuple[int, int], ...]] = field(default_factory=dict)

    def pass_over(self, card: int, what: str, name: str = "") -> None:
        """Count what is read past, and remember the card."""
        self.past[what] += 1
        self.passed.append((card, f"{what} {name}" if name else what))


def structure(
    *,
    path: str,
    title: str,
    files: tuple[SourceFile, ...],
    cards: tuple[Card | Run, ...],
    scripts: tuple[Script, ...],
    faults: tuple[Diagnostic, ...],
) -> Netlist:
    """Sort the cards of all files into definitions, hints and what is read past; parse those that are read.

    Raises NetlistError with the faults found before and here.
    """
    sorting = _Sorting(files, [_Open("", TOP)])
    found = list(faults)
    all_cards = numbered(cards)
    items: list[tuple[Item, ...]] = []
    for number, card in zip(all_cards.starts, cards, strict=True):
        if isinstance(card, Run):
            _sort_run(sorting, number, all_cards)
            items.append(())
            continue
        site = Site(files, card)
        try:
            items.append(_sort(sorting, number, site))
        except NetlistError as error:
            found.extend(error.diagnostics)
            items.append(())
    for unclosed in sorting.open[1:]:
        site = Site(files, all_cards[unclosed.card])
        found.extend(site.fault(0, "this subcircuit is never closed", "close it with .ends", wide=7).diagnostics)
    if not sorting.open[1:]:
        for block, _ in sorting.open[0].branches:
            found.extend(_never_ended(Site(files, all_cards[sorting.blocks[block][0]])).diagnostics)
    if found:
        raise gather(found, files)
    for script in scripts:
        lines = "line" if len(script.lines) == 1 else "lines"
        sorting.past[f".control block of {len(script.lines)} {lines}"] += 1
    return Netlist(
        path=path,
        title=title,
        files=files,
        cards=all_cards,
        items=ItemsOfCards(all_cards, tuple(items)),
        top=sorting.open[0].closed(),
        globals=tuple(sorting.globals),
        options=tuple(sorting.options),
        temperatures=tuple(sorting.temperatures),
        requests=(*sorting.requests, *(card for script in scripts for card in _lines_of(files, script))),
        past=tuple(sorting.past.items()),
        sha256="",
        notes=tuple(sorting.notes),
        passed=tuple(sorting.passed),
        scripts=scripts,
        blocks=tuple(map(tuple, sorting.blocks)),
        within=sorting.within,
    )


def _lines_of(files: tuple[SourceFile, ...], script: Script) -> Iterator[Card]:
    """Run through the lines of a `.control` block as cards."""
    for line, text in enumerate(script.lines, script.line + 1):
        written = files[script.file].lines[line - 1]
        yield Card(text, script.file, (Piece(0, line, len(written) - len(written.lstrip()) + 1),))


def _sort_run(sorting: _Sorting, number: int, cards: Cards) -> None:
    """Put a run where it belongs."""
    if sorting.ended:
        site = Site(sorting.files, cards[number])
        sorting.notes.append(ReadingNote(site.where, f"cards behind .end ({sorting.ended}) are read, as ngspice does"))
        sorting.ended = ""
    if sorting.open[-1].branches:
        sorting.within[number] = tuple(sorting.open[-1].branches)
    sorting.open[-1].elements.append(number)


def _sort(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    """Put one card where it belongs and give its items."""
    text = site.card.text
    word = text.split(maxsplit=1)[0]
    head = word.lower()
    if "(" in head and head.split("(")[0] in CONDITIONS:
        head = head.split("(")[0]
    if sorting.ended and head != ".end":
        sorting.notes.append(ReadingNote(site.where, f"cards behind .end ({sorting.ended}) are read, as ngspice does"))
        sorting.ended = ""
    if sorting.open[-1].branches and head in UNCONDITIONAL:
        which = " (the first of its name)" if head in (".subckt", ".macro") else ""
        says = f"{head} inside .if counts whether the condition holds or not{which}, as in ngspice"
        sorting.notes.append(ReadingNote(site.where, says))
    elif sorting.open[-1].branches and head not in CONDITIONS:
        sorting.within[number] = tuple(sorting.open[-1].branches)
    if not head.startswith("."):
        sorting.open[-1].elements.append(number)
        if word[0].upper() not in READ:
            return ()
        items = parse_element(site)
        _count(sorting, number, word[0].upper(), items)
        return items
    if head in ANALYSES:
        sorting.pass_over(number, "analysis")
        sorting.requests.append(site.card)
        return ()
    if head in OUTPUTS:
        sorting.pass_over(number, OUTPUTS[head])
        sorting.requests.append(site.card)
        return ()
    if head in WITHOUT_EFFECT:
        sorting.pass_over(number, head)
        return ()
    if head in OPTIONS:
        items = parse_card(site)
        settings = option_settings(site, items)
        sorting.options.append(number)
        for setting in settings:
            if fold(setting.name.text) not in EFFECTIVE:
                sorting.pass_over(number, "option", setting.name.text)
        return items
    sort = _DOT_CARDS.get(head)
    if sort is None:
        raise site.fault(0, f"there is no card {visible(word)}", nearest(head, KNOWN), wide=len(word))
    return sort(sorting, number, site)


def _count(sorting: _Sorting, number: int, letter: str, items: tuple[Item, ...]) -> None:
    """Count what an element card may carry without effect on operating point and AC."""
    for item in flattened(items):
        if isinstance(item, Setting):
            name = fold(item.name.text)
            if name in ("ic", "icvbe", "icvce"):
                sorting.pass_over(number, "initial condition", item.name.text)
            elif name == "noisy":
                sorting.pass_over(number, "noise switch", item.name.text)
        elif letter in "VI" and isinstance(item, Word) and fold(item.text) in TIME_FUNCTIONS:
            sorting.pass_over(number, "time function", item.text)


def _subckt(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    if len(sorting.open) > MOST_NESTED_DEFINITIONS:
        raise site.fault(0, f"subcircuits are defined more than {MOST_NESTED_DEFINITIONS} deep", wide=7)
    # Opened before anything can go wrong, so that its .ends finds it.
    opened = _Open("", number)
    sorting.open.append(opened)
    items = parse_card(site)
    flat = [item for item in flattened(items[1:]) if not (isinstance(item, Word) and fold(item.text) == "params:")]
    words = [item for item in flat if isinstance(item, Word)]
    if not words:
        raise site.fault(len(site.card.text), "the subcircuit's name is missing", "write .subckt name node1 node2 ..")
    opened.name = words[0].text
    for item in flat:
        if not isinstance(item, Word | Setting):
            raise site.fault(item, "a node or name=value is expected here")
    opened.ports = tuple(words[1:])
    opened.defaults = tuple(item for item in flat if isinstance(item, Setting))
    seen: set[str] = set()
    for port in opened.ports:
        if fold(port.text) in seen:
            raise site.fault(port, f"port {port.text!r} is named twice")
        seen.add(fold(port.text))
    return items


def _ends(sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    if len(sorting.open) == 1:
        raise site.fault(0, "no subcircuit is open here", "delete this line, or write .subckt before", wide=5)
    open_blocks = sorting.open[-1].branches
    definition = sorting.open.pop().closed()
    enclosing = sorting.open[-1]
    if open_blocks:
        raise site.fault(0, "an .if of this subcircuit is not closed", "close it with .endif", wide=5)
    twin = next((other for other in enclosing.definitions if fold(other.name) == fold(definition.name)), None)
    if twin is not None:
        says = f"subcircuit {definition.name} is defined twice; the first definition counts, as in ngspice"
        sorting.notes.append(ReadingNote(site.where, says))
        return ()
    enclosing.definitions.append(definition)
    return ()


def _model(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    items = parse_card(site)
    if len(items) < 2 or not isinstance(items[1], Word):
        raise site.fault(
            len(site.card.text), "the model's name is missing", "write .model name type (parameter=value ..)"
        )
    sorting.open[-1].models.append(number)
    return items


def _param(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    items = parse_assignments(site)
    sorting.open[-1].parameters.append(number)
    return items


def _func(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    items = parse_functions(site)
    sorting.open[-1].parameters.append(number)
    return items


def _if(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    branches = sorting.open[-1].branches
    if len(branches) >= MOST_NESTED_DEFINITIONS:
        raise site.fault(0, f".if blocks are nested more than {MOST_NESTED_DEFINITIONS} deep", wide=3)
    branches.append((len(sorting.blocks), 0))
    sorting.blocks.append([number])
    return _condition(site)


def _branch(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    """Begin the next branch of the innermost block."""
    word = re.split(r"[\s(]", site.card.text, maxsplit=1)[0]
    branches = sorting.open[-1].branches
    if not branches:
        raise site.fault(0, f"no .if is open before this {word.lower()}", wide=len(word))
    block, branch = branches[-1]
    branches[-1] = (block, branch + 1)
    sorting.blocks[block].append(number)
    return (Word(word, 0),) if word.lower() == ".else" else _condition(site)


def _endif(sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    if not sorting.open[-1].branches:
        raise site.fault(0, "no .if is open here", "delete this line", wide=6)
    sorting.open[-1].branches.pop()
    return ()


def _condition(site: Site) -> tuple[Item, ...]:
    """Read the condition of `.if` and `.elseif`, which stands in parentheses."""
    text = site.card.text.rstrip()
    word = re.match(r"\.\w+", text)
    assert word is not None
    start = len(text) - len(text[word.end() :].lstrip())
    if text[start : start + 1] != "(" or text[-1] != ")":
        raise site.fault(min(start, len(text)), "a condition stands in parentheses", f"write {word.group()} (a > 1)")
    return (Word(word.group(), 0), parse_formula(site, text[start + 1 : -1], start, start + 1))


def _never_ended(site: Site) -> NetlistError:
    return site.fault(0, "this .if is never closed", "close it with .endif", wide=3)


def _nodeset(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    items = parse_nodesets(site)
    sorting.open[-1].nodesets.append(number)
    return items


def _global(sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    items = parse_card(site)
    for item in items[1:]:
        if not isinstance(item, Word):
            raise site.fault(item, "the name of a node is expected here")
        sorting.globals.append(fold(item.text))
    return items


def _temp(sorting: _Sorting, number: int, site: Site) -> tuple[Item, ...]:
    items = parse_card(site)
    values = [item for item in flattened(items[1:]) if not isinstance(item, Setting)]
    if not values:
        raise site.fault(len(site.card.text), "the temperature is missing", "write .temp 27")
    if len(items) != 2:
        raise site.fault(items[2], "one temperature at a time", "run once for each temperature")
    sorting.temperatures.append(number)
    return items


def _end(sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    if site.card.file == 0:
        sorting.ended = site.where
    return ()


def _endc(_sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    raise site.fault(0, "no .control block is open here", "delete this line", wide=5)


def _title(_sorting: _Sorting, _number: int, site: Site) -> tuple[Item, ...]:
    raise site.fault(0, "the title is the first line of the netlist", "write it there", wide=6)


_DOT_CARDS: dict[str, Callable[[_Sorting, int, Site], tuple[Item, ...]]] = {
    ".subckt": _subckt,
    ".macro": _subckt,
    ".ends": _ends,
    ".eom": _ends,
    ".model": _model,
    ".param": _param,
    ".func": _func,
    ".if": _if,
    ".elseif": _branch,
    ".else": _branch,
    ".endif": _endif,
    ".nodeset": _nodeset,
    ".global": _global,
    ".temp": _temp,
    ".end": _end,
    ".endc": _endc,
    ".title": _title,
}
