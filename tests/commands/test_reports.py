"""`--report`: files by their ending, a folder for several netlists, whole files or none; progress on terminals."""

from __future__ import annotations

import io
import time
from collections.abc import Callable
from contextlib import nullcontext
from pathlib import Path

import pytest

from report.literal import ECHO_PREAMP
from report.markup import HTML, parse, words
from tauledger import cli, pipeline
from tauledger.engine import client
from tauledger.errors import EngineError, ExitCode
from tauledger.record import Review
from tauledger.report import html
from tauledger.report.csv import to_csv
from tauledger.report.index import file_names
from tauledger.report.markdown import to_markdown
from tauledger.report.progress import progress
from tauledger.report.terminal import render

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Run:
    """Run the command line in an empty folder; netlists are reviewed as the literal one, "broken.cir" fails."""

    def review(path: str, **_: object) -> Review:
        if path.endswith("broken.cir"):
            raise EngineError("ngspice found no operating point <b>", "check the bias")
        return ECHO_PREAMP

    monkeypatch.setattr(pipeline, "review", review)
    monkeypatch.setattr(client, "start_engine", lambda **_: nullcontext())
    monkeypatch.setattr(html, "_pictures", lambda _name, _review: ())
    monkeypatch.chdir(tmp_path)

    def call(*arguments: str) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            cli.main(["review", *arguments])
        told = capsys.readouterr()
        assert isinstance(left.value.code, int)
        return left.value.code, told.out, told.err

    return call


def test_each_ending_has_its_format_and_the_page_is_still_printed(run: Run) -> None:
    code, out, err = run("a.cir", "--report", "r.html", "--report", "r.md", "--report", "r.csv")
    assert (code, err) == (ExitCode.OK, "")
    assert out == render(ECHO_PREAMP, color=False, unicode=True)
    assert Path("r.html").read_bytes().startswith(b"<!DOCTYPE html>")
    assert Path("r.md").read_bytes() == to_markdown(ECHO_PREAMP)
    assert Path("r.csv").read_bytes() == to_csv(ECHO_PREAMP)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("a.cir", "--report", "r.pdf"), "r.pdf: no such format end it with .html, .md, .csv, or with / for a folder"),
        (("a.cir", "--report", "nowhere/r.html"), "nowhere/r.html: there is no folder nowhere"),
        (("a.cir", "--report", "nowhere/at/all/"), "there is no folder nowhere/at"),
        (("a.cir", "b.cir", "--report", "r.html"), "2 netlists do not fit into one file name a folder"),
        (("a.cir", "--report", "x/", "--report", "y/"), "one folder takes all the reports"),
        (("a.cir", "b.cir", "--json", "-"), "--json -: one document holds one review"),
    ],
)
def test_what_cannot_be_written_is_said_before_anything_is_reviewed(
    run: Run, monkeypatch: pytest.MonkeyPatch, arguments: tuple[str, ...], says: str
) -> None:
    monkeypatch.setattr(pipeline, "review", lambda *_a, **_k: pytest.fail("reviewed first"))
    code, out, err = run(*arguments)
    assert (code, out) == (ExitCode.UNUSABLE_INPUT, "")
    assert says in " ".join(err.split())
    assert list(Path().rglob("*.html")) == []


def test_several_netlists_get_a_page_each_and_an_index(run: Run) -> None:
    code, out, _ = run("one/board.cir", "two/board.cir", "c.cir", "--report", "out/")
    assert code == ExitCode.OK
    assert sorted(path.name for path in Path("out").iterdir()) == ["board-2.html", "board.html", "c.html", "index.html"]
    assert out.splitlines()[0] == "one/board.cir: out/board.html"
    root = parse(Path("out/index.html").read_bytes())
    assert [link.get("href") for link in root.iter(f"{HTML}a")] == ["board.html", "board-2.html", "c.html"]
    assert "580.7" in words(root)


def test_names_that_are_no_text_are_shown_and_linked(run: Run) -> None:
    code, _, err = run("caf\udce9 <1>&.cir", "--report", "out/")
    assert (code, err) == (ExitCode.OK, "")
    (link,) = parse(Path("out/index.html").read_bytes()).iter(f"{HTML}a")
    assert link.get("href") == "caf%E9%20%3C1%3E%26.html"
    assert Path("out/caf\udce9 <1>&.html").is_file()


def test_one_that_fails_does_not_keep_the_others_from_being_reviewed(run: Run) -> None:
    code, _, err = run("a.cir", "broken.cir", "c.cir", "--report", "out/")
    assert code == ExitCode.ENGINE_FAILED
    assert "no operating point" in err
    assert sorted(path.name for path in Path("out").iterdir()) == ["a.html", "c.html", "index.html"]
    assert "ngspice found no operating point <b>" in words(parse(Path("out/index.html").read_bytes()))


def test_without_a_folder_the_pages_follow_each_other(run: Run) -> None:
    code, out, _ = run("a.cir", "b.cir")
    assert code == ExitCode.OK
    assert out.count("Mid-band") == 2


def test_a_write_that_fails_leaves_the_old_file_whole(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    Path("r.csv").write_text("old")

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    code, _, err = run("a.cir", "--report", "r.csv")
    assert code == ExitCode.UNUSABLE_INPUT
    assert "--report r.csv: cannot be written: No space left on device" in err
    assert Path("r.csv").read_text() == "old"
    assert [path.name for path in Path().iterdir()] == ["r.csv"]


@pytest.mark.parametrize(
    ("paths", "names"),
    [
        (("a.cir", "b/a.cir", "A.cir"), ("a.html", "a-2.html", "A-3.html")),
        (("index.cir",), ("index-2.html",)),
        (("rev.B.cir",), ("rev.B.html",)),
    ],
)
def test_no_report_takes_the_place_of_another(paths: tuple[str, ...], names: tuple[str, ...]) -> None:
    assert file_names(paths) == names


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def test_progress_shows_after_a_while_and_is_taken_away() -> None:
    stream = Terminal()
    with progress(stream, after_s=0.0) as tell:
        tell("reviewing board.cir")
        time.sleep(0.05)
    told = stream.getvalue()
    assert "reviewing board.cir ... 0 s" in told or told.startswith("\r ... 0 s")
    assert told.endswith(" \r")


def test_what_is_quick_shows_no_progress() -> None:
    stream = Terminal()
    with progress(stream, after_s=5.0) as tell:
        tell("reviewing board.cir")
    assert stream.getvalue() == ""


def test_where_nobody_watches_nothing_is_written() -> None:
    stream = io.StringIO()
    with progress(stream, after_s=0.0) as tell:
        tell("reviewing board.cir")
        time.sleep(0.02)
    assert stream.getvalue() == ""


def test_progress_ends_with_what_it_watches() -> None:
    stream = Terminal()

    def fail() -> None:
        with progress(stream, after_s=0.0):
            time.sleep(0.02)
            raise EngineError("no operating point", "")

    with pytest.raises(EngineError):
        fail()
    assert stream.getvalue().endswith("\r")


@pytest.mark.parametrize(("columns", "width"), [("60", 60), ("200", 80), ("10", 40)])
def test_the_page_takes_the_width_of_the_terminal(
    run: Run, monkeypatch: pytest.MonkeyPatch, columns: str, width: int
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    _, out, _ = run("a.cir")
    assert width - 12 < max(map(len, out.splitlines())) <= width
