"""What it takes to reach a wanted figure: candidate changes, each solved for the value that does it, exactly.

A value is first taken from the slope of the figure, then the network is computed again and the value corrected until it
does; one that cannot do it within a factor of 100 is said to be none.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.changed_circuit import free_name
from tauledger.answers.elements import Element, elements
from tauledger.answers.figures import MARGINS, Figures, figures_of
from tauledger.errors import InputError, NetworkError
from tauledger.hand.compensated import CompensatedStage
from tauledger.network.altered import AddedCapacitor, SeriesResistor, altered
from tauledger.network.edges import HALF_POWER
from tauledger.network.first_order import follow_level
from tauledger.network.midband import in_changed
from tauledger.network.targets import UnityMove, follow_unity, unity_moves
from tauledger.network.unity import find_unity
from tauledger.numbers import Numbers
from tauledger.record import Help, Review

SMALLER_IS_BETTER = ("f_l",)
STEP = math.log(1.25)
FARTHEST = math.log(100.0)
SLOPE_STEP = 1e-3
REACHED = 1e-9
# How far a followed figure and one that is searched for may differ, to be called the same.
PROVED = 1e-6
CORRECTIONS = 4
# Twins of a balanced circuit, as close as its halves are asked to be.
SAME = 1e-6
ROUNDS = 60
CLEAR_OF_IT = math.log(1.1)
MOST_FREE = 3
# A capacitor that is put in begins at this part of what is across the stage, and may grow to its inverse.
LEAST_ACROSS = 0.01
# A resistor in series with the compensation is tried up to this many times 1/gm, in steps, then narrowed to 1e-7.
MOST_OVER_GM = 10.0
WIDER = 1.25
HALVINGS = 21
# Where a figure cannot be reached, the change that brings this much of what can be had.
MOST_OF_IT = 0.95


class Trial(Struct, frozen=True):
    """One candidate: the element whose value is sought, None where there is none, and a resistor that is put in.

    twin: in a balanced circuit the same element of the other half, which is changed with it. added: the element itself,
    where it is a capacitor that is put in. over_gm: the resistor times the gm of the stage, 1 as in the books.
    """

    element: Element | None
    series: SeriesResistor | None = None
    twin: Element | None = None
    added: AddedCapacitor | None = None
    over_gm: float = 1.0

    @property
    def farthest(self) -> float:
        """How far the value may go, in ln: what is put in begins at next to nothing."""
        return FARTHEST if self.added is None else math.log(LEAST_ACROSS**-2)

    def factors(self, factor: float) -> Mapping[str, float]:
        """Give the factors on the parts' values that are this factor on the element's."""
        return {one.name: factor**one.sign for one in (self.element, self.twin) if one is not None}


class Found(Struct, frozen=True):
    """What came of one candidate. factor: on the element's value; first_order: what the slope alone says."""

    trial: Trial
    factor: float
    first_order: float | None
    reaches: bool
    figures: Figures


def shortfall(quantity: str, figure: float | None, wanted: float) -> float:
    """Give by how much a figure is missed, on a scale that is straight in ln f for frequencies; met where not above 0.

    Infinite where there is no such figure.
    """
    if figure is None:
        return math.inf
    if quantity in MARGINS:
        return wanted - figure
    if figure in (0.0, math.inf):
        return -math.inf
    missed = math.log(wanted / figure)
    return -missed if quantity in SMALLER_IS_BETTER else missed


def trials(quantity: str, found: Review, numbers: Numbers, stage: CompensatedStage | None) -> Iterator[Trial]:
    """Give the candidates in the order in which a designer tries them.

    For a margin those of the compensated stage; for a frequency, or without such a stage, the three free elements with
    the largest effect. The gm with the largest effect comes last.
    """
    known = {one.name: one for one in elements(numbers)}
    effect = _effects(quantity, found, numbers)
    ranked = sorted((one for one in known.values() if effect.get(one.name)), key=lambda one: -abs(effect[one.name]))
    twin = _twins(found, ranked)
    leading = [one for one in ranked if one.name not in twin or ranked.index(one) < ranked.index(twin[one.name])]
    at_stage = list(_of_stage(stage, known, numbers)) if stage is not None and quantity in MARGINS else []
    if at_stage:
        yield from at_stage
    else:
        free = [one for one in leading if one.free][:MOST_FREE]
        yield from (Trial(one, twin=twin.get(one.name)) for one in free)
    yield from (Trial(one, twin=twin.get(one.name)) for one in [one for one in leading if one.unit == "S"][:1])


def _twins(found: Review, ranked: Sequence[Element]) -> Mapping[str, Element]:
    """Give for every element of a balanced circuit the same one of the other half, by name."""
    image = {member: row.image for row in found.nodes if row.image for member in row.members}
    row_of = {member: row.name for row in found.nodes for member in row.members}

    def place(one: Element) -> tuple[str, ...]:
        return tuple(sorted(row_of.get(node, node) for node in one.nodes))

    twins = {}
    for one in ranked:
        there = tuple(sorted(image.get(node, row_of.get(node, node)) for node in one.nodes))
        for other in ranked:
            same = math.isclose(one.value, other.value, rel_tol=SAME) and one.unit == other.unit
            if same and other.name != one.name and there != place(one) and place(other) == there:
                twins[one.name] = other
    return twins


def attempt(trial: Trial, quantity: str, wanted: float, numbers: Numbers) -> Found | None:
    """Solve for the value that reaches the wanted figure; None where the element has no effect or none can be computed.

    Where it cannot be reached, the best value within a factor of 100 in the direction that helps. The figure is
    followed from where it is; the value found is proved by a search of the whole response and corrected by what that
    finds, and where they do not come to agree the value is sought by such searches alone.
    """
    if trial.element is None and trial.series is not None:
        return _resistor_alone(trial, trial.series, quantity, wanted, numbers)
    followed, aim = _follow(trial, quantity, numbers), wanted
    for _ in range(CORRECTIONS):
        found = _solved(trial, quantity, aim, numbers, followed)
        if found is None:
            break
        left = shortfall(quantity, found.figures.of(quantity), wanted)
        if not found.reaches or abs(left) <= _near(quantity, wanted):
            return found
        aim = _aimed(quantity, aim, left)

    def searched(factor: float) -> float | None:
        figures = _figures(trial, factor, numbers)
        return None if figures is None else figures.of(quantity)

    return _solved(trial, quantity, wanted, numbers, searched)


def _resistor_alone(
    trial: Trial, series: SeriesResistor, quantity: str, wanted: float, numbers: Numbers
) -> Found | None:
    """Put the resistor in at 1/gm; where that is not enough, the least of up to ten times as much that is."""

    def put_in(over_gm: float) -> Found | None:
        wider = replace(trial, series=replace(series, ohm=over_gm * series.ohm), over_gm=over_gm)
        figures = _figures(wider, 1.0, numbers)
        if figures is None:
            return None
        return Found(wider, 1.0, None, shortfall(quantity, figures.of(quantity), wanted) <= 0.0, figures)

    first = put_in(1.0)
    if first is None or first.reaches:
        return first
    short, reached = 1.0, None
    while reached is None and short < MOST_OVER_GM:
        tried = put_in(min(WIDER * short, MOST_OVER_GM))
        if tried is not None and tried.reaches:
            reached = tried
        else:
            short = min(WIDER * short, MOST_OVER_GM)
    if reached is None:
        return first
    for _ in range(HALVINGS):
        tried = put_in(math.sqrt(short * reached.trial.over_gm))
        if tried is not None and tried.reaches:
            reached = tried
        else:
            short = math.sqrt(short * reached.trial.over_gm)
    return reached


def _solved(
    trial: Trial, quantity: str, aim: float, numbers: Numbers, figure: Callable[[float], float | None]
) -> Found | None:
    """Find the value at which `figure`, over the factor on it, is what is aimed at."""

    def miss(u: float) -> float:
        return shortfall(quantity, figure(math.exp(u)), aim)

    start = miss(0.0)
    u, first = 0.0, None
    if start > 0.0:
        slope = (miss(SLOPE_STEP) - miss(-SLOPE_STEP)) / (2.0 * SLOPE_STEP)
        if not math.isfinite(slope) or not slope:
            return None
        straight = -start / slope
        # from next to nothing the slope leads nowhere
        first = math.exp(straight) if abs(straight) <= FARTHEST and trial.added is None else None
        u = _walk(miss, math.copysign(1.0, straight), start, trial.farthest)
    figures = _figures(trial, math.exp(u), numbers)
    if figures is not None and u and quantity == "gain_margin" and figures.gain_margin_db is None:
        # where half turns just vanish any tolerance brings them back
        u += math.copysign(CLEAR_OF_IT, u)
        figures = _figures(trial, math.exp(u), numbers)
    return None if figures is None else Found(trial, math.exp(u), first, miss(u) <= _near(quantity, aim), figures)


def _near(quantity: str, wanted: float) -> float:
    return PROVED * (wanted if quantity in MARGINS else 1.0)


def _aimed(quantity: str, aim: float, left: float) -> float:
    """Aim by so much beyond as the figure, followed, fell short of what a search of the whole response finds."""
    if quantity in MARGINS:
        return aim + left
    return aim * math.exp(-left if quantity in SMALLER_IS_BETTER else left)


def _follow(trial: Trial, quantity: str, numbers: Numbers) -> Callable[[float], float | None]:
    """Give a quick way to the figure over the factor, with the mid-band frequency held."""
    unity = find_unity(numbers.network, numbers.midband, numbers.edges)
    # where |H| = 1 lay for the values that were tried, to start from the nearest
    crossed = {1.0: unity} if unity is not None else {}

    def by_unity(factor: float) -> float | None:
        assert unity is not None
        changed = altered(numbers.network, trial.factors(factor), trial.series, trial.added)
        nearest = crossed[min(crossed, key=lambda one: abs(math.log(one / factor)))]
        again = follow_unity(changed, numbers.midband, nearest)
        if again is None:
            return None
        crossed[factor] = replace(unity, hz=again.hz, phase_margin_deg=again.phase_margin_deg)
        return again.hz if quantity == "f_u" else again.phase_margin_deg

    def by_edge(factor: float) -> float | None:
        changed = altered(numbers.network, trial.factors(factor), trial.series, trial.added)
        level = HALF_POWER * abs(in_changed(changed, numbers.midband).gain)
        start = known[min(known, key=lambda one: abs(math.log(one / factor)))]
        followed = follow_level(changed, level, np.array([start]))
        if followed is None:
            return by_search(factor)
        known[factor] = float(followed[0])
        return known[factor]

    def by_search(factor: float) -> float | None:
        figures = _figures(trial, factor, numbers, held=True)
        return None if figures is None else figures.of(quantity)

    if quantity in ("margin", "f_u") and unity is not None:
        return by_unity
    edge = {"f_h": numbers.edges.f_high, "f_l": numbers.edges.f_low}.get(quantity)
    # where the edge lay for the values that were tried, to start from the nearest
    known = {1.0: edge.hz} if edge is not None and edge.hz is not None else {}
    return by_edge if known else by_search


def _walk(miss: Callable[[float], float], direction: float, start: float, farthest: float) -> float:
    """Go from 0 in steps until the figure is reached, then narrow; else stop where little more is to be had."""
    trail = [(start, 0.0)]
    while abs(trail[-1][1]) < farthest:
        before, u = trail[-1]
        after = u + direction * STEP
        here = miss(after)
        if here <= 0.0:
            return _narrow(miss, (u, before), (after, here))
        trail.append((here, after))
    best = min(trail)[0]
    return next(u for here, u in trail if start - here >= MOST_OF_IT * (start - best))


def _narrow(miss: Callable[[float], float], out: tuple[float, float], reached: tuple[float, float]) -> float:
    """Narrow the place where the shortfall falls to nothing: false position, an end kept twice counts half."""
    (a, weight_a), (b, weight_b) = out, reached
    kept_reached = False
    for _ in range(ROUNDS):
        if abs(b - a) <= REACHED:
            break
        straight = math.isfinite(weight_a) and math.isfinite(weight_b)
        middle = b - weight_b * (b - a) / (weight_b - weight_a) if straight else 0.5 * (a + b)
        here = miss(middle)
        if here <= 0.0:
            b, weight_b = middle, here
            weight_a *= 1.0 if kept_reached else 0.5
            kept_reached = False
            if -here <= REACHED:
                break
        else:
            a, weight_a = middle, here
            weight_b *= 0.5 if kept_reached else 1.0
            kept_reached = True
    return b


def _figures(trial: Trial, factor: float, numbers: Numbers, *, held: bool = False) -> Figures | None:
    """Give all figures with the element's value times this factor; held: the mid-band frequency is not sought anew."""
    try:
        changed = altered(numbers.network, trial.factors(factor), trial.series, trial.added)
        return figures_of(changed, numbers.midband, chosen=held or numbers.midband_chosen)
    except (NetworkError, InputError):
        # far from its value an element can leave a network without solution or signal: no candidate there
        return None


def _of_stage(stage: CompensatedStage, known: Mapping[str, Element], numbers: Numbers) -> Iterator[Trial]:
    """R in series with C_c, C_c itself, both; or R_z and C_c where both are there; or C_c where none is; the load."""
    capacitor = known.get(stage.capacitors[0])
    if capacitor is not None and capacitor.free:
        if not stage.r_z:
            series = SeriesResistor(free_name(_owners(numbers), "RZ"), capacitor.name, 1.0 / stage.gm_2)
            yield Trial(None, series)
            yield Trial(capacitor)
            yield Trial(capacitor, series)
        else:
            resistor = known.get(stage.resistor)
            if resistor is not None and resistor.free:
                yield Trial(resistor)
            yield Trial(capacitor)
    elif capacitor is None or capacitor.name != capacitor.owner:
        yield from _across(stage, numbers)
    load = _load(stage, known, numbers)
    if load is not None:
        yield Trial(load)


def _across(stage: CompensatedStage, numbers: Numbers) -> Iterator[Trial]:
    """A capacitor across a stage that has its transistor's own alone, where both ends are nodes of the netlist."""
    network = numbers.network
    ends = stage.output_name, stage.input_name
    if any("'" in end or end not in network.unknowns[: network.n_nodes] for end in ends):
        return
    added = AddedCapacitor(free_name(_owners(numbers), "CX"), *ends, LEAST_ACROSS * stage.across)
    one = Element(added.name, added.name, ends, added.farad, "F", 1.0, True, False)
    yield Trial(one, added=added)


def _load(stage: CompensatedStage, known: Mapping[str, Element], numbers: Numbers) -> Element | None:
    """Give the largest capacitor card from the output to ground."""
    port = numbers.network.port
    loads = [
        one
        for one in known.values()
        if one.unit == "F" and one.free and set(one.nodes) == {port.plus, "0"} and one.name not in stage.capacitors
    ]
    return max(loads, key=lambda one: one.value, default=None)


def _owners(numbers: Numbers) -> set[str]:
    return {part.owner for part in numbers.network.parts}


def _effects(quantity: str, found: Review, numbers: Numbers) -> Mapping[str, float]:
    """Give what each element does to the quantity, by name, for ranking only."""
    if quantity in ("f_h", "f_l"):
        return {one.name: _edge_effect(one, quantity) for one in found.helps}
    unity = find_unity(numbers.network, numbers.midband, numbers.edges)
    if unity is None:
        return {}

    def effect(move: UnityMove) -> float:
        return {"margin": move.phase_margin_deg, "gain_margin": move.gain_margin_db or 0.0, "f_u": move.f_unity}[
            quantity
        ]

    moves = unity_moves(numbers.network, numbers.midband, unity).parts
    return {name: effect(move) for name, move in moves.items()}


def _edge_effect(one: Help, quantity: str) -> float:
    return (one.f_high if quantity == "f_h" else one.f_low) or 0.0
