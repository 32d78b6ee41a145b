"""The bipolar transistor, SPICE level 1 (Gummel-Poon): readings → hybrid-π with its series resistances.

ngspice's readings are times m and have the same sign for npn and pnp; gmin is inside g_pi and g_mu. R_C and R_E have
no reading: they follow from model, area, m and temperature. The transcapacitance `cexbc` is the current from b' to e'
per dv(b'c')/dt: the base charge depends on both junction voltages.

Source: Gummel and Poon, "An integral charge control model of bipolar transistors", Bell Syst. Tech. J. 49(5), 1970.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from tauledger.circuit import GROUND, Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, Terminal, Transconductor, inner_node, names, readings_of
from tauledger.devices.parts import (
    Part,
    capacitance,
    conductance,
    delayed_transconductance,
    transcapacitance,
    transconductance,
)
from tauledger.quantity import engineering
from tauledger.solution import Bias, Observation

BOLTZMANN = 1.380649e-23  # J/K, SI 2019
ELECTRON = 1.602176634e-19  # C, SI 2019
ZERO_CELSIUS = 273.15

READINGS = (
    *("ic", "vbe", "vbc", "gm", "gpi", "gmu", "go", "gx"),
    *("cqbe", "cqbc", "cqbx", "cqsub", "cexbc"),
    *("m", "area", "temp"),
)

INSTANCE_PARAMETERS = names("area areab areac m off icvbe icvce temp dtemp")

MODEL_PARAMETERS = names(
    """
    level tnom tref subs is ibe ibc iss bf br nf nr ns nc ne nk nkf vaf va var vb ikf ik ikr ise isc c2 c4
    rb irb rbm re rc rco vo gamma qco vg cn d quasimod
    cje vje pe mje me cjc vjc pc mjc mc xcjc cjs csub ccs vjs ps mjs ms fc tf xtf vtf itf ptf tr kf af
    eg xti xtb tlev tlevc tbf1 tbf2 tbr1 tbr2 tikf1 tikf2 tikr1 tikr2 tirb1 tirb2 tnc1 tnc2 tne1 tne2 tnf1 tnf2
    tnr1 tnr2 tns1 tns2 trb trb1 trb2 trc trc1 trc2 tre tre1 tre2 trm1 trm2 tvaf1 tvaf2 tvar1 tvar2
    ctc cte cts tvjc tvje tvjs titf1 titf2 ttf1 ttf2 ttr1 ttr2 tmje1 tmje2 tmjc1 tmjc2 tmjs1 tmjs2
    tis1 tis2 tise1 tise2 tisc1 tisc2 tiss1 tiss2
    vbe_max vbc_max vce_max pd_max ic_max ib_max te_max rth0
    """
)

# Below 10 V_T a junction carries e^10 ≈ 2e4 times its saturation current: nothing on a board.
CONDUCTING_THERMAL_VOLTAGES = 10.0
# Within 8 V_T (0.2 V at 27 °C) the base-collector junction adds B_F/B_R·e^-8, some per cent, to the base current.
SATURATED_THERMAL_VOLTAGES = 8.0


def region_of(v_be: float, v_bc: float, temperature_c: float) -> str:
    """Name the region of operation from the inner junction voltages (V, positive is forward) in whole words."""
    v_t = BOLTZMANN * (temperature_c + ZERO_CELSIUS) / ELECTRON
    if max(v_be, v_bc) < CONDUCTING_THERMAL_VOLTAGES * v_t:
        return "off"
    if abs(v_be - v_bc) < SATURATED_THERMAL_VOLTAGES * v_t:
        return "saturated"
    return "active" if v_be > v_bc else "reversed"


def series_conductance(
    model: Model, resistance: str, tc1: tuple[str, ...], tc2: str, area: float, m: float, dt: float
) -> float:
    """Give the conductance in S of R_C or R_E: area·m / (R·(1 + tc1·ΔT + tc2·ΔT²)); 0 where the model has none.

    dt: device minus nominal temperature, K.
    """
    r_nominal = model.parameter(resistance, 0.0)
    if r_nominal == 0.0:
        return 0.0
    linear = next((model.parameter(name, 0.0) for name in tc1 if name in dict(model.parameters)), 0.0)
    return area * m / (r_nominal * (1.0 + linear * dt + model.parameter(tc2, 0.0) * dt**2))


def vertical_substrate(model: Model) -> bool:
    """Say whether the substrate capacitance hangs at the inner collector; a lateral device has it at the base."""
    return model.parameter("subs", 1.0 if model.type == "npn" else -1.0) > 0.0


def excess_delay(model: Model) -> float:
    """Give the delay in s of the collector current by excess phase: PTF (degrees at 1/(2π·TF)) times TF.

    ngspice takes TF as on the model card, whatever the temperature and the bias.
    """
    return math.radians(model.parameter("ptf", 0.0)) * model.parameter("tf", 0.0)


def delayed_remark(name: str, delay_s: float) -> str:
    """Word what a reader must know of a delayed collector current."""
    return (
        f"excess phase delays the collector current of {name} by {engineering(delay_s, 's')}: the response, the band "
        "edges and their shares count it exactly, the table of poles as an all-pass, the time constants not at all"
    )


def _transconductances(
    name: str, out: tuple[str, str], control: tuple[str, str], gm: float, g_o: float, delay_s: float
) -> tuple[Part, ...]:
    """gm alone, or with excess phase (gm + g_o)·exp(−s·τ) − g_o: what is delayed is the transport current."""
    if delay_s == 0.0:
        return (transconductance(name, out, control, gm, "gm"),)
    return (
        delayed_transconductance(name, out, control, gm + g_o, delay_s, "gm"),
        transconductance(name, out, control, -g_o, "gm_0"),
    )


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS)


def _refuse(_element: Element, model: Model | None) -> Refusal | None:
    if model is None:
        return None
    if model.level != 1:
        return Refusal(
            "level",
            f"level {model.level} of a bipolar transistor cannot be rebuilt from ngspice's readings",
            "use a Gummel-Poon model (level 1)",
        )
    if "rco" in dict(model.parameters):
        return Refusal(
            "rco",
            "quasi-saturation (RCO) cannot be rebuilt: ngspice does not tell the derivatives of the collector region",
            "leave RCO out, and put the collector resistance into RC",
        )
    return None


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    c, b, e = (circuit.nodes[node] for node in element.nodes[:3])
    s = circuit.nodes[element.nodes[3]] if len(element.nodes) > 3 else GROUND

    tnom = model.parameter("tnom", model.parameter("tref", circuit.tnom_c))
    dt = read["temp"] - tnom
    g_b = read["gx"]
    g_c = series_conductance(model, "rc", ("trc1", "trc"), "trc2", read["area"], read["m"], dt)
    g_e = series_conductance(model, "re", ("tre1", "tre"), "tre2", read["area"], read["m"], dt)
    ci, bi, ei = (
        inner_node(name, terminal) if g else outer
        for terminal, outer, g in (("c", c, g_c), ("b", b, g_b), ("e", e, g_e))
    )

    gm, g_pi, g_mu, g_o = read["gm"], read["gpi"], read["gmu"], read["go"]
    substrate_inner = ci if vertical_substrate(model) else bi
    delay_s = excess_delay(model)
    parts = (
        conductance(name, b, bi, g_b, "g_b"),
        conductance(name, c, ci, g_c, "g_c"),
        conductance(name, e, ei, g_e, "g_e"),
        *_transconductances(name, (ci, ei), (bi, ei), gm, g_o, delay_s),
        conductance(name, bi, ei, g_pi, "g_pi"),
        conductance(name, bi, ci, g_mu, "g_mu"),
        conductance(name, ci, ei, g_o, "g_o"),
        capacitance(name, bi, ei, read["cqbe"], "c_pi"),
        capacitance(name, bi, ci, read["cqbc"], "c_mu"),
        capacitance(name, b, ci, read["cqbx"], "c_bx"),
        capacitance(name, substrate_inner, s, read["cqsub"], "c_sub"),
        transcapacitance(name, (bi, ei), (bi, ci), read["cexbc"], "cexbc"),
    )
    kept = tuple(part for part in parts if part.value != 0.0 and not _shorted(part))
    v_ce = float(bias.voltages[element.nodes[0]] - bias.voltages[element.nodes[2]])
    terminals = [Terminal("collector", c, ci), Terminal("base", b, bi), Terminal("emitter", e, ei)]
    if len(element.nodes) > 3:
        terminals.append(Terminal("substrate", s, s))
    return Device(
        name=name,
        kind=model.type,
        region=region_of(read["vbe"], read["vbc"], read["temp"]),
        figures=_figures(read, v_ce),
        terminals=tuple(terminals),
        cell=Transconductor(name, bi, ei, ci, gm, _inverse(g_pi), _inverse(g_o)) if gm else None,
        parts=kept,
        remarks=(delayed_remark(name, delay_s),) if delay_s else (),
        without_charge=not any(part.kind in ("capacitance", "transcapacitance") for part in kept),
    )


def _figures(read: Mapping[str, float], v_ce: float) -> tuple[tuple[str, float], ...]:
    """List the figures of the operating point; c_mu is all of base-collector, X_CJC's outer part (c_bx) included.

    i_c and v_ce carry the signs of the terminals: both are negative in an active pnp. Infinite ones are left out.
    """
    gm, c_pi, c_mu = read["gm"], read["cqbe"], read["cqbc"] + read["cqbx"]
    figures: list[tuple[str, float | None]] = [
        ("i_c", read["ic"]),
        ("v_ce", v_ce),
        ("gm", gm),
        ("r_pi", _inverse(read["gpi"])),
        ("r_o", _inverse(read["go"])),
        ("c_pi", c_pi),
        ("c_mu", c_mu),
        ("f_t", gm / (2.0 * math.pi * (c_pi + c_mu)) if gm > 0.0 and c_pi + c_mu > 0.0 else None),
    ]
    return tuple((symbol, value) for symbol, value in figures if value is not None)


def _inverse(siemens: float) -> float | None:
    return 1.0 / siemens if siemens > 0.0 else None


def _shorted(part: Part) -> bool:
    """A part whose ends, or whose control's ends, are one node carries no current."""
    return part.nodes[0] == part.nodes[1] or (len(part.nodes) == 4 and part.nodes[2] == part.nodes[3])


GUMMEL_POON = Family(
    letter="Q",
    words="bipolar transistor",
    terminals=("collector", "base", "emitter", "substrate"),
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    optional_terminals=1,
    model_types=("npn", "pnp"),
    levels=(1,),
    instance_parameters=INSTANCE_PARAMETERS,
    model_parameters=MODEL_PARAMETERS,
)
