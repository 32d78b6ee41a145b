"""What the report says of a loop: rows of figures, the gain formula, the working by hand, and what T says of f_H."""

from __future__ import annotations

import cmath
import math

from tauledger.record import LoopFacts, LoopStageFacts
from tauledger.report.tables.grid import Column, Grid, GridRow, said
from tauledger.report.wording import NO_NUMBER, degrees, move, number

METHODS = {
    "gain-bandwidth over noise gain": "by hand, gain-bandwidth / noise gain",
    "by hand, edge of T times 1 + T": "by hand, edge of T · (1 + T0)",
    "edge of T times 1 + T": "edge of T · (1 + T), as with one pole",
    "loop alone": "T/(1 + T), with all poles of T",
    "ideal gain alone": "ideal gain A∞, with T → ∞",
    "closed loop, exact": "closed loop, exact",
}
TIMES = 2.0
SAME = 1e-3
OTHER_LOOPS = 0.1
REAL_DEG = 1.0


def place(facts: LoopFacts) -> str:
    """Say where T is taken."""
    return {"wire": "cut at the ", "admittance": "at the ", "source": "at "}[facts.kind] + facts.where


def title(facts: LoopFacts) -> str:
    """Say where T is taken and which nodes the loop passes."""
    path = f"; it passes {', '.join(facts.through)}" if facts.through else ""
    how = "; simulated by double injection" if facts.return_ratio_simulated is not None else ""
    return f"{place(facts)}{path}{how}"


def loop_rows(facts: LoopFacts) -> tuple[tuple[str, str, str], ...]:
    """Give name, exact and simulated of T at mid-band, its crossovers and margins."""
    at = "DC" if facts.at_hz == 0.0 else number(facts.at_hz, "Hz")
    t = complex(facts.return_ratio_real, facts.return_ratio_imag)
    decibel = f" ({20.0 * math.log10(abs(t)):.1f} dB)" if t else ""
    size, angle = facts.return_ratio_simulated, facts.return_ratio_simulated_deg
    if size is None:
        simulated = NO_NUMBER
    else:
        simulated = _ratio(t / abs(t) * size if t else size) if angle is None else _ratio(_turned(size, angle))
    rows = [(f"return ratio T at {at}", f"{_ratio(t)}{decibel}", simulated)]
    if facts.crossover_hz is not None:
        both = (number(facts.crossover_hz, "Hz"), number(facts.crossover_simulated_hz, "Hz"))
        rows.append(("|T| = 1, crossover", *both))
        rows.append(("phase margin", degrees(facts.phase_margin_deg), degrees(facts.phase_margin_simulated_deg)))
    if facts.gain_margin_db is not None:
        name = f"gain margin, at {number(facts.gain_margin_at_hz, 'Hz')}"
        rows.append((name, _decibel(facts.gain_margin_db), _decibel(facts.gain_margin_simulated_db)))
    if facts.lower_crossover_hz is not None:
        rows.append(("|T| = 1 below mid-band", number(facts.lower_crossover_hz, "Hz"), ""))
        rows.append(("phase margin there", degrees(facts.lower_phase_margin_deg), ""))
    return tuple(rows)


def closed_text(facts: LoopFacts) -> tuple[str, ...]:
    """Write H = A∞·T/(1 + T) + A0/(1 + T) with its figures; nothing where it is not defined."""
    if facts.closed_gain is None or facts.closing_return_ratio is None:
        return ()
    through = number(facts.feedthrough, facts.unit)
    if facts.ideal_gain is None:
        closed = number(facts.closed_gain, facts.unit)
        if closed == through:
            return (f"T is 0 there: the gain, {closed}, is feedthrough A0 alone",)
        return (
            f"T is 0 there: {facts.closing_source} has no loop; of the gain, {closed}, feedthrough A0 is {through}",
        )
    wire = complex(facts.return_ratio_real, facts.return_ratio_imag)
    closing = complex(facts.closing_return_ratio, facts.closing_return_ratio_imag or 0.0)
    own = abs(closing - wire) > SAME * abs(wire)
    other = f", T {_ratio(closing, brackets=True)} at {facts.closing_source}, its own resistances counted"
    return (
        f"closed loop A∞·T/(1 + T) + A0/(1 + T) = {number(facts.closed_gain, facts.unit)} with the ideal gain A∞ "
        f"{number(facts.ideal_gain, facts.unit)}, feedthrough A0 {through}{other if own else ''}",
    )


def hand_text(facts: LoopFacts) -> tuple[str, ...]:
    """Write T₀ as a product from node to node."""
    if facts.hand_return_ratio is None:
        return ()
    if facts.hand_siemens is None:
        size = math.hypot(facts.return_ratio_real, facts.return_ratio_imag)
        apart = move(facts.hand_return_ratio / math.copysign(size, facts.return_ratio_real) - 1.0)
        return (f"T0 = {' · '.join(map(_factor, facts.hand_stages))} = {_plain(facts.hand_return_ratio)} ({apart})",)
    first, *others = facts.hand_stages
    device = facts.closing_source.removeprefix("gm of ")
    product = " · ".join((f"{number(abs(first.hand), 'Ω')} ({first.node})", *map(_factor, others)))
    t = complex(facts.closing_return_ratio or 0.0, facts.closing_return_ratio_imag or 0.0)
    exact, own = math.copysign(abs(t), t.real), math.hypot(facts.return_ratio_real, facts.return_ratio_imag)
    off = "" if not exact else f" ({move(facts.hand_return_ratio / exact - 1.0)})"
    value = f"{_plain(facts.hand_return_ratio)}{off}"
    if facts.kind == "wire" and exact and abs(abs(exact) - own) > OTHER_LOOPS * abs(exact):
        value += f", of every loop through {device}: T there is {_plain(exact)}"
    return (f"T0 = gm of {device} {number(abs(facts.hand_siemens), 'S')} · {product} = {value}",)


def hand_ideal_text(facts: LoopFacts) -> tuple[str, ...]:
    """Write the ideal gain by hand and the closed loop that T₀ makes of it."""
    if facts.hand_ideal_gain is None:
        return ()
    ideal = f"A∞ = {facts.hand_ideal_text} = {number(facts.hand_ideal_gain, facts.unit)}"
    t = facts.hand_return_ratio
    if t is None or facts.closed_gain is None:
        return (ideal,)
    closed = facts.hand_ideal_gain * t / (1.0 + t)
    return (
        f"{ideal}; A∞·T0/(1 + T0) = {number(closed, facts.unit)} ({move(closed / facts.closed_gain - 1.0)}); "
        f"β = 1/A∞ = {number(1.0 / facts.hand_ideal_gain, _inverse(facts.unit), 3)}",
    )


def instance_text(facts: LoopFacts) -> tuple[str, ...]:
    """Say what an amplifier is by itself."""
    own = facts.amplifier
    if own is None or own.open_loop_gain is None:
        return ()
    told = [f"open-loop gain {_plain(abs(own.open_loop_gain))} ({20.0 * math.log10(abs(own.open_loop_gain)):.1f} dB)"]
    if own.gain_bandwidth_hz is not None:
        told.append(f"pole {number(own.first_pole_hz, 'Hz')}, gain-bandwidth {number(own.gain_bandwidth_hz, 'Hz')}")
        if not own.loaded:
            second = own.second_pole_hz
            told.append("no second pole" if second is None else f"second pole {number(second, 'Hz')}")
    else:
        told.append("no pole")
    how = "as it stands, loaded" if own.loaded else "by itself, unloaded"
    return (f"{own.name} {how}: {', '.join(told)}",)


def noise_text(facts: LoopFacts) -> tuple[str, ...]:
    """Say the noise gain and the f_H that follows from it."""
    if facts.noise_gain is None:
        return ()
    edge = facts.noise_gain_edge_hz
    hand = f"; {facts.not_f_high}: gain-bandwidth over it is not f_H" if facts.not_f_high else ""
    if edge is not None:
        hand = f"; f_H = gain-bandwidth / noise gain = {number(edge, 'Hz')}"
    return (f"noise gain 1/β {_plain(facts.noise_gain)}, its output over what comes back to its inputs{hand}",)


def open_text(facts: LoopFacts) -> tuple[str, ...]:
    """Write the edge of T by hand as a sum over the nodes of the opened loop."""
    if facts.hand_open_edge_hz is None:
        return ()
    nodes = " + ".join(
        f"{number(one.ohm, 'Ω', 3)}·{number(one.farad, 'F', 3)} ({one.node})" for one in facts.hand_open_nodes
    )
    exact = facts.open_edge_hz
    off = "" if not exact else f" ({move(facts.hand_open_edge_hz / exact - 1.0)})"
    return (f"edge of T, the loop opened: 1/(2π·({nodes})) = {number(facts.hand_open_edge_hz, 'Hz')}{off}",)


def estimate_rows(facts: LoopFacts) -> tuple[tuple[str, str, str], ...]:
    """Give what T makes of f_H, one idea after the other: method, f_H, difference."""
    return tuple(
        (METHODS.get(one.method, one.method), number(one.hz, "Hz"), _apart(one.difference)) for one in facts.estimates
    )


def told(facts: LoopFacts) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """Give all sentences with the word that leads them; the estimates of f_H have a table of their own there."""
    return (
        ("Gain", closed_text(facts)),
        ("By hand", (*hand_text(facts), *hand_ideal_text(facts), *open_text(facts))),
        ("Amplifier", (*instance_text(facts), *noise_text(facts))),
        ("Why", facts.why),
        ("Note", facts.says),
    )


def figures(facts: LoopFacts) -> Grid:
    """Give the figures of one loop as a table."""
    heads = (Column("Return ratio T", "l"), Column("exact"), Column("simulated"))
    rows = tuple(GridRow(cells) for cells in loop_rows(facts))
    caption = title(facts)
    return said(Grid(caption[:1].upper() + caption[1:], heads, rows))


def estimates(facts: LoopFacts) -> Grid:
    """Give what T says of f_H as a table; no rows where it says nothing."""
    heads = (Column("What T says of f_H", "l"), Column("f_H"), Column("difference"))
    rows = tuple(GridRow(cells) for cells in estimate_rows(facts))
    edge = "" if facts.open_edge_hz is None else f"The edge of T itself: {number(facts.open_edge_hz, 'Hz')}."
    return Grid("Closed-loop f_H from the loop", heads, rows, edge)


def _factor(stage: LoopStageFacts) -> str:
    if "'" in stage.node:
        owner = stage.node.partition("'")[0]
        return f"{_plain(abs(stage.hand))} (r_π over r_π + r_b of {owner})"
    return f"{_plain(abs(stage.hand))} ({stage.node})"


def _plain(value: float) -> str:
    """Write a ratio with four digits, large ones in full."""
    if not value:
        return "0"
    return f"{float(f'{value:.4g}'):.0f}" if 1e4 <= abs(value) < 1e7 else f"{value:#.4g}".rstrip(".")


def _ratio(t: complex, *, brackets: bool = False) -> str:
    """Write T: with its sign where it is real, else with its angle."""
    angle = math.degrees(cmath.phase(t))
    if min(abs(angle), 180.0 - abs(angle)) < REAL_DEG:
        return _plain(math.copysign(abs(t), t.real) if t else 0.0)
    return f"{_plain(abs(t))} ({angle:.1f}°)" if brackets else f"{_plain(abs(t))} at {angle:.1f}°"


def _turned(size: float, angle_deg: float) -> complex:
    return cmath.rect(size, math.radians(angle_deg))


def around_the_loop(facts: LoopFacts) -> str:
    """Say in a sentence what paper makes of f_H round the loop; nothing where it was not worked out."""
    by_hand = next((one for one in facts.estimates if METHODS.get(one.method, "").startswith("by hand")), None)
    if by_hand is None or by_hand.hz is None:
        return ""
    formula = METHODS[by_hand.method].removeprefix("by hand, ")
    off = _apart(by_hand.difference).replace("times", "times too high")
    told = f"Round the feedback loop, {formula} gives {number(by_hand.hz, 'Hz')}, {off}"
    told += f": {facts.why[0]}." if facts.why else "."
    if any(node.time_constant_s for node in facts.hand_open_nodes):
        told += " The time constants of the nodes stand divided by 1 + T and are not the way to f_H."
    return told


def _apart(difference: float | None) -> str:
    """Write how far an estimate is off: per cent, or how many times it is too high."""
    return f"{1.0 + difference:.3g} times" if difference is not None and difference >= TIMES else move(difference)


def _decibel(value: float | None) -> str:
    return NO_NUMBER if value is None else f"{value:.1f} dB"


def _inverse(unit: str) -> str:
    return {"Ω": "S", "S": "Ω"}.get(unit, "")
