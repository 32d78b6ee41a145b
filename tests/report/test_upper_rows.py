"""Rows of the budget multiply in their own line, and a band edge that no method by hand reaches says so."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from amplifiers import coupled_stage
from role_boards import ROLE_BOARDS
from tauledger.engine.client import Engine
from tauledger.pipeline import review, review_network
from tauledger.report.terminal import render

FIXTURES = Path(__file__).parents[2] / "fixtures"
PREFIX = {"p": 1e-12, "n": 1e-9, "f": 1e-15, "k": 1e3, "": 1.0}
FIGURE = re.compile(r"([0-9.]+) ([pnfk]?)(Ω|F|s)")


def test_each_capacitance_of_the_budget_is_r_times_c_in_its_line_or_in_that_of_its_node(engine: Engine) -> None:
    """C_bx hangs on the outer base: it faces 510 Ω there, not the 604 Ω of the inner base."""
    page = render(review(FIXTURES / "echo_preamp.cir", engine=engine), color=False, unicode=True)
    table = page[page.index("UPPER EDGE") : page.index("Σ R·C")].splitlines()[1:]
    of_node = 0.0
    checked = 0
    for line in filter(str.strip, table):
        found = {unit: float(value) * PREFIX[prefix] for value, prefix, unit in FIGURE.findall(line)[-3:]}
        if not line.startswith("    "):
            of_node = next(float(v) * PREFIX[p] for v, p, unit in FIGURE.findall(line) if unit == "Ω")
            continue
        if "F" not in found:
            continue
        assert found["s"] == pytest.approx(found.get("Ω", of_node) * found["F"], rel=6e-3, abs=0), line
        checked += 1
    assert checked >= 4
    assert any("C_bx" in line and "Ω" in line for line in table)


def test_where_no_method_by_hand_comes_near_the_page_says_so(tmp_path: Path, engine: Engine) -> None:
    """A Darlington follower that peaks: every hand method is a third low."""
    path = tmp_path / "darlington.cir"
    path.write_text(
        """Darlington follower of the level gauge
VCC vcc 0 15
VB s 0 DC 8 AC 1
RS s b 10k
Q1 vcc b m nsmall
RB m out 4.7k
Q2 vcc m out nlarge
RE out 0 1k
CL out 0 100p
.model nsmall npn (is=1e-15 bf=180 vaf=90 rb=80 rc=2 re=0.5 cje=12p cjc=3p tf=0.4n)
.model nlarge npn (is=4e-15 bf=180 vaf=90 rb=40 rc=1 re=0.2 cje=20p cjc=6p tf=0.4n)
.ac dec 20 1 1g
.print ac v(out)
.end
""",
        encoding="utf-8",
    )
    found = review(path, engine=engine)
    by_hand = [
        abs(row.difference)
        for row in found.estimates
        if row.edge == "f_high" and row.difference is not None and row.method not in ("all poles", "exact", "simulated")
    ]
    page = render(found, color=False, unicode=True)
    assert min(by_hand) > 0.10
    assert not any(row.recommended for row in found.estimates if row.edge == "f_high")
    assert "no method recommended: the time constants pull each other" in " ".join(page.split())
    assert "further-poles" in [cause.cause for cause in found.causes]


def test_a_factor_whose_gain_was_solved_is_marked(tmp_path: Path, engine: Engine) -> None:
    """Two followers at rest with joined emitters: no chain of hand gains says how far one moves with the other."""
    path = tmp_path / "class_ab.cir"
    path.write_text(ROLE_BOARDS["class-AB followers at rest"].netlist, encoding="utf-8")
    found = review(path, engine=engine)
    sources = {
        term.part: term.gain_source for node in found.nodes if node.working for term in node.working.capacitances
    }
    page = render(found, color=False, unicode=True)
    assert "solved" in sources.values()
    marked = [line for line in page.splitlines() if " × " in line and "†" in line]
    assert marked
    assert all("†" not in line for line in page.splitlines() if line.startswith("    C_μ of Q2"))
    plain = review_network(coupled_stage(), title="")
    assert "†" not in "".join(
        line for line in render(plain, color=False, unicode=True).splitlines(keepends=True) if " × " in line
    )
