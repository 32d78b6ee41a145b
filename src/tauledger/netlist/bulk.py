"""Runs of plain lines → columns of the flat circuit, the same as line by line."""

from __future__ import annotations

import math
from collections.abc import Mapping

from tauledger.circuit import fold
from tauledger.netlist.draft import MOST_ELEMENTS, Block, Draft
from tauledger.netlist.items import Word
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.numbers import CAPITAL_M, DOUBLED
from tauledger.netlist.runs import Columns, Run, columns
from tauledger.netlist.surroundings import Surroundings, node_of


def add_run(netlist: Netlist, draft: Draft, around: Surroundings, number: int, run: Run) -> bool:
    """Add the elements of a run in columns; False, and nothing added, where its lines must be read one by one."""
    found = columns(run)
    prefix = fold(around.prefix)
    names = [prefix + name for name in found.folded_names] if prefix else found.folded_names
    fresh = dict(zip(names, range(number, number + run.count), strict=True))
    changed = not draft.changed_elements.keys().isdisjoint(fresh)
    changed = changed or any(of in fresh for of, _ in draft.changed_given)
    if len(fresh) < run.count or changed or not draft.taken.keys().isdisjoint(fresh):
        return False
    if any(map(DOUBLED.fullmatch, {text for text in run.text.split()[3::4] if text[-2:].isalpha()})):
        return False
    if "M" in run.text and CAPITAL_M.search(run.text):
        return False
    kind = "".join([name[0] for name in found.folded_names]).upper()
    lowest = min(found.values)
    if lowest < 0.0 or (lowest == 0.0 and "R" in kind) or max(found.values) == math.inf:
        return False
    if len(draft.taken) + run.count > MOST_ELEMENTS:
        return False
    numbers = _node_numbers(netlist, draft, around, found)
    values = found.values
    if around.m != 1.0:
        draft.divided.update((name, around.m) for k, name in zip(kind, names, strict=True) if k == "L")
        values = [v * around.m if k == "C" else v / around.m for k, v in zip(kind, values, strict=True)]
    draft.taken.update(fresh)
    draft.rows.append(
        Block(
            kind=kind,
            names=[around.prefix + name for name in found.names] if prefix else found.names,
            a=list(map(numbers.__getitem__, found.folded_a)),
            b=list(map(numbers.__getitem__, found.folded_b)),
            values=values,
            cards=range(number, number + run.count),
            path=around.path,
        )
    )
    return True


def _node_numbers(netlist: Netlist, draft: Draft, around: Surroundings, found: Columns) -> Mapping[str, int]:
    """Give the node numbers of a run by folded name on its cards; new nodes are numbered in the order of the cards."""
    keys, written = [""] * (2 * len(found.a)), [""] * (2 * len(found.a))
    keys[0::2], keys[1::2] = found.folded_a, found.folded_b
    written[0::2], written[1::2] = found.a, found.b
    different = dict.fromkeys(keys)
    if around.path:
        spelt = dict(zip(reversed(keys), reversed(written), strict=True))
        return {key: node_of(netlist, draft, around, Word(spelt[key], 0)) for key in different}
    new = [key for key in different if key not in draft.numbers]
    draft.numbers.update(zip(new, range(len(draft.nodes), len(draft.nodes) + len(new)), strict=True))
    if keys != written:
        # Of several spellings the first stays.
        spelt = dict(zip(reversed(keys), reversed(written), strict=True))
        new = [spelt[key] for key in new]
    draft.nodes.extend(new)
    return draft.numbers
