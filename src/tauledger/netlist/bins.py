"""Binned models: name.1, name.2, .. of which a transistor takes the one whose range of length and width it lies in."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping

from tauledger.circuit import Model

_NUMBERED = re.compile(r"(.+)\.\d+")
# Sizes that are equal but for rounding lie in the range.
ROUNDING = 1e-12


def bins_of(names: Iterable[str]) -> dict[str, list[str]]:
    """Give the names under which bins can be called, each with the names of its bins in the order given."""
    found: dict[str, list[str]] = {}
    for name in names:
        match = _NUMBERED.fullmatch(name)
        if match is not None:
            found.setdefault(match.group(1), []).append(name)
    return found


def fits(model: Model, parameters: Mapping[str, float]) -> bool:
    """Say whether a transistor of this l and (whole) w lies in the range of a bin, both ends included."""
    if (
        not {"lmin", "lmax", "wmin", "wmax"} <= {name for name, _ in model.parameters}
        or not {"l", "w"} <= parameters.keys()
    ):
        return False
    length, width = parameters["l"], parameters["w"]
    return all(
        low * (1.0 - ROUNDING) <= size <= high * (1.0 + ROUNDING)
        for size, low, high in (
            (length, model.parameter("lmin", 0.0), model.parameter("lmax", math.inf)),
            (width, model.parameter("wmin", 0.0), model.parameter("wmax", math.inf)),
        )
    )
