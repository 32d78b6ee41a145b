"""Who sets unity gain and margin, the first two computed again, and what a picofarad at each node costs."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.elements import PROVED, Element, elements, size, worth_a_row
from tauledger.compose.helps import LESS
from tauledger.network.identities import check
from tauledger.network.midband import in_changed
from tauledger.network.recompute import scaled
from tauledger.network.targets import (
    PERCENT,
    UnityMove,
    follow_unity,
    unity_identities,
    unity_moves,
    with_capacitance,
)
from tauledger.network.unity import Unity, find_unity
from tauledger.numbers import Numbers
from tauledger.record import Review, UnityElement, UnityNode

PROBE_F = 1e-12
MOST_NODES = 12


class UnityShares(Struct, frozen=True):
    """Elements and nodes, the largest effect first."""

    elements: tuple[UnityElement, ...]
    nodes: tuple[UnityNode, ...]


def unity_shares(found: Review, numbers: Numbers, unity: Unity) -> UnityShares:
    """Give the elements of which 10 % less, and the nodes where 1 pF, moves f_u by 0.5 % or the margin by 0.1°.

    found: the review so far, for the names of its signal nodes.
    Raises NetworkError where the network has no unique solution, and where an identity does not hold.
    """
    high = numbers.edges.f_high
    moves = unity_moves(numbers.network, numbers.midband, unity, high.hz if high is not None else None)
    check(unity_identities(numbers.network, moves))
    return UnityShares(_elements(numbers, unity, moves.parts), _nodes(found, numbers, unity, moves.nodes))


def _elements(numbers: Numbers, unity: Unity, moves: Mapping[str, UnityMove]) -> tuple[UnityElement, ...]:
    rows = []
    for one in elements(numbers):
        row = _element(one, moves[one.name])
        if worth_a_row(LESS * row.f_unity, LESS / PERCENT * row.phase_margin_deg):
            rows.append((one, row))
    rows.sort(key=lambda pair: -size(pair[1].f_unity, pair[1].phase_margin_deg / PERCENT))
    proven = []
    for one, row in rows[:PROVED]:
        again = follow_unity(scaled(numbers.network, {one.name: one.ten_percent_less}), numbers.midband, unity)
        hz, margin = (again.hz, again.phase_margin_deg) if again is not None else (None, None)
        proven.append(replace(row, f_unity_rerun_hz=hz, phase_margin_rerun_deg=margin))
    return (*proven, *(row for _, row in rows[PROVED:]))


def _element(one: Element, move: UnityMove) -> UnityElement:
    more = PERCENT * one.sign
    return UnityElement(
        name=one.name,
        owner=one.owner,
        nodes=one.nodes,
        value=one.value,
        unit=one.unit,
        free=one.free,
        moves_bias=one.moves_bias,
        f_unity=-one.sign * move.f_unity,
        phase_margin_deg=more * move.phase_margin_deg,
        gain_margin_db=None if move.gain_margin_db is None else more * move.gain_margin_db,
        gain_bandwidth=None if move.gain_bandwidth is None else -one.sign * move.gain_bandwidth,
    )


def _nodes(found: Review, numbers: Numbers, unity: Unity, moves: Mapping[str, UnityMove]) -> tuple[UnityNode, ...]:
    """Give the signal nodes, or where there are none by hand all nodes of the netlist, that a picofarad matters at."""
    titles = {row.name: row.title for row in found.nodes if row.name in moves and not row.second} or {
        name: name for name in moves if "'" not in name
    }
    rows = [
        UnityNode(name, title, unity.hz * moves[name].f_unity, moves[name].phase_margin_deg, None, None)
        for name, title in titles.items()
    ]
    changes = {row.node: (PROBE_F * row.per_farad / unity.hz, PROBE_F * row.margin_slope) for row in rows}
    rows = [row for row in rows if worth_a_row(*changes[row.node])]
    rows.sort(key=lambda row: -size(*changes[row.node]))
    told = []
    for row in rows[:MOST_NODES]:
        # a picofarad may move the half turn far: what is followed is not enough
        again = find_unity(
            probed := with_capacitance(numbers.network, row.node, PROBE_F), in_changed(probed, numbers.midband)
        )
        if again is None:
            told.append(row)
            continue
        row = replace(row, one_picofarad_hz=again.hz, one_picofarad_margin_deg=again.phase_margin_deg)
        told.append(replace(row, one_picofarad_gain_margin_db=again.gain_margin_db))
    return tuple(told)
