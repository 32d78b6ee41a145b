"""The options that ask for unity gain, peaking, and gain and phase at a frequency."""

from __future__ import annotations

import click
import pytest
from click.testing import CliRunner

from tauledger.asked import Asked
from tauledger.commands.questions import questions
from tauledger.errors import ExitCode, InputError


def asked(*arguments: str) -> Asked:
    """What a command with the options of `questions` is asked by these arguments."""
    found: list[Asked] = []

    def remember(*, asked: Asked) -> ExitCode:
        found.append(asked)
        return ExitCode.OK

    CliRunner().invoke(click.command()(questions(remember)), arguments, catch_exceptions=False, standalone_mode=False)
    return found[0]


def test_frequencies_are_read_as_a_netlist_writes_them_in_their_order() -> None:
    assert asked("--at", "10meg", "--at", "2.2k").at_hz == (10e6, 2.2e3)


def test_nothing_is_asked_unasked() -> None:
    nothing = asked()
    assert (nothing.at_hz, nothing.unity, nothing.peaking) == ((), False, False)


def test_unity_and_peaking_are_flags() -> None:
    assert (asked("--unity").unity, asked("--unity").peaking) == (True, False)
    assert (asked("--peaking").unity, asked("--peaking").peaking) == (False, True)


@pytest.mark.parametrize(
    ("given", "says"), [("fast", "not a frequency"), ("10M", "M is milli"), ("-3k", "not a frequency")]
)
def test_a_frequency_that_cannot_be_read_is_refused_with_what_was_given(given: str, says: str) -> None:
    with pytest.raises(InputError, match=says) as refused:
        asked("--at", given)
    assert given in str(refused.value)
