"""The netlist's way of writing numbers: a decimal number, a scale suffix, and a unit that is only read past.

Source of the suffixes: SPICE's own (T G MEG K M MIL U N P F), upper and lower case alike; M is milli, F is femto.
"""

from __future__ import annotations

import re

from msgspec import Struct

SCALES = {"t": 1e12, "g": 1e9, "meg": 1e6, "k": 1e3, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "n": 1e-9, "p": 1e-12}
SCALES |= {"f": 1e-15, "mil": 25.4e-6}

# A second suffix in the place of the unit; m and f there are metre and farad.
DOUBLED = re.compile(r"(.*\d\.?(?:meg|[tgkmuµμnpf]))(?:meg|[tgkuµμnp])", re.IGNORECASE | re.DOTALL)
# A number with the suffix that elsewhere means mega.
CAPITAL_M = re.compile(r"(?<=[\s=])([0-9.]+)M(?:[oO]hms?)?(?=\s|$)")

_DECIMAL = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+))(?:([eEdD])([+-]?\d{1,9}))?(.*)", re.ASCII | re.DOTALL)
_SUFFIX = re.compile(r"meg|mil|[tgkmuµμnpf]", re.IGNORECASE)
_UNIT = re.compile(r"[A-Za-zµμΩ°%]*")


class Decimal(Struct, frozen=True):
    """A number as read. tail: what stands behind suffix and unit and would be dropped ("5" of "4k5"), else empty."""

    value: float
    tail: str = ""


def read_number(text: str) -> Decimal | None:
    """Read a number with its suffix, e.g. "2.2kohm" → 2200; None where the text does not begin as a number.

    A value beyond the range of double precision is infinite; the caller says so.
    """
    match = _DECIMAL.fullmatch(text)
    if match is None:
        return None
    mantissa, _letter, exponent, rest = match.groups()
    value = float(f"{mantissa}e{exponent or 0}")
    suffix = _SUFFIX.match(rest)
    scale = 1.0
    if suffix is not None:
        scale = SCALES[suffix.group().lower()]
        rest = rest[suffix.end() :]
    unit = _UNIT.match(rest)
    return Decimal(_scaled(value, scale, mantissa, exponent), rest[unit.end() if unit else 0 :])


def read_formula_number(text: str) -> float:
    """Read a number inside a formula; there the engine knows no mil (it is milli) and no exponent letter d."""
    match = _DECIMAL.fullmatch(text)
    if match is None:
        raise ValueError(text)
    mantissa, letter, exponent, rest = match.groups()
    if letter in ("d", "D"):
        rest, exponent = f"d{exponent}{rest}", None
    lower = rest.lower()
    scale = 1e6 if lower.startswith("meg") else SCALES.get(lower[:1], 1.0)
    return _scaled(float(f"{mantissa}e{exponent or 0}"), scale, mantissa, exponent)


def _scaled(value: float, scale: float, mantissa: str, exponent: str | None) -> float:
    """Scale by moving the exponent where the suffix is a power of ten: 4.7u is the double next to 4.7e-6."""
    if scale == 1.0:
        return value
    power = f"{scale:e}".partition("e")
    if float(power[0]) != 1.0:
        return value * scale
    return float(f"{mantissa}e{int(exponent or 0) + int(power[2])}")
