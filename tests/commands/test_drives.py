"""Options about drives, outputs and amplitudes, from the command line to every format."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable
from pathlib import Path

import pytest

from tauledger import cli

PAIR = str(Path(__file__).parents[2] / "fixtures" / "pair.cir")
PREAMP = str(Path(__file__).parents[2] / "fixtures" / "echo_preamp.cir")

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    def ran(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            cli.main(["review", *arguments])
        said = capsys.readouterr()
        return int(left.value.code or 0), said.out, said.err

    return ran


def test_everything_asked_is_in_every_format(run: Run, tmp_path: Path) -> None:
    files = [tmp_path / name for name in ("page.html", "page.md", "page.csv")]
    reports = [option for file in files for option in ("--report", str(file))]
    code, out, err = run(PAIR, "--output", "outp", "--output", "outn", "--impedance", "--swing", "500m", *reports)
    assert (code, err) == (0, "")
    assert all(len(line) <= 80 for line in out.splitlines())
    for heading in ("LARGE SIGNAL", "MODES of VINP and VINN", "FURTHER OUTPUTS", "IMPEDANCES"):
        assert heading in out
    assert "500 mV peak" in out
    html, markdown, table = (file.read_text(encoding="utf-8") for file in files)
    for title in ("Large signal", "Differential and common mode", "Further outputs", "Input and output impedance"):
        assert f">{title}</h2>" in html
        assert f"### {title}" in markdown
    rows = list(csv.DictReader(io.StringIO(table)))
    names = {(row["table"], row["name"]) for row in rows}
    assert {("outputs", "v(outn)"), ("modes", ""), ("impedances", "VINP beyond RSP"), ("large_signal", "")} <= names
    units = {row["quantity"]: row["unit"] for row in rows if row["table"] == "large_signal.nodes"}
    assert (units["slew_v_per_s"], units["current_a"], units["capacitance_f"]) == ("V/s", "A", "F")
    curve = [row for row in rows if row["table"] == "impedances.curve" and row["quantity"] == "exact_ohm"]
    assert len(curve) > 1000


def test_the_document_holds_them_as_numbers(run: Run) -> None:
    code, out, _ = run(PREAMP, "--output", "out", "--output", "b", "--impedance", "--swing", "3", "--json", "-")
    found = json.loads(out)
    assert code == 0
    assert found["output"]["plus"] == "out"
    assert [row["name"] for row in found["outputs"]] == ["v(b)"]
    assert (found["large_signal"]["swing_v"], found["large_signal"]["asked"]) == (3.0, True)
    assert [one["name"] for one in found["impedances"]] == [
        "VIN beyond RS",
        "VIN with RS",
        "v(out) with RL, CL",
        "v(out) without RL, CL",
    ]
    assert found["modes"] is None


@pytest.mark.parametrize("given", ["0", "-3", "three", "inf", ""])
def test_a_swing_that_is_none_gets_one_clear_message(run: Run, given: str) -> None:
    code, out, err = run(PREAMP, "--swing", given)
    assert (code, out) == (2, "")
    assert err.startswith(f"tauledger: --swing {given}: not a peak value in V\n  give volts above 0")


def test_an_unknown_further_output_gets_one_clear_message(run: Run) -> None:
    code, out, err = run(PREAMP, "--output", "out", "--output", "bb")
    assert (code, out) == (2, "")
    assert err.startswith("tauledger: no node is called 'bb'\n")


def test_a_pair_of_inputs_is_driven_in_opposite_phase(run: Run) -> None:
    code, out, _ = run(PAIR, "--input", "VINP,VINN", "--output", "outp")
    assert code == 0
    assert "Drive VINP 500 mV through 300 Ω, VINN -500 mV through 300 Ω" in out
    assert "MODES of VINP and VINN" in out
