"""A line in every format: its row among the parts, what paper leaves out, and no pole that stands for it."""

from __future__ import annotations

import csv
import html
import io
import json
import re
from pathlib import Path

import pytest

from tauledger.engine.client import Engine
from tauledger.pipeline import review
from tauledger.record import Review
from tauledger.report.csv import to_csv
from tauledger.report.html import to_html
from tauledger.report.json import to_json
from tauledger.report.markdown import to_markdown
from tauledger.report.terminal import render
from tauledger.report.wording import part_title

BOARD = Path(__file__).parents[2] / "fixtures" / "long_cable.cir"
LEFT_OUT = "O1 is a line (50 Ω, 100 ns, 2 Ω along it): taken as at DC, as on paper, f_H would be"


@pytest.fixture(scope="module")
def found(engine: Engine) -> Review:
    return review(BOARD, engine=engine)


def test_the_terminal_tells_the_share_of_the_delay_and_what_paper_leaves_out(found: Review) -> None:
    page = render(found, color=False, unicode=True)
    assert max(map(len, page.splitlines())) <= 80
    words = " ".join(page.split())
    assert LEFT_OUT in words
    assert "delay of O1 100 ns 89 %" in words
    assert "O1 is a line (50 Ω, 100 ns, 2 Ω along it), till here as at DC" in words
    assert "f_H: by hand without O1, as lines are at DC; that moves it by " in words
    assert "= group delay without lines" in words
    assert "poles, zeros, time constants and figures by hand leave out its delay" in words


def _plain(page: str) -> str:
    """Leave the tags out of a page."""
    return html.unescape(re.sub(r"<[^>]*>", "", page)).replace("\N{NO-BREAK SPACE}", " ")


def test_markdown_and_html_say_that_the_line_sets_the_edge(found: Review) -> None:
    for page in (to_markdown(found).decode(), _plain(to_html(found).decode())):
        assert "above all delay of O1 sets the upper edge" in page
        assert "The line O1 from near to out, 100 ns" in page
        assert LEFT_OUT.replace("_", "") in page.replace("_", "")
        assert "group delay without lines" in page


def test_csv_and_json_have_the_line_among_the_parts(found: Review) -> None:
    (part,) = [part for part in json.loads(to_json(found))["parts"] if part["kind"] == "line"]
    assert (part["name"], part["owner"], part["class"]) == ("O1.delay", "O1", "line")
    assert part["value"] == pytest.approx(100e-9, rel=1e-12, abs=0.0)
    assert part["nodes"] == ["near", "0", "out", "0"]
    rows = {tuple(row[:3]): row[3] for row in csv.reader(io.StringIO(to_csv(found).decode()))}
    assert float(rows["parts", "O1.delay", "share.f_high"]) == part["share"]["f_high"]


def test_nothing_that_would_help_is_told_with_a_loss(found: Review) -> None:
    """10 % less of the line moves f_H to a lower dip, though its share says otherwise: no help."""
    page = to_markdown(found).decode()
    told = next(line for line in page.splitlines() if "What would help most?" in line)
    assert "delay of O1" not in told
    assert all(row.f_high_rerun_hz is not None for row in found.helps if row.name == "O1.delay")


def test_a_line_of_r_and_c_is_told_by_what_is_changed_its_c() -> None:
    """Rerun and share scale R·C by C, with R held: less of R would do something else."""
    assert part_title("O1.rc", "O1") == "C in R·C of O1"
