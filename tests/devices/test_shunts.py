"""`.options rshunt` loads the nodes inside devices too: the rebuilt network has them where ngspice does."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.netlist import read
from tauledger.numbers import Numbers, solve

BOARD = """River-level gauge, shunts at every node
.options rshunt=50k
VDD vdd 0 {supply}
VIN in 0 DC {drive} AC 1
RS in g 1k
RD vdd d {load}
RE e 0 50
CL d 0 1p
{card}
.model m {model}
.print ac v(d)
.end
"""
BJT = "npn(is=1e-15 bf=150 vaf=80 rb=300 rbm=30 irb=50u rc=80 re=5 cje=4p cjc=2p xcjc=.6 cjs=2p tf=300p tr=20n{more})"
MOS = "nmos(level={level} vto=.7 kp=60u tox=2e-8 rd=300 rs=200 cgso=2e-10)"
VBIC = (
    "npn(level=4 is=1e-16 ibei=1e-18 rcx=100 rci=60 rbx=100 rbi=400 re=20 vef=10 tf=10p cje=20f cjc=20f rs=20 rbp=40)"
)
POWER = "vdmos(vto=1 kp=.1 rd=20 rs=10 rg=500 rb=20 cgs=3p cgdmax=4p cgdmin=1p cjo=2p is=1e-14)"
BSIM4 = "nmos(level=54 version=4.8 vth0=.5 toxe=4n rsh=100{more})"
EXACT = {
    "bipolar": (BJT.format(more=""), "Q1 d g e m", 5, 0.9),
    "delayed": (BJT.format(more=" ptf=30"), "Q1 d g e m", 5, 0.9),
    "diode": ("d(is=1e-14 rs=100 cjo=4p tt=5n)", "D1 d g m", 5, 0),
    "MOS level 1": (MOS.format(level=1), "M1 d g e 0 m w=50u l=1u", 5, 1.5),
    "MOS level 3": (MOS.format(level=3), "M1 d g e 0 m w=50u l=1u", 5, 1.5),
    "JFET": ("njf(vto=-2 beta=1m rd=100 rs=50 cgs=4p cgd=2p)", "J1 d g e m", 9, -0.5),
    "power MOS": (POWER, "M1 d g e m m=2", 5, 1.8),
    "BSIM3": ("nmos(level=8 version=3.3.0 vth0=.5 tox=9n rsh=100)", "M1 d g e 0 m w=50u l=1u nrd=2 nrs=1", 5, 1.2),
    "BSIM4": (BSIM4.format(more=""), "M1 d g e 0 m w=20u l=1u nrd=2 nrs=1", 3, 1.2),
}
FITTED = {
    "VBIC": (VBIC, "Q1 d g e m", 3, 0.9),
    "quasi-saturation": (BJT.format(more=" rco=100 vo=2 gamma=1e-11"), "Q1 d g e m", 5, 0.9),
    "BSIM4 with gate and body resistances": (
        BSIM4.format(more=" rgatemod=1 rbodymod=1 rshg=50"),
        "M1 d g e 0 m w=20u l=1u nrd=2 nrs=1",
        3,
        1.2,
    ),
    "MESFET": ("nmf(vto=-2 beta=2.5m rd=50 rs=50 cgs=1p cgd=.2p)", "Z1 d g e m", 5, -0.5),
}


def solved(case: tuple[str, str, float, float], tmp_path: Path, engine: Engine) -> Numbers:
    model, card, supply, drive = case
    path = tmp_path / "board.cir"
    path.write_text(BOARD.format(model=model, card=card, supply=supply, drive=drive, load="1k"))
    return solve(read(path), NO_CHANGE, engine)


@pytest.mark.parametrize("case", EXACT)
def test_shunts_inside_devices_are_rebuilt_exactly(case: str, tmp_path: Path, engine: Engine) -> None:
    numbers = solved(EXACT[case], tmp_path, engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= 1e-9
    shunted = {part.nodes[0] for part in numbers.network.parts if part.owner.startswith("Rshunt.")}
    assert shunted >= {"in", "g", "d", "e", "vdd"}
    assert any("'" in node for node in shunted)


@pytest.mark.parametrize("case", FITTED)
def test_shunts_inside_fitted_devices_are_in_their_block(case: str, tmp_path: Path, engine: Engine) -> None:
    numbers = solved(FITTED[case], tmp_path, engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= 1e-6
    shunted = {part.nodes[0] for part in numbers.network.parts if part.owner.startswith("Rshunt.")}
    assert shunted == {"in", "g", "d", "e", "vdd"}
