"""`.options scale`: the sizes that ngspice multiplies by it, which depend on the letter and on the level of the model.

Measured with ngspice 39, level by level: a deck under `scale` against one with the sizes multiplied by hand.
"""

from __future__ import annotations

from tauledger.circuit import Model

Parameters = tuple[tuple[str, float], ...]

# The power of scale that each size takes.
SIZES = {**dict.fromkeys(("l", "w", "pd", "ps", "sa", "sb", "sd"), 1), **dict.fromkeys(("ad", "as"), 2)}
# MOS levels that take their sizes as written: BSIM1, BSIM2, MOS6, MOS9 and three silicon-on-insulator models.
UNSCALED_MOS = frozenset({4, 5, 6, 9, 55, 56, 57})
# Metal and polysilicon over a level-3 diode; what the model gives is scaled as well.
OVERLAYS = ("lm", "wm", "lp", "wp")
DRAWN_DIODE = 3


def scaled_sizes(parameters: Parameters, scale: float) -> Parameters:
    """Multiply lengths by scale and areas by its square."""
    return tuple((name, value * scale ** SIZES.get(name, 0)) for name, value in parameters)


def scaled(parameters: Parameters, letter: str, model: Model, scale: float) -> Parameters:
    """Give an element's parameters with `.options scale` worked in where ngspice does it for this letter and level."""
    if letter in "RC" or (letter == "M" and model.level not in UNSCALED_MOS):
        return scaled_sizes(parameters, scale)
    if letter == "D" and model.level == DRAWN_DIODE:
        return _drawn_diode(parameters, model, scale)
    return parameters


def grows(parameters: Parameters, letter: str, model: Model) -> bool:
    """Say whether ngspice scales a size of this element again with every analysis: area and pj of a level-3 diode."""
    given = dict(parameters)
    drawn = {"w", "l"} <= given.keys()
    return letter == "D" and model.level == DRAWN_DIODE and not drawn and bool(given.keys() & {"area", "pj"})


def _drawn_diode(parameters: Parameters, model: Model, scale: float) -> Parameters:
    """Scale w and l where both are given, else the area and perimeter that are used in their place."""
    given = dict(parameters)
    if {"w", "l"} <= given.keys():
        given |= {name: given[name] * scale for name in ("w", "l")}
    else:
        given["area"] = given.get("area", model.parameter("area", 1.0)) * scale**2
        given["pj"] = given.get("pj", model.parameter("pj", 0.0)) * scale
    for name in OVERLAYS:
        size = given.get(name, model.parameter(name, 0.0))
        if size:
            given[name] = size * scale
    return tuple(given.items())
