"""The junction diode: conductance and capacitance from the engine's readings, behind its series resistance.

`gd` and `cd` hold junction, sidewall, diffusion, recombination and tunnelling, temperature and area. The series
resistance has no reading: it follows from model, area and temperature. The engine multiplies m= of a diode in again at
every analysis (measured in version 39), so it is given area and pj times m instead.
"""

from __future__ import annotations

from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.family import Device, Family, Refusal, Terminal, inner_node, names, readings_of
from tauledger.devices.gummel_poon import BOLTZMANN, CONDUCTING_THERMAL_VOLTAGES, ELECTRON, ZERO_CELSIUS
from tauledger.devices.parts import capacitance, conductance
from tauledger.devices.temperature import polynomial_factor, temperature_rise
from tauledger.solution import Bias, Observation

READINGS = ("vd", "id", "gd", "cd")
# Near the breakdown voltage the current grows by decades within some per cent of it.
BREAKDOWN = 0.95
# Of level 3: metal and polysilicon capacitors over the junction, which area and pj do not scale.
OVERLAYS = ("lm", "lp", "wm", "wp")


def region_of(v_d: float, temperature_c: float, breakdown_v: float | None) -> str:
    """Name the region from the junction voltage in V in whole words."""
    v_t = BOLTZMANN * (temperature_c + ZERO_CELSIUS) / ELECTRON
    if v_d > CONDUCTING_THERMAL_VOLTAGES * v_t:
        return "conducting"
    if breakdown_v is not None and -v_d > BREAKDOWN * breakdown_v:
        return "breakdown"
    return "off"


def without_m(element: Element, model: Model | None) -> tuple[tuple[str, float], ...]:
    """Give the parameters of the card with m worked into area and pj."""
    given = dict(element.parameters)
    m = given.pop("m", 1.0)
    if m == 1.0 or model is None:
        return tuple(given.items())
    area, perimeter = _area(element, model), given.get("pj", model.parameter("pj", 0.0))
    if model.level == 3 and "w" in given and "l" in given:
        perimeter = 2.0 * (given.pop("w") + given.pop("l"))
    given |= {"area": m * area, "pj": m * perimeter}
    return tuple(given.items())


def _area(element: Element, model: Model) -> float:
    given = dict(element.parameters)
    if model.level == 3 and "w" in given and "l" in given:
        return given["w"] * given["l"]
    return given.get("area", model.parameter("area", 1.0))


def _observe(element: Element) -> Observation | None:
    return Observation(element.name, READINGS)


def _refuse(element: Element, model: Model | None) -> Refusal | None:
    if model is None or element.parameter("m", 1.0) == 1.0 or model.level != 3:
        return None
    if any(name in dict(element.parameters) for name in OVERLAYS):
        return Refusal(
            "m",
            "m= together with metal or polysilicon capacitors of level 3 is scaled differently by each ngspice version",
            "leave m out, and write the diode as many times as it is there",
        )
    return None


def _linearise(circuit: Circuit, element: Element, bias: Bias) -> Device:
    model = circuit.model(element.model)
    read = readings_of(bias, element)
    name = element.name
    a, c = (circuit.nodes[node] for node in element.nodes[:2])
    rise = temperature_rise(circuit, element, model)
    r_s = model.parameter("rs", 0.0)
    linear = model.parameter("trs1", model.parameter("trs", 0.0))
    scale = _area(element, model) * element.parameter("m", 1.0)
    g_s = scale / (r_s * polynomial_factor(linear, model.parameter("trs2", 0.0), rise)) if r_s else 0.0
    ai = inner_node(name, "a") if g_s else a
    parts = (
        conductance(name, a, ai, g_s, "g_s"),
        conductance(name, ai, c, read["gd"], "g_d"),
        capacitance(name, ai, c, read["cd"], "c_d"),
    )
    kept = tuple(part for part in parts if part.value != 0.0 and part.nodes[0] != part.nodes[1])
    bv = dict(model.parameters).get("bv")
    temperature = rise + model.parameter("tnom", model.parameter("tref", circuit.tnom_c))
    figures = [("i_d", read["id"]), ("v_d", read["vd"]), ("r_d", 1.0 / read["gd"] if read["gd"] > 0.0 else None)]
    figures.append(("c_d", read["cd"]))
    return Device(
        name=name,
        kind="diode",
        region=region_of(read["vd"], temperature, bv),
        figures=tuple((symbol, value) for symbol, value in figures if value is not None),
        terminals=(Terminal("anode", a, ai), Terminal("cathode", c, c)),
        cell=None,
        parts=kept,
        without_charge=not any(part.kind == "capacitance" for part in kept),
    )


DIODE = Family(
    letter="D",
    words="diode",
    terminals=("anode", "cathode"),
    linearise=_linearise,
    observe=_observe,
    refuse=_refuse,
    model_types=("d",),
    levels=(1, 3),
    instance_parameters=names("area pj w l m off temp dtemp lm lp wm wp"),
    model_parameters=names(
        """
        level is js jsw tnom tref rs trs trs1 trs2 n ns tt ttt1 ttt2 cjo cj0 cj vj pb m mj tm1 tm2 cjp cjsw php mjsw
        ikf ik ikr nbv area pj tlev tlevc eg xti cta ctc ctp tpb tvj tphp jtun jtunsw ntun xtitun keg kf af fc fcs
        bv ibv ib tcv isr nr fv_max bv_max id_max te_max pd_max rth0 cth0 lm lp wm wp xom xoi xm xp
        """
    ),
    as_written=without_m,
)
