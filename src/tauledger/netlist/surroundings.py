"""The instance whose cards are being read, and what a node's name means there."""

from __future__ import annotations

from msgspec import Struct

from tauledger.circuit import GROUND, fold
from tauledger.netlist.draft import Draft, node_number
from tauledger.netlist.items import Word
from tauledger.netlist.models import ModelCard
from tauledger.netlist.netlist import Definition, Netlist
from tauledger.netlist.scopes import Scope


class Surroundings(Struct, frozen=True):
    """The instance whose cards are being read.

    prefix: "X1." before its own names. ports: node numbers by folded formal name. m: product of m of all instances
    around. caller: the instance that holds it. lexical: where its definition stands, for the models and definitions
    that it can see. models: what has been read here already, by folded name. seen: the models that can be seen from
    here, once they have been looked for.
    """

    definition: Definition
    scope: Scope
    prefix: str
    ports: dict[str, int]
    m: float
    path: int
    context: tuple[str, ...]
    caller: Surroundings | None
    lexical: Surroundings | None
    models: dict[str, ModelCard]
    seen: list[Visible]


class Visible(Struct, frozen=True):
    """The models that can be seen from an instance, by folded name: where each stands and its card.

    The nearest counts, of two in one place the first. bins: names of the bins by the name under which they are called.
    twins: the cards of later models of the instance's own that have the name of an earlier one.
    names, with_bins: of the models, and of all that can be called.
    """

    models: dict[str, tuple[Surroundings, int]]
    bins: dict[str, list[str]]
    twins: dict[str, list[int]]
    names: frozenset[str]
    with_bins: frozenset[str]


def node_of(netlist: Netlist, draft: Draft, around: Surroundings, word: Word) -> int:
    """Give the number of a node by its name on a card of this instance; a new one gets the next number."""
    key = fold(word.text)
    if key in (GROUND, "gnd"):
        return 0
    if key in netlist.globals:
        return node_number(draft, word.text)
    port = around.ports.get(key)
    return node_number(draft, around.prefix + word.text) if port is None else port


def existing_node(netlist: Netlist, draft: Draft, around: Surroundings, word: Word) -> int | None:
    """Give the number of a node by its name on a card, or None where there is none of that name."""
    key = fold(word.text)
    if key in around.ports and key not in netlist.globals:
        return around.ports[key]
    return draft.numbers.get(key if key in netlist.globals else fold(around.prefix) + key)
