"""Rebuilt field-effect transistors answer as the engine's own do: every region, polarity, scale and temperature."""

from __future__ import annotations

from collections.abc import Callable
from itertools import product

import numpy as np
import pytest
from msgspec.structs import replace

from agreement import FAR_OUT, IN_BAND, disagreement, reads_past, rebuilt, worst_of
from circuits import board
from tauledger.circuit import Circuit, Element, Model
from tauledger.devices.bsim import BSIM4, _overlap
from tauledger.devices.catalogue import choose, fitting, isolations, linearise
from tauledger.devices.family import Device, Refusal
from tauledger.devices.field_effect import mos_region
from tauledger.devices.parts import resistance
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.network.assemble import Network


def model(kind: str, level: int, **parameters: float) -> Model:
    return Model("mx", kind, level, tuple(parameters.items()), 0, 0)


MEYER = {
    **{"kp": 6e-5, "gamma": 0.5, "phi": 0.65, "tox": 2e-8, "nsub": 2e16, "u0": 550.0, "ld": 5e-8},
    **{"cgso": 2e-10, "cgdo": 3e-10, "cgbo": 1e-10, "cj": 2e-4, "mj": 0.5, "cjsw": 3e-10, "mjsw": 0.33, "pb": 0.8},
    **{"js": 1e-6, "fc": 0.5},
}
# Voltages of the n-channel stage: gate, supply, body against the source's rail.
MOS_BIAS = {
    "off": (0.2, 3.0, 0.0),
    "weak": (0.62, 3.0, 0.0),
    "saturation": (1.3, 3.0, -0.3),
    "triode": (3.0, 1.0, 0.0),
    "reversed": (2.0, -2.0, -2.5),
    "forward body": (1.3, 3.0, 0.35),
}
GEOMETRY = "w=2e-5 l=1e-6 ad=2e-11 as=3e-11 pd=3e-5 ps=4e-5"


def mos_stage(
    card: Model,
    gate: float = 1.3,
    supply: float = 3.0,
    body: float = -0.3,
    extra: str = "",
    temperature_c: float = 27.0,
) -> Circuit:
    """A common-source stage of either polarity, its body behind a resistance of its own."""
    sign = -1.0 if card.type == "pmos" else 1.0
    return board(
        *(f"VDD vdd 0 {sign * supply}", f"VG drive 0 {sign * gate}", f"VB bb 0 {sign * body}"),
        *("RG drive g 1k", "RD vdd out 5k", "RS s 0 200", "CS s 0 1p", "RB bb b 300", "CL out 0 50f"),
        f"M1 out g s b {card.name} {GEOMETRY} {extra}",
        models=(card,),
        drive={"VG": 1.0},
        temperature_c=temperature_c,
    )


def assert_agrees(circuit: Circuit, engine: Engine, within: float = 1e-9) -> tuple[Network, Device]:
    network, devices = rebuilt(circuit, engine)
    assert disagreement(network, engine, IN_BAND) < within
    assert disagreement(network, engine, FAR_OUT) < 1e-7
    return network, devices[0]


def meyer(kind: str, level: int, **more: float) -> Model:
    sign = -1.0 if kind == "pmos" else 1.0
    parameters = {**MEYER, "vto": sign * 0.7, **({"lambda": 0.05} if level < 3 else {}), **more}
    if level == 9:
        # ngspice 39 says of any LD of level 9 that the channel is shorter than nothing
        del parameters["ld"]
    return model(kind, level, **parameters)


def bsim(kind: str, level: int, **more: float) -> Model:
    sign = -1.0 if kind == "pmos" else 1.0
    of_level = {"version": 3.3} if level in (8, 49) else {"version": 4.8, "toxe": 4e-9}
    if level in (8, 49):
        of_level |= {"tox": 6e-9, "cj": 5e-4, "cjsw": 5e-10, "cgsl": 1e-10, "cgdl": 1.5e-10}
    else:
        of_level |= {"cjs": 5e-4, "cjsws": 5e-10, "cgsl": 1e-10, "cgdl": 1.5e-10}
    return model(kind, level, **{**of_level, "vth0": sign * 0.6, "cgso": 2e-10, "cgdo": 2.5e-10, "cgbo": 1e-12, **more})


def of_level(kind: str, level: int, **more: float) -> Model:
    return meyer(kind, level, **more) if level < 8 or level == 9 else bsim(kind, level, **more)


LEVELS = (1, 2, 3, 9, 8, 54)


@pytest.mark.parametrize(("level", "kind"), list(product(LEVELS, ["nmos", "pmos"])))
@pytest.mark.parametrize("bias", MOS_BIAS)
def test_mos_agrees_in_every_region(bias: str, level: int, kind: str, engine: Engine) -> None:
    _, device = assert_agrees(mos_stage(of_level(kind, level), *MOS_BIAS[bias]), engine)
    words = {"off": "off", "saturation": "saturation", "triode": "triode", "forward body": "saturation"}
    if bias in words and level < 8:
        assert device.region == words[bias]
    if bias == "reversed":
        assert device.region.endswith("reversed")


RESISTANCES = ["rsh and squares", "in parallel", "cold", "hot"]


@pytest.mark.parametrize("level", LEVELS)
@pytest.mark.parametrize("variant", RESISTANCES)
@pytest.mark.parametrize("bias", ["saturation", "reversed"])
def test_mos_agrees_with_series_resistance_scale_and_temperature(
    bias: str, variant: str, level: int, engine: Engine
) -> None:
    more = {"rsh": 40.0}
    extra, celsius = {
        "rsh and squares": ("nrd=3 nrs=2", 27.0),
        "in parallel": ("nrd=3 nrs=2 m=3", 27.0),
        "cold": ("nrd=1 nrs=1 m=2", -40.0),
        "hot": ("nrd=1 nrs=1", 125.0),
    }[variant]
    assert_agrees(mos_stage(of_level("nmos", level, **more), *MOS_BIAS[bias], extra, celsius), engine)


@pytest.mark.parametrize("level", [1, 2, 3, 9])
def test_mos_with_rd_and_rs_of_the_model_agrees(level: int, engine: Engine) -> None:
    card = meyer("pmos", level, rd=30.0, rs=50.0, cbd=1e-13, cbs=2e-13)
    assert_agrees(mos_stage(replace(card), extra="m=2 dtemp=40"), engine)


@pytest.mark.parametrize(
    ("level", "more", "extra"),
    [
        (49, {"version": 3.24}, "nrd=0 nrs=0"),
        (8, {"capmod": 0.0}, ""),
        (8, {"capmod": 2.0, "rdsw": 300.0}, "m=2"),
        (14, {"version": 4.5}, "nf=2"),
        (54, {"capmod": 0.0}, "nf=4 m=2"),
        (54, {"capmod": 1.0}, ""),
        (54, {"rsh": 20.0, "rdsw": 150.0}, "nrd=2 nrs=0"),
        (54, {"trnqsmod": 1.0}, ""),
    ],
)
def test_bsim_agrees_for_other_versions_and_charge_models(
    level: int, more: dict[str, float], extra: str, engine: Engine
) -> None:
    for bias in ("saturation", "triode", "reversed"):
        assert_agrees(mos_stage(bsim("nmos", level, **more), *MOS_BIAS[bias], extra), engine)


def test_body_and_source_on_one_node_agree(engine: Engine) -> None:
    for level in (1, 54):
        circuit = mos_stage(of_level("nmos", level, rsh=40.0), extra="nrd=2 nrs=3")
        *rest, transistor = circuit.elements
        d, g, s, _ = transistor.nodes
        assert_agrees(replace(circuit, elements=(*rest, replace(transistor, nodes=(d, g, s, s)))), engine)


def test_charge_that_is_not_reciprocal_is_needed(engine: Engine) -> None:
    """Without the transcapacitances a BSIM stage is wrong by more than rounding."""
    network, _ = assert_agrees(mos_stage(bsim("nmos", 8)), engine)
    labels = {part.label for part in network.parts if part.kind == "transcapacitance"}
    assert labels == {"c_m", "c_mb", "c_mx"}
    reciprocal = Network.from_parts(
        [part for part in network.parts if part.kind != "transcapacitance"], output=network.port
    )
    assert disagreement(reciprocal, engine, IN_BAND) > 1e-3


@pytest.mark.parametrize("level", LEVELS)
def test_every_mos_part_is_needed(level: int, engine: Engine) -> None:
    """Taking any part 1 % too large is seen; g_db and g_sb are gmin here and are not."""
    circuit = mos_stage(of_level("nmos", level, rsh=40.0), extra="nrd=2 nrs=3")
    network, device = assert_agrees(circuit, engine)
    for part in device.parts:
        if part.label in ("g_db", "g_sb"):
            continue
        others = tuple(p for p in network.parts if p is not part)
        worse = Network.from_parts((*others, replace(part, value=1.01 * part.value)), output=network.port)
        assert disagreement(worse, engine, IN_BAND) > 1e-9, part.name


def test_overlap_read_and_overlap_measured_are_the_same(engine: Engine) -> None:
    """Where the engine tells cgso, cgdo, cgbo nothing is measured alone, and the parts are the same."""
    circuit = mos_stage(bsim("nmos", 54))
    bias = engine.operating_point(circuit)
    assert [asked.element for asked in isolations(circuit, bias)] == ["M1"]
    told = {**bias.readings["M1"], **_overlap(circuit.elements[-1], bias)}
    newer = replace(bias, readings={"M1": told}, samples={})
    assert isolations(circuit, newer) == ()
    assert linearise(circuit, newer).parts == linearise(circuit, bias).parts
    assert BSIM4.isolate(circuit, circuit.elements[-1], newer) is None


@pytest.mark.parametrize(
    ("v_gs", "v_ds", "ampere", "region"),
    [
        (0.3, 3.0, 1e-13, "off"),
        (0.6, 3.0, 1e-8, "weak inversion"),
        (1.2, 3.0, 1e-4, "saturation"),
        (1.2, 0.2, 1e-4, "triode"),
        (1.2, -3.0, 1e-4, "saturation, reversed"),
        (1.2, -0.2, 1e-4, "triode, reversed"),
    ],
)
def test_region_is_named_in_whole_words(v_gs: float, v_ds: float, ampere: float, region: str) -> None:
    assert mos_region(v_gs, v_ds, 0.7, 0.5, ampere) == region


def test_figures_and_hand_model_are_those_of_the_operating_point(engine: Engine) -> None:
    for level, kind in product((1, 54), ("nmos", "pmos")):
        circuit = mos_stage(of_level(kind, level, rsh=40.0), extra="nrd=2 nrs=3")
        bias = engine.operating_point(circuit)
        device = linearise(circuit, bias).devices[0]
        figures, v = dict(device.figures), dict(zip(circuit.nodes, bias.voltages, strict=True))
        assert list(figures)[:6] == ["i_d", "v_ds", "v_gs", "gm", "g_mb", "r_o"]
        assert list(figures)[-2:] == ["f_t", "gm/I"]
        # the drain's current comes through R_D, less what the drain junction leaks
        assert figures["i_d"] == pytest.approx((v["vdd"] - v["out"]) / 5e3, rel=1e-5)
        assert figures["v_gs"] == v["g"] - v["s"]
        assert figures["gm/I"] == pytest.approx(figures["gm"] / abs(figures["i_d"]), rel=1e-12)
        cell = device.cell
        assert cell is not None
        assert (cell.control, cell.common, cell.output, cell.body) == ("g", "M1's", "M1'd", "b")
        assert (cell.gm, cell.r_pi, cell.g_mb) == (figures["gm"], None, figures["g_mb"])
        assert [t.word for t in device.terminals] == ["drain", "gate", "source", "body"]


def test_in_reverse_the_hand_model_stands_the_other_way_round(engine: Engine) -> None:
    _, device = assert_agrees(mos_stage(meyer("nmos", 1), *MOS_BIAS["reversed"]), engine)
    cell = device.cell
    assert cell is not None
    assert (cell.common, cell.output) == ("out", "s")


JFET = {"vto": -2.0, "beta": 1.2e-3, "lambda": 0.02, "cgs": 4e-12, "cgd": 3e-12, "is": 1e-14, "pb": 0.8, "fc": 0.5}
JFET_BIAS = {
    "off": (-3.0, 6.0),
    "saturation": (-0.5, 9.0),
    "triode": (0.2, 1.5),
    "reversed": (-2.2, -3.0),
    "forward gate": (0.9, 6.0),
}


def jfet_stage(
    card: Model, gate: float = -0.5, supply: float = 9.0, extra: str = "", temperature_c: float = 27.0
) -> Circuit:
    sign = -1.0 if card.type == "pjf" else 1.0
    return board(
        *(f"VDD vdd 0 {sign * supply}", f"VG drive 0 {sign * gate}", "RG drive g 10k", "RD vdd out 1k"),
        *("RS s 0 50", "CS s 0 10p", "CL out 0 2p", f"J1 out g s {card.name} {extra}"),
        models=(card,),
        drive={"VG": 1.0},
        temperature_c=temperature_c,
    )


@pytest.mark.parametrize(("level", "kind"), list(product((1, 2), ["njf", "pjf"])))
@pytest.mark.parametrize("bias", JFET_BIAS)
def test_jfet_agrees_in_every_region(bias: str, level: int, kind: str, engine: Engine) -> None:
    _, device = assert_agrees(jfet_stage(model(kind, level, **JFET), *JFET_BIAS[bias]), engine)
    if bias in ("off", "saturation", "triode"):
        assert device.region == bias


@pytest.mark.parametrize("level", [1, 2])
@pytest.mark.parametrize(("extra", "celsius"), [("area=2 m=3", 27.0), ("area=0.5", -40.0), ("dtemp=20 m=2", 125.0)])
def test_jfet_agrees_with_series_resistance_scale_and_temperature(
    level: int, extra: str, celsius: float, engine: Engine
) -> None:
    card = model("njf", level, **JFET, rd=40.0, rs=25.0)
    assert_agrees(jfet_stage(card, extra=extra, temperature_c=celsius), engine)


POWER = {
    **{"vto": 2.0, "kp": 3.0, "lambda": 0.01, "rd": 0.02, "rs": 0.01, "rg": 5.0, "rb": 0.02, "theta": 0.05},
    **{"cgs": 3e-10, "cgdmax": 4e-10, "cgdmin": 2e-11, "a": 0.5, "cjo": 2e-10, "vj": 0.8, "m": 0.4, "is": 1e-12},
    **{"ksubthres": 0.1, "mtriode": 1.1},
}
POWER_BIAS = {"off": (0.0, 20.0), "saturation": (3.0, 20.0), "triode": (8.0, 5.0), "weak": (1.9, 10.0)}


def power_stage(
    card: Model, gate: float = 3.0, supply: float = 20.0, extra: str = "", temperature_c: float = 27.0
) -> Circuit:
    sign = -1.0 if dict(card.parameters).get("pchan") else 1.0
    return board(
        *(f"VDD vdd 0 {sign * supply}", f"VG drive 0 {sign * gate}", "RG drive g 50", "RD vdd out 20", "RS s 0 0.5"),
        *("CL out 0 100p", f"M1 out g s {card.name} {extra}"),
        models=(card,),
        drive={"VG": 1.0},
        temperature_c=temperature_c,
    )


@pytest.mark.parametrize("channel", ["n", "p"])
@pytest.mark.parametrize("bias", POWER_BIAS)
def test_power_mos_agrees_while_the_body_diode_is_off(bias: str, channel: str, engine: Engine) -> None:
    card = model("vdmos", 1, **{**POWER, **({"pchan": 1.0, "vto": -2.0} if channel == "p" else {})})
    assert_agrees(power_stage(card, *POWER_BIAS[bias]), engine)


@pytest.mark.parametrize(
    ("more", "extra", "celsius"),
    [
        ({"rds": 1e6}, "m=3", 27.0),
        ({"trd1": 5e-3, "trg1": 2e-3, "trg2": 1e-5, "trs1": 1e-3, "trb1": 3e-3}, "m=2", 125.0),
        ({"trg1": 2e-3, "trb1": 3e-3}, "dtemp=-10", -40.0),
        ({"rg": 0.0, "rb": 0.0, "rd": 0.0, "rs": 0.0}, "", 27.0),
    ],
)
def test_power_mos_agrees_with_scale_and_temperature(
    more: dict[str, float], extra: str, celsius: float, engine: Engine
) -> None:
    circuit = power_stage(model("vdmos", 1, **{**POWER, **more}), extra=extra, temperature_c=celsius)
    assert_agrees(circuit, engine)


@pytest.mark.parametrize("channel", ["n", "p"])
@pytest.mark.parametrize("celsius", [-40.0, 27.0, 125.0])
@pytest.mark.parametrize("more", [{}, {"n": 1.7, "eg": 0.9, "xti": 4.0, "tnom": 50.0}, {"is": 1e-10, "n": 1.2}])
def test_conductance_of_the_reversed_body_diode_is_that_of_the_engine(
    more: dict[str, float], celsius: float, channel: str, engine: Engine
) -> None:
    """Behind 10 MΩ, where gmin and what the saturation current adds to it are all that is left.

    Without R_D and R_B: beside 50 S the last digit of a double is 7e-15 S.
    """
    sign = -1.0 if channel == "p" else 1.0
    card = model(
        "vdmos", 1, **{**POWER, **({"pchan": 1.0, "vto": -2.0} if channel == "p" else {}), **more, "rd": 0.0, "rb": 0.0}
    )
    supplies = (20.0, 1.0, 0.1) if celsius < 100.0 else (20.0,)
    for supply, extra in product(supplies, ("", "m=3 dtemp=-5")):
        circuit = board(
            *(f"VDD vdd 0 {sign * supply}", "RD vdd out 1e7", f"VG g 0 {-5.0 * sign}", f"M1 out g 0 mx {extra}"),
            models=(card,),
            drive={"VDD": 1.0},
            temperature_c=celsius,
        )
        _, device = assert_agrees(circuit, engine)
        assert not any(part.kind == "block" for part in device.parts)


@pytest.mark.parametrize(
    ("channel", "extra", "more"),
    [
        ("n", "", {"cthj": 1e-3}),
        ("p", "m=2", {"cthj": 2e-3}),
        ("n", "", {}),
    ],
)
def test_power_mos_that_heats_itself_is_fitted_with_its_temperatures(
    channel: str, extra: str, more: dict[str, float], engine: Engine
) -> None:
    """The junction's temperature is the voltage of a node, its heat capacity a part from there to ground."""
    sign = -1.0 if channel == "p" else 1.0
    heat = {"rthjc": 1.5, "mu": -1.3, "texp0": 1.5, "tcvth": 5e-3, **more}
    card = model("vdmos", 1, **{**POWER, **({"pchan": 1.0, "vto": -2.0} if channel == "p" else {}), **heat})
    circuit = board(
        *(f"VDD vdd 0 {sign * 20.0}", f"VG drive 0 {sign * 2.6}", "RG drive g 50", "RD vdd out 4", "CL out 0 100p"),
        *("VA amb 0 35", "RT case amb 5", "CT case 0 0.01", f"M1 out g 0 tj case mx {extra}"),
        models=(card,),
        drive={"VG": 1.0},
    )
    *rest, transistor = circuit.elements
    warm = replace(transistor, parameters=(*transistor.parameters, ("thermal", 1.0)))
    network, devices = rebuilt(replace(circuit, elements=(*rest, warm)), engine)
    assert disagreement(network, engine, np.concatenate([decades(1e-4, 1.0, 4), IN_BAND])) < 1e-6
    told = {part.nodes: part.value for part in devices[0].parts if part.label == "c_th"}
    # ngspice does not multiply it by m
    assert told == pytest.approx({("tj", "0"): more["cthj"]} if more else {}, rel=1e-6, abs=0)
    # one frozen at its temperature of rest has another gain at DC
    cold = Network.from_parts((*network.parts, resistance("hold", "tj", "0", 1e-6)), output=network.port)
    assert disagreement(cold, engine, np.array([1e-4])) > 1e-2
    assert bool(devices[0].remarks) == bool(more)


def test_power_mos_near_breakdown_is_measured_alone(engine: Engine) -> None:
    for supply, fitted in ((20.0, False), (33.0, True)):
        card = model("vdmos", 1, **POWER, bv=30.0, ibv=1e-4, nbv=2.0)
        network, devices = rebuilt(power_stage(card, 0.0, supply, temperature_c=60.0), engine)
        assert any(part.kind == "block" for part in devices[0].parts) == fitted
        assert disagreement(network, engine, IN_BAND) < 1e-6


@pytest.mark.parametrize("channel", ["n", "p"])
@pytest.mark.parametrize(("gate", "supply", "celsius"), [(0.0, -5.0, 27.0), (0.0, -5.0, 125.0), (0.0, -0.3, -40.0)])
def test_power_mos_is_fitted_where_its_body_diode_conducts(
    gate: float, supply: float, celsius: float, channel: str, engine: Engine
) -> None:
    card = model("vdmos", 1, **{**POWER, **({"pchan": 1.0, "vto": -2.0} if channel == "p" else {})})
    network, devices = rebuilt(power_stage(card, gate, supply, temperature_c=celsius), engine)
    assert disagreement(network, engine, IN_BAND) < 1e-6
    assert devices[0].kind == ("pmos" if channel == "p" else "nmos")
    assert any(part.kind == "block" for part in devices[0].parts)


def test_power_mos_just_forward_is_exact(engine: Engine) -> None:
    """At some 40 mV the diode carries nothing yet: the channel does."""
    _, device = assert_agrees(power_stage(model("vdmos", 1, **POWER), 3.0, -5.0, "m=2"), engine)
    assert not any(part.kind == "block" for part in device.parts)


@pytest.mark.parametrize(
    ("card", "culprit"),
    [
        (meyer("nmos", 1), None),
        (replace(meyer("nmos", 1), level=6), "level"),
        (bsim("nmos", 8, alpha0=1e-6), "alpha0"),
        (bsim("nmos", 54, rgatemod=1.0), "rgatemod"),
        (bsim("nmos", 54, igcmod=1.0), "igcmod"),
        (bsim("nmos", 54, agidl=1e-9), "agidl"),
        (bsim("nmos", 54), None),
        (model("njf", 2, **JFET, lfgam=0.1), "lfgam"),
        (model("njf", 2, **JFET, cds=1e-12), "cds"),
        (model("njf", 1, **JFET), None),
    ],
)
def test_what_readings_do_not_tell_is_refused_by_the_exact_family(card: Model, culprit: str | None) -> None:
    letter = "J" if card.type == "njf" else "M"
    element = Element(letter, f"{letter}1", (1, 2, 3, 4)[: 4 if letter == "M" else 3], card.name, (), 0, 0)
    first = fitting(element, card)[0]
    refusal = first.refuse(element, card)
    assert (refusal.parameter if refusal else None) == culprit


def test_level_6_is_refused_by_all(engine: Engine) -> None:
    element = mos_stage(meyer("nmos", 1)).elements[-1]
    refusal = choose(element, replace(meyer("nmos", 1), level=6))
    assert isinstance(refusal, Refusal)
    assert "AC model" in refusal.reason
    # the engine's own sweep shows why: no gain at all
    circuit = mos_stage(replace(meyer("nmos", 1), level=6, parameters=(("vto", 0.7), ("kv", 2.0), ("kc", 1e-5))))
    engine.bias(circuit, ())
    assert abs(engine.sweep([1e3]).response[0]) < 1e-6


STAGES = (
    *((of_level("nmos", level), mos_stage) for level in LEVELS),
    *((model("njf", level, **JFET), jfet_stage) for level in (1, 2)),
    (model("vdmos", 1, **POWER), power_stage),
)


@pytest.mark.parametrize(("card", "stage"), STAGES)
def test_the_engine_knows_every_parameter(card: Model, stage: Callable[..., Circuit], engine: Engine) -> None:
    family = fitting(stage(card).elements[-1], card)[0]
    extras = ["off" if name == "off" else f"{name}=1" for name in sorted(family.instance_parameters)]
    assert [extra for extra in extras if reads_past(stage(card, extra=extra), engine)] == []
    values = {name: dict(card.parameters).get(name, 1.0) for name in family.model_parameters - family.flags - {"level"}}
    assert not reads_past(stage(replace(card, parameters=tuple(values.items()))), engine)


def _every(level: int) -> list[Circuit]:
    """One level in every region, both polarities, with and without series resistance, m, -40, 27 and 125 °C."""
    conditions = [({}, "", 27.0), ({"rsh": 40.0}, "nrd=3 nrs=2 m=3", -40.0), ({"rsh": 40.0}, "nrd=1 nrs=1", 125.0)]
    return [
        mos_stage(of_level(kind, level, **more), *MOS_BIAS[bias], extra, celsius)
        for kind, bias, (more, extra, celsius) in product(("nmos", "pmos"), MOS_BIAS, conditions)
    ]


def _every_jfet(level: int) -> list[Circuit]:
    conditions = [({}, "", 27.0), ({"rd": 40.0, "rs": 25.0}, "area=2 m=3", -40.0), ({"rs": 9.0}, "area=0.5", 125.0)]
    return [
        jfet_stage(model(kind, level, **{**JFET, **more}), *JFET_BIAS[bias], extra, celsius)
        for kind, bias, (more, extra, celsius) in product(("njf", "pjf"), JFET_BIAS, conditions)
    ]


FAMILIES = {
    **{f"MOS level {level}": _every(level) for level in (1, 2, 3, 9)},
    **{"BSIM3v3 (8)": _every(8), "BSIM4 (54)": _every(54)},
    **{f"JFET level {level}": _every_jfet(level) for level in (1, 2)},
    "VDMOS, body diode off": [
        power_stage(model("vdmos", 1, **{**POWER, **({"pchan": 1.0, "vto": -2.0} if p else {})}), *bias, "m=2", celsius)
        for p, bias, celsius in product((False, True), POWER_BIAS.values(), (-40.0, 27.0, 125.0))
    ],
}


def test_worst_agreement_is_what_the_developers_page_keeps(
    engine: Engine, pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    assert worst_of(FAMILIES, engine, pytestconfig, capsys) < 1e-9
