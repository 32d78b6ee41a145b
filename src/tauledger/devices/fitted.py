"""Families that ngspice does not tell enough about: measured alone, fitted, and reduced to textbook elements.

What the readings of a compact model leave out (quasi-saturation, base modulation, gate and body resistances, tunnel
currents) is in its terminal admittance; `fit.py` makes G and C of it, `reduced.py` the elements that paper knows.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from tauledger.circuit import Circuit, Element, Model, terminals_of
from tauledger.devices.family import Device, Family, Refusal, Terminal, Transconductor, names, readings_of
from tauledger.devices.fit import fit, frequencies
from tauledger.devices.gummel_poon import MODEL_PARAMETERS as GUMMEL_POON_PARAMETERS
from tauledger.devices.gummel_poon import region_of
from tauledger.devices.model_names import (
    BSIM1,
    BSIM2,
    BSIM_SOI,
    HFET_1,
    HFET_2,
    HICUM,
    HISIM2,
    MESFET,
    MESFET_A,
    VBIC,
)
from tauledger.devices.parts import Part
from tauledger.devices.reduced import hybrid_pi, quasi_static, with_remainder
from tauledger.solution import Bias, Isolation, Observation

# Suffixes of the engine's inner nodes; those that an instance does not have are left out.
GUMMEL_POON_INNER = ("collector", "collCX", "base", "emitter")
VBIC_INNER = ("collector", "collCI", "base", "baseBI", "baseBP", "emitter", "substrate", "xf1", "xf2")
HICUM_INNER = ("collCI", "baseBP", "baseBI", "emitEI", "subsSI", "xf", "xf1", "xf2")
FET_INNER = ("drain", "source", "gate", "midgate", "dbody", "body", "sbody", "drainPrmPrm", "sourcePrmPrm")

OFF_SIEMENS = 1e-9

Refuse = Callable[[Element, Model | None], Refusal | None]


def isolated(inner: tuple[str, ...]) -> Callable[[Circuit, Element, Bias], Isolation | None]:
    """Give the `isolate` of a family that is fitted, with these inner nodes."""

    def isolate(_circuit: Circuit, element: Element, bias: Bias) -> Isolation:
        volts = tuple(float(bias.voltages[node]) for node in terminals_of(element))
        return Isolation(element.name, volts, frequencies(), inner=inner)

    return isolate


def bipolar(circuit: Circuit, element: Element, bias: Bias) -> Device:
    """Give a fitted bipolar transistor: hybrid-π between its terminals, and the remainder.

    Raises EngineError where no matrices describe it.
    """
    samples = bias.samples[element.name]
    found, name = fit(samples), element.name
    c, b, e = (circuit.nodes[node] for node in element.nodes[:3])
    s = circuit.nodes[element.nodes[3]] if len(element.nodes) > 3 else None
    elements = hybrid_pi(name, samples.terminals, found, (c, b, e, s))
    value = {part.label: part.value for part in elements}
    model = circuit.model(element.model)
    sign = 1.0 if model.type == "npn" else -1.0
    v_be, v_bc = (sign * _volts(bias, element, 1, k) for k in (2, 0))
    gm, c_pi, c_mu = value.get("gm", 0.0), value.get("c_pi", 0.0), value.get("c_mu", 0.0)
    figures = (
        ("i_c", readings_of(bias, element)["ic"]),
        ("v_ce", _volts(bias, element, 0, 2)),
        ("gm", gm),
        ("r_pi", _inverse(value.get("g_pi"))),
        ("r_o", _inverse(value.get("g_o"))),
        ("c_pi", c_pi),
        ("c_mu", c_mu),
        ("f_t", _transit_hz(gm, c_pi + c_mu)),
    )
    terminals = [Terminal("collector", c, c), Terminal("base", b, b), Terminal("emitter", e, e)]
    if s is not None:
        terminals.append(Terminal("substrate", s, s))
    cell = None
    if len({c, b, e}) == 3 and gm:
        cell = Transconductor(name, b, e, c, gm, _inverse(value.get("g_pi")), _inverse(value.get("g_o")))
    return Device(
        name=name,
        kind=model.type,
        region=region_of(v_be, v_bc, _temperature(circuit, element)),
        figures=tuple((symbol, number) for symbol, number in figures if number is not None),
        terminals=tuple(terminals),
        cell=cell,
        parts=with_remainder(name, samples.terminals, found, elements),
    )


def field_effect(circuit: Circuit, element: Element, bias: Bias) -> Device:
    """Give a fitted field-effect transistor: charges and conductances between its terminals, and the remainder.

    Drain and source are exchanged where the gate's current flows the other way. Region: off below 1e-9 S of gm, triode
    where g_ds exceeds gm, else saturated.
    Raises EngineError where no matrices describe it.
    """
    samples = bias.samples[element.name]
    found, name = fit(samples), element.name
    d, g, s = (circuit.nodes[node] for node in element.nodes[:3])
    b = circuit.nodes[element.nodes[3]] if len(element.nodes) > 3 else None
    forward = quasi_static(name, samples.terminals, found, (d, g, s, b))
    gm = _value(forward, "gm")
    turned = gm is not None and gm < 0.0
    elements = quasi_static(name, samples.terminals, found, (s, g, d, b)) if turned else forward
    low, high = (d, s) if turned else (s, d)
    value = {part.label: part.value for part in elements}
    gm, g_o = value.get("gm", 0.0), value.get("g_o", 0.0)
    region = "off" if gm < OFF_SIEMENS else "triode" if g_o > gm else "saturated"
    c_gate = sum(value.get(label, 0.0) for label in ("c_gs", "c_gd", "c_gb"))
    figures = (
        ("i_d", _drain_current(bias, element)),
        ("v_ds", _volts(bias, element, 0, 2)),
        ("gm", gm),
        ("g_mb", value.get("g_mb")),
        ("r_o", _inverse(value.get("g_o"))),
        *((label, value.get(label)) for label in ("c_gs", "c_gd", "c_gb", "c_db", "c_sb")),
        ("f_t", _transit_hz(gm, c_gate)),
    )
    words = (("drain", d), ("gate", g), ("source", s), *((("body", b),) if b is not None else ()))
    cell = None
    if len({d, g, s}) == 3 and gm > 0.0:
        cell = Transconductor(
            name, g, low, high, gm, None, _inverse(value.get("g_o")), b, value.get("g_mb", 0.0) if b else 0.0
        )
    return Device(
        name=name,
        kind=circuit.model(element.model).type,
        region=f"reversed, {region}" if turned and region != "off" else region,
        figures=tuple((symbol, number) for symbol, number in figures if number is not None),
        terminals=tuple(Terminal(word, node, node) for word, node in words),
        cell=cell,
        parts=with_remainder(name, samples.terminals, found, elements),
    )


def _volts(bias: Bias, element: Element, plus: int, minus: int) -> float:
    return float(bias.voltages[element.nodes[plus]] - bias.voltages[element.nodes[minus]])


def _drain_current(bias: Bias, element: Element) -> float:
    read = readings_of(bias, element)
    return next(iter(read.values()))


def _temperature(circuit: Circuit, element: Element) -> float:
    return element.parameter("temp", circuit.temperature_c + element.parameter("dtemp", 0.0))


def _inverse(siemens: float | None) -> float | None:
    return 1.0 / siemens if siemens is not None and siemens > 0.0 else None


def _transit_hz(gm: float, farad: float) -> float | None:
    return gm / (2.0 * math.pi * farad) if gm > 0.0 and farad > 0.0 else None


def _value(parts: tuple[Part, ...], label: str) -> float | None:
    return next((part.value for part in parts if part.label == label), None)


def _reading(*asked: str) -> Callable[[Element], Observation | None]:
    def observe(element: Element) -> Observation:
        return Observation(element.name, asked)

    return observe


def _never(_element: Element, _model: Model | None) -> Refusal | None:
    return None


def _no_delay(_element: Element, model: Model | None) -> Refusal | None:
    if model is not None and model.parameter("ptf", 0.0) != 0.0:
        return Refusal(
            "ptf",
            "excess phase (PTF) together with quasi-saturation (RCO) cannot be rebuilt: a delay is in no matrix",
            "leave one of the two out",
        )
    return None


def _without_self_heating(_element: Element, model: Model | None) -> Refusal | None:
    if model is not None and model.parameter("flsh", 0.0) != 0.0:
        return Refusal(
            "flsh",
            "self-heating (FLSH) cannot be rebuilt: its temperature is no node that ngspice tells",
            "set FLSH to 0 for the small-signal review",
        )
    return None


BIPOLAR_TERMINALS = ("collector", "base", "emitter", "substrate")
MOS_TERMINALS = ("drain", "gate", "source", "bulk")
MESFET_TERMINALS = ("drain", "gate", "source")
BIPOLAR_INSTANCE = names("area areab areac m off icvbe icvce temp dtemp dt")
MOS_INSTANCE = names("l w m ad as pd ps nrd nrs off temp dtemp icvds icvgs icvbs nf sa sb sd nbdp")
MESFET_INSTANCE = names("area m l w off icvds icvgs temp dtemp td ts")


def _bipolar(
    levels: tuple[int, ...], inner: tuple[str, ...], parameters: frozenset[str], words: str, refuse: Refuse
) -> Family:
    return Family(
        letter="Q",
        words=words,
        terminals=BIPOLAR_TERMINALS,
        linearise=bipolar,
        observe=_reading("ic"),
        refuse=refuse,
        optional_terminals=1,
        model_types=("npn", "pnp"),
        levels=levels,
        instance_parameters=BIPOLAR_INSTANCE,
        model_parameters=parameters,
        isolate=isolated(inner),
    )


def _fet(
    letter: str, types: tuple[str, ...], levels: tuple[int, ...], parameters: frozenset[str], words: str
) -> Family:
    mos = letter == "M"
    return Family(
        letter=letter,
        words=words,
        terminals=MOS_TERMINALS if mos else MESFET_TERMINALS,
        linearise=field_effect,
        observe=_reading("id" if mos else "cd"),
        refuse=_never,
        model_types=types,
        levels=levels,
        instance_parameters=MOS_INSTANCE if mos else MESFET_INSTANCE,
        model_parameters=parameters,
        isolate=isolated(FET_INNER),
    )


QUASI_SATURATION = _bipolar((1,), GUMMEL_POON_INNER, GUMMEL_POON_PARAMETERS, "bipolar transistor", _no_delay)
VBIC_BIPOLAR = _bipolar((4, 9), VBIC_INNER, VBIC, "bipolar transistor", _never)
HICUM_BIPOLAR = _bipolar((8,), HICUM_INNER, HICUM, "bipolar transistor", _without_self_heating)
MESFETS = (
    _fet("Z", ("nmf", "pmf"), (1,), MESFET, "MESFET"),
    _fet("Z", ("nmf", "pmf"), (2, 3, 4), MESFET_A, "MESFET"),
    _fet("Z", ("nhfet", "phfet"), (5,), HFET_1, "heterostructure FET"),
    _fet("Z", ("nhfet", "phfet"), (6,), HFET_2, "heterostructure FET"),
)
OTHER_MOS = (
    _fet("M", ("nmos", "pmos"), (4,), BSIM1, "MOS transistor"),
    _fet("M", ("nmos", "pmos"), (5,), BSIM2, "MOS transistor"),
    _fet("M", ("nmos", "pmos"), (10, 58), BSIM_SOI, "MOS transistor on insulator"),
    _fet("M", ("nmos", "pmos"), (68,), HISIM2, "MOS transistor"),
)
FITTED: tuple[Family, ...] = (QUASI_SATURATION, VBIC_BIPOLAR, HICUM_BIPOLAR, *MESFETS, *OTHER_MOS)
