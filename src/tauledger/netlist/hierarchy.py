"""The tree of instances with what stands in each, as text."""

from __future__ import annotations

from collections import Counter

from tauledger.circuit import Circuit
from tauledger.netlist.diagnostics import Site, visible
from tauledger.netlist.netlist import Netlist


def hierarchy(netlist: Netlist, circuit: Circuit) -> str:
    """Give one line per instance, indented under the one that holds it: its name, its subcircuit with place, and how
    many elements of each letter stand in it, with those of all inner instances behind a slash where there are any."""
    own: list[Counter[str]] = [Counter() for _ in circuit.instances]
    for letter, path in zip(circuit.passives.kind, circuit.passives.path.tolist(), strict=True):
        own[path][letter] += 1
    for element in circuit.elements:
        own[element.path][element.letter] += 1
    whole = [Counter(counts) for counts in own]
    children: list[list[int]] = [[] for _ in circuit.instances]
    for path in range(len(circuit.instances) - 1, 0, -1):
        parent = circuit.instances[path].parent
        whole[parent].update(whole[path])
        children[parent].insert(0, path)
    lines: list[str] = []

    def line(path: int, depth: int) -> None:
        instance = circuit.instances[path]
        if path:
            at = Site(netlist.files, netlist.cards[instance.card]).where
            of = Site(netlist.files, netlist.cards[instance.definition]).where
            head = f"{visible(instance.name)}  {visible(instance.subcircuit)} ({of}), called at {at}"
        else:
            head = visible(netlist.path)
        lines.append(f"{'  ' * depth}{head}: {_counted(own[path], whole[path])}")
        for child in children[path]:
            line(child, depth + 1)

    line(0, 0)
    return "\n".join(lines) + "\n"


def _counted(own: Counter[str], whole: Counter[str]) -> str:
    total = whole.total()
    here = ", ".join(f"{letter} {own[letter]}" for letter in sorted(own)) or "no elements"
    if total == own.total():
        return here
    return f"{here}; {total} with what is inside"
