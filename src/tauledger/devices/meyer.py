"""MOS transistors of levels 1, 2, 3 and 9: the channel's conductances and Meyer's capacitances, all by reading.

The readings are times m and hold the overlap; drain and source resistance, R_SH·NRD included, have readings too. The
capacitances stand where they are when the device works in reverse; only the controlled sources exchange their ends.

Source: Meyer, "MOS models and circuit simulation", RCA Review 32, 1971.
"""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, names, never_refused, readings_of
from tauledger.devices.field_effect import cell_of, channel, ends_of, figures, is_p, kept, mos_region, series
from tauledger.devices.parts import capacitance, conductance
from tauledger.solution import Bias, Observation

READINGS = (
    *("id", "vgs", "vds", "von", "vdsat", "gm", "gds", "gmbs", "gbd", "gbs"),
    *("cgs", "cgd", "cgb", "cbd", "cbs", "rd", "rs", "drainconductance", "sourceconductance"),
)

INSTANCE_PARAMETERS = names("l w ad as pd ps nrd nrs m off icvds icvgs icvbs temp dtemp")
COMMON = """vto vt0 kp gamma phi lambda rd rs cbd cbs is pb cgso cgdo cgbo rsh cj mj cjsw mjsw js tox ld u0 uo fc nsub
    tpg nss tnom kf af"""
MODEL_PARAMETERS = {
    1: names(COMMON),
    2: names(f"{COMMON} delta uexp ucrit vmax xj neff nfs"),
    3: names(f"{COMMON} xl wd xw delvto delvt0 vmax xj nfs xd alpha eta delta input_delta theta kappa"),
}
MODEL_PARAMETERS[9] = MODEL_PARAMETERS[3]


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS)


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    g_drain = read["drainconductance"] if read["rd"] > 0.0 else 0.0
    g_source = read["sourceconductance"] if read["rs"] > 0.0 else 0.0
    ends = ends_of(circuit, element, g_drain, g_source, in_reverse=read["vds"] < 0.0)
    body = ends.body
    assert body is not None
    gm, g_o, g_mb = read["gm"], read["gds"], read["gmbs"]
    parts = kept(
        (
            *series(name, ends, g_drain, g_source),
            *channel(name, ends, gm, g_o, g_mb),
            conductance(name, body, ends.inner_drain, read["gbd"], "g_db"),
            conductance(name, body, ends.inner_source, read["gbs"], "g_sb"),
            capacitance(name, ends.gate, ends.inner_source, read["cgs"], "c_gs"),
            capacitance(name, ends.gate, ends.inner_drain, read["cgd"], "c_gd"),
            capacitance(name, ends.gate, body, read["cgb"], "c_gb"),
            capacitance(name, ends.inner_drain, body, read["cbd"], "c_db"),
            capacitance(name, ends.inner_source, body, read["cbs"], "c_sb"),
        )
    )
    sign = -1.0 if is_p(model.type) else 1.0
    return Device(
        name=name,
        kind=model.type,
        region=mos_region(read["vgs"], read["vds"], sign * read["von"], sign * read["vdsat"], read["id"]),
        figures=figures(
            bias,
            element,
            sign * read["id"],
            gm=gm,
            g_mb=g_mb,
            g_o=g_o,
            charges={"c_gs": read["cgs"], "c_gd": read["cgd"], "c_db": read["cbd"], "c_sb": read["cbs"]},
            gate_charge=read["cgs"] + read["cgd"] + read["cgb"],
        ),
        terminals=ends.terminals(),
        cell=cell_of(name, ends, gm, g_o, g_mb),
        parts=parts,
        without_charge=not any(part.kind == "capacitance" for part in parts),
    )


def _family(level: int) -> Family:
    return Family(
        letter="M",
        words="MOS transistor",
        terminals=("drain", "gate", "source", "body"),
        linearise=_linearise,
        observe=_observe,
        refuse=never_refused,
        model_types=("nmos", "pmos"),
        levels=(level,),
        instance_parameters=INSTANCE_PARAMETERS,
        model_parameters=MODEL_PARAMETERS[level],
    )


def _without_ac(_element: Element, _model: Model | None) -> Refusal | None:
    return Refusal(
        "level",
        "level 6 of a MOS transistor has no AC model in ngspice: its sweep takes the device as not there",
        "use level 1, 2 or 3, or a BSIM model",
    )


LEVEL_1, LEVEL_2, LEVEL_3, LEVEL_9 = (_family(level) for level in (1, 2, 3, 9))
LEVEL_6 = Family(
    letter="M",
    words="MOS transistor",
    terminals=("drain", "gate", "source", "body"),
    linearise=_linearise,
    observe=_observe,
    refuse=_without_ac,
    model_types=("nmos", "pmos"),
    levels=(6,),
    instance_parameters=INSTANCE_PARAMETERS,
    model_parameters=names(f"{COMMON} kv nv kc nc nvth ps gamma1 sigma lambda0 lambda1"),
)
