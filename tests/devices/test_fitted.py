"""Fitted transistors in an amplifier: the rebuilt network against ngspice over bias, polarity, size, temperature."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauledger.circuit import NO_CHANGE, Change
from tauledger.cli import main
from tauledger.devices import fit
from tauledger.devices.family import Device
from tauledger.engine.client import Engine
from tauledger.errors import ExitCode, NetlistError
from tauledger.netlist import elaborate, read
from tauledger.network.assemble import Network
from tauledger.network.solve import response
from tauledger.numbers import Numbers, solve

AGREES = 1e-6
SERIES = ("g_c", "g_b", "g_e", "g_drain", "g_gate", "g_source")

STAGE = """River-level gauge, one fitted transistor
VDD vdd 0 {supply}
VIN in 0 DC {drive} AC 1
RS in g 1k
RD vdd d {load}
{card}
RE e 0 {degeneration}
CL d 0 1p
VB b 0 {body}
.model m {model}
.ac dec 10 10 100meg
.print ac v(d)
.end
"""

VBIC = (
    "(level=4 is=1e-16 ibei=1e-18 iben=5e-15 ibci=2e-17 ibcn=5e-15 isp=1e-15 rcx=10 rci=60 rbx=10 rbi=40 re=2 rs=20 "
    "rbp=40 vef=10 ver=4 ikf=2m itf=80m xtf=20 tf=10p tr=100p cje=20f cjc=20f cjep=100f cjcp=400f vo=2 gamm=2e-11 "
    "hrcf=2 qco=1e-12 xre=0.5 xrb=0.5)"
)
RCO = (
    "(is=1e-16 bf=100 vaf=50 rb=100 rbm=20 irb=1m rc=10 re=1 rco=100 vo=2 gamma=1e-11 qco=1e-12 cje=1p cjc=0.5p "
    "xcjc=.5 cjs=1p tf=20p tr=1n ikf=10m)"
)
HICUM = (
    "(level=8 c10=1e-30 qp0=3e-14 ibeis=1e-18 t0=5e-12 rbx=5 re=2 rcx=5 rbi0=50 cjei0=10f cjci0=5f cjcx0=10f "
    "cjep0=5f cjs0=30f)"
)
BSIM4 = (
    "(level=14 version=4.8.0 rgatemod=3 rbodymod=1 rdsmod=1 rshg=10 xgw=1e-7 toxe=3e-9 vth0={sign}0.4 u0=0.04 "
    "rdsw=100 rbpb=50 rbpd=50 rbps=50 rbdb=50 rbsb=50)"
)
TUNNEL = "(level=54 igcmod=1 igbmod=1 agidl=1e-10 toxe=1.5e-9 vth0=0.4)"
BSIM3 = "(level=8 version=3.3.0 alpha0=1e-6 alpha1=0.1 beta0=20 rsh=10 vth0=0.5 tox=9e-9)"
MES = "(level=1 vto=-2 beta=2.5m lambda=.05 rd=5 rs=5 cgs=1p cgd=.2p)"
JFET = "(level=2 vto=-2 beta=1m cds=1p cgs=2p cgd=1p rd=10 rs=10)"


def stage(card: str, model: str, supply: float, drive: float, load: str = "1k", body: float = 0.0, e: str = "0") -> str:
    return STAGE.format(
        supply=supply, drive=drive, load=load, card=card, degeneration="50" if e == "e" else "1", body=body, model=model
    )


CASES = {
    "vbic active": stage("Q1 d g e b m", f"npn{VBIC}", 3, 0.85, e="e"),
    "vbic off": stage("Q1 d g 0 b m", f"npn{VBIC}", 3, 0.2),
    "vbic saturated": stage("Q1 d g 0 b m", f"npn{VBIC}", 3, 0.95, "20k"),
    "vbic reversed": stage("Q1 d g 0 b m", f"npn{VBIC}", -1, 0.1, "2k", body=-2),
    "vbic pnp m area": stage("Q1 d g e b m area=2 m=3", f"pnp{VBIC}", -3, -0.85, e="e"),
    "vbic three terminals": stage("Q1 d g 0 m", f"npn{VBIC}", 3, 0.8),
    "quasi-saturation active": stage("Q1 d g 0 b m", f"npn{RCO}", 5, 0.75),
    "quasi-saturation saturated pnp": stage("Q1 d g 0 m area=2 m=3", f"pnp{RCO}", -5, -0.85, "5k"),
    "hicum active": stage("Q1 d g 0 b m", f"npn{HICUM}", 3, 0.9, "500"),
    "bsim4 saturation": stage("M1 d g 0 b m w=10u l=0.2u m=2", f"nmos{BSIM4.format(sign='')}", 1.5, 0.6, "2k"),
    "bsim4 triode": stage("M1 d g 0 b m w=10u l=0.2u", f"nmos{BSIM4.format(sign='')}", 1.5, 1.2, "20k"),
    "bsim4 reversed": stage("M1 d g 0 b m w=10u l=0.2u", f"nmos{BSIM4.format(sign='')}", -0.5, 0.7, "500", body=-1),
    "bsim4 off": stage("M1 d g 0 b m w=10u l=0.2u", f"nmos{BSIM4.format(sign='')}", 1.5, 0.0, "5k"),
    "bsim4 weak": stage("M1 d g 0 b m w=10u l=0.2u", f"nmos{BSIM4.format(sign='')}", 1.5, 0.3, "50k"),
    "bsim4 pmos": stage("M1 d g 0 b m w=10u l=0.2u", f"pmos{BSIM4.format(sign='-')}", -1.5, -0.7, "5k"),
    "bsim4 tunnelling": stage("M1 d g 0 b m w=10u l=0.2u", f"nmos{TUNNEL}", 1.5, 0.7, "1k"),
    "bsim3 impact ionisation": stage("M1 d g 0 b m w=10u l=1u nrd=1 nrs=1 m=2", f"nmos{BSIM3}", 3, 1.5, "5k"),
    "bsim1": stage(
        "M1 d g 0 b m w=10u l=2u",
        "nmos(level=4 vfb=-0.8 phi=0.7 k1=0.6 muz=600 tox=0.02 mus=700 cgso=1e-10 cgdo=1e-10 temp=27 vdd=5)",
        3,
        1.5,
        "5k",
    ),
    "bsimsoi floating body": stage("M1 d g 0 b m w=10u l=0.5u", "nmos(level=58)", 1.5, 0.8, "50k"),
    "hisim2": stage("M1 d g 0 b m w=10u l=0.5u", "nmos(level=68)", 1.5, 0.8, "5k"),
    "mesfet": stage("Z1 d g 0 m", f"nmf{MES}", 5, -0.5, "500"),
    "mesfet triode": stage("Z1 d g 0 m area=2 m=2", f"nmf{MES}", 5, 0.0, "5k"),
    "mesfet level 2": stage("Z1 d g 0 m l=1u w=20u", "nmf(level=2 rd=30 rs=30)", 3, 0.1, "500"),
    "hfet level 5": stage("Z1 d g 0 m l=1u w=20u", "nhfet(level=5 rd=60 rs=60)", 3, 0.3, "500"),
    "hfet level 6": stage("Z1 d g 0 m l=1u w=20u", "nhfet(level=6 rd=60 rs=60)", 3, 0.3, "500"),
    "jfet level 2 with cds": stage("J1 d g 0 m", f"njf{JFET}", 10, -0.5, "2k"),
}


def solved(text: str, tmp_path: Path, engine: Engine, change: Change = NO_CHANGE) -> Numbers:
    path = tmp_path / "stage.cir"
    path.write_text(text)
    return solve(read(path), change, engine)


def device_of(numbers: Numbers) -> Device:
    return numbers.devices[0]


@pytest.mark.parametrize("case", CASES)
def test_fitted_transistor_agrees_with_the_engine_in_an_amplifier(case: str, tmp_path: Path, engine: Engine) -> None:
    numbers = solved(CASES[case], tmp_path, engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= AGREES
    assert device_of(numbers).parts[-1].kind == "block"


@pytest.mark.parametrize("temperature", [-40.0, 125.0])
@pytest.mark.parametrize("case", ["vbic active", "bsim4 saturation", "mesfet", "quasi-saturation active"])
def test_fitted_transistor_agrees_when_it_is_cold_or_hot(
    case: str, temperature: float, tmp_path: Path, engine: Engine
) -> None:
    numbers = solved(CASES[case], tmp_path, engine, Change(temperature_c=temperature))
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= AGREES


@pytest.mark.parametrize(
    ("case", "region"),
    [
        ("vbic active", "active"),
        ("vbic off", "off"),
        ("vbic saturated", "saturated"),
        ("vbic reversed", "reversed"),
        ("bsim4 saturation", "saturation"),
        ("bsim4 triode", "triode"),
        ("bsim4 reversed", "triode, reversed"),
        ("mesfet triode", "triode"),
        ("mesfet", "saturation"),
    ],
)
def test_region_is_named_in_whole_words(case: str, region: str, tmp_path: Path, engine: Engine) -> None:
    assert device_of(solved(CASES[case], tmp_path, engine)).region == region


@pytest.mark.parametrize("case", ["vbic active", "bsim4 saturation", "mesfet", "bsim4 pmos"])
def test_hand_model_of_a_fitted_transistor_is_its_low_frequency_gain(case: str, tmp_path: Path, engine: Engine) -> None:
    # with RS ≪ 1/g_π and RE = 1 Ω or 50 Ω: v(d)/v(g) = −gm·(RD ‖ r_o)/(1 + gm·RE), to some per cent
    numbers = solved(CASES[case], tmp_path, engine)
    cell = device_of(numbers).cell
    assert cell is not None
    part = {p.name: p.value for p in numbers.network.parts if p.kind == "conductance"}
    r_o = cell.r_o or float("inf")
    load = 1.0 / (part["RD"] + 1.0 / r_o)
    own = sum(1.0 / part[name] for name in ("Q1.g_e", "Z1.g_source") if name in part)
    degeneration = 1.0 + cell.gm * (own + (1.0 / part["RE"] if " e b m" in CASES[case] else 0.0))
    divider = 1.0 / (1.0 + 1e3 / (cell.r_pi * degeneration)) if cell.r_pi else 1.0
    gain = abs(complex(response(numbers.network, np.array([1e3]))[0]))
    assert gain == pytest.approx(cell.gm * load / degeneration * divider, rel=0.05)


@pytest.mark.parametrize(
    ("case", "temperature", "exponents", "expected"),
    [
        ("vbic active", -40.0, {"g_c": 1.2, "g_b": 0.5, "g_e": 0.5}, {"g_c": 10.0, "g_b": 10.0, "g_e": 2.0}),
        ("vbic pnp m area", 125.0, {"g_c": 1.2, "g_b": 0.5, "g_e": 0.5}, {"g_c": 10 / 6, "g_b": 10 / 6, "g_e": 2 / 6}),
        ("quasi-saturation active", 27.0, {}, {"g_c": 10.0, "g_e": 1.0}),
        ("hicum active", 27.0, {}, {"g_c": 5.0, "g_e": 2.0}),
        ("mesfet triode", 27.0, {}, {"g_drain": 2.5, "g_source": 2.5}),
        ("jfet level 2 with cds", 27.0, {}, {"g_drain": 10.0, "g_source": 10.0}),
        ("bsim3 impact ionisation", 27.0, {}, {"g_drain": 5.0, "g_source": 5.0}),
        ("bsim4 saturation", 27.0, {}, {}),
    ],
)
def test_series_resistances_are_parts_of_their_own(
    case: str,
    temperature: float,
    exponents: dict[str, float],
    expected: dict[str, float],
    tmp_path: Path,
    engine: Engine,
) -> None:
    """Those of the model card with area, m and temperature; none where a resistance depends on the voltages."""
    text = CASES[case].replace("xre=0.5 xrb=0.5", "xre=0.5 xrb=0.5 xrc=1.2")
    device = device_of(solved(text, tmp_path, engine, Change(temperature_c=temperature)))
    found = {part.label: 1.0 / part.value for part in device.parts if part.label in SERIES}
    warmer = (temperature + 273.15) / 300.15
    assert found == pytest.approx({k: ohm * warmer ** exponents.get(k, 0.0) for k, ohm in expected.items()}, rel=1e-9)
    inner = {terminal.inner for terminal in device.terminals if terminal.inner != terminal.outer}
    assert len(inner) == len(expected)
    if device.cell is not None and "g_b" in expected:
        assert (device.cell.control, device.cell.output, device.cell.common) == ("Q1'b", "Q1'c", "Q1'e")


@pytest.mark.parametrize(("outside", "expected"), [(1.0, ["g_c", "g_b", "g_e"]), (0.5, ["g_c", "g_e"])])
def test_a_capacitance_at_the_terminal_itself_keeps_the_resistance_inside(
    outside: float, expected: list[str], tmp_path: Path, engine: Engine
) -> None:
    """C_bx of X_CJC hangs at the outer base."""
    text = CASES["quasi-saturation active"].replace("rbm=20 irb=1m", "").replace("xcjc=.5", f"xcjc={outside}")
    numbers = solved(text, tmp_path, engine)
    assert [part.label for part in device_of(numbers).parts if part.label in SERIES] == expected
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= AGREES


def test_a_body_tied_to_its_source_changes_no_figure(tmp_path: Path, engine: Engine) -> None:
    for case in ("bsim4 saturation", "bsim4 triode", "bsim4 pmos", "bsim3 impact ionisation", "vbic saturated"):
        apart, tied = (solved(CASES[case].replace(" g 0 b m", f" g 0 {body} m"), tmp_path, engine) for body in "b0")
        expected, found = (dict(device_of(numbers).figures) for numbers in (apart, tied))
        assert found == pytest.approx(expected, rel=1e-6, abs=0), case
        assert device_of(tied).region == device_of(apart).region
        assert tied.agreement is not None
        assert tied.agreement.max_relative_error <= AGREES


@pytest.mark.parametrize("polarity", ["n", "p"])
def test_a_diode_connected_transistor_keeps_its_own_gm_and_r_o(polarity: str, tmp_path: Path, engine: Engine) -> None:
    # a 0 V source between gate and drain leaves the bias alone and keeps the two terminals apart
    sign = "-" if polarity == "p" else ""
    text = stage("M1 d d 0 0 m w=10u l=0.2u", f"{polarity}mos{BSIM4.format(sign=sign)}", float(f"{sign}1.5"), 0, "100k")
    tied = solved(text.replace("VIN in 0 DC 0 AC 1", "IIN 0 d AC 1").replace("RS in g 1k\n", ""), tmp_path, engine)
    apart = solved(
        text.replace("M1 d d ", "M1 d g ")
        .replace("VIN in 0 DC 0 AC 1", "IIN 0 d AC 1")
        .replace("RS in g 1k\n", "VT g d 0\n"),
        tmp_path,
        engine,
    )
    expected, found = (dict(device_of(numbers).figures) for numbers in (apart, tied))
    assert found["gm"] > 10.0 / found["r_o"]
    assert found == pytest.approx(expected, rel=1e-6, abs=0)
    assert device_of(tied).region == device_of(apart).region == "weak inversion"
    assert tied.agreement is not None
    assert tied.agreement.max_relative_error <= AGREES


@pytest.mark.parametrize(("drive", "region"), [(0.35, "weak inversion"), (0.7, "saturation")])
def test_polarity_makes_no_difference_to_the_region(drive: float, region: str, tmp_path: Path, engine: Engine) -> None:
    # what the engine tells of a p-channel device has its polarity taken out, the threshold voltage too
    for sign, kind in (("", "nmos"), ("-", "pmos")):
        side = float(f"{sign}1")
        text = stage("M1 d g 0 b m w=10u l=0.2u", f"{kind}{BSIM4.format(sign=sign)}", 1.5 * side, drive * side, "1k")
        assert device_of(solved(text, tmp_path, engine)).region == region


@pytest.mark.parametrize("base", ["rbm=20 irb=1m", "", "no r_b"])
@pytest.mark.parametrize("case", ["quasi-saturation active", "quasi-saturation saturated pnp"])
def test_excess_phase_beside_quasi_saturation_is_rebuilt(case: str, base: str, tmp_path: Path, engine: Engine) -> None:
    text = CASES[case].replace("rco=100", "rco=100 ptf=40").replace("rbm=20 irb=1m", base)
    text = text.replace("rb=100 no r_b", "").replace(".ac dec 10 10 100meg", ".ac dec 10 10 100g")
    numbers = solved(text, tmp_path, engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= AGREES
    device = device_of(numbers)
    assert "excess phase delays the collector current of Q1" in device.remarks[0]
    # without the delay the response is another
    parts = [part for part in numbers.network.parts if part.label not in ("delay", "delay_0")]
    hurried = Network.from_parts(parts, output=numbers.network.port)
    at = np.array([1e9])
    assert abs(response(hurried, at)[0] / response(numbers.network, at)[0] - 1.0) > 1e-3


def test_self_heating_without_its_nodes_is_refused_at_the_card(tmp_path: Path) -> None:
    path = tmp_path / "stage.cir"
    path.write_text(stage("M1 d g 0 m thermal", "vdmos(vto=2 kp=3 rthjc=1)", 10, 3))
    with pytest.raises(NetlistError, match=r"stage\.cir:6:1: self-heating needs nodes") as caught:
        elaborate(read(path), NO_CHANGE)
    assert "write M1 drain gate source junction case m thermal" in str(caught.value)


def test_non_quasi_static_ac_is_refused_at_its_model(tmp_path: Path) -> None:
    path = tmp_path / "stage.cir"
    path.write_text(CASES["bsim4 saturation"].replace("rgatemod=3", "acnqsmod=1"))
    with pytest.raises(NetlistError, match=r"stage\.cir:\d+:\d+: .*ACNQSMOD"):
        elaborate(read(path), NO_CHANGE)


def test_a_fit_that_fails_its_check_is_told_at_the_card(
    tmp_path: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(fit, "ACCEPTED", 0.0)
    with pytest.raises(NetlistError) as caught:
        solved(CASES["vbic active"], tmp_path, engine)
    (told,) = caught.value.diagnostics
    assert (told.line, told.column, told.width, told.text) == (6, 1, 2, "Q1 d g e b m")
    assert "the small-signal behaviour of Q1 could not be fitted" in told.message
    assert caught.value.exit_code == ExitCode.UNUSABLE_INPUT


def test_a_formula_without_derivative_is_told_at_its_card_and_nothing_is_written(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = stage("X1 d g part", f"npn{VBIC}", 3, 0.0).replace(
        ".end", ".subckt part d g\n* at v(g) = 0 the slope is infinite\nB1 d 0 i = 1m*sqrt(v(g))\n.ends\n.end"
    )
    path, report = tmp_path / "stage.cir", tmp_path / "stage.html"
    path.write_text(text)
    with pytest.raises(SystemExit) as left:
        main(["review", str(path), "--report", str(report)])
    assert left.value.code == ExitCode.UNUSABLE_INPUT
    said = capsys.readouterr()
    assert "stage.cir:15:1: the formula of X1.B1 has no derivative at its operating point" in said.err
    assert "  B1 d 0 i = 1m*sqrt(v(g))\n  ^^\n" in said.err
    assert "in X1 (" in said.err
    assert said.out == ""
    assert not report.exists()


def test_worst_agreement_per_family_is_what_the_developers_page_keeps(
    tmp_path: Path, engine: Engine, pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    """With --write-tables the table is printed; without, one case of a family is enough."""
    families: dict[str, list[str]] = {}
    for case in CASES:
        families.setdefault(case.split()[0], []).append(case)
    whole = pytestconfig.getoption("--write-tables")
    worst: dict[str, float] = {}
    for family, cases in families.items():
        for case in cases if whole else cases[:1]:
            found = solved(CASES[case], tmp_path, engine).agreement
            assert found is not None
            worst[family] = max(worst.get(family, 0.0), found.max_relative_error)
    if whole:
        with capsys.disabled():
            print("\n| fitted family | cases | worst agreement |\n|---|---|---|")
            for family, error in worst.items():
                print(f"| {family} | {len(families[family])} | {error:.0e} |")
    assert max(worst.values()) <= AGREES
