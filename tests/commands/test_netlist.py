"""`tauledger netlist`: the flat deck, the tree of instances, the origin of a name, and what was read past."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from tauledger import cli

BOARD = """River-level gauge, two stages
.param base=1k load={base*2}
V1 in 0 AC 1 SIN(0 1 1k)
R1 in a {load+base}
X1 a b stage gain=3 rr={load}
X2 b out pair
R9 out 0 1k m=2
.subckt stage i o gain=1 rr=1k
R1 i o {rr*gain}
C1 o 0 1n ic=2
.ends
.subckt pair i o
X1 i m stage
X2 m o stage gain={2*2}
D1 o 0 dd
.model dd d is={1e-14*base/1k}
.ends
.ac dec 10 1 1meg
.options reltol=1e-4
.control
print v(out)
.endc
"""

Run = Callable[..., tuple[int, list[str], list[str]]]


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "board.cir").write_text(BOARD)

    def ran(*options: str) -> tuple[int, list[str], list[str]]:
        with pytest.raises(SystemExit) as left:
            cli.main(["netlist", "board.cir", *options])
        said = capsys.readouterr()
        return int(left.value.code or 0), said.out.splitlines(), said.err.splitlines()

    return ran


def test_the_deck_is_flat_with_hierarchical_names_and_full_numbers(run: Run) -> None:
    code, out, err = run()
    assert (code, err) == (0, [])
    assert out[0] == "* River-level gauge, two stages"
    assert "R.X1.R1 a b 6000.0" in out
    assert "C.X2.X1.C1 X2.m 0 1e-09" in out
    assert "D.X2.D1 out 0 X2:dd" in out
    assert ".model X2:dd d is=1e-14" in out


def test_the_deck_goes_to_a_file_where_one_is_named(run: Run, tmp_path: Path) -> None:
    _, out, _ = run()
    code, nothing, _ = run("--output", "flat.cir")
    assert (code, nothing) == (0, [])
    assert (tmp_path / "flat.cir").read_text().splitlines() == out


def test_the_tree_counts_elements_of_each_instance_and_of_all_inside(run: Run) -> None:
    _, out, _ = run("--hierarchy")
    assert out == [
        "board.cir: R 2, V 1; 10 with what is inside",
        "  X1  stage (board.cir:8), called at board.cir:5: C 1, R 1",
        "  X2  pair (board.cir:12), called at board.cir:6: D 1; 5 with what is inside",
        "    X2.X1  stage (board.cir:8), called at board.cir:13: C 1, R 1",
        "    X2.X2  stage (board.cir:8), called at board.cir:14: C 1, R 1",
    ]


def test_the_origin_of_an_element_follows_its_parameters_to_the_last_number(run: Run) -> None:
    _, out, _ = run("--origin", "x1.r1")
    assert out == [
        "X1.R1  board.cir:9",
        "  R1 i o {rr*gain}",
        "  in X1 (board.cir:5), subcircuit stage (board.cir:8)",
        "  value 6000 ohm",
        "  rr = 2000  rr={load}  board.cir:5",
        "    load = 2000  load={base*2}  board.cir:2",
        "      base = 1000  base=1k  board.cir:2",
        "  gain = 3  gain=3  board.cir:5",
    ]
    assert run("--origin", "R.X1.R1")[1] == out


@pytest.mark.parametrize(
    ("name", "lines"),
    [
        (
            "LOAD",
            ["parameter load", "  load = 2000  load={base*2}  board.cir:2", "    base = 1000  base=1k  board.cir:2"],
        ),
        (
            "X2.X2.gain",
            [
                "parameter gain",
                "  in X2.X2 (board.cir:14), subcircuit stage (board.cir:8)",
                "  in X2 (board.cir:6), subcircuit pair (board.cir:12)",
                "  gain = 4  gain={2*2}  board.cir:14",
            ],
        ),
        (
            "X2:dd",
            [
                "model X2:dd  board.cir:16",
                "  .model dd d is={1e-14*base/1k}",
                "  in X2 (board.cir:6), subcircuit pair (board.cir:12)",
                "  type d",
                "  is=1e-14",
                "  base = 1000  base=1k  board.cir:2",
            ],
        ),
    ],
)
def test_parameters_and_models_have_their_origin_too(run: Run, name: str, lines: list[str]) -> None:
    assert run("--origin", name)[1] == lines


def test_a_name_that_is_nowhere_gets_the_nearest_one(run: Run) -> None:
    code, out, err = run("--origin", "X1.R2")
    assert (code, out) == (2, [])
    assert err == ["tauledger: no element, model or parameter is called 'X1.R2'", "  did you mean 'X1.R1'?"]


def test_what_was_read_past_is_listed_when_it_is_asked_for(run: Run) -> None:
    assert run("--verbose")[2] == [
        "board.cir:3: read past: time function SIN of V1 in 0 AC 1 SIN(0 1 1k)",
        "board.cir:10: read past: initial condition ic of C1 o 0 1n ic=2",
        "board.cir:18: read past: .ac dec 10 1 1meg",
        "board.cir:19: read past: option reltol of .options reltol=1e-4",
        "board.cir:20: read past: .control block of 1 line, never run",
    ]


def test_notes_stand_on_standard_error(run: Run, tmp_path: Path) -> None:
    (tmp_path / "board.cir").write_text("pad\nV1 in 0 AC 1\nR1 in 0 {pow(-2,2)*1k}\n")
    code, out, err = run()
    assert code == 0
    assert "R1 in 0 4000.0" in out
    assert err == [
        "board.cir:3: note: pow(x,y) keeps the sign of x here, as ngspice does; in a behavioural source it takes |x|"
    ]


def test_folders_are_allowed_one_by_one(run: Run, tmp_path: Path) -> None:
    shared = tmp_path / "shared"
    shared.mkdir()
    (shared / "load.inc").write_text("R1 in 0 1k\n")
    inner = tmp_path / "own"
    inner.mkdir()
    (tmp_path / "board.cir").unlink()
    (tmp_path / "board.cir").symlink_to(inner / "board.cir")
    (inner / "board.cir").write_text(f"pad\nV1 in 0 AC 1\n.include {shared / 'load.inc'}\n")
    assert run()[0] == 2
    code, out, _ = run("--allow-include", str(shared))
    assert code == 0
    assert "R1 in 0 1000.0" in out


@pytest.mark.parametrize("options", [("--hierarchy", "--origin", "R1"), ("--output", "none/flat.cir")])
def test_options_that_cannot_be_used_are_one_message(run: Run, options: tuple[str, ...]) -> None:
    code, out, err = run(*options)
    assert (code, out) == (2, [])
    assert len(err) <= 2
