"""The netlist room: text in, circuit out.

`read` takes the files, `elaborate` gives the flat circuit under a Change. In between: lines (comments, continuations),
cards and expressions (the Lark grammars of grammar/), structure (subcircuits, what is read past), scopes (parameters),
elements, sources and models (what places and keywords mean), flatten, ports (drive and output), hints. Messages are
made in diagnostics. Only reader touches files; no text of a netlist leaves this room except names.
"""

from tauledger.netlist.elaborate import elaborate, instance_context
from tauledger.netlist.hints import Hints, ac_range, hints, read_past, read_past_places
from tauledger.netlist.netlist import Netlist, place
from tauledger.netlist.reader import read

__all__ = [
    "Hints",
    "Netlist",
    "ac_range",
    "elaborate",
    "hints",
    "instance_context",
    "place",
    "read",
    "read_past",
    "read_past_places",
]
