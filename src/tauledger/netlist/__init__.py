"""The netlist room: text in, circuit out.

`read` takes the files, `elaborate` gives the flat circuit under a Change. On the way:

reader, sections, lines, runs    files → logical cards; plain R, C, L lines stay together as runs
structure                        cards → subcircuits, hints, what is read past
cards, assignments               the items of a card: grammar/card.lark, and a fast way for plain words
expressions, behaviour           the two dialects of formulas: numbers before the run, formulas of the circuit
scopes, conditions               parameters and functions, `.if`
elements, passive, sources, controlled, models, bins, letters    what places and keywords mean
flatten, instances, surroundings, draft    instances → the flat circuit
instantiate, bulk, lookup, references      its elements: one by one, plain ones at once; the models that they mean
ports, hints                     drive and output
writer, hierarchy, origin, settings, added    the flat deck, the tree, where a value came from, NAME=VALUE

Messages are made in diagnostics. Only reader touches files; no text of a netlist leaves this room except names.
"""

from tauledger.netlist.elaborate import at_element, elaborate, instance_context
from tauledger.netlist.hints import Hints, ac_range, hints, read_past, read_past_places
from tauledger.netlist.netlist import Netlist, place
from tauledger.netlist.reader import read

__all__ = [
    "Hints",
    "Netlist",
    "ac_range",
    "at_element",
    "elaborate",
    "hints",
    "instance_context",
    "place",
    "read",
    "read_past",
    "read_past_places",
]
