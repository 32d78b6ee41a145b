"""Markdown for a pull request: one snapshot, and text that stays text."""

from __future__ import annotations

from pathlib import Path

import pytest

from report.literal import ECHO_PREAMP
from report.markup import hostile, rejected, without_plateau
from tauledger.report.markdown import escape, to_markdown

PAGE = Path(__file__).with_name("page.md")


def test_the_page_reads_as_agreed() -> None:
    """After a change that is meant, write it anew: to_markdown(ECHO_PREAMP) > page.md."""
    assert to_markdown(ECHO_PREAMP).decode() == PAGE.read_text(encoding="utf-8")


@pytest.mark.parametrize("review", [ECHO_PREAMP, hostile(), rejected(), without_plateau()])
def test_every_row_of_a_table_has_the_cells_of_its_head(review: object) -> None:
    lines = to_markdown(review).decode().splitlines()  # type: ignore[arg-type]
    for k, line in enumerate(lines):
        if line.startswith("|"):
            above = lines[k - 1]
            assert not above.startswith("|") or line.count("|") == above.count("|"), line


@pytest.mark.parametrize(
    ("text", "escaped"),
    [
        ("a|b", "a&#124;b"),
        ("<img src=x>", "&#60;img src=x&#62;"),
        ("C_μ of Q1", "C_μ of Q1"),
        ("_net_", r"\_net\_"),
        ("*bold* `code` [a](b)", r"\*bold\* \`code\` \[a\](b)"),
        ("@someone fixes #12", "&#64;someone fixes &#35;12"),
        ("two\nlines", "two lines"),
    ],
)
def test_names_cannot_become_markup(text: str, escaped: str) -> None:
    assert escape(text) == escaped


def test_a_pull_request_is_not_flooded() -> None:
    """What only some readers need is folded."""
    lines = to_markdown(ECHO_PREAMP).decode().splitlines()
    depth, open_lines = 0, 0
    for line in lines:
        depth += line.startswith("<details>")
        open_lines += depth == 0 and bool(line)
        depth -= line.startswith("</details>")
    assert depth == 0
    assert open_lines < 80
