"""The options of `tauledger review` that ask beyond the band edges, gathered into one record."""

from __future__ import annotations

from collections.abc import Callable
from functools import wraps

import click

from tauledger.commands.console import hertz
from tauledger.errors import ExitCode

Command = Callable[..., ExitCode]

_OPTIONS = (
    click.option("--at", "at", metavar="HZ", multiple=True, help="Gain and phase at HZ, e.g. 10meg; repeatable."),
)


def questions(command: Command) -> Command:
    """Give `command`, which takes `asked: Asked`, the options that ask; InputError where one cannot be used."""

    @wraps(command)
    def asking(*, at: tuple[str, ...], **others: object) -> ExitCode:
        from tauledger.asked import Asked

        asked = Asked(at_hz=tuple(hertz("--at", given) for given in at))
        return command(asked=asked, **others)

    for option in reversed(_OPTIONS):
        asking = option(asking)
    return asking
