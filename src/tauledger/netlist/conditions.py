"""`.if` blocks: which of their branches counts in a scope, for elements and models.

Parameters, functions and definitions of subcircuits are no branch's own: ngspice collects them before it looks at a
condition. Of parameters and functions the last counts, of subcircuits the first.
"""

from __future__ import annotations

from tauledger.circuit import fold
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.formulas import Formula
from tauledger.netlist.items import Function, Setting
from tauledger.netlist.netlist import Definition, Netlist
from tauledger.netlist.scopes import Binding, Scope, define, number_of


def counts(netlist: Netlist, card: int, scope: Scope, context: tuple[str, ...] = ()) -> bool:
    """Say whether a card counts in a scope: it stands outside of all `.if` blocks, or in the chosen branches.

    Raises NetlistError where a condition has no value.
    """
    return all(_chosen(netlist, block, scope, context) == branch for block, branch in netlist.within.get(card, ()))


def _chosen(netlist: Netlist, block: int, scope: Scope, context: tuple[str, ...]) -> int:
    """Give the number of the first branch whose condition holds, or -1; worked out once for each scope."""
    known = scope.choices.get(block)
    if known is not None:
        return known
    chosen = -1
    for branch, card in enumerate(netlist.blocks[block]):
        condition = netlist.items[card][1:]
        if not condition or _holds(Site(netlist.files, netlist.cards[card], context), condition[0], scope):
            chosen = branch
            break
    scope.choices[block] = chosen
    return chosen


def _holds(site: Site, condition: object, scope: Scope) -> bool:
    assert isinstance(condition, Formula)
    return number_of(site, condition, scope) != 0.0


def define_all(netlist: Netlist, definition: Definition, scope: Scope, context: tuple[str, ...]) -> None:
    """Define the parameters and functions of a definition's cards in a scope; `.if` does not touch them."""
    for card in definition.parameters:
        site = Site(netlist.files, netlist.cards[card], context)
        for item in netlist.items[card]:
            if isinstance(item, Function):
                scope.functions[fold(item.name.text)] = (site, item)
            elif isinstance(item, Setting):
                define(scope, Binding(site, item))
