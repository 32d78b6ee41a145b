"""Numbers as one writes them in the margin of a calculation: three digits, a prefix, no unit."""

from __future__ import annotations

import math

from tauledger.quantity import MICRO

PREFIXES = {-15: "f", -12: "p", -9: "n", -6: MICRO, -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}


def compact(value: float, digits: int = 3) -> str:
    """Write a number without unit and trailing zeros: 2200 → "2.2k", 4.35e-10 → "435p", -81.5 → "−81.5".

    digits: significant digits. Infinite and missing values are written as "∞" and "–".
    """
    if math.isnan(value):
        return "–"
    sign = "−" if value < 0 else ""
    if math.isinf(value):
        return f"{sign}∞"
    if value == 0:
        return "0"
    mantissa, exponent = f"{abs(value):.{digits - 1}e}".split("e")
    power = min(12, max(-15, 3 * (int(exponent) // 3)))
    decimals = max(0, digits - 1 - (int(exponent) - power))
    text = f"{float(mantissa) * 10.0 ** (int(exponent) - power):.{decimals}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return f"{sign}{text}{PREFIXES[power]}"


def plain(value: float, digits: int = 3) -> str:
    """Write a number that is rather below 1 than in milli: 0.987, −0.0127, 121, −42.5k; for gains and for ohms."""
    if 1e-3 <= abs(value) < 1.0:
        return f"{value:.{digits}g}".replace("-", "−")
    return compact(value, digits)
