"""Families that ngspice does not tell enough about: measured alone, fitted, and reduced to textbook elements.

What the readings of a compact model leave out (quasi-saturation, base modulation, gate and body resistances, tunnel
currents) is in its terminal admittance; `extrinsic.py` brings out its series resistances, `fit.py` makes G and C of
what lies behind, `reduced.py` the elements that paper knows. All are imported where an instance is fitted: a board
without one does not pay for them.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.bsim import BSIM3_LEVELS, BSIM4_LEVELS
from tauledger.devices.bsim3_parameters import MODEL_PARAMETERS as BSIM3_PARAMETERS
from tauledger.devices.bsim4_parameters import MODEL_PARAMETERS as BSIM4_PARAMETERS
from tauledger.devices.family import Device, Family, Refusal, Terminal, Transconductor, inner_node, names, readings_of
from tauledger.devices.field_effect import Ends, cell_of, figures, is_p, mos_region
from tauledger.devices.gummel_poon import MODEL_PARAMETERS as GUMMEL_POON_PARAMETERS
from tauledger.devices.gummel_poon import delayed_remark, excess_delay, region_of
from tauledger.devices.jfet import DISPERSION, LEVEL_2
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
from tauledger.devices.parts import Part, conductance
from tauledger.devices.temperature import device_temperature
from tauledger.solution import Bias, Isolation, Observation, Samples

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from tauledger.devices.delayed_fit import Delay

# Suffixes of the engine's inner nodes; those that an instance does not have are left out.
GUMMEL_POON_INNER = ("collector", "collCX", "base", "emitter")
VBIC_INNER = ("collector", "collCI", "base", "baseBI", "baseBP", "emitter", "substrate", "xf1", "xf2")
HICUM_INNER = ("collCI", "baseBP", "baseBI", "emitEI", "subsSI", "xf", "xf1", "xf2")
FET_INNER = ("drain", "source", "gate", "midgate", "dbody", "body", "Body", "sbody", "drainPrmPrm", "sourcePrmPrm")

# The node behind the series resistance of a terminal, by its place: collector, base, emitter; drain, gate, source.
BEHIND_BIPOLAR = {0: ("collCX", "collector", "collCI"), 1: ("base", "baseBP"), 2: ("emitter", "emitEI")}
BEHIND_FET = {0: ("drain",), 1: ("gate",), 2: ("source",)}
LABELS_BIPOLAR = {0: "g_c", 1: "g_b", 2: "g_e"}
LABELS_FET = {0: "g_drain", 1: "g_gate", 2: "g_source"}

OFF_SIEMENS = 1e-9

# What the engine calls the drain's current, by element letter, the first that a model has; and what tells the region.
CURRENTS = {"M": ("id", "ids"), "J": ("id",), "Z": ("cd",)}
THRESHOLDS = ("vgs", "vds", "vth", "vdsat")

Refuse = Callable[[Element, Model | None], Refusal | None]


def isolated(inner: tuple[str, ...]) -> Callable[[Circuit, Element, Bias], Isolation | None]:
    """Give the `isolate` of a family that is fitted, with these inner nodes."""

    def isolate(_circuit: Circuit, element: Element, bias: Bias) -> Isolation:
        from tauledger.devices.fit import frequencies

        volts = tuple(float(bias.voltages[node]) for node in element.nodes)
        return Isolation(element.name, volts, frequencies(), inner=inner, each_node=True)

    return isolate


def bipolar(circuit: Circuit, element: Element, bias: Bias) -> Device:
    """Give a fitted bipolar transistor: series resistances, hybrid-π between what lies behind, and the remainder.

    Raises ElementError where no matrices describe it.
    """
    from tauledger.devices.extrinsic import series_outside
    from tauledger.devices.fit import fit
    from tauledger.devices.reduced import hybrid_pi, placed, with_remainder

    outside, name = series_outside(bias.samples[element.name], BEHIND_BIPOLAR), element.name
    model = circuit.model(element.model)
    delay = _delay(outside.behind, excess_delay(model), readings_of(bias, element))
    if delay is None:
        found = fit(outside.behind)
        late: tuple[Part, ...] = ()
    else:
        from tauledger.devices.delayed_fit import delay_parts, fit_delayed

        found = fit_delayed(outside.behind, delay)
        late = delay_parts(name, found, delay)
    outer = [circuit.nodes[node] for node in element.nodes]
    inner = _inner(name, outer, outside.siemens, "cbe")
    c, b, e = inner[:3]
    s = circuit.nodes[element.nodes[3]] if len(element.nodes) > 3 else None
    ports = BIPOLAR_TERMINALS[: len(element.nodes)]
    elements = hybrid_pi(name, ports, found, ("collector", "base", "emitter", None if s is None else "substrate"))
    value = {part.label: part.value for part in elements}
    sign = 1.0 if model.type == "npn" else -1.0
    v_be, v_bc = (sign * _volts(bias, element, 1, k) for k in (2, 0))
    ampere = readings_of(bias, element)["ic"]
    gm, c_pi, c_mu = value.get("gm", 0.0), value.get("c_pi", 0.0), value.get("c_mu", 0.0)
    figures = (
        ("i_c", ampere),
        ("v_ce", _volts(bias, element, 0, 2)),
        ("gm", gm),
        ("r_pi", _inverse(value.get("g_pi"))),
        ("r_o", _inverse(value.get("g_o"))),
        ("c_pi", c_pi),
        ("c_mu", c_mu),
        ("f_t", _transit_hz(gm, c_pi + c_mu)),
        ("gm/I", gm / abs(ampere) if ampere else None),
    )
    terminals = [Terminal(*one) for one in zip(BIPOLAR_TERMINALS, outer, inner, strict=False)]
    cell = None
    if len({c, b, e}) == 3 and gm:
        cell = Transconductor(name, b, e, c, gm, _inverse(value.get("g_pi")), _inverse(value.get("g_o")))
    return Device(
        name=name,
        kind=model.type,
        region=region_of(v_be, v_bc, device_temperature(circuit, element)),
        figures=tuple((symbol, number) for symbol, number in figures if number is not None),
        terminals=tuple(terminals),
        cell=cell,
        parts=(
            *_series(name, outer, inner, outside.siemens, LABELS_BIPOLAR),
            *late,
            *placed(with_remainder(name, ports, found, elements), dict(zip(ports, inner, strict=True))),
        ),
        remarks=(delayed_remark(name, delay.delay_s),) if delay is not None else (),
    )


def _delay(samples: Samples, delay_s: float, read: Mapping[str, float]) -> Delay | None:
    """Give the transport current that excess phase delays, and v(b'e') that controls it; None without delay."""
    if delay_s == 0.0:
        return None
    from tauledger.devices.delayed_fit import Delay

    base, emitter = (_recorded(samples, name, place) for name, place in (("base", 1), ("emitter", 2)))
    return Delay(read["gm"] + read["go"], delay_s, base - emitter)


def _recorded(samples: Samples, name: str, place: int) -> NDArray[np.complex128]:
    """Give the voltage of an inner node, that of its terminal where there is none, V/V (n_freq, n_terminals)."""
    import numpy as np

    if name in samples.inner:
        return samples.inner_gain[:, samples.inner.index(name), :]
    return np.broadcast_to(np.eye(len(samples.terminals), dtype=complex)[place], samples.admittance.shape[:2])


def _inner(name: str, outer: Sequence[str], siemens: Mapping[int, float], letters: str) -> tuple[str, ...]:
    """Give the nodes behind the series resistances, the terminals themselves where there are none."""
    return tuple(inner_node(name, letters[k]) if k in siemens else node for k, node in enumerate(outer))


def _series(
    name: str, outer: Sequence[str], inner: Sequence[str], siemens: Mapping[int, float], labels: Mapping[int, str]
) -> tuple[Part, ...]:
    return tuple(conductance(name, outer[k], inner[k], g, labels[k]) for k, g in sorted(siemens.items()))


def field_effect(circuit: Circuit, element: Element, bias: Bias, *, terminals: tuple[str, ...] | None = None) -> Device:
    """Give a fitted field-effect transistor: series resistances, channel and charges behind them, and the remainder.

    terminals: their words where they are others than drain, gate, source and body.
    Drain and source are exchanged where the gate's current flows the other way.
    Raises ElementError where no matrices describe it.
    """
    from tauledger.devices.extrinsic import series_outside
    from tauledger.devices.fit import fit
    from tauledger.devices.reduced import placed, quasi_static, with_remainder

    outside, name = series_outside(bias.samples[element.name], BEHIND_FET), element.name
    found = fit(outside.behind)
    outer = [circuit.nodes[node] for node in element.nodes]
    inner = _inner(name, outer, outside.siemens, "dgs")
    d, g, s = inner[:3]
    ports = (terminals or MOS_TERMINALS)[: len(element.nodes)]
    body = "body" if "body" in ports else None
    b = circuit.nodes[element.nodes[3]] if body else None
    forward = quasi_static(name, ports, found, ("drain", "gate", "source", body))
    turned = any(part.label == "gm" and part.value < 0.0 for part in forward)
    elements = quasi_static(name, ports, found, ("source", "gate", "drain", body)) if turned else forward
    value = {part.label: part.value for part in elements}
    gm, g_o, g_mb = (value.get(label, 0.0) for label in ("gm", "g_o", "g_mb"))
    kind = circuit.model(element.model).type
    sign = -1.0 if is_p(kind) else 1.0
    read = readings_of(bias, element)
    ampere = next((sign * read[name] for name in CURRENTS[element.letter] if name in read), math.nan)
    ends = Ends(d, g, s, b, d, s, turned)
    gate = ports.index("gate")
    told = figures(
        bias,
        element,
        ampere,
        gm=gm,
        g_mb=value.get("g_mb") if b is not None else None,
        g_o=g_o,
        charges={label: value[label] for label in ("c_gs", "c_gd", "c_db", "c_sb") if label in value},
        gate_charge=float(found.at_rest()[1][gate, gate]),
    )
    return Device(
        name=name,
        kind=kind,
        region=_region(read, gm, g_o, turned=turned),
        # models that do not tell their current leave out what follows from it
        figures=tuple((symbol, number) for symbol, number in told if math.isfinite(number)),
        terminals=tuple(Terminal(*one) for one in zip(ports, outer, inner, strict=True)),
        cell=cell_of(name, ends, gm, g_o, g_mb) if len({d, g, s}) == 3 else None,
        parts=(
            *_series(name, outer, inner, outside.siemens, LABELS_FET),
            *placed(with_remainder(name, ports, found, elements), dict(zip(ports, inner, strict=True))),
        ),
    )


def _region(read: Mapping[str, float], gm: float, g_o: float, *, turned: bool) -> str:
    """Name the region: by threshold and saturation voltage where the engine tells them, else by gm and g_ds."""
    if {*THRESHOLDS, "id"} <= read.keys():
        return mos_region(read["vgs"], read["vds"], read["vth"], read["vdsat"], read["id"])
    if gm < OFF_SIEMENS:
        return "off"
    word = "triode" if g_o > gm else "saturation"
    return f"{word}, reversed" if turned else word


def _volts(bias: Bias, element: Element, plus: int, minus: int) -> float:
    return float(bias.voltages[element.nodes[plus]] - bias.voltages[element.nodes[minus]])


def _inverse(siemens: float | None) -> float | None:
    return 1.0 / siemens if siemens is not None and siemens > 0.0 else None


def _transit_hz(gm: float, farad: float) -> float | None:
    return gm / (2.0 * math.pi * farad) if gm > 0.0 and farad > 0.0 else None


def _reading(*asked: str, optional: tuple[str, ...] = ()) -> Callable[[Element], Observation | None]:
    def observe(element: Element) -> Observation:
        return Observation(element.name, asked, optional)

    return observe


def _never(_element: Element, _model: Model | None) -> Refusal | None:
    return None


def _quasi_static_only(element: Element, model: Model | None) -> Refusal | None:
    given = {**dict(model.parameters if model is not None else ()), **dict(element.parameters)}
    if given.get("acnqsmod", 0.0) != 0.0:
        return Refusal(
            "acnqsmod",
            "the non-quasi-static model for AC (ACNQSMOD) is no network of conductances and capacitances",
            "leave ACNQSMOD out, or set it to 0",
        )
    return None


def _without_dispersion(_element: Element, model: Model | None) -> Refusal | None:
    given = dict(model.parameters) if model is not None else {}
    for name in DISPERSION:
        if given.get(name, 0.0) != 0.0:
            return Refusal(
                name,
                f"dispersion ({name.upper()}) is no network of conductances and capacitances",
                f"leave {name.upper()} out, or use level 1",
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
MOS_TERMINALS = ("drain", "gate", "source", "body")
GATE_TERMINALS = ("drain", "gate", "source")
BIPOLAR_INSTANCE = names("area areab areac m off icvbe icvce temp dtemp dt")
MOS_INSTANCE = names(
    """l w m ad as pd ps nrd nrs off nf sa sb sd sca scb scc sc min rbdb rbsb rbpb rbps rbpd delvto delvt0 mulu0 xgw
    ngcon wnflag nqsmod trnqsmod acnqsmod rbodymod rgatemod geo geomod rgeomod temp dtemp nbdp"""
)
GATE_INSTANCE = names("area m l w off icvds icvgs temp dtemp td ts")


def _bipolar(
    levels: tuple[int, ...],
    inner: tuple[str, ...],
    parameters: frozenset[str],
    words: str,
    refuse: Refuse,
    read: tuple[str, ...] = ("ic",),
) -> Family:
    return Family(
        letter="Q",
        words=words,
        terminals=BIPOLAR_TERMINALS,
        linearise=bipolar,
        observe=_reading(*read),
        refuse=refuse,
        optional_terminals=1,
        model_types=("npn", "pnp"),
        levels=levels,
        instance_parameters=BIPOLAR_INSTANCE,
        model_parameters=parameters,
        isolate=isolated(inner),
    )


def _fet(
    letter: str,
    types: tuple[str, ...],
    levels: tuple[int, ...],
    parameters: frozenset[str],
    words: str,
    refuse: Refuse = _never,
) -> Family:
    mos = letter == "M"
    return Family(
        letter=letter,
        words=words,
        terminals=MOS_TERMINALS if mos else GATE_TERMINALS,
        linearise=field_effect,
        observe=_reading(optional=CURRENTS[letter] + (THRESHOLDS if mos else ())),
        refuse=refuse,
        model_types=types,
        levels=levels,
        instance_parameters=MOS_INSTANCE if mos else GATE_INSTANCE,
        model_parameters=parameters,
        isolate=isolated(FET_INNER),
    )


QUASI_SATURATION = _bipolar(
    (1,), GUMMEL_POON_INNER, GUMMEL_POON_PARAMETERS, "bipolar transistor", _never, ("ic", "gm", "go")
)
VBIC_BIPOLAR = _bipolar((4, 9), VBIC_INNER, VBIC, "bipolar transistor", _never)
HICUM_BIPOLAR = _bipolar((8,), HICUM_INNER, HICUM, "bipolar transistor", _without_self_heating)
MESFETS = (
    _fet("Z", ("nmf", "pmf"), (1,), MESFET, "MESFET"),
    _fet("Z", ("nmf", "pmf"), (2, 3, 4), MESFET_A, "MESFET"),
    _fet("Z", ("nhfet", "phfet"), (5,), HFET_1, "heterostructure FET"),
    _fet("Z", ("nhfet", "phfet"), (6,), HFET_2, "heterostructure FET"),
)
OTHER_FETS = (
    _fet("J", ("njf", "pjf"), (2,), LEVEL_2.model_parameters, "junction field-effect transistor", _without_dispersion),
    _fet("M", ("nmos", "pmos"), BSIM3_LEVELS, BSIM3_PARAMETERS, "MOS transistor", _quasi_static_only),
    _fet("M", ("nmos", "pmos"), BSIM4_LEVELS, BSIM4_PARAMETERS, "MOS transistor", _quasi_static_only),
    _fet("M", ("nmos", "pmos"), (4,), BSIM1, "MOS transistor"),
    _fet("M", ("nmos", "pmos"), (5,), BSIM2, "MOS transistor"),
    _fet("M", ("nmos", "pmos"), (10, 58), BSIM_SOI, "MOS transistor on insulator", _quasi_static_only),
    _fet("M", ("nmos", "pmos"), (68,), HISIM2, "MOS transistor"),
)
FITTED: tuple[Family, ...] = (QUASI_SATURATION, VBIC_BIPOLAR, HICUM_BIPOLAR, *MESFETS, *OTHER_FETS)
