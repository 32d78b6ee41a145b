"""Lines: lossless (T) by characteristic impedance and delay, lossy (O) by R, L, G, C per length and their length.

A line is one part by its delay: √(L·C) of the whole length, or R·C where it has no inductance. One with R and G alone,
which ngspice has as well, is resistive.
"""

from __future__ import annotations

import math

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, names, never_refused, observe_nothing
from tauledger.devices.parts import Part, conductance, line, transconductance
from tauledger.solution import Bias

TERMINALS = ("near plus", "near minus", "far plus", "far minus")
# How the engine steps through time: of no effect on the response.
FLAGS = names("nocontrol steplimit nosteplimit lininterp quadinterp mixedinterp truncnr truncdontcut")
HAS = {
    frozenset("lc"): "L and C",
    frozenset("rlc"): "R, L and C",
    frozenset("rc"): "R and C",
    frozenset("rg"): "R and G",
}


def _lossless(circuit: Circuit, element: Element, _bias: Bias) -> Device:
    z0, delay_s = element.parameter("z0", 0.0), element.parameter("td", 0.0)
    part = line(element.name, _ends(circuit, element), delay_s, surge_ohm=z0)
    return Device(element.name, "lossless line", "", (), (), None, (part,))


def _lossy(circuit: Circuit, element: Element, _bias: Bias) -> Device:
    ends = _ends(circuit, element)
    model = circuit.model(element.model)
    ohm, henry, siemens, farad = (model.parameter(name, 0.0) * model.parameter("len", 0.0) for name in "rlgc")
    parts: tuple[Part, ...]
    if siemens:
        parts = _resistive(element.name, ends, ohm, siemens)
    elif henry:
        parts = (line(element.name, ends, math.sqrt(henry * farad), math.sqrt(henry / farad), ohm),)
    else:
        parts = (line(element.name, ends, ohm * farad, series_ohm=ohm),)
    return Device(element.name, "lossy line", "", (), (), None, parts)


def _ends(circuit: Circuit, element: Element) -> tuple[str, str, str, str]:
    near_plus, near_minus, far_plus, far_minus = (circuit.nodes[node] for node in element.nodes)
    return near_plus, near_minus, far_plus, far_minus


def _resistive(owner: str, ends: tuple[str, str, str, str], ohm: float, siemens: float) -> tuple[Part, ...]:
    """Give a line of R and G: with θ = √(RG), y₁₁ = √(G/R)/tanh θ and y₂₁ = −√(G/R)/sinh θ."""
    theta, surge = math.sqrt(ohm * siemens), math.sqrt(siemens / ohm)
    y11, y21 = surge / math.tanh(theta), -surge / math.sinh(theta)
    near, far = ends[:2], ends[2:]
    if near[1] == far[1]:
        across = surge * math.tanh(theta / 2.0)
        return (
            conductance(owner, *near, across, "near"),
            conductance(owner, near[0], far[0], -y21, "through"),
            conductance(owner, *far, across, "far"),
        )
    return (
        conductance(owner, *near, y11, "near"),
        conductance(owner, *far, y11, "far"),
        transconductance(owner, near, far, y21, "back"),
        transconductance(owner, far, near, y21, "forth"),
    )


def _refuse(_element: Element, model: Model | None) -> Refusal | None:
    if model is None:
        return None
    for name in "rlgc":
        if model.parameter(name, 0.0) < 0.0:
            return Refusal(name, f"a lossy line cannot have a negative {name.upper()}", f"give {name.upper()}= above 0")
    given = frozenset(name for name in "rlgc" if model.parameter(name, 0.0) > 0.0)
    if given not in HAS:
        has = ", ".join(name.upper() for name in "rlgc" if name in given) or "nothing"
        culprit = next((name for name in "gcrl" if name in given), "c")
        known = "; ".join(HAS.values())
        return Refusal(culprit, f"ngspice has no lossy line of {has}", f"per length give: {known}")
    if not model.parameter("len", 0.0) > 0.0:
        return Refusal("len", "the length LEN of a lossy line must be greater than 0", "give LEN=")
    return None


LOSSLESS_LINE = Family(
    letter="T",
    words="lossless line",
    terminals=TERMINALS,
    linearise=_lossless,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=names("z0 td"),
)
LOSSY_LINE = Family(
    letter="O",
    words="lossy line",
    terminals=TERMINALS,
    linearise=_lossy,
    observe=observe_nothing,
    refuse=_refuse,
    model_types=("ltra",),
    levels=(1,),
    model_parameters=names("r l g c len rel abs compactrel compactabs"),
    flags=FLAGS,
)
