"""`--fold`: macromodels by themselves, other instances by name."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.netlist import read
from tauledger.numbers import solve
from tauledger.pipeline import review
from tauledger.report.terminal import render

FIXTURES = Path(__file__).parent.parent / "fixtures"
FILTER = FIXTURES / "opamp_filter.cir"

STAGE = """River-level gauge, a stage as a subcircuit
VCC vcc 0 12
VIN in 0 DC 0 AC 1
RS in a 1k
C1 a b 1u
XST b c vcc stage
RL c 0 100k
CL c 0 10p
.subckt stage b c vcc
R1 vcc b 47k
R2 b 0 12k
RC vcc c 3.9k
RE e 0 1k
Q1 c b e n
.ends
.model n npn(is=1e-15 bf=200 vaf=80 cje=5p cjc=2p tf=300p)
.print ac v(c)
.end
"""


def test_a_macromodel_is_one_part_and_one_row(engine: Engine) -> None:
    found = review(FILTER, engine=engine)
    assert {part.owner for part in found.parts if part.kind == "block"} == {"XU1"}
    assert [node.title for node in found.nodes].count("inside XU1") == 1
    assert "inside XU1" in render(found, color=False, unicode=True)


def test_none_leaves_it_open_and_the_edges_where_they_are(engine: Engine) -> None:
    closed, opened = review(FILTER, engine=engine), review(FILTER, engine=engine, fold=("none",))
    assert any(part.name == "XU1.CA" for part in opened.parts)
    assert opened.f_high is not None
    assert closed.f_high is not None
    assert closed.f_high.exact_hz == pytest.approx(opened.f_high.exact_hz, rel=1e-9)


@pytest.mark.parametrize("name", ["XST", "xst", "ST"])
def test_an_instance_with_a_transistor_is_folded_when_it_is_named(name: str, tmp_path: Path, engine: Engine) -> None:
    path = tmp_path / "stage.cir"
    path.write_text(STAGE)
    plain = solve(read(path), NO_CHANGE, engine)
    one = solve(read(path), NO_CHANGE, engine, fold=(name,))
    assert [device.name for device in plain.devices] == ["XST.Q1"]
    assert one.devices == ()
    assert {"XST.inside"} == {part.name for part in one.network.parts if part.owner.startswith("XST")}
    assert one.agreement is not None
    assert one.agreement.max_relative_error <= 1e-9
    assert review(path, engine=engine, fold=(name,)).f_high is not None


def test_an_instance_that_is_not_there_is_named_with_those_that_are(tmp_path: Path, engine: Engine) -> None:
    path = tmp_path / "stage.cir"
    path.write_text(STAGE)
    with pytest.raises(InputError, match=r"--fold U7: there is no such subcircuit instance\n\s+instances: XST"):
        solve(read(path), NO_CHANGE, engine, fold=("U7",))
    path.write_text("divider\nVIN in 0 AC 1\nR1 in out 1k\nC1 out 0 1n\n.print ac v(out)\n.end\n")
    with pytest.raises(InputError, match=r"--fold U7: there is no such subcircuit instance\n\s+instances: none"):
        solve(read(path), NO_CHANGE, engine, fold=("U7",))
