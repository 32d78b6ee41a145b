"""`--curve`: from the file on the command line to the page, and what becomes of a file that cannot be used."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tauledger.cli import main

PREAMP = str(Path(__file__).parents[2] / "fixtures" / "echo_preamp.cir")
# what a bench might read of the board with a probe on its output; gain of our own making
CURVE = "# probe 10:1\nf_hz,gain_db\n3e3,38.6\n1e4,39.5\n3e4,39.6\n1e5,39.5\n3e5,38.6\n7e5,36.1\n1.5e6,31.6\n4e6,23.9\n"


def run(arguments: list[str]) -> int:
    with pytest.raises(SystemExit) as end:
        main(arguments)
    assert isinstance(end.value.code, int)
    return end.value.code


def test_the_page_and_the_record_hold_the_measured_curve(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    curve, record = tmp_path / "bench.csv", tmp_path / "review.json"
    curve.write_text(CURVE)
    assert run(["review", PREAMP, "--curve", str(curve), "--json", str(record)]) == 0
    assert "MEASURED CURVE" in capfd.readouterr().out
    facts = json.loads(record.read_text())
    assert [point["frequency_hz"] for point in facts["curve"]["points"]][:2] == [3e3, 1e4]
    assert facts["miller"]["frequency_hz"], "JSON holds Miller's factor over frequency too"


def test_a_faulty_line_is_pointed_at_and_the_code_is_that_of_a_netlist(
    tmp_path: Path, capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("bench.csv").write_text("f_hz,gain_db\n1e3,39\n2e3,thirty\n")
    assert run(["review", PREAMP, "--curve", "bench.csv"]) == 2
    told = capfd.readouterr().err.splitlines()
    assert told[0] == "bench.csv:3:5: gain_db is no number: thirty"
    assert told[1:3] == ["  2e3,thirty", "      ^^^^^^"]


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ([PREAMP, "--curve", "nowhere.csv"], "--curve nowhere.csv: cannot be read"),
        ([PREAMP, PREAMP, "--curve", "bench.csv"], "one curve is for one netlist"),
    ],
)
def test_what_cannot_be_used_is_refused(
    arguments: list[str], says: str, tmp_path: Path, capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("bench.csv").write_text(CURVE)
    assert run(["review", *arguments]) == 2
    assert says in capfd.readouterr().err
