"""`--want margin=60`: a figure that the amplifier should have."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from tauledger.commands.console import hertz
from tauledger.errors import InputError

if TYPE_CHECKING:
    from tauledger.asked import Want

FIGURES = "margin=60 (degrees), gain_margin=12 (dB), f_u=5meg, f_h=1meg or f_l=20 (Hz)"
HALF_TURN_DEG = 180.0
_PLAIN = re.compile(r"[0-9]+(\.[0-9]*)?|\.[0-9]+")


def wanted(given: tuple[str, ...]) -> tuple[Want, ...]:
    """Read the figures that are wanted, each quantity once.

    Raises InputError where one is no such figure, or no value that it can have.
    """
    found: dict[str, Want] = {}
    for text in given:
        want = _want(text)
        if want.quantity in found:
            raise InputError(f"--want {text}: {want.quantity} is wanted twice", "give each figure once")
        found[want.quantity] = want
    return tuple(found.values())


def _want(text: str) -> Want:
    from tauledger.asked import Want

    name, equals, value = (part.strip() for part in text.partition("="))
    # figures are least values, f_l a greatest one
    bound = name[-1:] if name[-1:] in "<>" else ""
    name = name.removesuffix(bound).strip() if bound else name
    quantity = name.lower()
    if bound and bound != ("<" if quantity == "f_l" else ">"):
        meant = "a greatest value" if quantity == "f_l" else "a least value"
        raise InputError(f"--want {text}: a wanted {name} is {meant}", f"give e.g. {FIGURES}")
    match quantity:
        case "margin":
            degrees = _number(text, value, "deg", "degrees, e.g. margin=60")
            if degrees >= HALF_TURN_DEG:
                raise InputError(f"--want {text}: a phase margin lies below 180 degrees", "give e.g. margin=60")
            return Want("margin", degrees)
        case "gain_margin":
            return Want("gain_margin", _number(text, value, "db", "decibels, e.g. gain_margin=12"))
        case "f_u" | "f_h" | "f_l":
            hz = hertz(f"--want {name}{bound}=", value) if equals else 0.0
            if not hz > 0.0:
                raise InputError(f"--want {text}: no frequency above 0", f"give hertz, e.g. {quantity}=1meg")
            return Want(quantity, hz)
    raise InputError(f"--want {text}: not a figure that can be wanted", f"give {FIGURES}")


def _number(text: str, value: str, unit: str, right: str) -> float:
    """Read a plain number: a suffix of SPICE would make 60m of 60 degrees a twentieth of one."""
    bare = value.lower().removesuffix("°").removesuffix("degrees").removesuffix(unit).strip()
    if not _PLAIN.fullmatch(bare) or not 0.0 < float(bare) < float("inf"):
        raise InputError(f"--want {text}: not a value above 0", f"give {right}")
    return float(bare)
