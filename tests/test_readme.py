"""README shows what the program prints today."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from tauledger.engine.client import Engine
from tauledger.pipeline import review
from tauledger.report.terminal import render

ROOT = Path(__file__).parent.parent
NUMBER = re.compile(r"[-+]?\d+(?:\.\d+)?(?:e[-+]?\d+)?")


def test_the_output_in_readme_is_that_of_the_echo_preamp(engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    """Words and layout must be equal; the agreement with the engine is rounding and may differ."""
    monkeypatch.chdir(ROOT)
    printed = render(review("fixtures/echo_preamp.cir", engine=engine), color=False, unicode=True)
    shown = (ROOT / "README.md").read_text(encoding="utf-8").split("```\n")[1]
    for here, there in zip(shown.splitlines(), printed.splitlines(), strict=True):
        if here.startswith("ngspice"):
            continue
        assert NUMBER.sub("#", here) == NUMBER.sub("#", there)
        told, found = (list(map(float, NUMBER.findall(line))) for line in (here, there))
        assert told == pytest.approx(found, rel=1e-2)


def test_readme_opens_with_one_paragraph_that_states_the_job() -> None:
    first = (ROOT / "README.md").read_text(encoding="utf-8").split("\n\n")
    assert first[0] == "# tauledger"
    assert first[1].startswith("tauledger is the instrument")
    assert "GPL-3.0-or-later" in (ROOT / "README.md").read_text(encoding="utf-8")
