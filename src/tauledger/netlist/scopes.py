"""Parameters: which definition of a name counts where, and its value, worked out when it is first asked for.

Scopes are dynamic, as in ngspice: the body of a subcircuit sees its own names, then those of the instance that calls
it, and so on up to the netlist. A value given on an X card is read in the called subcircuit too (only its own name
means the caller's); where that differs from the caller's reading, a note says so.
"""

from __future__ import annotations

from collections.abc import Iterator

from msgspec import Struct, field

from tauledger.circuit import ReadingNote, fold
from tauledger.errors import Diagnostic, NetlistError
from tauledger.netlist.diagnostics import Site, nearest
from tauledger.netlist.expressions import evaluate
from tauledger.netlist.formulas import Formula, Name, Tree, names
from tauledger.netlist.items import Quoted, Setting, Value, Word, width
from tauledger.netlist.numbers import read_number


class Binding(Struct, frozen=True):
    """One definition of a parameter. actual: it was given on an X card. site: where that is."""

    site: Site
    setting: Setting
    actual: bool = False


class Scope(Struct):
    """The parameters of one instance. values fills as names are asked for; pending holds those being worked out.

    fixed: values that a Change sets. notes and pending are shared by all scopes of one elaboration.
    """

    outer: Scope | None = None
    bindings: dict[str, Binding] = field(default_factory=dict)
    fixed: dict[str, float] = field(default_factory=dict)
    values: dict[str, float] = field(default_factory=dict)
    pending: list[tuple[int, str, Binding]] = field(default_factory=list)
    notes: list[ReadingNote] = field(default_factory=list)

    def inner(self) -> Scope:
        """Open the scope of an instance called from here."""
        return Scope(outer=self, pending=self.pending, notes=self.notes)


def define(scope: Scope, binding: Binding) -> None:
    """Add a definition; of two in one scope the last counts, with a note."""
    name = fold(binding.setting.name.text)
    if name in scope.bindings and not binding.actual and not scope.bindings[name].actual:
        first = scope.bindings[name].site
        if first.card is not binding.site.card or first.card.text.startswith("."):
            says = f"parameter {binding.setting.name.text} is set again; the last value counts, as in ngspice"
            scope.notes.append(ReadingNote(binding.site.where, says))
    scope.bindings[name] = binding


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
        if decimal.tail[:1].isdigit():
            head, tail = value.text[: -len(decimal.tail)], decimal.tail
            hint = f"write the point: {_pointed(head, tail)} ({head} is what ngspice would read)"
            raise site.fault(value, f"{value.text!r} has digits behind its suffix", hint)
        if decimal.tail:
            formula = decimal.tail[0] in "*/+-^%"
            hint = "a formula stands in braces: {..}" if formula else ""
            raise site.fault(value, f"{value.text!r} is not a number", hint)
        if abs(decimal.value) == float("inf"):
            raise site.fault(value, f"{value.text!r} is beyond the range of numbers")
        return decimal.value
    found = find(scope, fold(value.text))
    if found is None:
        hint = nearest(value.text, known_names(scope))
        raise site.fault(value, f"{value.text!r} is neither a number nor a parameter", hint)
    return found


def _pointed(head: str, tail: str) -> str:
    """Turn 4k and 7 into 4.7k."""
    digits = len(head.rstrip("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZµμ"))
    return f"{head[:digits]}.{tail}{head[digits:]}"


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


def _formula(site: Site, formula: Formula, scope: Scope, *, own: str) -> float:
    """Evaluate a formula in a scope; the name `own` is looked up outside of it."""

    def fault(tree: Tree, message: str, hint: str) -> NetlistError:
        wide = len(tree.text) if isinstance(tree, Name) else 1
        return site.fault(formula.inner + tree.at, message, hint, wide=wide)

    def parameter(name: Name) -> float:
        key = fold(name.text)
        start = scope.outer if key == own and scope.outer is not None else scope
        found = find(start, key)
        if found is None:
            raise fault(name, f"no parameter is called {name.text!r}", nearest(name.text, known_names(scope)))
        return found

    return evaluate(formula.tree, parameter, fault)
