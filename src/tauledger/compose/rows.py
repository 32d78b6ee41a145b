"""The tables of the review: signal nodes, parts, sums, poles and zeros."""

from __future__ import annotations

import math

from tauledger.causes.notes import WORTH_A_SHARE
from tauledger.explain import Explanation
from tauledger.hand.estimate import InnerLine, LookingIn, MillerTerm, SignalNode
from tauledger.hand.halves import counted
from tauledger.network.constants import OpenConstant
from tauledger.network.lower import ShortConstant
from tauledger.network.reactances import REACTIVE
from tauledger.network.recompute import EdgeFrequencies
from tauledger.network.shares import Shares
from tauledger.numbers import Numbers
from tauledger.record import (
    Budget,
    CapacitanceTerm,
    EdgePair,
    InductorFacts,
    LowerBudget,
    NodeRow,
    Owner,
    PartRow,
    PoleFacts,
    ResistanceTerm,
    TenPercent,
    UpperBudget,
    Working,
    WorkingLine,
    ZeroFacts,
)

# Owners below one per cent of a pole are rounding to a reader.
OWNS_SOMETHING = 0.01


def node_rows(explanation: Explanation) -> tuple[NodeRow, ...]:
    """Give one row per signal node, those off the path included; none where the hand side is withheld."""
    return tuple(_node_row(node, explanation) for node in (explanation.hand.nodes if explanation.hand else ()))


def inductor_facts(explanation: Explanation) -> tuple[InductorFacts, ...]:
    """Give one row per inductor that is short at mid-band; none where the hand side is withheld."""
    return tuple(
        InductorFacts(
            part=row.part,
            title=row.title,
            in_path=row.in_path,
            henry=row.henry,
            resistance_hand_ohm=row.resistance.ohm,
            resistance_exact_ohm=row.resistance_exact_ohm,
            time_constant_s=row.time_constant_s,
            time_constant_exact_s=row.time_constant_exact_s,
            source=row.resistance.source,
            text=row.resistance.text,
        )
        for row in (explanation.hand.inductors if explanation.hand else ())
    )


def part_rows(numbers: Numbers, explanation: Explanation) -> tuple[PartRow, ...]:
    """Give one row per capacitance, inductance, transcapacitance and line; none where the network is not trusted."""
    if not numbers.trusted:
        return ()
    opened = {row.name: row for row in explanation.open.parts} if explanation.open else {}
    shorted = {name: row for row in explanation.short.parts for name in row.names} if explanation.short else {}
    rows = []
    for part in numbers.network.parts:
        if part.kind not in (*REACTIVE, "line"):
            continue
        open_row, short_row = opened.get(part.name), shorted.get(part.name)
        less = explanation.ten_percent_less.get(part.name, EdgeFrequencies(None, None))
        by_hand = explanation.hand.part_resistance.get(part.name) if explanation.hand else None
        aid = part.name in numbers.bands.aids
        klass = "line" if part.kind == "line" else numbers.bands.class_of[part.name]
        sets_gain = klass == "gain" and short_row is not None
        hand_ohm = by_hand.ohm if by_hand is not None and not sets_gain else _lower_hand(explanation, part.name)
        hand_ohm = _finite(hand_ohm) if sets_gain else hand_ohm
        rows.append(
            PartRow(
                name=part.name,
                owner=part.owner,
                kind=part.kind,
                nodes=part.nodes,
                value=part.value,
                klass=klass,
                in_path=_in_path(open_row, short_row, _of(explanation.shares_low, part.name)),
                weight=_weight(open_row, short_row),
                resistance_hand_ohm=hand_ohm,
                resistance_exact_ohm=_finite(_resistance(None if sets_gain else open_row, short_row)),
                time_constant_s=_finite(_time_constant(open_row, short_row)),
                edge_hz=_finite(short_row.edge_hz) if short_row else None,
                zero_hz=_finite(short_row.zero_hz) if short_row else None,
                share=EdgePair(
                    None if aid else _of(explanation.shares_high, part.name),
                    None if aid else _of(explanation.shares_low, part.name),
                ),
                ten_percent_less=TenPercent(None, None) if aid else TenPercent(less.f_high, less.f_low),
                aid=aid,
            )
        )
    return tuple(rows)


def budget_facts(explanation: Explanation) -> Budget:
    """Give the sums of both ledgers, None where the hand side is withheld."""
    upper = lower = None
    if explanation.open is not None and explanation.hand is not None:
        path = [node.time_constant_s for node in counted(explanation.hand.nodes).rows]
        path += [row.time_constant_s for row in explanation.hand.inductors if row.in_path]
        upper = UpperBudget(
            explanation.open.sum_s,
            explanation.open.inverse_pole_sum_s,
            math.fsum(path) if path else None,
            explanation.open.weighted_sum_s,
            explanation.open.group_delay_s,
        )
    if explanation.short is not None:
        lower = LowerBudget(explanation.short.sum_hz, explanation.short.pole_sum_hz)
    return Budget(upper, lower)


def pole_facts(numbers: Numbers, explanation: Explanation) -> tuple[PoleFacts, ...]:
    """Give every pole (of a pair the one above the axis) with hand formula, owners and effect."""
    if not numbers.trusted:
        return ()
    by_hand = {row.pole: row for row in explanation.hand_poles}
    facts = []
    for pole in numbers.poles.poles:
        told = by_hand.get(pole.s)
        owners = sorted(pole.owners.items(), key=lambda owner: (-abs(owner[1]), owner[0]))
        facts.append(
            PoleFacts(
                real_hz=pole.s.real / (2.0 * math.pi),
                imag_hz=pole.s.imag / (2.0 * math.pi),
                hand_hz=told.hz if told else None,
                hand_formula=told.formula if told else "",
                effect=None if pole.cancelled else _effect(pole.s, explanation),
                owners=tuple(Owner(part, share) for part, share in owners if abs(share) >= OWNS_SOMETHING),
                cancelled=pole.cancelled,
                f0_hz=pole.f0_hz,
                q=_finite(pole.q),
            )
        )
    return tuple(facts)


def zero_facts(numbers: Numbers) -> tuple[ZeroFacts, ...]:
    """Give every zero (of a pair the one above the axis)."""
    if not numbers.trusted:
        return ()
    return tuple(
        ZeroFacts(zero.s.real / (2.0 * math.pi), zero.s.imag / (2.0 * math.pi), zero.cancelled)
        for zero in numbers.poles.zeros
    )


def _node_row(node: SignalNode, explanation: Explanation) -> NodeRow:
    return NodeRow(
        name=node.name,
        title=node.title,
        members=node.members,
        role=node.role,
        in_path=node.in_path,
        resistance_hand_ohm=node.resistance_hand_ohm,
        resistance_exact_ohm=node.resistance_exact_ohm,
        capacitance_f=node.capacitance_f,
        time_constant_s=node.time_constant_s,
        time_constant_exact_s=node.time_constant_exact_s,
        share=EdgePair(_node_share(explanation.shares_high, node), None),
        per_farad=EdgePair(_per_farad(explanation.shares_high, node), _per_farad(explanation.shares_low, node)),
        working=_working(node, explanation),
        image=node.image,
        second=node.second,
    )


def _working(node: SignalNode, explanation: Explanation) -> Working:
    first = node.lines[0].resistance
    lines = tuple(
        WorkingLine(
            node=line.node,
            text="; ".join(_line_texts(line)),
            source=line.resistance.source,
            resistance_hand_ohm=line.resistance.ohm,
            resistance_exact_ohm=line.resistance_exact_ohm,
            resistances=_resistance_terms(line.resistance),
            capacitances=tuple(_capacitance_term(line, term, explanation) for term in line.capacitances),
            time_constant_s=line.time_constant_s,
            time_constant_exact_s=line.time_constant_exact_s,
            why=line.why,
        )
        for line in node.lines
    )
    return Working(
        rule=first.rule,
        text="; ".join(line.text for line in lines),
        resistances=_resistance_terms(first),
        capacitances=tuple(term for line in lines for term in line.capacitances),
        loop_gain=first.loop_gain,
        source=first.source,
        lines=lines,
    )


def _resistance_terms(seen: LookingIn) -> tuple[ResistanceTerm, ...]:
    return tuple(ResistanceTerm(term.name, term.ohm) for term in seen.resistances)


def _capacitance_term(line: InnerLine, term: MillerTerm, explanation: Explanation) -> CapacitanceTerm:
    at_edge = explanation.edge_factors.get((line.at, term.part))
    return CapacitanceTerm(
        part=term.part,
        farad=term.farad,
        factor=term.factor,
        gain_real=term.gain.real,
        gain_imag=term.gain.imag,
        time_constant_s=line.resistance.ohm * term.farad * term.factor,
        text=term.text,
        edge_factor_real=at_edge.real if at_edge is not None else None,
        edge_factor_imag=at_edge.imag if at_edge is not None else None,
        gain_source=term.source,
    )


def _line_texts(line: InnerLine) -> tuple[str, ...]:
    gains = dict.fromkeys(term.text for term in line.capacitances if term.text)
    return (line.resistance.text, *gains)


def _node_share(shares: Shares | None, node: SignalNode) -> float | None:
    return math.fsum(shares.nodes.get(member, 0.0) for member in node.members) if shares else None


def _per_farad(shares: Shares | None, node: SignalNode) -> float | None:
    """Take the node that the row is named after: a probe is soldered there, not inside a device."""
    if shares is None:
        return None
    return shares.per_farad.get(node.name, shares.per_farad.get(node.members[0]))


def _lower_hand(explanation: Explanation, part: str) -> float | None:
    rows = explanation.hand.lower if explanation.hand else ()
    return next((row.resistance.ohm for row in rows if part in row.parts), None)


def _in_path(open_row: OpenConstant | None, short_row: ShortConstant | None, share_low: float | None) -> bool:
    """Whether signal passes a part: by its weight in the sums, and a short one also where it has a share of f_L."""
    if open_row is not None:
        return open_row.in_path
    return short_row is not None and (short_row.in_path or abs(share_low or 0.0) >= WORTH_A_SHARE)


def _weight(open_row: OpenConstant | None, short_row: ShortConstant | None) -> float | None:
    row = open_row if open_row is not None else short_row
    return row.weight if row is not None else None


def _resistance(open_row: OpenConstant | None, short_row: ShortConstant | None) -> float | None:
    row = open_row if open_row is not None else short_row
    return row.resistance_ohm if row is not None else None


def _time_constant(open_row: OpenConstant | None, short_row: ShortConstant | None) -> float | None:
    if open_row is not None:
        return open_row.time_constant_s
    return 1.0 / (2.0 * math.pi * short_row.edge_hz) if short_row is not None and short_row.edge_hz else None


def _of(shares: Shares | None, part: str) -> float | None:
    return shares.parts.get(part) if shares else None


def _effect(pole: complex, explanation: Explanation) -> float | None:
    """Find the pole of the full network among those of the upper and lower one, which lie a little beside it."""
    nearest = min(explanation.pole_effects, key=lambda other: abs(other - pole), default=None)
    if nearest is None or abs(nearest - pole) > 0.1 * abs(pole):
        return None
    return explanation.pole_effects[nearest]


def _finite(value: float | None) -> float | None:
    return value if value is not None and math.isfinite(value) else None
