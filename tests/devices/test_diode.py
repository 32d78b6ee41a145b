"""The rebuilt diode answers as the engine's own does, wherever it is biased and however it is scaled."""

from __future__ import annotations

import pytest
from msgspec.structs import replace

from agreement import FAR_OUT, IN_BAND, disagreement, reads_past, rebuilt, worst_of
from circuits import board, changed
from tauledger.circuit import Circuit, Model
from tauledger.devices.diode import DIODE, region_of, without_m
from tauledger.engine.client import Engine
from tauledger.engine.deck import write_deck
from tauledger.network.assemble import Network

D1 = Model(
    "dx",
    "d",
    1,
    tuple(
        {
            **{"is": 3e-14, "n": 1.1, "rs": 4.0, "cjo": 5e-12, "vj": 0.7, "m": 0.4, "tt": 8e-9, "fc": 0.5},
            **{"bv": 12.0, "ibv": 1e-4, "jsw": 1e-15, "cjsw": 1e-12, "php": 0.6, "mjsw": 0.3},
            **{"isr": 1e-11, "nr": 2.0, "ikf": 0.05, "trs1": 4e-3, "trs2": 1e-5, "xti": 3.0},
        }.items()
    ),
    0,
    0,
)
BIAS = {"conducting": 3.0, "off": -5.0, "at rest": 0.0, "barely on": 0.45, "breakdown": -20.0}
VARIANTS: dict[str, tuple[dict[str, float], str, float]] = {
    "three in parallel": ({}, "m=3", 27.0),
    "area, perimeter and m": ({}, "area=2 pj=3 m=2.5", 27.0),
    "area of the model": ({"area": 2.0, "pj": 4.0}, "m=2", 27.0),
    "no series resistance": ({"rs": 0.0}, "m=3 area=2", 27.0),
    "cold": ({}, "area=2", -40.0),
    "hot": ({}, "m=2", 125.0),
    "of its own temperature": ({"tnom": 35.0}, "temp=80", 27.0),
    "warmer than the rest": ({}, "dtemp=30", 50.0),
    "tunnelling": ({"jtun": 1e-9, "ntun": 30.0, "jtunsw": 1e-10}, "pj=2 m=2", 27.0),
    "level 3 by size": ({}, "w=2 l=1.5", 27.0),
}


def stage(card: Model = D1, volt: float = 3.0, extra: str = "", temperature_c: float = 27.0) -> Circuit:
    """A diode between a driven source and a load, its ends both alive."""
    cards = (
        f"VIN in 0 {volt}",
        "RS in a 500",
        "CA a 0 1p",
        f"D1 a out {card.name} {extra}",
        "RL out 0 500",
        "CL out 0 2p",
    )
    return board(*cards, models=(card,), drive={"VIN": 1.0}, temperature_c=temperature_c)


def worst(circuit: Circuit, engine: Engine) -> float:
    network, _ = rebuilt(circuit, engine)
    assert disagreement(network, engine, FAR_OUT) < 1e-7
    return disagreement(network, engine, IN_BAND)


@pytest.mark.parametrize("bias", BIAS)
def test_agrees_in_every_region(bias: str, engine: Engine) -> None:
    circuit = stage(volt=BIAS[bias], extra="pj=2")
    assert worst(circuit, engine) < 1e-9
    device = rebuilt(circuit, engine)[1][0]
    assert device.region == {"at rest": "off", "barely on": "conducting"}.get(bias, bias)
    turned = replace(
        circuit, elements=tuple(replace(e, nodes=e.nodes[::-1]) if e.letter == "D" else e for e in circuit.elements)
    )
    assert worst(turned, engine) < 1e-9


@pytest.mark.parametrize("variant", VARIANTS)
@pytest.mark.parametrize("volt", [3.0, -5.0])
def test_agrees_for_every_scale_and_temperature(variant: str, volt: float, engine: Engine) -> None:
    more, extra, celsius = VARIANTS[variant]
    card = replace(changed(D1, **more), level=3 if variant.startswith("level 3") else 1)
    assert worst(stage(card, volt, extra, celsius), engine) < 1e-9


def test_m_is_given_as_area_because_the_engine_counts_it_again_at_every_analysis(engine: Engine) -> None:
    three = stage(extra="m=3")
    assert "m=" not in next(line for line in write_deck(three).text.splitlines() if line.startswith("d"))
    one = stage()
    parallel = replace(one, elements=(*one.elements, *(replace(one.elements[-1], name=f"D{k}") for k in (2, 3))))
    a, b = (engine.bias(circuit, ()).voltages for circuit in (three, parallel))
    assert a == pytest.approx(b, rel=1e-9)
    engine.bias(three, ())
    first = engine.sweep([1e6]).response[0]
    assert engine.sweep([1e6]).response[0] == first


def test_m_of_level_3_scales_what_w_and_l_give() -> None:
    element = stage(extra="w=2 l=1.5 m=2").elements[-1]
    assert dict(without_m(element, replace(D1, level=3))) == {"area": 6.0, "pj": 14.0}
    overlaid = stage(extra="w=2 l=1.5 m=2 lm=1 wm=1").elements[-1]
    refusal = DIODE.refuse(overlaid, replace(D1, level=3))
    assert refusal is not None
    assert refusal.parameter == "m"


@pytest.mark.parametrize("volt", [3.0, -5.0])
def test_every_part_is_needed(volt: float, engine: Engine) -> None:
    """Reverse biased only the capacitance is seen: the conductance is gmin, the series resistance rounding."""
    network, devices = rebuilt(stage(volt=volt), engine)
    for part in devices[0].parts:
        if volt < 0.0 and part.label != "c_d":
            continue
        others = tuple(p for p in network.parts if p is not part)
        worse = Network.from_parts((*others, replace(part, value=1.01 * part.value)), output=network.port)
        assert disagreement(worse, engine, IN_BAND) > 1e-9, part.name


@pytest.mark.parametrize(
    ("v_d", "bv", "region"),
    [
        (0.6, 12.0, "conducting"),
        (0.1, 12.0, "off"),
        (-5.0, 12.0, "off"),
        (-11.9, 12.0, "breakdown"),
        (-50.0, None, "off"),
    ],
)
def test_region(v_d: float, bv: float | None, region: str) -> None:
    assert region_of(v_d, 27.0, bv) == region


def test_the_engine_knows_every_parameter(engine: Engine) -> None:
    cards = [changed(D1, **{name: dict(D1.parameters).get(name, 1.0)}) for name in sorted(DIODE.model_parameters)]
    assert [card for card in cards if reads_past(stage(card), engine)] == []
    extras = [f"{name}=1" for name in sorted(DIODE.instance_parameters - {"off", "m"})]
    assert [extra for extra in extras if reads_past(stage(extra=extra), engine)] == []


FAMILIES = {
    "diode": [
        stage(changed(D1, **more), volt, extra, celsius)
        for volt in BIAS.values()
        for more, extra, celsius in VARIANTS.values()
        if "w=" not in extra
    ]
}


def test_worst_agreement_is_what_the_developers_page_keeps(
    engine: Engine, pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    assert worst_of(FAMILIES, engine, pytestconfig, capsys) < 1e-9
