"""What it takes to reach a wanted figure: candidate changes, each solved for the value that does it, exactly.

A value is first taken from the slope of the figure, then the network is computed again and the value corrected until it
does; one that cannot do it within a factor of 100 is said to be none.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping

from msgspec import Struct

from tauledger.answers.elements import Element, elements
from tauledger.answers.figures import Figures, figures_of
from tauledger.errors import NetworkError
from tauledger.hand.compensated import CompensatedStage
from tauledger.network.altered import SeriesResistor, altered
from tauledger.network.targets import UnityMove, unity_moves
from tauledger.network.unity import find_unity
from tauledger.numbers import Numbers
from tauledger.record import Help, Review

SMALLER_IS_BETTER = ("f_l",)
STEP = math.log(1.25)
FARTHEST = math.log(100.0)
SLOPE_STEP = 1e-3
REACHED = 1e-9
ROUNDS = 60
MOST_FREE = 3


class Trial(Struct, frozen=True):
    """One candidate: the element whose value is sought, None where there is none, and a resistor that is put in."""

    element: Element | None
    series: SeriesResistor | None = None


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
    if quantity in ("margin", "gain_margin"):
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
    gm = max(
        (one for one in known.values() if one.unit == "S"), key=lambda one: abs(effect.get(one.name, 0.0)), default=None
    )
    at_stage = list(_of_stage(stage, known, numbers)) if stage is not None and quantity.endswith("margin") else []
    if at_stage:
        yield from at_stage
    else:
        free = [one for one in known.values() if one.free and effect.get(one.name)]
        free.sort(key=lambda one: -abs(effect[one.name]))
        yield from (Trial(one) for one in free[:MOST_FREE])
    if gm is not None and effect.get(gm.name):
        yield Trial(gm)


def attempt(trial: Trial, quantity: str, wanted: float, numbers: Numbers) -> Found | None:
    """Solve for the value that reaches the wanted figure; None where the element has no effect or none can be computed.

    Where it cannot be reached, the best value within a factor of 100 in the direction that helps.
    """
    computed: dict[float, Figures | None] = {}

    def at(u: float) -> Figures | None:
        if u not in computed:
            computed[u] = _figures(trial, math.exp(u), numbers)
        return computed[u]

    def miss(u: float) -> float:
        figures = at(u)
        return math.inf if figures is None else shortfall(quantity, figures.of(quantity), wanted)

    start = miss(0.0)
    if trial.element is None or start <= 0.0:
        figures = at(0.0)
        return None if figures is None else Found(trial, 1.0, None, start <= 0.0, figures)
    slope = (miss(SLOPE_STEP) - miss(-SLOPE_STEP)) / (2.0 * SLOPE_STEP)
    if not math.isfinite(slope) or not slope:
        return None
    straight = -start / slope
    u, reaches = _walk(miss, math.copysign(1.0, straight), start)
    best = at(u)
    if best is None:
        return None
    return Found(trial, math.exp(u), math.exp(straight) if abs(straight) <= FARTHEST else None, reaches, best)


def _walk(miss: Callable[[float], float], direction: float, start: float) -> tuple[float, bool]:
    """Go from 0 in steps until the figure is reached, then narrow; else give the best place."""
    before, best, u = start, (start, 0.0), 0.0
    while abs(u) < FARTHEST:
        after = u + direction * STEP
        here = miss(after)
        if here <= 0.0:
            return _narrow(miss, (u, before), (after, here)), True
        best = min(best, (here, after))
        u, before = after, here
    return best[1], False


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


def _figures(trial: Trial, factor: float, numbers: Numbers) -> Figures | None:
    one = trial.element
    factors = {} if one is None else {one.name: factor**one.sign}
    try:
        return figures_of(altered(numbers.network, factors, trial.series), numbers.midband)
    except NetworkError:
        # far from its value an element can leave a network that has no solution: no candidate there
        return None


def _of_stage(stage: CompensatedStage, known: Mapping[str, Element], numbers: Numbers) -> Iterator[Trial]:
    """R in series with C_c, C_c itself, both; where R_z is there already its value; the load; gm comes later."""
    capacitor = known.get(stage.capacitors[0])
    if capacitor is not None and capacitor.free:
        if not stage.r_z:
            series = SeriesResistor(_free_name(numbers), capacitor.name, 1.0 / stage.gm_2)
            yield Trial(None, series)
            yield Trial(capacitor)
            yield Trial(capacitor, series)
        else:
            resistor = known.get(stage.resistor)
            if resistor is not None and resistor.free:
                yield Trial(resistor)
            yield Trial(capacitor)
    load = _load(stage, known, numbers)
    if load is not None:
        yield Trial(load)


def _load(stage: CompensatedStage, known: Mapping[str, Element], numbers: Numbers) -> Element | None:
    """Give the largest capacitor card from the output to ground."""
    port = numbers.network.port
    loads = [
        one
        for one in known.values()
        if one.unit == "F" and one.free and set(one.nodes) == {port.plus, "0"} and one.name not in stage.capacitors
    ]
    return max(loads, key=lambda one: one.value, default=None)


def _free_name(numbers: Numbers) -> str:
    taken = {part.owner.casefold() for part in numbers.network.parts}
    name = "RZ"
    while name.casefold() in taken:
        name += "X"
    return name


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
