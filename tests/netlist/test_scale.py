"""`.options scale` and `scale=`: what they multiply, letter by letter and level by level, with ngspice as judge."""

from __future__ import annotations

from pathlib import Path

import pytest

from netlist_judge import answers, judged
from tauledger.netlist import elaborate, read
from tauledger.netlist.scale import UNSCALED_MOS
from tauledger.netlist.writer import flat_netlist

SAME = 1e-6
HEAD = "scale\nV1 in 0 1 AC 1\nRs in out 1k\n"
OPTION = ".options scale=2\n"
SIZES = "l=1u w=5u ad=5p as=6p pd=9u ps=10u"
MOS = {
    1: "vto=.4 cj=1e-4 cjsw=1e-10 js=100",
    2: "vto=.4 cj=1e-4 cjsw=1e-10",
    3: "vto=.4 cj=1e-4 cjsw=1e-10",
    5: "vfb=-.5 phi=.7 tox=.02 k1=.5 cj=1e-4 cjsw=1e-10",
    8: "vth0=.4",
    9: "vto=.4 cj=1e-4 cjsw=1e-10",
    14: "version=4.5 vth0=.4",
}
CARDS = {
    "a resistor with l and w": "R1 out 0 rm l=10u w=1u\n.model rm r rsh=100 narrow=.2u\n",
    "a resistor whose model has l and w": "R1 out 0 rm\n.model rm r rsh=100 narrow=.2u l=10u w=1u\n",
    "a capacitor with l and w": "R1 out 0 1k\nC1 out 0 cm l=20u w=10u\n.model cm c cj=1e-4 cjsw=1e-9 narrow=.1u\n",
    "a drawn diode": "D1 out 0 dd w=2 l=3\n.model dd d level=3 is=1e-14 cjo=1p jsw=1e-15\n",
    "a drawn diode under metal of its model": "R1 out 0 1k\nD1 0 out dd w=2 l=3\n"
    ".model dd d level=3 is=1e-14 cjo=1p lm=10u wm=5u lp=5u wp=6u\n",
    "a diode of level 3 without sizes": "D1 out 0 dd\n.model dd d level=3 is=1e-14 cjo=1p\n",
    "a diode of level 1": "D1 out 0 dd area=2\n.model dd d is=1e-14 cjo=1p\n",
}


@pytest.mark.parametrize("level", MOS)
def test_sizes_of_a_mos_transistor_are_scaled_where_ngspice_does_it(level: int, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(f"{HEAD}M1 out out 0 0 n {SIZES}\n.model n nmos level={level} {MOS[level]}\n{OPTION}")
    circuit = elaborate(read(path), purpose="reading")
    assert judged(path, circuit) <= SAME
    assert (circuit.elements[-1].parameter("w", 0.0) == 5e-6) == (level in UNSCALED_MOS)


@pytest.mark.parametrize("name", CARDS)
def test_sizes_of_passives_and_diodes_are_scaled_where_ngspice_does_it(name: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(HEAD + CARDS[name] + OPTION)
    assert judged(path, elaborate(read(path), purpose="reading")) <= SAME


def test_area_of_a_level_3_diode_is_scaled_once_and_a_note_says_that_ngspice_goes_on(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    card = "D1 0 out dd area=2 pj=3\nR1 out 0 1k\n"
    model = ".model dd d level=3 is=1e-14 cjo=1p jsw=1e-15 cjp=2p\n"
    path.write_text(HEAD + card + model + OPTION)
    circuit = elaborate(read(path), purpose="reading")
    diode = next(element for element in circuit.elements if element.letter == "D")
    assert dict(diode.parameters) == {"area": 8.0, "pj": 6.0}
    assert ["again with every further analysis" in note.says for note in circuit.notes] == [True]
    first, again = answers(tmp_path, path)
    path.write_text(flat_netlist(circuit))
    ours = answers(tmp_path, path)
    assert first["out"] == pytest.approx(ours[0]["out"], rel=SAME)
    assert again["out"][-1] != pytest.approx(ours[1]["out"][-1], rel=1e-2)


@pytest.mark.parametrize("card", ["ac=500 scale=2", "ac=500 scale=2 m=3", "ac=500 scale=2 tc1=1m", "ac=500 m=2"])
def test_scale_and_m_of_a_resistor_act_on_its_ac_value_too(card: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(f"{HEAD}R8 out 0 1k {card}\n.temp 60\n.print ac v(out)\n")
    assert judged(path, elaborate(read(path))) <= SAME
