"""The vertical power MOS transistor: channel, gate charge and series resistances by reading, and its body diode.

The body diode stands between the outer drain and source, behind R_B on the side of the source. Its capacitance has a
reading (`cds`), its conductance has none: it follows from the model. Reverse biased ngspice takes, to the last digit of
a measurement, gmin (whatever m is) plus the slope of I_S·(1 + 3·n·V_T/(e·v)), which counts where it is hot: I_S grows
by 1e5 from 27 to 125 °C. Where the diode conducts or is near breakdown, the instance is measured alone and fitted. The
shunt R_DS counts in ngspice's operating point, and (measured) not in its AC analysis.

With self-heating (the flag `thermal`) the temperatures of junction and case are voltages of two nodes more, and AC
takes part in it: the instance is then measured alone with all five, at the temperatures of its operating point. The
heat capacity of the junction is a part of its own, from there to ground: above a few hertz it is a short.
"""

from __future__ import annotations

import math

from msgspec.structs import replace

from tauledger.circuit import GROUND, Circuit, Element, Model
from tauledger.devices.family import GMIN, Device, Family, Refusal, Terminal, inner_node, names, readings_of
from tauledger.devices.field_effect import Ends, cell_of, channel, figures, kept, mos_region, series
from tauledger.devices.fitted import field_effect, isolated
from tauledger.devices.gummel_poon import ZERO_CELSIUS
from tauledger.devices.parts import capacitance, conductance
from tauledger.devices.temperature import (
    device_temperature,
    nominal_temperature,
    polynomial_factor,
    temperature_rise,
)
from tauledger.quantity import engineering
from tauledger.solution import Bias, Isolation, Observation

READINGS = (
    *("id", "vgs", "vds", "von", "gm", "gds", "cgs", "cgd", "cds"),
    *("rd", "rs", "drainconductance", "sourceconductance"),
)
TERMINALS = ("drain", "gate", "source", "junction", "case")
JUNCTION = 3
# k/q in V/K as ngspice has it (CODATA 2014): with the value of 2019 a hot diode differs by 3e-6.
BOLTZMANN_OVER_CHARGE = 1.38064852e-23 / 1.6021766208e-19
# Forward voltage that counts as conducting: four times V_T.
FORWARD_VOLT = 0.1
# The current of breakdown falls by e per n_BV·V_T below BV; this many of them below it nothing is left.
BREAKDOWN_THERMAL_VOLTAGES = 40.0
# More than this of its voltage falls across R_B: the junction's own is no longer that of the terminals.
ACROSS_R_B = 1e-7
# The node behind R_B has a blank in its name in older versions of ngspice.
INNER = ("drain", "source", "gate", "body diode", "body_diode")


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS)


def _refuse(element: Element, model: Model | None) -> Refusal | None:
    if model is not None and _heats_itself(element) and len(element.nodes) != len(TERMINALS):
        return Refusal(
            "thermal",
            "self-heating needs nodes for the temperatures of junction and case",
            f"write {element.name} drain gate source junction case {element.model} thermal",
        )
    return None


def _heats_itself(element: Element) -> bool:
    return "thermal" in dict(element.parameters)


def is_p_channel(model: Model) -> bool:
    """Say whether the model is that of a p-channel device."""
    return any(model.parameter(name, 0.0) for name in ("pchan", "vdmosp"))


def diode_conducts(circuit: Circuit, element: Element, bias: Bias) -> bool:
    """Say whether the body diode carries so much, forward or by breakdown, that the instance is measured alone."""
    model = circuit.model(element.model)
    forward = _forward_volt(model, element, bias)
    kelvin = device_temperature(circuit, element) + ZERO_CELSIUS
    breakdown = dict(model.parameters).get("bv")
    margin = BREAKDOWN_THERMAL_VOLTAGES * model.parameter("nbv", 1.0) * BOLTZMANN_OVER_CHARGE * kelvin
    if forward > FORWARD_VOLT or (breakdown is not None and -forward > breakdown - margin):
        return True
    g_body = _conductance(model, "rb", element.parameter("m", 1.0), temperature_rise(circuit, element, model))
    return g_body > 0.0 and diode_conductance(circuit, element, forward) > ACROSS_R_B * g_body


def _forward_volt(model: Model, element: Element, bias: Bias) -> float:
    sign = -1.0 if is_p_channel(model) else 1.0
    drain, source = (float(bias.voltages[element.nodes[place]]) for place in (0, 2))
    return sign * (source - drain)


def diode_conductance(circuit: Circuit, element: Element, v: float) -> float:
    """Give dI/dv of the body diode in S at its forward voltage v in V, gmin included; breakdown apart.

    Forward and down to -3·n·V_T I = I_S·(e^(v/(n·V_T)) - 1), below it I = -I_S·(1 + 3·n·V_T/(e·v)); I_S(T) as of a
    junction diode (Antognetti and Massobrio, "Semiconductor Device Modeling with SPICE", 1988, section 1.4).
    """
    model = circuit.model(element.model)
    kelvin = device_temperature(circuit, element) + ZERO_CELSIUS
    nominal = nominal_temperature(circuit, model) + ZERO_CELSIUS
    n = model.parameter("n", 1.0)
    nvt = n * BOLTZMANN_OVER_CHARGE * kelvin
    warmer = kelvin / nominal
    exponent = (warmer - 1.0) * model.parameter("eg", 1.11) / nvt + model.parameter("xti", 3.0) / n * math.log(warmer)
    saturation = element.parameter("m", 1.0) * model.parameter("is", 1e-14) * math.exp(exponent)
    gmin = dict(circuit.options).get("gmin", GMIN)
    if v >= -3.0 * nvt:
        return saturation * math.exp(v / nvt) / nvt + gmin
    return saturation * 9.0 * nvt / (math.e * v**2) + gmin


def _isolate(circuit: Circuit, element: Element, bias: Bias) -> Isolation | None:
    """Measure the instance alone where its body diode conducts or it heats itself."""
    alone = _heats_itself(element) or diode_conducts(circuit, element, bias)
    return isolated(INNER)(circuit, element, bias) if alone else None


def _fitted(circuit: Circuit, element: Element, bias: Bias) -> Device:
    """Give the device as its terminals answer, under the type of its channel."""
    kind = "pmos" if is_p_channel(circuit.model(element.model)) else "nmos"
    models = tuple(replace(model, type=kind) if model.name == element.model else model for model in circuit.models)
    device = field_effect(replace(circuit, models=models), element, bias, terminals=TERMINALS)
    if not _heats_itself(element) or circuit.model(element.model).parameter("cthj", 0.0) <= 0.0:
        return device
    return _with_heat(device, circuit.nodes[element.nodes[JUNCTION]])


def _with_heat(device: Device, junction: str) -> Device:
    """Bring the heat capacity at the junction's node out of the block, in J/K where a capacitance has F."""
    *elements, rest = device.parts
    at = rest.nodes.index(junction)
    rows = [list(row) for row in rest.capacitances]
    joule_per_kelvin, rows[at][at] = rows[at][at], 0.0
    heat = capacitance(device.name, junction, GROUND, joule_per_kelvin, "c_th")
    slow_hz = rest.conductances[at][at] / (2.0 * math.pi * joule_per_kelvin)
    warm = (
        f"{device.name} heats itself, and its temperature follows the signal up to some {engineering(slow_hz, 'Hz')}: "
        f"the hand analysis of the upper edge refers to what is faster, name such a frequency with --midband"
    )
    return replace(
        device,
        parts=(*elements, heat, replace(rest, capacitances=tuple(map(tuple, rows)))),
        remarks=(*device.remarks, warm),
    )


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    if _heats_itself(element) or diode_conducts(circuit, element, bias):
        return _fitted(circuit, element, bias)
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    m = element.parameter("m", 1.0)
    rise = temperature_rise(circuit, element, model)
    sign = -1.0 if is_p_channel(model) else 1.0
    drain, gate, source = (circuit.nodes[node] for node in element.nodes[:3])
    g_drain = read["drainconductance"] if read["rd"] > 0.0 else 0.0
    g_source = read["sourceconductance"] if read["rs"] > 0.0 else 0.0
    g_gate, g_body = (_conductance(model, resistance, m, rise) for resistance in ("rg", "rb"))
    inner_gate = inner_node(name, "g") if g_gate else gate
    inner_body = inner_node(name, "b") if g_body else source
    ends = Ends(
        drain=drain,
        gate=inner_gate,
        source=source,
        body=None,
        inner_drain=inner_node(name, "d") if g_drain else drain,
        inner_source=inner_node(name, "s") if g_source else source,
        reversed=read["vds"] < 0.0,
    )
    gm, g_o = read["gm"], read["gds"]
    g_diode = diode_conductance(circuit, element, _forward_volt(model, element, bias))
    parts = kept(
        (
            *series(name, ends, g_drain, g_source),
            conductance(name, gate, inner_gate, g_gate, "g_gate"),
            *channel(name, ends, gm, g_o, 0.0),
            capacitance(name, inner_gate, ends.inner_source, read["cgs"], "c_gs"),
            capacitance(name, inner_gate, ends.inner_drain, read["cgd"], "c_gd"),
            conductance(name, source, inner_body, g_body, "g_body"),
            conductance(name, drain, inner_body, g_diode, "g_diode"),
            capacitance(name, drain, inner_body, read["cds"], "c_db"),
        )
    )
    threshold = sign * read["von"]
    return Device(
        name=name,
        kind="pmos" if sign < 0.0 else "nmos",
        region=mos_region(read["vgs"], read["vds"], threshold, read["vgs"] - threshold, read["id"]),
        figures=figures(
            bias,
            element,
            sign * read["id"],
            gm=gm,
            g_mb=None,
            g_o=g_o,
            charges={"c_gs": read["cgs"], "c_gd": read["cgd"], "c_db": read["cds"]},
            gate_charge=read["cgs"] + read["cgd"],
        ),
        terminals=(
            Terminal("drain", drain, ends.inner_drain),
            Terminal("gate", gate, inner_gate),
            Terminal("source", source, ends.inner_source),
        ),
        cell=cell_of(name, ends, gm, g_o, 0.0),
        parts=parts,
        without_charge=not any(part.kind == "capacitance" for part in parts),
    )


def _conductance(model: Model, resistance: str, m: float, rise_k: float) -> float:
    """Give m/(R·(1 + T·ΔT + T2·ΔT²)) in S of R_G or R_B; 0 where the model has none."""
    ohm = model.parameter(resistance, 0.0)
    if not ohm:
        return 0.0
    of_temperature = [model.parameter(f"t{resistance}{order}", 0.0) for order in (1, 2)]
    return m / (ohm * polynomial_factor(of_temperature[0], of_temperature[1], rise_k))


FLAGS = names("nchan pchan vdmosn vdmosp vdmos")
VDMOS = Family(
    letter="M",
    words="power MOS transistor",
    terminals=TERMINALS,
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    optional_terminals=2,
    model_types=("vdmos",),
    levels=(1,),
    instance_parameters=names("m off icvds icvgs temp dtemp thermal"),
    model_parameters=names(
        """
        vto vth0 kp phi lambda theta rd rs rg tnom kf af rq vq mtriode tcvth vtotc mu bex texp0 texp1 trd1 trd2 trg1
        trg2 trs1 trs2 trb1 trb2 subshift ksubthres tksubthres1 tksubthres2 bv ibv nbv rds rb n tt eg xti is vj cjo m fc
        cgdmin cgdmax a cgs rthjc rthca cthj vgs_max vgd_max vds_max vgsr_max vgdr_max pd_max id_max idr_max te_max
        rth_ext derating
        """
    )
    | FLAGS,
    flags=FLAGS,
    isolate=_isolate,
)
