"""From paper to the full network: the estimate of one band edge, one step after the other, with the reason in words.

A step is never an improvement: two errors may cancel on paper, and where two large steps do, the later one says so.
Steps: lowest (the dominant time constant alone), all-nodes, exact-constants, two-coefficients, all-poles, zeros, full;
with lines, which are as at DC until then, lines.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence

import numpy as np

from tauledger.hand.combine import Combined
from tauledger.hand.estimate import Edge, InductorRow, LowerRow, SignalNode, StepEstimate
from tauledger.hand.halves import counted
from tauledger.quantity import engineering, percent

IN_WORDS = {
    "all-nodes": "the other time constants",
    "exact-constants": "the exact time constants",
    "two-coefficients": "the interaction",
    "all-poles": "the further poles",
    "zeros": "the zeros",
    "full": "the real mid-band",
    "lines": "the lines",
}

LARGE = 0.05
WORTH_NAMING = 0.005
SAME = 1e-4
# σ = b2 / Σ τ_i·τ_j is 1 for nodes that do not see each other.
SPLITTING = 0.5
INDEPENDENT = (0.8, 1.25)


def upper_steps(
    nodes: Sequence[SignalNode],
    combined: Combined,
    *,
    full_hz: float | None,
    stable: bool = True,
    lines: tuple[str, float | None] | None = None,
    inductors: Sequence[InductorRow] = (),
) -> tuple[StepEstimate, ...]:
    """Give the steps from the lowest signal node alone to f_H of the full network.

    combined: of `combine_upper` with the same nodes and inductors. full_hz: f_H of the full network, None where
    there is none.
    stable: no pole of the full network lies in the right half plane. lines: why lines move it further, and f_H with
    them as they are; full_hz has them as at DC.
    Empty where the network is unstable or no pole lies between input and output.
    The step two-coefficients is left out where it leads away from where all poles lead back.
    """
    if not (stable and combined.stable) or len(combined.roots.poles) == 0:
        return ()
    rows: list[SignalNode | InductorRow] = [*counted(nodes).rows, *(row for row in inductors if row.in_path)]
    rows.sort(key=lambda row: -row.time_constant_s)
    parts = counted(nodes).parts
    reasons = {
        "lowest": _lowest_node(rows),
        "all-nodes": _other_nodes(rows) + ("" if parts == 1 else " in each half"),
        "exact-constants": _exact_nodes(rows),
        "two-coefficients": _interaction(combined, "capacitance"),
        "all-poles": _more_poles(combined, "node", "third and higher poles"),
        "zeros": _zeros(combined, nearest=min, levels="the zero at {} holds the gain up"),
        "full": "coupling capacitors are real: mid-band is not flat",
    }
    return _walk("f_high", combined, reasons, full_hz, lines)


def lower_steps(
    rows: Sequence[LowerRow],
    combined: Combined,
    *,
    full_hz: float | None,
    stable: bool = True,
    zero_owner: LowerRow | None = None,
    lines: tuple[str, float | None] | None = None,
) -> tuple[StepEstimate, ...]:
    """Give the steps from the capacitor with the highest edge alone to f_L of the full network.

    combined: of `combine_lower` with the same rows. full_hz: f_L of the full network, None where there is none.
    stable: no pole of the full network lies in the right half plane. zero_owner: whose is the zero nearest the edge.
    lines: as in `upper_steps`.
    Empty where the network is unstable or no pole lies between input and output.
    The step two-coefficients is left out where it leads away from where all poles lead back.
    """
    if not (stable and combined.stable) or len(combined.roots.poles) == 0:
        return ()
    used = sorted((row for row in rows if row.in_path), key=lambda row: -row.edge_hand_hz)
    reasons = {
        "lowest": _highest_capacitor(used),
        "all-nodes": _other_capacitors(used),
        "exact-constants": _exact_capacitors(used),
        "two-coefficients": _interaction(combined, "capacitor"),
        "all-poles": _more_poles(combined, "capacitor", "third and lower poles"),
        "zeros": _zeros(combined, nearest=max, levels="the zero at {} ends the fall")
        + ("" if zero_owner is None or combined.with_zeros is None else f" ({zero_owner.title})"),
        "full": "load and device capacitances are real: mid-band is not flat",
    }
    return _walk("f_low", combined, reasons, full_hz, lines)


def factors(steps: Sequence[StepEstimate]) -> tuple[float | None, ...]:
    """Give for every step the factor by which it moved the estimate; None for the first and where one is missing."""
    moved: list[float | None] = []
    before: float | None = None
    for step in steps:
        moved.append(step.hz / before if step.hz is not None and before is not None else None)
        before = step.hz
    return tuple(moved)


def _walk(
    edge: Edge,
    combined: Combined,
    reasons: dict[str, str],
    full_hz: float | None,
    lines: tuple[str, float | None] | None,
) -> tuple[StepEstimate, ...]:
    hz = {
        "lowest": combined.lowest,
        "all-nodes": combined.all_nodes,
        "exact-constants": combined.exact_constants,
        "two-coefficients": combined.two_coefficients,
        "all-poles": combined.all_poles,
        "zeros": combined.with_zeros,
        "full": full_hz,
    }
    if combined.two_coefficients_overshoot:
        del hz["two-coefficients"]
    if full_hz is None and combined.with_zeros is None:
        reasons = {**reasons, "full": "no -3 dB frequency here either"}
    elif full_hz is None:
        reasons = {**reasons, "full": f"{reasons['full']}, and it never falls 3 dB below its reference"}
    elif combined.with_zeros is not None and abs(full_hz / combined.with_zeros - 1.0) < SAME:
        reasons = {**reasons, "full": "nothing on the other side of mid-band moves it"}
    if lines is not None:
        reasons, hz = {**reasons, "lines": lines[0]}, {**hz, "lines": lines[1]}
    return _say_what_cancels(tuple(StepEstimate(edge, step, value, reasons[step]) for step, value in hz.items()))


def _say_what_cancels(steps: tuple[StepEstimate, ...]) -> tuple[StepEstimate, ...]:
    moves = [math.log(factor) if factor else 0.0 for factor in factors(steps)]
    told = list(steps)
    for later in range(1, len(steps)):
        for earlier in range(later - 1, 0, -1):
            a, b = moves[earlier], moves[later]
            opposite = a * b < 0 and min(abs(a), abs(b)) >= math.log1p(LARGE)
            if opposite and abs(a + b) <= 0.5 * min(abs(a), abs(b)):
                back = f"; cancels the {percent(math.expm1(a))} of {IN_WORDS[steps[earlier].step]}"
                told[later] = StepEstimate(
                    steps[later].edge, steps[later].step, steps[later].hz, steps[later].why + back
                )
                break
    return tuple(told)


def _lowest_node(rows: list[SignalNode | InductorRow]) -> str:
    if not rows or rows[0].time_constant_s <= 0:
        return "no signal node with a positive time constant counts"
    row = rows[0]
    if isinstance(row, InductorRow):
        quotient = f"{_henry(row.henry)} / {_ohm(row.resistance.ohm)} = {_seconds(row.time_constant_s)}"
        return f"{row.title} alone: {quotient}"
    product = f"{_ohm(row.resistance_hand_ohm)} · {_farad(row.capacitance_f)} = {_seconds(row.time_constant_s)}"
    return f"{row.title} alone: {product}"


def _other_nodes(rows: list[SignalNode | InductorRow]) -> str:
    others = [row for row in rows[1:] if row.time_constant_s > 0]
    negative = [row for row in rows if row.time_constant_s < 0]
    total = math.fsum(row.time_constant_s for row in rows if row.time_constant_s > 0)
    left_out = "".join(
        f"; {row.title} is left out, its time constant is {_seconds(row.time_constant_s)}" for row in negative
    )
    if not others:
        return "no other node counts" + left_out
    told = [f"{row.title} takes {_seconds(row.time_constant_s)}" for row in others[:2]]
    rest = len(others) - len(told)
    more = "" if not rest else "; one more takes the rest" if rest == 1 else f"; {rest} more take the rest"
    return f"{' and '.join(told)} of {_seconds(total)}{more}{left_out}"


def _exact_nodes(rows: list[SignalNode | InductorRow]) -> str:
    total = math.fsum(abs(row.time_constant_exact_s) for row in rows)
    worst = max(rows, key=lambda row: abs(row.time_constant_s - row.time_constant_exact_s), default=None)
    if worst is None or abs(worst.time_constant_s - worst.time_constant_exact_s) <= SAME * total:
        return "the time constants by hand agree with the exact ones"
    hand, exact = worst.time_constant_s, worst.time_constant_exact_s
    digits = 3 if _seconds(hand) != _seconds(exact) else 5
    return f"{worst.title} {engineering(hand, 's', digits)} by hand, {engineering(exact, 's', digits)} exact"


def _highest_capacitor(rows: list[LowerRow]) -> str:
    if not rows:
        return "no coupling or bypass capacitor counts"
    row = rows[0]
    if row.henry:
        quotient = f"{_ohm(row.resistance.ohm)} / {_henry(row.henry)}"
        return f"{row.title} alone: {quotient} gives {_hz(row.edge_hand_hz)}"
    return f"{row.title} alone: {_ohm(row.resistance.ohm)} · {_farad(row.farad)} gives {_hz(row.edge_hand_hz)}"


def _other_capacitors(rows: list[LowerRow]) -> str:
    if len(rows) < 2:
        return "no other capacitor counts"
    told = [f"{row.title} at {_hz(row.edge_hand_hz)}" for row in rows[1:3]]
    more = f" and {len(rows) - 3} more" if len(rows) > 3 else ""
    return f"the other capacitors: {', '.join(told)}{more}"


def _exact_capacitors(rows: list[LowerRow]) -> str:
    total = math.fsum(row.edge_exact_hz for row in rows)
    worst = max(rows, key=lambda row: abs(row.edge_hand_hz - row.edge_exact_hz), default=None)
    if worst is None or abs(worst.edge_hand_hz - worst.edge_exact_hz) <= WORTH_NAMING * total:
        return "the resistances by hand agree with the exact ones"
    return (
        f"exact resistances: {worst.title} {_ohm(worst.resistance.ohm)} by hand, "
        f"{_ohm(worst.resistance_exact_ohm)} exact"
    )


def _interaction(combined: Combined, thing: str) -> str:
    poles, pair, sigma = combined.roots.poles, combined.coefficients, combined.sigma
    if combined.hidden:
        return f"the output does not see all poles{_cancelled(combined)}"
    if len(poles) == 1:
        return f"one pole in all, at {_hz(abs(poles[0]) / (2 * math.pi))}"
    of_sigma = "" if sigma is None else f", σ = {sigma:.2g}"
    if combined.complex_pair and pair.q is not None and pair.q > 0.5:
        how = f"the {thing}s pull each other: b1 and b2 give a complex pair, Q = {pair.q:.2f}"
    elif sigma is None:
        how = f"one time constant counts, the poles beside it are at {', '.join(_frequencies(poles)[1:3])}"
    elif sigma < SPLITTING:
        how = f"each {thing} loads the other{'s' if len(poles) > 2 else ''}: the poles split"
    elif sigma < INDEPENDENT[0]:
        how = f"each {thing} loads the other{'s' if len(poles) > 2 else ''}"
    elif sigma <= INDEPENDENT[1]:
        how = f"the {thing}s hardly act on each other"
    else:
        how = f"the {thing}s pull each other: their poles move together"
    return how + of_sigma


def _more_poles(combined: Combined, thing: str, words: str) -> str:
    poles = [complex(pole) for pole in combined.roots.poles]
    if thing == "capacitor":
        poles.reverse()
    if combined.two_coefficients_overshoot:
        nearest = ", ".join(_frequencies(poles)[:4])
        sigma = "" if combined.sigma is None else f" (σ = {combined.sigma:.2g})"
        return f"the {thing}s act on each other{sigma} and more than two poles count: {nearest}" + (
            _cancelled(combined) if combined.hidden else ""
        )
    further = _frequencies(poles[2:])
    if not further:
        return "there is no third pole"
    more = f" and {len(further) - 2} more" if len(further) > 2 else ""
    return f"{words}: {', '.join(further[:2])}{more}"


def _cancelled(combined: Combined) -> str:
    if len(combined.roots.cancelled) == 0:
        return ""
    told = _frequencies([complex(pole) for pole in combined.roots.cancelled])
    more = f" and {len(told) - 2} more" if len(told) > 2 else ""
    return f"; cancelled by a zero each and left out: the pole at {', '.join(told[:2])}{more}"


def _zeros(combined: Combined, *, nearest: Callable[[Sequence[float]], float], levels: str) -> str:
    zeros = combined.roots.zeros[combined.roots.zeros != 0]
    if len(zeros) == 0:
        return "there is no zero"
    at = zeros[int(np.argmin(np.abs(np.abs(zeros) - nearest(np.abs(zeros).tolist()))))]
    where = _hz(abs(at) / (2 * math.pi))
    if combined.with_zeros is None and math.isfinite(combined.far_gain) and combined.far_gain > 0:
        level = f"{20 * math.log10(combined.far_gain):+.2g} dB"
        return f"levels off at {level} of mid-band: {levels.format(where)}, there is no -3 dB frequency"
    if combined.with_zeros is None:
        return f"{levels.format(where)}, there is no -3 dB frequency"
    side = " in the right half plane" if at.real > 0 else ""
    if at.imag:
        return f"pair of zeros at {where}{side}"
    return f"zero at {where}{side}"


def _frequencies(poles: Iterable[complex]) -> list[str]:
    return [_hz(abs(pole) / (2 * math.pi)) for pole in poles if pole.imag >= 0]


def _hz(value: float) -> str:
    return engineering(value, "Hz", 3)


def _seconds(value: float) -> str:
    return engineering(value, "s", 3)


def _ohm(value: float) -> str:
    return engineering(value, "Ω", 3)


def _henry(value: float) -> str:
    return engineering(value, "H", 3)


def _farad(value: float) -> str:
    return engineering(value, "F", 3)
