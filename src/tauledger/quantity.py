"""Numbers with units in engineering notation, and the netlist's own way of writing them."""

from __future__ import annotations

import math

from quantiphy import Quantity

MICRO = "µ"


def engineering(value: float, unit: str = "", digits: int = 4) -> str:
    """Write `value` with an SI prefix, e.g. 0.00272 A → "2.72 mA".

    digits: significant digits; trailing zeros are kept so that columns line up.
    Infinite and missing values are written as "∞" and "–".
    """
    if math.isnan(value):
        return "–"
    if math.isinf(value):
        return "∞" if value > 0 else "-∞"
    rounded = float(f"{value:.{digits - 1}e}")
    with Quantity.prefs(map_sf={"u": MICRO, "μ": MICRO}, spacer=" ", strip_zeros=False, strip_radix=True):
        text = Quantity(rounded, unit).render(prec=digits - 1)
    return text.replace("μ", MICRO).rstrip()


def percent(fraction: float, digits: int = 2) -> str:
    """Write a fraction as signed per cent: +0.0312 → "+3.1 %"; at least one decimal below ten per cent."""
    value = 100.0 * fraction
    decimals = max(0, digits - 1 - math.floor(math.log10(abs(value)))) if value else 1
    return f"{value:+.{min(decimals, 2)}f} %"
