"""Parameters: which definition of a name counts where, and its value, worked out when it is first asked for.

Scopes are dynamic, as in ngspice: the body of a subcircuit sees its own names, then those of the instance that calls
it, and so on up to the netlist. A value given on an X card is read in the called subcircuit too (only its own name
means the caller's); where that differs from the caller's reading, a note says so.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence

from msgspec import Struct, field

from tauledger.circuit import ReadingNote, fold
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.expressions import Surrounding, evaluate
from tauledger.netlist.formulas import Call, Formula, Name, Tree, names
from tauledger.netlist.items import Function, Quoted, Setting, Value, Word, width
from tauledger.netlist.numbers import DOUBLED, read_number

MOST_NESTED_CALLS = 30
MOST_CALLS = 50_000

# What ngspice drops behind a suffix: 7 of 4k7, 2F of 2n2F.
_DROPPED = re.compile(r"\d+[A-Za-z]*", re.ASCII)
_MIL = re.compile(r"[\d.]mil", re.IGNORECASE)


class Binding(Struct, frozen=True):
    """One definition of a parameter. actual: it was given on an X card. site: where that is."""

    site: Site
    setting: Setting
    actual: bool = False


class Scope(Struct):
    """The parameters of one instance. values fills as names are asked for; pending holds those being worked out.

    fixed: values that a Change sets. functions: the user's own, by folded name. choices: the branch that counts, by
    number of the `.if` block. notes, pending and calls (the functions that are being worked out) are shared by all
    scopes of one elaboration.
    """

    outer: Scope | None = None
    bindings: dict[str, Binding] = field(default_factory=dict)
    fixed: dict[str, float] = field(default_factory=dict)
    values: dict[str, float] = field(default_factory=dict)
    pending: list[tuple[int, str, Binding]] = field(default_factory=list)
    notes: list[ReadingNote] = field(default_factory=list)
    functions: dict[str, tuple[Site, Function]] = field(default_factory=dict)
    calls: Counter[str] = field(default_factory=Counter)
    choices: dict[int, int] = field(default_factory=dict)

    def inner(self) -> Scope:
        """Open the scope of an instance called from here."""
        return Scope(outer=self, pending=self.pending, notes=self.notes, calls=self.calls)


def define(scope: Scope, binding: Binding) -> None:
    """Add a definition; one given on an X card wins, else of two in one scope the last counts, with a note."""
    name = fold(binding.setting.name.text)
    if name in scope.bindings and scope.bindings[name].actual and not binding.actual:
        return
    if name in scope.bindings and not binding.actual:
        first = scope.bindings[name].site
        if first.card is not binding.site.card or first.card.text.startswith("."):
            says = f"parameter {binding.setting.name.text} is set again; the last value counts, as in ngspice"
            scope.notes.append(ReadingNote(binding.site.where, says))
    scope.bindings[name] = binding


def find_function(scope: Scope, name: str) -> tuple[Site, Function] | None:
    """Give a function of the user's own (folded name) as seen from a scope, or None where nobody defines it."""
    here: Scope | None = scope
    while here is not None:
        if name in here.functions:
            return here.functions[name]
        here = here.outer
    return None


def known_functions(scope: Scope) -> list[str]:
    """List the functions of the user's own that can be seen from a scope, as written."""
    here: Scope | None = scope
    found: list[str] = []
    while here is not None:
        found += [function.name.text for _, function in here.functions.values()]
        here = here.outer
    return found


def known_names(scope: Scope) -> Iterator[str]:
    """Run through all names that can be seen from a scope, as written."""
    here: Scope | None = scope
    while here is not None:
        for binding in here.bindings.values():
            yield binding.setting.name.text
        here = here.outer


def find(scope: Scope, name: str) -> float | None:
    """Give the value of a parameter (folded name) as seen from a scope, or None where nobody defines it."""
    here: Scope | None = scope
    while here is not None:
        if name in here.fixed:
            return here.fixed[name]
        if name in here.values:
            return here.values[name]
        if name in here.bindings:
            return _work_out(here, name)
        here = here.outer
    return None


def work_out_all(scope: Scope, faults: list[Diagnostic]) -> None:
    """Work out every parameter of a scope, asked for or not, so that a wrong one does not go unseen."""
    for name, binding in list(scope.bindings.items()):
        try:
            find(scope, name)
        except NetlistError as error:
            faults.extend(error.diagnostics)
        except RecursionError:
            message = "parameters and formulas are nested too deeply"
            faults.extend(binding.site.fault(binding.setting, message).diagnostics)
            # The others of the chain would say the same.
            return


def number_of(site: Site, value: Value, scope: Scope) -> float:
    """Give the value of a word or formula on a card in SI units; raises NetlistError at the value."""
    if isinstance(value, Formula):
        try:
            return _formula(site, value, scope, own="")
        except RecursionError as error:
            raise site.fault(value, "parameters and formulas are nested too deeply") from error
    if isinstance(value, Quoted):
        raise site.fault(value, "a number is expected here, not text", "put a formula in braces: {..}")
    decimal = read_number(value.text)
    if decimal is not None:
        if _DROPPED.fullmatch(decimal.tail):
            head, tail = value.text[: -len(decimal.tail)], decimal.tail
            says = f"{value.text} is {head}, as ngspice reads it: digits behind a suffix are dropped"
            scope.notes.append(ReadingNote(site.where, f"{says}; if {_pointed(head, tail)} is meant, write the point"))
        elif decimal.tail:
            formula = decimal.tail[0] in "*/+-^%"
            hint = "a formula stands in braces: {..}" if formula else ""
            raise site.fault(value, f"{value.text!r} is not a number", hint)
        elif (doubled := DOUBLED.fullmatch(value.text)) is not None:
            says = f"{value.text} is {doubled.group(1)}, as ngspice reads it: what follows a suffix is a unit"
            scope.notes.append(ReadingNote(site.where, says))
        if abs(decimal.value) == float("inf"):
            raise site.fault(value, f"{value.text!r} is beyond the range of numbers")
        return decimal.value
    found = find(scope, fold(value.text))
    if found is None:
        hint = nearest(value.text, known_names(scope))
        raise site.fault(value, f"{value.text!r} is neither a number nor a parameter", hint)
    return found


def _pointed(head: str, tail: str) -> str:
    """Turn 4k and 7 into 4.7k, 2n and 2F into 2.2nF."""
    digits = len(head.rstrip("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZµμ"))
    unit = tail.lstrip("0123456789")
    return f"{head[:digits]}.{tail[: len(tail) - len(unit)]}{head[digits:]}{unit}"


def _work_out(scope: Scope, name: str) -> float:
    binding = scope.bindings[name]
    key = (id(scope), name, binding)
    if key in scope.pending:
        raise _circle(scope.pending[scope.pending.index(key) :])
    scope.pending.append(key)
    try:
        value = _bound(scope, name, binding)
    finally:
        scope.pending.pop()
    scope.values[name] = value
    return value


def _circle(round_: list[tuple[int, str, Binding]]) -> NetlistError:
    """Report a circle of parameters once, wherever it was entered: at the one that stands first."""
    start = min(range(len(round_)), key=lambda k: _standing(round_[k][2]))
    names_in_order = [name for _, name, _ in round_[start:] + round_[:start]]
    _, name, binding = round_[start]
    chain = " → ".join([*names_in_order, name])
    return binding.site.fault(binding.setting, f"parameter {name} depends on itself", chain)


def _standing(binding: Binding) -> tuple[int, int, int]:
    card = binding.site.card
    return (card.file, card.pieces[0].line, binding.setting.at)


def _bound(scope: Scope, name: str, binding: Binding) -> float:
    """Work out a definition; its own name means what is defined outside of the scope, where there is an outside."""
    site, value = binding.site, binding.setting.value
    outer = scope.outer
    if outer is None:
        return _read_in(site, value, scope, own="")
    if not binding.actual:
        return _read_in(site, value, scope, own=name)
    captured = (set(_mentioned(value)) - {name}) & scope.bindings.keys()
    if not captured:
        return _read_in(site, value, outer, own="")
    taken = _read_in(site, value, scope, own=name)
    callers = _read_in(site, value, outer, own="")
    if taken != callers:
        text = site.card.text[value.at : value.at + width(value)]
        says = (
            f"{binding.setting.name.text}={text} is {taken:.6g}: ngspice takes {', '.join(sorted(captured))} from the "
            f"subcircuit that is called; with the caller's it would be {callers:.6g}"
        )
        scope.notes.append(ReadingNote(site.where, says))
    return taken


def _mentioned(value: Value) -> Iterator[str]:
    """Run through the folded names that a value mentions."""
    if isinstance(value, Formula):
        yield from map(fold, names(value.tree))
    elif isinstance(value, Word):
        yield fold(value.text)


def _read_in(site: Site, value: Value, scope: Scope, *, own: str) -> float:
    """Give a value as read in a scope; the name `own` is looked up outside of it."""
    if isinstance(value, Formula):
        return _formula(site, value, scope, own=own)
    if isinstance(value, Word) and fold(value.text) == own and scope.outer is not None:
        return number_of(site, value, scope.outer)
    return number_of(site, value, scope)


def _formula(
    site: Site, formula: Formula, scope: Scope, *, own: str, arguments: Mapping[str, float] | None = None
) -> float:
    """Evaluate a formula in a scope; the name `own` is looked up outside of it. arguments: of the function it is of."""
    given = arguments or {}

    def fault(tree: Tree, message: str, hint: str) -> NetlistError:
        wide = len(tree.text) if isinstance(tree, Name) else 1
        return site.fault(formula.inner + tree.at, message, hint, wide=wide)

    def parameter(name: Name) -> float:
        key = fold(name.text)
        if key in given:
            return given[key]
        start = scope.outer if key == own and scope.outer is not None else scope
        found = find(start, key)
        if found is None:
            raise fault(name, f"no parameter is called {name.text!r}", nearest(name.text, known_names(scope)))
        return found

    def call(tree: Call, values: Sequence[float]) -> float | None:
        known = find_function(scope, fold(tree.function))
        if known is None:
            return None
        home, function = known
        check_call(scope, tree, function, lambda message, hint: fault(tree, message, hint))
        if function.formula is None:
            raise fault(tree, f"{function.name.text} is made of voltages or currents", "only a source can use it")
        bound = dict(zip(map(fold, function.parameters), values, strict=True))
        value = _formula(home, function.formula, scope, own="", arguments=bound)
        scope.calls[tree.function] -= 1
        return value

    def remark(says: str) -> None:
        note = ReadingNote(site.where, says)
        if note not in scope.notes[-20:]:
            scope.notes.append(note)

    if _MIL.search(formula.text):
        remark("mil inside a formula is m (1e-3), as ngspice reads it; outside it is 25.4e-6")
    return evaluate(formula.tree, Surrounding(parameter, call, lambda: known_functions(scope), fault, remark))


def check_call(scope: Scope, tree: Call, function: Function, fault: Callable[[str, str], NetlistError]) -> None:
    """Count a call of a user's function; raise NetlistError for a wrong number of arguments and for endless calls.

    Whoever calls takes one off `Scope.calls` when the function is worked out.
    """
    name, count = function.name.text, len(function.parameters)
    if len(tree.arguments) != count:
        raise fault(f"{name} takes {count} argument{'' if count == 1 else 's'}, not {len(tree.arguments)}", "")
    scope.calls[tree.function] += 1
    scope.calls[""] += 1
    if scope.calls[tree.function] > MOST_NESTED_CALLS:
        raise fault(f"{name} calls itself", "a function cannot be defined by itself")
    if scope.calls[""] > MOST_CALLS:
        raise fault(f"the netlist calls functions more than {MOST_CALLS} times", "write parameters instead")
