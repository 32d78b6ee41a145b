"""The hand formula that belongs to each pole: 1/b1 for the dominant one, b1/b2 for the next, f0 and Q for a pair.

A node's own 1/(2πRC) is not a pole: the capacitances act on each other, and the second pole of a split pair lies
far above (or, with several time constants in a loop, does not exist). Below mid-band the same holds with 1/s:
a1 for the highest of the low poles, a2/a1 for the next.

Source: Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed. (2009), sec. 7.3 and
9.4 (pole splitting); Cochrun and Grabel, IEEE Trans. Circuit Theory CT-20(1), 1973 (b1 and b2 from time constants).
"""

from __future__ import annotations

import math

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.hand.combine import Coefficients, Complex
from tauledger.quantity import percent

# Two real poles are told apart by 1/b1 and b1/b2 from b1²/b2 > 10 on (a ratio of 8); below, the quadratic is solved.
SEPARATED = 10.0
THIRD_FAR = 4.0
MISSES = 0.2
MISSES_BY_HALF = 0.5


class HandPole(Struct, frozen=True):
    """One pole, of a complex pair the one above the axis, with what paper says of it.

    pole: exact, rad/s. hz: |p|/2π by hand, None where no formula of two coefficients reaches it. formula: as written
    on paper, empty where there is none. q: Q by hand, of a pair.
    """

    pole: complex
    hz: float | None
    formula: str
    q: float | None = None


def hand_poles(
    poles: Complex,
    cancelled: Complex,
    *,
    midband_hz: float,
    upper: Coefficients | None,
    lower: Coefficients | None,
) -> tuple[HandPole, ...]:
    """Give every pole of the full network with the formula that belongs to it, in the order of `poles`.

    poles: rad/s (n,), both members of each pair. cancelled: those of them with a zero on top, rad/s (k,): no formula.
    Poles above mid-band belong to `upper` (b1 in s, b2 in s²), the others to `lower` (a1 in rad/s, a2 in (rad/s)²).
    """
    hidden = {complex(pole) for pole in cancelled}
    # one at the origin is a node that nothing holds at DC, and has no formula
    seen = [complex(pole) for pole in poles if pole.imag >= 0 and pole != 0.0 and complex(pole) not in hidden]
    edge = 2 * math.pi * midband_hz
    above = sorted((pole for pole in seen if abs(pole) > edge), key=abs)
    below = sorted((pole for pole in seen if abs(pole) <= edge), key=abs, reverse=True)
    told = {
        **_kept(above[:1], _upper(above, upper)),
        **_kept(below[:1], _lower(below, lower)),
    }
    return tuple(told.get(complex(pole), HandPole(complex(pole), None, "")) for pole in poles if pole.imag >= 0)


def pair_frequency_and_q(pole: complex) -> tuple[float, float]:
    """Give f0 = |p|/2π in Hz and Q = |p| / (−2·Re p) of the pair that `pole` (rad/s) belongs to."""
    return abs(pole) / (2 * math.pi), abs(pole) / (-2 * pole.real) if pole.real else math.inf


def _kept(dominant: list[complex], told: dict[complex, HandPole]) -> dict[complex, HandPole]:
    """Leave out a formula that misses its pole by more than 20 %; up to 50 % the dominant one keeps it, and says so."""
    kept: dict[complex, HandPole] = {}
    for pole, by_hand in told.items():
        off = 0.0 if by_hand.hz is None else by_hand.hz * 2 * math.pi / abs(pole) - 1.0
        if abs(off) <= MISSES:
            kept[pole] = by_hand
        elif pole in dominant and abs(off) <= MISSES_BY_HALF:
            kept[pole] = replace(by_hand, formula=f"{by_hand.formula}, {percent(off)} off")
    return kept


def _upper(poles: list[complex], pair: Coefficients | None) -> dict[complex, HandPole]:
    if pair is None or not poles or pair.b1 <= 0:
        return {}
    return {
        pole: HandPole(pole, omega / (2 * math.pi), formula, q)
        for pole, (omega, formula, q) in zip(
            poles, _formulas(poles, pair, "b1", "b2", "1/(2π·b1)", "b1/(2π·b2)"), strict=False
        )
    }


def _lower(poles: list[complex], pair: Coefficients | None) -> dict[complex, HandPole]:
    if pair is None or not poles or pair.b1 <= 0:
        return {}
    return {
        pole: HandPole(pole, 1 / omega / (2 * math.pi), formula, q)
        for pole, (omega, formula, q) in zip(
            poles, _formulas(poles, pair, "a1", "a2", "a1/2π", "a2/(2π·a1)"), strict=False
        )
    }


def _formulas(
    poles: list[complex], pair: Coefficients, first: str, second: str, dominant: str, next_one: str
) -> list[tuple[float, str, float | None]]:
    """Give (ω, formula, Q) for the first one or two of `poles`; for a lower edge ω is that of 1/s."""
    root = f"1/(2π·√{second})" if first == "b1" else f"√{second}/2π"
    if poles[0].imag:
        q = pair.q
        if q is None or q <= 0.5:
            return []
        ratio = f"Q = √{second}/{first} = {q:.3g}"
        return [(1 / math.sqrt(pair.b2), f"f0 = {root}, {ratio}", q)]
    if len(poles) == 1 or pair.b2 <= 0 or poles[1].imag:
        return [(1 / pair.b1, dominant, None)]
    if pair.separation > SEPARATED:
        found: list[tuple[float, str, float | None]] = [
            (1 / pair.b1, dominant, None),
            (pair.b1 / pair.b2, next_one, None),
        ]
    elif pair.separation < 4:
        # several real poles close together: two coefficients would make them a pair, and neither formula holds
        return []
    else:
        low, high = np.sort(np.abs(np.roots([pair.b2, pair.b1, 1.0])))
        quadratic = f"root of 1 + {first}·s + {second}·s²" if first == "b1" else f"root of s² + {first}·s + {second}"
        found = [(float(low), quadratic, None), (float(high), quadratic, None)]
    # two coefficients hold two poles: with a third near the second they give their sum, and belong to neither
    crowded = len(poles) > 2 and max(abs(poles[2] / poles[1]), abs(poles[1] / poles[2])) < THIRD_FAR
    return found[:1] if crowded else found
