"""The command line: options reach the review, every outcome has its exit code, and stdout is the result alone."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import threading
from collections.abc import Callable
from contextlib import nullcontext
from pathlib import Path
from typing import Any

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger import cli, pipeline
from tauledger.asked import Asked
from tauledger.engine import client
from tauledger.errors import (
    Diagnostic,
    EngineError,
    EngineMissing,
    EngineTimeout,
    ExitCode,
    InputError,
    NetlistError,
    NetworkError,
)
from tauledger.record import AgreementFacts, Review
from tauledger.report.terminal import render

PREAMP = Path(__file__).parents[1] / "fixtures" / "echo_preamp.cir"

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """What the command line asks of the pipeline; it answers with the literal review."""
    seen: dict[str, Any] = {}

    def review(path: str, **options: object) -> Review:
        assert options.pop("engine") is None
        seen.update(options, path=path)
        return ECHO_PREAMP

    def start(**options: object) -> nullcontext[None]:
        seen.update(options)
        return nullcontext()

    monkeypatch.setattr(pipeline, "review", review)
    monkeypatch.setattr(client, "start_engine", start)
    return seen


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Run:
    """Run the command line in this process: exit code, stdout, stderr."""
    for name in ("NO_COLOR", "FORCE_COLOR"):
        monkeypatch.delenv(name, raising=False)

    def call(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            cli.main(list(arguments))
        told = capsys.readouterr()
        assert isinstance(left.value.code, int)
        return left.value.code, told.out, told.err

    return call


def raising(error: Exception) -> Callable[..., Review]:
    def review(_path: str, **_options: object) -> Review:
        raise error

    return review


def test_a_review_is_the_page_on_stdout_and_nothing_else(run: Run, asked: dict[str, Any]) -> None:
    code, out, err = run("review", "board.cir")
    assert (code, err) == (ExitCode.OK, "")
    assert out == render(ECHO_PREAMP, color=False, unicode=True)
    assert asked["path"] == "board.cir"


def test_options_reach_the_review(run: Run, asked: dict[str, Any]) -> None:
    code, _, _ = run(
        *("review", "board.cir", "--input", "VS", "--output", "v(a,b)", "--output", "c", "--midband", "2.2meg"),
        *("--add", "out=10meg,12p", "--impedance", "--swing", "3"),
        *("--timeout", "5", "--library", "/opt/libngspice.so"),
        *("--set", "RL=2k", "--set", "nsmall.bf=100", "--allow-include", "../parts", "--fold", "XU1", "--at", "10meg"),
    )
    assert code == ExitCode.OK
    assert asked == {
        "path": "board.cir",
        "fold": ("XU1",),
        "asked": Asked(at_hz=(10e6,), outputs=("c",), impedances=True, swing_v=3.0),
        "drive": "VS",
        "output": "v(a,b)",
        "midband_hz": 2.2e6,
        "timeout_s": 5.0,
        "library": "/opt/libngspice.so",
        "page": None,
        "settings": ("RL=2k", "nsmall.bf=100"),
        "add": ("out=10meg,12p",),
        "allow": ("../parts",),
    }


def test_without_options_the_netlist_decides(run: Run, asked: dict[str, Any]) -> None:
    run("review", "board.cir")
    assert (asked["drive"], asked["output"], asked["midband_hz"], asked["library"]) == (None, None, None, None)


def test_verbose_shows_the_working(run: Run, asked: dict[str, Any]) -> None:
    assert "WORKING, base of Q1 (b)" in run("review", "board.cir", "--verbose")[1]
    assert "WORKING" not in run("review", "board.cir")[1]
    assert asked


def test_working_is_shown_for_the_nodes_that_are_asked_for(run: Run, asked: dict[str, Any]) -> None:
    out = run("review", "board.cir", "--working", "B")[1]
    assert out.count("WORKING") == 1
    assert "WORKING, base of Q1 (b)" in out
    code, out, err = run("review", "board.cir", "--working", "nowhere")
    assert (code, out) == (ExitCode.UNUSABLE_INPUT, "")
    assert "--working nowhere: no signal node of that name" in err
    assert "signal nodes here: b" in err
    assert asked


def test_a_page_is_read_before_anything_is_reviewed(run: Run, asked: dict[str, Any], tmp_path: Path) -> None:
    page = tmp_path / "page.toml"
    page.write_text("[node.b]\nresistence = 5\n", encoding="utf-8")
    code, out, err = run("review", "board.cir", "--paper", str(page))
    assert (code, out) == (ExitCode.UNUSABLE_INPUT, "")
    assert f"{page}:2:1: no such figure of a node: resistence" in err
    code, _, err = run("review", "board.cir", "--paper", str(tmp_path / "none.toml"))
    assert (code, "cannot be read" in err) == (ExitCode.UNUSABLE_INPUT, True)
    assert run("review", "a.cir", "b.cir", "--paper", str(page))[0] == ExitCode.UNUSABLE_INPUT
    assert not asked
    page.write_text("[node.b]\nresistance = 5\n", encoding="utf-8")
    assert run("review", "board.cir", "--paper", str(page))[0] == ExitCode.OK
    assert [claim.key for claim in asked["page"].claims] == ["resistance"]


def test_an_empty_page_never_overwrites_one(run: Run, asked: dict[str, Any], tmp_path: Path) -> None:
    page = tmp_path / "page.toml"
    page.write_text("gain = 7\n", encoding="utf-8")
    code, out, err = run("paper", "board.cir", "--to", str(page))
    assert (code, out) == (ExitCode.UNUSABLE_INPUT, "")
    assert "is there already" in err
    assert page.read_text(encoding="utf-8") == "gain = 7\n"
    assert not asked


def test_methods_lists_rules_and_methods_within_80_columns(run: Run) -> None:
    code, out, err = run("methods")
    assert (code, err) == (ExitCode.OK, "")
    for wanted in ("into emitter", "(r_π + R_B)/(β + 1)", "sum of time constants", "holds", "source", "Miller"):
        assert wanted in out
    assert max(map(len, out.splitlines())) <= 80


@pytest.mark.parametrize(("typed", "hertz"), [("10k", 1e4), ("8.5kHz", 8.5e3), ("1e4", 1e4), ("10m", 0.01), ("0", 0.0)])
def test_midband_is_written_as_in_a_netlist(run: Run, asked: dict[str, Any], typed: str, hertz: float) -> None:
    assert run("review", "board.cir", "--midband", typed)[0] == ExitCode.OK
    assert asked["midband_hz"] == pytest.approx(hertz, rel=1e-15)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("review", "b.cir", "--midband", "fast"), "--midband fast: not a frequency"),
        (("review", "b.cir", "--midband", "4k5"), "--midband 4k5: not a frequency"),
        (("review", "b.cir", "--midband=-1k"), "--midband -1k: not a frequency"),
        (("review", "b.cir", "--midband", "10M"), "M is milli in SPICE"),
        (("review", "b.cir", "--timeout", "0"), "--timeout 0: no time to run in"),
        (("review", "b.cir", "--timeout", "soon"), "'soon' is not a valid float"),
        (("review", "b.cir", "--color", "sepia"), "'sepia' is not one of 'auto', 'always', 'never'"),
        (("review", "-"), "the netlist must be a file"),
        (("review",), "Missing argument 'NETLIST...'"),
        (("review", "b.cir", "--jso", "x"), "Did you mean"),
        (("review", "b.cir", "--json", "/"), "this is a folder"),
        (("review", "b.cir", "--json", "/nowhere/at/all.json"), "there is no folder /nowhere/at"),
        (("revue", "b.cir"), "No such command 'revue'"),
    ],
)
def test_an_option_that_cannot_be_used_is_one_message(
    run: Run, asked: dict[str, Any], arguments: tuple[str, ...], says: str
) -> None:
    code, out, err = run(*arguments)
    assert (code, out) == (ExitCode.UNUSABLE_INPUT, "")
    assert says in err
    assert "Traceback" not in err
    assert not asked, "nothing is reviewed before the options are known to be good"


PLACE = Diagnostic("board.cir", 4, 3, "Q1 c b e MISSING", "there is no model MISSING", "models here: GENERIC", 2)


@pytest.mark.parametrize(
    ("error", "code", "says"),
    [
        (NetlistError(PLACE), 2, f"{PLACE}\n"),
        (InputError("there is no file board.cir"), 2, "tauledger: there is no file board.cir\n"),
        (EngineError("no operating point", "look at node b"), 3, "tauledger: no operating point\n  look at node b\n"),
        (EngineMissing("the ngspice library is not installed"), 3, "tauledger: the ngspice library is not installed\n"),
        (EngineTimeout("ngspice did not answer in 60 s"), 3, "tauledger: ngspice did not answer in 60 s\n"),
    ],
)
def test_expected_failures_are_one_message_and_their_code(
    run: Run, monkeypatch: pytest.MonkeyPatch, error: Exception, code: int, says: str
) -> None:
    monkeypatch.setattr(pipeline, "review", raising(error))
    assert run("review", "board.cir") == (code, "", says)


def test_a_network_without_solution_is_ours_and_asks_for_a_report(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(pipeline, "review", raising(NetworkError("singular at 1 kHz")))
    code, out, err = run("review", "board.cir")
    assert (code, out) == (ExitCode.INTERNAL, "")
    assert err.startswith("tauledger: singular at 1 kHz\n")
    assert "Please report it" in err
    assert "Traceback" not in err


def test_the_unexpected_shows_a_traceback_and_asks_for_a_report(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(pipeline, "review", raising(ZeroDivisionError("of all things")))
    code, out, err = run("review", "board.cir")
    assert (code, out) == (ExitCode.INTERNAL, "")
    assert "Traceback (most recent call last)" in err
    assert "ZeroDivisionError: of all things" in err
    assert "Please report it" in err


def test_an_interrupt_ends_quietly_with_130(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    def review(_path: str, **_options: object) -> Review:
        raise KeyboardInterrupt

    monkeypatch.setattr(pipeline, "review", review)
    code, out, err = run("review", "board.cir")
    assert (code, out, err.strip()) == (ExitCode.INTERRUPTED, "", "")


@pytest.mark.parametrize(("error", "code"), [(1e-9, 0), (5e-5, 0), (0.99e-3, 0), (1.01e-3, 1), (float("nan"), 1)])
def test_disagreement_above_1e_3_fails_the_check(
    run: Run, monkeypatch: pytest.MonkeyPatch, error: float, code: int
) -> None:
    found = replace(ECHO_PREAMP, agreement=AgreementFacts(error, 1e6, 200))
    monkeypatch.setattr(pipeline, "review", lambda _path, **_options: found)
    assert run("review", "board.cir")[0] == code
    assert run("review", "board.cir", "--json", "-")[0] == code


def test_json_to_stdout_is_the_json_alone(run: Run, asked: dict[str, Any]) -> None:
    code, out, err = run("review", "board.cir", "--json", "-")
    assert (code, err) == (ExitCode.OK, "")
    assert json.loads(out)["schema"] == "tauledger.review/1"
    assert asked


def test_json_to_a_file_replaces_it_whole_and_leaves_nothing_beside_it(
    run: Run, asked: dict[str, Any], tmp_path: Path
) -> None:
    target = tmp_path / "review.json"
    target.write_text("old" * 100_000)
    code, out, err = run("review", "board.cir", "--json", str(target))
    assert (code, err) == (ExitCode.OK, "")
    assert "WHOSE CAPACITANCE" in out, "the page is printed as well"
    assert json.loads(target.read_text())["netlist"]["path"] == "fixtures/echo_preamp.cir"
    assert [entry.name for entry in tmp_path.iterdir()] == ["review.json"]
    assert asked


def test_json_through_a_link_keeps_the_link(run: Run, asked: dict[str, Any], tmp_path: Path) -> None:
    (tmp_path / "real.json").write_text("{}")
    (tmp_path / "link.json").symlink_to("real.json")
    assert run("review", "board.cir", "--json", str(tmp_path / "link.json"))[0] == ExitCode.OK
    assert (tmp_path / "link.json").is_symlink()
    assert json.loads((tmp_path / "real.json").read_text())["schema"] == "tauledger.review/1"
    assert asked


def test_json_to_a_device_is_written_through(run: Run, asked: dict[str, Any]) -> None:
    assert run("review", "board.cir", "--json", os.devnull)[0] == ExitCode.OK
    assert Path(os.devnull).is_char_device()
    assert asked


def test_a_failed_review_leaves_the_old_json(run: Run, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    target = tmp_path / "review.json"
    target.write_text("{}")
    monkeypatch.setattr(pipeline, "review", raising(EngineError("no operating point")))
    assert run("review", "board.cir", "--json", str(target))[0] == ExitCode.ENGINE_FAILED
    assert target.read_text() == "{}"


@pytest.mark.parametrize(
    ("option", "environment", "colored"),
    [
        ("auto", {}, False),
        ("auto", {"FORCE_COLOR": "1"}, True),
        ("auto", {"FORCE_COLOR": "1", "NO_COLOR": "1"}, False),
        ("auto", {"FORCE_COLOR": "1", "NO_COLOR": ""}, True),
        ("always", {"NO_COLOR": "1"}, True),
        ("never", {"FORCE_COLOR": "1"}, False),
    ],
)
def test_the_option_rules_over_no_color_and_that_over_force_color(
    run: Run,
    asked: dict[str, Any],
    monkeypatch: pytest.MonkeyPatch,
    option: str,
    environment: dict[str, str],
    colored: bool,
) -> None:
    for name, value in environment.items():
        monkeypatch.setenv(name, value)
    assert ("\x1b[" in run("review", "board.cir", "--color", option)[1]) is colored
    assert asked


def test_threads_are_left_to_the_user_who_chose_them(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("OPENBLAS_NUM_THREADS", "3")
    run("--version")
    assert os.environ["OPENBLAS_NUM_THREADS"] == "3"
    monkeypatch.delenv("OPENBLAS_NUM_THREADS")
    run("--version")
    assert os.environ["OPENBLAS_NUM_THREADS"] == "1"


# --- in a process of its own: what only a process has ----------------------------------------------------------------

STUBBED = """
import sys
sys.path.insert(0, {tests!r})
from report.literal import ECHO_PREAMP
from tauledger import cli, pipeline
{more}
pipeline.review = review
cli.main(["review", "board.cir", *sys.argv[1:]])
"""
AT_ONCE = "def review(path, **options): return ECHO_PREAMP"
WAITS = """
def review(path, **options):
    import time
    print("waiting", file=sys.stderr, flush=True)
    time.sleep(60)
"""


def stubbed(more: str) -> list[str]:
    return [sys.executable, "-c", STUBBED.format(tests=str(Path(__file__).parent), more=more)]


def test_a_reader_that_goes_away_gets_no_message() -> None:
    """The page is written into a pipe whose other end is closed."""
    read_end, write_end = os.pipe()
    os.close(read_end)
    process = subprocess.run(stubbed(AT_ONCE), stdout=write_end, stderr=subprocess.PIPE, timeout=30, check=False)
    os.close(write_end)
    assert (process.returncode, process.stderr) == (ExitCode.OK, b"")


def test_a_full_disk_is_one_message() -> None:
    with Path("/dev/full").open("wb") as full:
        process = subprocess.run(stubbed(AT_ONCE), stdout=full, stderr=subprocess.PIPE, timeout=30, check=False)
    assert process.returncode == ExitCode.UNUSABLE_INPUT
    assert process.stderr == b"tauledger: standard output cannot be written: No space left on device\n"


def test_ctrl_c_ends_with_130_and_no_traceback() -> None:
    process = subprocess.Popen(stubbed(WAITS), stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    deadline = threading.Timer(30, process.kill)
    deadline.start()
    assert process.stderr is not None
    assert process.stderr.readline() == b"waiting\n"
    process.send_signal(signal.SIGINT)
    out, err = process.communicate()
    deadline.cancel()
    assert (process.returncode, out, err.strip()) == (ExitCode.INTERRUPTED, b"", b"")


def test_an_encoding_without_the_symbols_gets_ascii() -> None:
    process = subprocess.run(
        stubbed(AT_ONCE),
        capture_output=True,
        timeout=30,
        check=True,
        env={**os.environ, "PYTHONIOENCODING": "ascii"},
    )
    assert process.stdout.decode("ascii") == render(ECHO_PREAMP, color=False, unicode=False)


def test_the_whole_walk_from_the_command_line() -> None:
    """The page of the first board: at most 60 lines of 80 columns, with every section that a reviewer looks for."""
    process = subprocess.run(
        [sys.executable, "-m", "tauledger", "review", "fixtures/echo_preamp.cir"],
        cwd=PREAMP.parents[1],
        capture_output=True,
        timeout=60,
        check=False,
        env={**os.environ, "PYTHONIOENCODING": "utf-8"},
    )
    lines = process.stdout.decode().splitlines()
    assert (process.returncode, process.stderr) == (ExitCode.OK, b"")
    assert len(lines) <= 60
    assert max(map(len, lines)) <= 80
    for start in ("BAND EDGES", "BIAS", "WHY PAPER", "UPPER EDGE", "FROM PAPER", "WHOSE", "LOWER EDGE", "POLES"):
        assert sum(line.startswith(start) for line in lines) == 1, start
