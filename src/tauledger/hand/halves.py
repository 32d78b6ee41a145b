"""Half circuits: where mirror images carry the same signal, one of them is analysed, as on paper.

A balanced pair driven and read differentially has every pole twice, once for the difference and once for the common
signal; the second is not seen at the output, and time constants of both halves would be counted double.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from msgspec import Struct

from tauledger.hand.estimate import SignalNode

EQUAL = 1e-6
SHARES_ALL = 0.05


class Counted(Struct, frozen=True):
    """The signal nodes that count: rows, longest time constant first, and how many equal parts the circuit has."""

    rows: tuple[SignalNode, ...]
    parts: int


def counted(nodes: Sequence[SignalNode]) -> Counted:
    """Give the rows that count, of n mirror images only the first; rows of a half circuit's second half never.

    Rows are mirror images where time constants, ρ and moment are equal (1e-6); they carry one signal together where
    n·ρ = 1 within 5 % for one group at least. Equal stages in a row have ρ = 1 each and are all counted.
    """
    if any(node.image for node in nodes):
        first = [node for node in nodes if node.in_path and not node.second]
        return Counted(tuple(sorted(first, key=lambda row: -row.time_constant_s)), 2)
    groups: list[list[SignalNode]] = []
    for row in (node for node in nodes if node.in_path):
        for group in groups:
            if _mirrored(group[0], row):
                group.append(row)
                break
        else:
            groups.append([row])
    parts = next(
        (len(group) for group in groups if len(group) > 1 and abs(len(group) * group[0].crossing - 1) <= SHARES_ALL), 1
    )
    kept = [row for group in groups for row in (group[:1] if len(group) == parts else group)]
    return Counted(tuple(sorted(kept, key=lambda row: -row.time_constant_s)), parts)


def images(nodes: Sequence[SignalNode]) -> Mapping[str, str]:
    """Give for every inner line of a half circuit the node where its image is in the upper network, and back."""
    at = {node.name: node for node in nodes}
    return {
        here.at: there.at
        for node in nodes
        if node.image
        for here, there in zip(node.lines, at[node.image].lines, strict=True)
    }


def _mirrored(a: SignalNode, b: SignalNode) -> bool:
    pairs = (
        (a.time_constant_s, b.time_constant_s),
        (a.time_constant_exact_s, b.time_constant_exact_s),
        (a.crossing, b.crossing),
        (a.moment, b.moment),
    )
    return all(math.isclose(x, y, rel_tol=EQUAL) for x, y in pairs)
