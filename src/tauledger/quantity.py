"""Numbers with units in engineering notation, and changes in per cent."""

from __future__ import annotations

import math

from quantiphy import Quantity

MICRO = "µ"


class _Figure(Quantity):
    """A quantity with preferences of its own, so that nobody else's are touched."""


_Figure.set_prefs(map_sf={"u": MICRO, "μ": MICRO}, spacer=" ", strip_radix=True, form="si")


def engineering(value: float, unit: str = "", digits: int = 4, *, zeros: bool = True) -> str:
    """Write `value` with an SI prefix, e.g. 0.00272 A → "2.720 mA".

    digits: significant digits. zeros: keep trailing zeros, so that columns line up; without them a nominal value
    reads as it was written ("50 pF").
    Infinite and missing values are written as "∞" and "–".
    """
    if math.isnan(value):
        return "–"
    if math.isinf(value):
        return "∞" if value > 0 else "-∞"
    if value == 0.0:
        return f"0 {unit}".rstrip()
    rounded = float(f"{value:.{digits - 1}e}")
    text: str = _Figure(rounded, unit).render(prec=digits - 1, strip_zeros=not zeros)
    return text.replace("μ", MICRO).rstrip()


def percent(fraction: float, digits: int = 2) -> str:
    """Write a fraction as signed per cent: +0.0312 → "+3.1 %"; at least one decimal below ten per cent."""
    value = 100.0 * fraction
    decimals = max(0, digits - 1 - math.floor(math.log10(abs(value)))) if value else 1
    return f"{value:+.{min(decimals, 2)}f} %"


def decibel_unit(unit: str) -> str:
    """Give the unit of a gain in decibel by the unit of the gain: dB of a plain ratio, dBΩ of Ω, dBS of S."""
    return {"Ω": "dBΩ", "S": "dBS"}.get(unit, "dB")
