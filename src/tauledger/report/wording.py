"""How the report names things and writes numbers: "C_μ of Q1", "121.9 Hz", "share 64 %"."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping

from tauledger.quantity import engineering, percent
from tauledger.record import DeviceFacts, Owner, PartRow, Review

_UNITS = {"ohm": "Ω"}
_GREEK = {"pi": "π", "mu": "μ", "tau": "τ", "beta": "β"}
_LABELS = {"cexbc": "dQ_be/dV_bc", "rc": "C in R·C"}
_RATIOS = ("", "V/V", "A/A")
_PART_UNIT = {"capacitance": "F", "transcapacitance": "F", "inductance": "H", "C": "F", "L": "H", "R": "Ω"}
_PART_UNIT |= {"mutual inductance": "H", "line": "s"}

# A coefficient stands after or before a fraction bar, after a product or a root, or in a phrase; a node of that name
# does not.
_COEFFICIENT = re.compile(
    r"(?<=[/·√])[ab][1-9]\b|\b[ab][1-9](?=/(?:[ab][1-9]\b|\(?2π))|\ba1(?= is the first)|\b[ab][1-9](?=·s)"
    r"|(?<=·s \+ )[ab][1-9]\b"
    r"|(?:(?<!nodes )(?<!between )\b(?:a1 and a2|b1 and b2)|(?<=coefficients )(?:a1, a2|b1, b2))\b"
)
EDGE = {"f_high": "f_H", "f_low": "f_L"}

SOLVED = "†"
LOOP = "‡"
NO_NUMBER = "–"
_NOTHING = 5e-5
# Less than what is printed of an angle.
NOTHING_DEG = 0.05


def number(value: float | None, unit: str, digits: int = 4) -> str:
    """Write a number with its unit, at most `digits` significant digits; a dash where there is none."""
    if value is None:
        return NO_NUMBER
    if unit in _RATIOS:
        # five digits and more stand in full: 23820 V/V, not a power of ten
        plain = f"{float(f'{value:.{digits}g}'):.0f}" if 1e4 <= abs(value) < 1e7 else f"{value:.{digits}g}"
        return f"{plain} {unit}".rstrip()
    return engineering(value, _UNITS.get(unit, unit), digits)


def nominal(value: float, unit: str) -> str:
    """Write the value of a part as one would on a schematic: "50 pF", no trailing zeros."""
    return engineering(value, _UNITS.get(unit, unit), 3 if abs(value) == 0.0 else 4, zeros=False)


def amount(part: PartRow) -> str:
    """Write a part's value: as on the schematic where it is a card of its own or a line, with three digits else.

    The remainder of a fitted device is no single value: a dash.
    """
    if part.kind == "block":
        return NO_NUMBER
    unit = part_unit(part.kind)
    return nominal(part.value, unit) if part.kind == "line" else value_of(part.name, part.owner, part.value, unit)


def value_of(name: str, owner: str, value: float, unit: str) -> str:
    """Write the value of an element: a card as on the schematic, what lies inside a device with three digits."""
    return nominal(value, unit) if name == owner else number(value, unit, 3)


def part_unit(kind: str) -> str:
    """Give the unit of a part's value: F, H, Ω or s."""
    return _PART_UNIT[kind]


def move(fraction: float | None, digits: int = 2) -> str:
    """Write a change as signed per cent, a dash where there is none."""
    if fraction is None or not math.isfinite(fraction):
        return NO_NUMBER
    return "0.00 %" if abs(fraction) < _NOTHING else percent(fraction, digits)


def degrees(value: float | None) -> str:
    """Write an angle with one decimal, "23.5°"; no minus before a zero, a dash where there is none."""
    if value is None:
        return NO_NUMBER
    return f"{value if abs(value) >= NOTHING_DEG else 0.0:.1f}°"


def change(after: float | None, before: float | None) -> float | None:
    """Give how far a value lies from what it was, as a fraction; None where either is missing or nothing was there."""
    return after / before - 1.0 if after is not None and before else None


def fraction(value: float | None) -> str:
    """Write a share as per cent without a plus sign."""
    return move(value).removeprefix("+")


def share(value: float | None) -> str:
    """Write a share of a band edge: "64 %"; negative, "-6.0 %", where more of the part widens the band."""
    return fraction(value)


def symbol(label: str) -> str:
    """Write a label as the trade does: c_mu → C_μ, i_c → I_C, r_pi → r_π, f_t → f_T."""
    head, _, tail = label.partition("_")
    if not tail:
        return label
    tail = _GREEK.get(tail, tail)
    if head in ("i", "v"):
        return f"{head.upper()}_{tail.upper()}"
    if head == "c":
        return f"C_{tail}"
    if head == "l":
        return f"L_{tail}"
    if head == "f":
        return f"f_{tail.upper()}"
    return f"{head}_{tail}"


def figure_symbols(device: DeviceFacts) -> tuple[str, ...]:
    """Write the symbols of a device's figures; where it has C_bx, C_μ of the operating point is the sum of both."""
    return tuple(
        "C_μ+bx" if device.c_mu_with_bx and figure.symbol == "c_mu" else symbol(figure.symbol)
        for figure in device.figures
    )


def coefficients(text: str) -> str:
    """Set the coefficients of the denominator apart from nodes of the same name: "1/(2π·b1)" → "1/(2π·b₁)"."""
    return _COEFFICIENT.sub(
        lambda found: re.sub(r"(?<=[ab])[1-9]", lambda k: "₁₂₃₄₅₆₇₈₉"[int(k.group()) - 1], found[0]), text
    )


def part_title(name: str, owner: str) -> str:
    """Name a part: a card by itself ("CL"), a device's own as "C_μ of Q1"."""
    label = name.removeprefix(owner).removeprefix(".")
    if not label or not name.startswith(owner):
        return name
    if label == "inside":
        return f"inside {owner}"
    if label in _LABELS:
        return f"{_LABELS[label]} of {owner}"
    return f"{symbol(label)} of {owner}"


def part_titles(parts: Iterable[PartRow]) -> Mapping[str, str]:
    """Give the title of every part by its name."""
    return {part.name: part_title(part.name, part.owner) for part in parts}


def retitled(text: str, parts: Iterable[PartRow]) -> str:
    """Write "Q1.c_mu" inside a sentence as the tables do: "C_μ of Q1"."""
    text = coefficients(text)
    inner = {part.name: part_title(part.name, part.owner) for part in parts if part.name != part.owner}
    if not inner:
        return text
    names = "|".join(re.escape(name) for name in sorted(inner, key=len, reverse=True))
    return re.sub(rf"(?<![\w.])(?:{names})(?![\w.])", lambda found: inner[found.group()], text)


def owners_text(owners: Iterable[Owner], titles: Mapping[str, str], most: int = 2) -> str:
    """Say what a pole depends on: "C_μ of Q1 64 %, CL 29 %"; nothing below 10 %."""
    large = sorted((owner for owner in owners if abs(owner.share) >= 0.1), key=lambda owner: -abs(owner.share))
    return ", ".join(f"{_owner_title(owner.part, titles)} {fraction(owner.share)}" for owner in large[:most])


def _owner_title(name: str, titles: Mapping[str, str]) -> str:
    """Give the title of what owns a pole; the all-pass in the place of a delay ("Q1.gm.delay") is no part."""
    if name not in titles and name.endswith(".delay"):
        return f"delay of {name.rsplit('.', 2)[0]}"
    return titles.get(name, name)


def withheld(review: Review) -> str:
    """Say why tables that rest on hand analysis or the rebuilt network are left out; empty where none is."""
    if network_rejected(review):
        return "Left out, for the rebuilt network is not ngspice's: budget, steps, shares, lower edge, poles."
    if review.midband.from_hz is None:
        return "Hand tables are left out: without a plateau no capacitor is clearly short or open."
    if review.budget.upper is None:
        return "Hand tables are left out: the notes below say why."
    return ""


def group_delay(review: Review) -> str:
    """Name what the weighted sum equals: the sums know lines as at DC alone."""
    return "group delay without lines" if any(part.kind == "line" for part in review.parts) else "group delay"


def by_loop(review: Review) -> str:
    """Say what the mark of a resistance by loop or branch form means; inside a feedback loop such rows only rank."""
    told = "R0/(1 + T), the loop through it counted, or branches by 1 − K; T and K are of the solved network"
    if any(facts.found for facts in review.loops):
        told += "; divided by 1 + T of the feedback loop R·C ranks nodes, but f_H follows from the loop"
    return told


AGREEMENT_WARNS = 1e-6
AGREEMENT_FAILS = 1e-3


def network_rejected(review: Review) -> bool:
    """Whether the rebuilt network differs so much from the sweep that nothing may rest on it."""
    return review.agreement is not None and not review.agreement.max_relative_error <= AGREEMENT_FAILS
