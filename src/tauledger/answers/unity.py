"""Unity gain: f_u with its margins from three sources, who sets them, and what a picofarad at each node costs."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec.structs import replace

from tauledger.answers.answer import Subject
from tauledger.answers.elements import Element, elements
from tauledger.answers.simulated_unity import SimulatedUnity, simulate_unity
from tauledger.network.midband import MidBand
from tauledger.network.recompute import scaled
from tauledger.network.targets import PERCENT, UnityMove, follow_unity, unity_moves, with_capacitance
from tauledger.network.unity import Unity, find_unity, is_ratio
from tauledger.numbers import Numbers
from tauledger.record import Review, UnityElement, UnityFacts, UnityNode

# From here on an amplifier is meant to be closed around: at less, unity gain is what lies beyond the band.
WORTH_A_SECTION = 10.0
PROBE = 1e-12
RERUN = 2
# Changes by 10 % of an element, or by 1 pF: below these nobody looks.
WORTH_A_FRACTION = 5e-3
WORTH_DEGREES = 0.1
# A degree of margin counts like a per cent of f_u.
DEGREE = 0.01
MOST_NODES = 12


def unity_facts(found: Review, subject: Subject, *, asked: bool) -> UnityFacts | None:
    """Give f_u and its margins; None where the response is no ratio above 1 at mid-band or does not fall to 1.

    asked: elements and nodes are wanted; they are given unasked where the plateau reaches down to DC with a gain of 10
    or more, as of an amplifier that is meant to be closed around. Nothing where a pole lies in the right half-plane:
    no margin means anything then. Where the network is not trusted ngspice's figures alone are given.
    """
    numbers = subject.numbers
    midband = numbers.midband if numbers.trusted or numbers.simulated is None else numbers.simulated.midband
    if not is_ratio(numbers.network) or abs(midband.gain) <= 1.0 or not numbers.poles.stable:
        return None
    unity = find_unity(numbers.network, numbers.midband, numbers.edges) if numbers.trusted else None
    simulated = _simulated(subject, unity)
    if unity is None and simulated is None:
        return None
    facts = _facts(found, numbers, unity, simulated)
    if unity is None or not (asked or _is_open(midband)):
        return facts
    high = numbers.edges.f_high
    moves = unity_moves(numbers.network, numbers.midband, unity, high.hz if high is not None else None)
    return replace(
        facts, elements=_elements(numbers, unity, moves.parts), nodes=_nodes(found, numbers, unity, moves.nodes)
    )


def _is_open(midband: MidBand) -> bool:
    """Whether the amplifier passes DC (but for measuring aids) and has gain to spare for a loop around it."""
    return midband.from_hz == 0.0 and abs(midband.gain) >= WORTH_A_SECTION


def _simulated(subject: Subject, unity: Unity | None) -> SimulatedUnity | None:
    simulated = subject.numbers.simulated
    if simulated is None or subject.engine is None:
        return None
    reach = 0.0 if unity is None else max(unity.hz, unity.gain_margin_at_hz or 0.0)
    return simulate_unity(subject.engine.sweep, simulated, reach_hz=reach)


def _facts(found: Review, numbers: Numbers, unity: Unity | None, simulated: SimulatedUnity | None) -> UnityFacts:
    high = numbers.simulated.f_high_hz if numbers.simulated is not None else None
    # paper: one pole alone, at f_H by hand
    edge = found.f_high.hand_hz if found.f_high is not None else None
    hand_hz = None if edge is None else abs(numbers.midband.gain) * edge
    hz = simulated.hz if simulated is not None else unity.hz if unity is not None else None
    return UnityFacts(
        simulated_hz=simulated.hz if simulated else None,
        exact_hz=unity.hz if unity else None,
        hand_hz=hand_hz,
        difference=hand_hz / hz - 1.0 if hand_hz is not None and hz is not None else None,
        slope=unity.slope if unity else None,
        phase_margin_deg=simulated.phase_margin_deg if simulated else None,
        phase_margin_exact_deg=unity.phase_margin_deg if unity else None,
        gain_margin_db=simulated.gain_margin_db if simulated else None,
        gain_margin_exact_db=unity.gain_margin_db if unity else None,
        gain_margin_at_hz=simulated.gain_margin_at_hz if simulated else None,
        gain_margin_exact_at_hz=unity.gain_margin_at_hz if unity else None,
        gain_bandwidth_hz=(
            abs(numbers.simulated.midband.gain) * high if numbers.simulated is not None and high is not None else None
        ),
        gain_bandwidth_exact_hz=unity.gain_bandwidth_hz if unity else None,
        further_hz=unity.further_hz if unity else (),
    )


def _size(f_unity: float, margin_deg: float) -> float:
    """Rank a change of f_u (a fraction) and one of the margin on one scale."""
    return max(abs(f_unity), DEGREE * abs(margin_deg))


def _elements(numbers: Numbers, unity: Unity, moves: Mapping[str, UnityMove]) -> tuple[UnityElement, ...]:
    rows = []
    for one in elements(numbers):
        row = _element(one, moves[one.name])
        # 10 % less of it
        if abs(row.f_unity) >= 10.0 * WORTH_A_FRACTION or abs(row.phase_margin_deg) >= WORTH_DEGREES / 10.0:
            rows.append((one, row))
    rows.sort(key=lambda pair: -_size(pair[1].f_unity, pair[1].phase_margin_deg / PERCENT))
    proven = []
    for one, row in rows[:RERUN]:
        again = follow_unity(scaled(numbers.network, {one.name: one.ten_percent_less}), numbers.midband, unity)
        hz, margin = (again.hz, again.phase_margin_deg) if again is not None else (None, None)
        proven.append(replace(row, f_unity_rerun_hz=hz, phase_margin_rerun_deg=margin))
    return (*proven, *(row for _, row in rows[RERUN:]))


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
    rows = [
        row
        for row in rows
        if PROBE * abs(row.per_farad) >= WORTH_A_FRACTION * unity.hz or PROBE * abs(row.margin_slope) >= WORTH_DEGREES
    ]
    rows.sort(key=lambda row: -_size(PROBE * row.per_farad / unity.hz, PROBE * row.margin_slope))
    told = []
    for row in rows[:MOST_NODES]:
        again = follow_unity(with_capacitance(numbers.network, row.node, PROBE), numbers.midband, unity)
        hz, margin = (again.hz, again.phase_margin_deg) if again is not None else (None, None)
        told.append(replace(row, one_picofarad_hz=hz, one_picofarad_margin_deg=margin))
    return tuple(told)
