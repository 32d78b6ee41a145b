"""--add: what a probe does, told before and after as by --set, its bias found anew."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tauledger import cli

BOARD = """a common emitter
VCC vcc 0 9
VIN in 0 DC 0 AC 1
RS in s 600
C1 s b 1u
R1 vcc b 1.2meg
R2 vcc c 3.3k
Q1 c b 0 qn
{more}
.model qn npn(is=6e-15 bf=220 vaf=80 cje=9p cjc=3.6p tf=350p)
.print ac v(c)
.end
"""

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    (tmp_path / "board.cir").write_text(BOARD.format(more="* nothing"))
    (tmp_path / "loaded.cir").write_text(BOARD.format(more="RP c 0 10k\nCP c 0 12p"))
    monkeypatch.chdir(tmp_path)

    def ran(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            cli.main(["review", *arguments])
        said = capsys.readouterr()
        return int(left.value.code or 0), said.out, said.err

    return ran


def document(run: Run, *arguments: str) -> Any:
    code, out, err = run(*arguments, "--json", "-")
    assert (code, err) == (0, "")
    return json.loads(out)


def test_what_is_added_counts_as_if_its_cards_stood_there_bias_included(run: Run) -> None:
    added, loaded = document(run, "board.cir", "--add", "c=10k,12p"), document(run, "loaded.cir")
    for edge in ("f_high", "f_low"):
        assert added[edge]["simulated_hz"] == pytest.approx(loaded[edge]["simulated_hz"], rel=1e-9)
    assert added["devices"] == loaded["devices"]
    assert added["added"] == [
        {"node": "c", "kind": "R", "value": 10e3},
        {"node": "c", "kind": "C", "value": pytest.approx(12e-12, abs=0)},
    ]


def test_headline_figures_stand_before_and_after(run: Run) -> None:
    plain, added = document(run, "board.cir"), document(run, "board.cir", "--add", "c=10k,12p")
    moved = {figure["figure"]: figure for figure in added["moved"]}
    for figure, value in (
        ("gain", "gain_db"),
        ("plateau to", "to_hz"),
    ):
        assert moved[figure]["before"] == pytest.approx(plain["midband"][value])
        assert moved[figure]["after"] == pytest.approx(added["midband"][value])
    assert moved["f_H simulated"]["before"] == pytest.approx(plain["f_high"]["simulated_hz"])
    assert moved["f_H simulated"]["after"] == pytest.approx(added["f_high"]["simulated_hz"])
    for figure, value in (
        ("f_u simulated", "simulated_hz"),
        ("f_u exact", "exact_hz"),
        ("phase margin simulated", "phase_margin_deg"),
        ("phase margin exact", "phase_margin_exact_deg"),
    ):
        assert moved[figure]["before"] == pytest.approx(plain["f_unity"][value], rel=1e-6)
        assert moved[figure]["after"] == pytest.approx(added["f_unity"][value], rel=1e-6)
    assert moved["f_u simulated"]["after"] < 0.9 * moved["f_u simulated"]["before"]
    assert plain["added"] == []


def test_unity_gain_stands_there_only_where_both_have_it(run: Run) -> None:
    loaded = document(run, "board.cir", "--add", "c=10")
    assert loaded["f_unity"] is None
    assert not [figure for figure in loaded["moved"] if figure["figure"].startswith(("f_u", "phase margin"))]


def test_the_page_names_the_added_part(run: Run, tmp_path: Path) -> None:
    report = tmp_path / "page.md"
    code, out, _ = run("board.cir", "--add", "c=12p", "--report", str(report))
    assert code == 0
    assert "\nADDED at c 12 pF\n" in out
    assert "C added at c" in out
    assert "with it" in out
    text = report.read_text()
    assert "### What was changed" in text
    assert "Added: at c 12 pF" in text


def test_setting_and_adding_go_together(run: Run) -> None:
    code, out, _ = run("board.cir", "--add", "c=12p", "--set", "R2=2.2k")
    assert code == 0
    assert "\nSET R2 = 2200\nADDED at c 12 pF\n" in out
    assert "as changed" in out


def test_a_node_that_is_not_there_is_no_traceback(run: Run) -> None:
    code, out, err = run("board.cir", "--add", "vc=12p")
    assert (code, out) == (2, "")
    assert err.startswith("tauledger: --add vc=12p: no node is called 'vc'\n  did you mean")
