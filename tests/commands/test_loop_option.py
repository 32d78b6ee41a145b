"""--loop: repeatable, as typed; what it cannot mean is told with what it could."""

from __future__ import annotations

from pathlib import Path

import click
import pytest
from click.testing import CliRunner

from tauledger import cli
from tauledger.asked import Asked
from tauledger.commands.questions import questions
from tauledger.errors import ExitCode

FIXTURES = Path(__file__).parents[2] / "fixtures"


def test_every_place_is_asked_for_as_typed() -> None:
    found: list[Asked] = []

    def remember(*, asked: Asked) -> ExitCode:
        found.append(asked)
        return ExitCode.OK

    command = click.command()(questions(remember))
    result = CliRunner().invoke(command, ["--loop", "m6", "--loop", "XU1.E2"], standalone_mode=False)
    assert result.exception is None
    assert found[0].loops == ("m6", "XU1.E2")


def test_a_place_that_is_none_is_told_with_what_there_is(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        cli.main(["review", str(FIXTURES / "tia_pair.cir"), "--loop", "Q9"])
    told = capsys.readouterr()
    assert left.value.code == ExitCode.UNUSABLE_INPUT
    assert told.out == ""
    assert "--loop Q9: no return ratio can be taken there" in told.err
    assert "name a source (Q1, Q2), a resistor, capacitor or inductor, a wire into a terminal (Q1.base)" in told.err


def test_the_page_shows_the_return_ratio_that_is_asked_for(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        cli.main(["review", str(FIXTURES / "tia_pair.cir"), "--loop", "q2", "--color", "never"])
    assert left.value.code == 0
    page = capsys.readouterr().out
    assert "RETURN RATIO" in page
    assert "at gm of Q2" in page
    assert "--loop Q2.base is what ngspice" in " ".join(page.split())
