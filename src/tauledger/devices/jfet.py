"""Junction field-effect transistors of levels 1 and 2: channel, gate junctions and their capacitances, by reading.

At the operating point the readings `qgs` and `qgd` hold capacitances. R_D and R_S have no reading: they follow from
model, area and m. The device has one gm from v(g, s') in both directions; in reverse the signs alone differ.

Sources: Shichman and Hodges, "Modeling and simulation of insulated-gate field-effect transistor switching circuits",
IEEE J. Solid-State Circuits SC-3, 1968 (level 1); Parker and Skellern, "An improved FET model for computer simulators",
IEEE Trans. CAD 9(5), 1990 (level 2).
"""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, names, readings_of
from tauledger.devices.field_effect import OFF_AMPERE, cell_of, channel, ends_of, figures, is_p, kept, series
from tauledger.devices.parts import capacitance, conductance
from tauledger.solution import Bias, Observation

READINGS = ("id", "ig", "vgs", "vgd", "gm", "gds", "ggs", "ggd", "qgs", "qgd", "area")
INSTANCE_PARAMETERS = names("area m off temp dtemp")
DISPERSION = ("lfgam", "lfg1", "lfg2", "hfgam", "hfg1", "hfg2", "hfeta", "hfe1", "hfe2", "taug", "taud", "delta")


def region_of(v_gs: float, v_gd: float, pinch_off: float, ampere: float) -> str:
    """Name the region in whole words; voltages in V with the polarity taken out, pinch_off negative."""
    reverse = v_gd > v_gs
    open_end, far_end = (v_gd, v_gs) if reverse else (v_gs, v_gd)
    if abs(ampere) <= OFF_AMPERE or open_end <= pinch_off:
        return "off"
    word = "triode" if far_end > pinch_off else "saturation"
    return f"{word}, reversed" if reverse else word


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS)


def _refuse(_element: Element, model: Model | None) -> Refusal | None:
    if model is None or model.level != 2:
        return None
    given = dict(model.parameters)
    for name in DISPERSION:
        if given.get(name, 0.0) != 0.0:
            return Refusal(
                name,
                f"dispersion or self-heating ({name.upper()}) is no network of conductances and capacitances",
                f"leave {name.upper()} out, or use level 1",
            )
    if given.get("cds", 0.0) != 0.0:
        return Refusal(
            "cds",
            "the drain-source capacitance (CDS) cannot be rebuilt: ngspice does not tell it",
            "leave CDS out, and write a capacitor from drain to source",
        )
    return None


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    g_drain, g_source = (
        read["area"] / ohm if (ohm := model.parameter(resistance, 0.0)) else 0.0 for resistance in ("rd", "rs")
    )
    ends = ends_of(circuit, element, g_drain, g_source, in_reverse=False)
    gm, g_o, sign = read["gm"], read["gds"], -1.0 if is_p(model.type) else 1.0
    parts = kept(
        (
            *series(name, ends, g_drain, g_source),
            *channel(name, ends, gm, g_o, 0.0),
            conductance(name, ends.gate, ends.inner_source, read["ggs"], "g_gs"),
            conductance(name, ends.gate, ends.inner_drain, read["ggd"], "g_gd"),
            capacitance(name, ends.gate, ends.inner_source, read["qgs"], "c_gs"),
            capacitance(name, ends.gate, ends.inner_drain, read["qgd"], "c_gd"),
        )
    )
    pinch_off = model.parameter("vto", model.parameter("vt0", PINCH_OFF))
    return Device(
        name=name,
        kind=model.type,
        region=region_of(read["vgs"], read["vgd"], pinch_off, read["id"]),
        figures=figures(
            bias,
            element,
            sign * read["id"],
            gm=gm,
            g_mb=None,
            g_o=g_o,
            charges={"c_gs": read["qgs"], "c_gd": read["qgd"]},
            gate_charge=read["qgs"] + read["qgd"],
        ),
        terminals=ends.terminals(),
        cell=cell_of(name, ends, gm, g_o, 0.0),
        parts=parts,
        without_charge=not any(part.kind == "capacitance" for part in parts),
    )


PINCH_OFF = -2.0


def _family(level: int, parameters: str) -> Family:
    return Family(
        letter="J",
        words="junction field-effect transistor",
        terminals=("drain", "gate", "source"),
        linearise=_linearise,
        observe=_observe,
        refuse=_refuse,
        model_types=("njf", "pjf"),
        levels=(level,),
        instance_parameters=INSTANCE_PARAMETERS,
        model_parameters=names(parameters),
    )


LEVEL_1 = _family(1, "vt0 vto beta lambda rd rs cgs cgd pb is fc b tnom tcv vtotc bex betatce xti eg kf af nlev gdsnoi")
LEVEL_2 = _family(
    2,
    """acgam af beta cds cgd cgs delta hfeta hfe1 hfe2 hfg1 hfg2 mvst mxi fc ibd is kf lambda lfgam lfg1 lfg2 n p vbi pb
    q rd rs taud taug vbd ver vst vt0 vto xc xi z hfgam tnom""",
)
