"""BSIM3v3 and BSIM4: channel and junctions by reading, and the charge of four terminals with what is not reciprocal.

The readings c_ij = ∂Q_i/∂V_j, i of gate, drain, body, j of gate, drain, source, give the 4 × 4 matrix, because charge
is kept and only differences of voltage act. It is written as the textbook's elements: capacitances c_gs, c_gd, c_gb,
c_db, c_sb, c_ds, and three transcapacitances: c_m = C_dg − C_gd and c_mb = C_db − C_bd, the currents into the drain by
gate and body, and c_mx = C_bg − C_gb, that into the body by the gate. In reverse, drain and source are exchanged in it,
not in junctions and overlap.
Overlap depends on the bias. Newer versions of ngspice tell it; for others the instance is measured alone, without its
series resistances, and what its gate moves into the other terminals beyond the readings is the overlap.

Source: Tsividis and McAndrew, "Operation and Modeling of the MOS Transistor", 3rd ed., 2011, chapters 6 and 7
(capacitances and transcapacitances of the complete quasi-static model).
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.bsim3_parameters import MODEL_PARAMETERS as BSIM3_PARAMETERS
from tauledger.devices.bsim4_parameters import MODEL_PARAMETERS as BSIM4_PARAMETERS
from tauledger.devices.family import Device, Family, Refusal, names, readings_of
from tauledger.devices.field_effect import Ends, cell_of, channel, ends_of, figures, is_p, kept, mos_region, series
from tauledger.devices.parts import Part, capacitance, conductance, transcapacitance
from tauledger.solution import Bias, Isolation, Observation

READINGS = (
    *("id", "vgs", "vds", "vbs", "vth", "vdsat", "gm", "gds", "gmbs", "gbd", "gbs", "capbd", "capbs"),
    *("cgg", "cgd", "cgs", "cdg", "cdd", "cds", "cbg", "cbd", "cbs"),
)
OVERLAP = ("cgso", "cgdo", "cgbo")
# Without inner nodes the instance is exactly G + s·C, so that one frequency tells C; here rounding matters least.
ISOLATED_HZ = 1e9
GATE, SOURCE = 1, 2

# What makes an instance more than its readings tell, with the words for it; nonzero is on.
IMPACT = ("alpha0", "alpha1", "lalpha0", "walpha0", "palpha0", "lalpha1", "walpha1", "palpha1")
LEAKAGE = ("agidl", "agisl", "lagidl", "wagidl", "pagidl", "lagisl", "wagisl", "pagisl")
BEYOND = {
    **dict.fromkeys(IMPACT, "impact ionisation"),
    **dict.fromkeys(LEAKAGE, "gate-induced drain leakage"),
    "igcmod": "tunnelling from gate to channel",
    "igbmod": "tunnelling from gate to body",
    "rdsmod": "bias-dependent series resistances",
    "rgatemod": "the resistance of the gate",
    "rbodymod": "the resistances of the body",
    "nqsmod": "the non-quasi-static model",
    "acnqsmod": "the non-quasi-static model",
    "rgeomod": "series resistances from the layout",
}


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS, OVERLAP)


def _refuse(element: Element, model: Model | None) -> Refusal | None:
    if model is None:
        return None
    given = {**dict(model.parameters), **dict(element.parameters)}
    for name, words in BEYOND.items():
        if given.get(name, 0.0) != 0.0:
            return Refusal(
                name,
                f"{words} ({name.upper()}) cannot be rebuilt: ngspice does not tell its derivatives",
                f"leave {name.upper()} out, or set it to 0",
            )
    return None


def _isolate(circuit: Circuit, element: Element, bias: Bias) -> Isolation | None:
    """Measure the instance alone at its inner voltages where this version of ngspice does not tell the overlap."""
    read = readings_of(bias, element)
    if all(name in read for name in OVERLAP):
        return None
    sign = -1.0 if is_p(circuit.model(element.model).type) else 1.0
    volts = (sign * read["vds"], sign * read["vgs"], 0.0, sign * read["vbs"])
    without_resistance = (("nrd", 0.0), ("nrs", 0.0))
    return Isolation(
        element.name,
        volts,
        (ISOLATED_HZ,),
        parameters=without_resistance,
        each_node=True,
        driven=(GATE,),
        grounded=SOURCE,
    )


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    g_drain, g_source = (_series_conductance(element, model, squares) for squares in ("nrd", "nrs"))
    ends = ends_of(circuit, element, g_drain, g_source, in_reverse=read["vds"] < 0.0)
    body = ends.body
    assert body is not None
    gm, g_o, g_mb = read["gm"], read["gds"], read["gmbs"]
    overlap = _overlap(element, bias)
    charges = _charges(name, ends, body, read, overlap)
    parts = kept(
        (
            *series(name, ends, g_drain, g_source),
            *channel(name, ends, gm, g_o, g_mb),
            conductance(name, body, ends.inner_drain, read["gbd"], "g_db"),
            conductance(name, body, ends.inner_source, read["gbs"], "g_sb"),
            *charges,
        )
    )
    at = {part.label: part.value for part in charges}
    sign = -1.0 if is_p(model.type) else 1.0
    return Device(
        name=name,
        kind=model.type,
        region=mos_region(read["vgs"], read["vds"], read["vth"], read["vdsat"], read["id"]),
        figures=figures(
            bias,
            element,
            sign * read["id"],
            gm=gm,
            g_mb=g_mb,
            g_o=g_o,
            charges={label: at[label] for label in ("c_gs", "c_gd", "c_db", "c_sb")},
            gate_charge=read["cgg"] + sum(overlap.values()),
        ),
        terminals=ends.terminals(),
        cell=cell_of(name, ends, gm, g_o, g_mb),
        parts=parts,
        without_charge=not any(part.kind in ("capacitance", "transcapacitance") for part in parts),
    )


def _charges(
    name: str, ends: Ends, body: str, read: Mapping[str, float], overlap: Mapping[str, float]
) -> tuple[Part, ...]:
    """Give the capacitances, those of junctions and overlap included, and the transcapacitances."""
    c_gb = -(read["cgg"] + read["cgd"] + read["cgs"])
    c_db = -(read["cdg"] + read["cdd"] + read["cds"])
    of_drain = (-read["cgd"], -read["cbd"])
    of_source = (-read["cgs"], -read["cbs"])
    if ends.reversed:
        of_drain, of_source = of_source, of_drain
    drain, source, gate = ends.inner_drain, ends.inner_source, ends.gate
    out = (ends.acting_drain, ends.acting_source)
    return (
        capacitance(name, gate, source, of_source[0] + overlap["cgso"], "c_gs"),
        capacitance(name, gate, drain, of_drain[0] + overlap["cgdo"], "c_gd"),
        capacitance(name, gate, body, -c_gb + overlap["cgbo"], "c_gb"),
        capacitance(name, drain, body, of_drain[1] + read["capbd"], "c_db"),
        capacitance(name, source, body, of_source[1] + read["capbs"], "c_sb"),
        capacitance(name, *out, read["cdd"] + read["cgd"] + read["cbd"], "c_ds"),
        transcapacitance(name, out, (gate, ends.acting_source), read["cdg"] - read["cgd"], "c_m"),
        transcapacitance(name, out, (body, ends.acting_source), c_db - read["cbd"], "c_mb"),
        transcapacitance(name, (body, ends.acting_source), (gate, body), read["cbg"] - c_gb, "c_mx"),
    )


def _overlap(element: Element, bias: Bias) -> dict[str, float]:
    """Give the overlap capacitances in F, read, or measured: what the gate's charge moves beyond the readings."""
    read = readings_of(bias, element)
    if all(name in read for name in OVERLAP):
        return {name: read[name] for name in OVERLAP}
    samples = bias.samples[element.name]
    of_drain, _, of_source, of_body = (
        float(siemens) / (2.0 * math.pi * samples.frequency_hz[0]) for siemens in samples.admittance[0, :, GATE].imag
    )
    drain_gate, source_gate = read["cdg"], -(read["cgg"] + read["cdg"] + read["cbg"])
    if read["vds"] < 0.0:
        drain_gate, source_gate = source_gate, drain_gate
    return {"cgso": source_gate - of_source, "cgdo": drain_gate - of_drain, "cgbo": read["cbg"] - of_body}


def _series_conductance(element: Element, model: Model, squares: str) -> float:
    """Give m/(RSH·squares) in S, 0 without resistance; BSIM3 counts one square where the card gives none."""
    n = element.parameter(squares, 1.0 if model.level in BSIM3_LEVELS else 0.0)
    ohm = model.parameter("rsh", 0.0) * n
    return element.parameter("m", 1.0) / ohm if ohm > 0.0 else 0.0


BSIM3_LEVELS = (8, 49)
BSIM4_LEVELS = (14, 54)


def _family(levels: tuple[int, ...], instance: str, parameters: frozenset[str]) -> Family:
    return Family(
        letter="M",
        words="MOS transistor",
        terminals=("drain", "gate", "source", "body"),
        linearise=_linearise,
        observe=_observe,
        refuse=_refuse,
        model_types=("nmos", "pmos"),
        levels=levels,
        instance_parameters=names(instance),
        model_parameters=parameters,
        isolate=_isolate,
    )


BSIM3 = _family(BSIM3_LEVELS, "l w m ad as pd ps nrd nrs off nqsmod acnqsmod geo delvto mulu0", BSIM3_PARAMETERS)
BSIM4 = _family(
    BSIM4_LEVELS,
    """l w m nf sa sb sd sca scb scc sc min ad as pd ps nrd nrs off rbdb rbsb rbpb rbps rbpd delvto delvt0 mulu0 xgw
    ngcon wnflag trnqsmod acnqsmod rbodymod rgatemod geomod rgeomod""",
    BSIM4_PARAMETERS,
)
