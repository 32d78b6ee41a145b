"""Every command that reads a netlist takes the folders that messages tell one to allow, and values to be set."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from tauledger import cli

BOARD = """Echo input stage
.param load=1k
VCC vcc 0 9
VIN in 0 AC 1
C1 in b 1u
R1 vcc b 470k
R2 vcc c {{load}}
Q1 c b 0 nsmall
.include {models}
.print ac v(c)
"""

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    (tmp_path / "board").mkdir()
    (tmp_path / "parts").mkdir()
    (tmp_path / "parts" / "nsmall.lib").write_text(".model nsmall npn (is=6e-15 bf=220)\n")
    (tmp_path / "board" / "board.cir").write_text(BOARD.format(models="../parts/nsmall.lib"))
    monkeypatch.chdir(tmp_path / "board")

    def ran(command: str, *options: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            cli.main([command, "board.cir", *options])
        said = capsys.readouterr()
        return int(left.value.code or 0), said.out, said.err

    return ran


@pytest.mark.parametrize("command", ["devices", "paper", "netlist", "review"])
def test_a_folder_is_allowed_by_the_option_that_the_message_names(command: str, run: Run) -> None:
    code, _, err = run(command)
    assert code == 2
    assert "allow its folder with --allow-include" in err
    code, out, err = run(command, "--allow-include", "../parts")
    assert (code, "Q1" in out or "echo input" in out.lower()) == (0, True)


def test_devices_are_biased_under_the_values_that_are_set(run: Run) -> None:
    allowed = ("--allow-include", "../parts")
    _, before, _ = run("devices", *allowed)
    code, after, _ = run("devices", *allowed, "--set", "load=2k", "--set", "nsmall.bf=100")
    assert code == 0
    assert before != after
    code, _, err = run("devices", *allowed, "--set", "lode=2k")
    assert code == 2
    assert "did you mean 'load'" in err


def test_the_flat_deck_holds_the_values_that_are_set(run: Run) -> None:
    code, out, _ = run("netlist", "--allow-include", "../parts", "--set", "load=2k", "--set", "Q1.area=3")
    assert code == 0
    assert "R2 vcc c 2000.0" in out
    assert "Q1 c b 0 nsmall area=3.0" in out
