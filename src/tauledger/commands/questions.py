"""The options of `tauledger review` that ask beyond the band edges, gathered into one record."""

from __future__ import annotations

from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tauledger.commands.console import hertz
from tauledger.errors import ExitCode, InputError

if TYPE_CHECKING:
    from tauledger.asked import MeasuredCurve, Want

Command = Callable[..., ExitCode]

_OPTIONS = (
    click.option("--at", "at", metavar="HZ", multiple=True, help="Gain and phase at HZ, e.g. 10meg; repeatable."),
    click.option("--unity", is_flag=True, help="Show who sets unity gain and phase margin, whatever the circuit."),
    click.option("--peaking", is_flag=True, help="Show who makes the peaking."),
    click.option("--impedance", is_flag=True, help="Input and output impedance, at mid-band and at f_H."),
    click.option("--swing", metavar="V", help="Peak at the output for the large-signal figures, e.g. 3; else 1 V."),
    click.option(
        "--loop", "loop", metavar="NAME", multiple=True, help="Return ratio at M6, R3, E2 or Q1.base; repeatable."
    ),
    click.option(
        "--want",
        "want",
        metavar="F=V",
        multiple=True,
        help="What margin=60 takes, or more; gain_margin, f_u, f_h too; f_l=20 or less.",
    ),
    click.option(
        "--curve", "curve", metavar="CSV", help="Set a measured curve (f_hz,gain_db,phase_deg) beside ngspice."
    ),
)


def questions(command: Command) -> Command:
    """Give `command`, which takes `asked: Asked`, the options that ask; InputError where one cannot be used."""

    @wraps(command)
    def asking(
        *,
        at: tuple[str, ...],
        unity: bool,
        peaking: bool,
        impedance: bool,
        swing: str | None,
        loop: tuple[str, ...],
        curve: str | None,
        want: tuple[str, ...],
        **others: object,
    ) -> ExitCode:
        from tauledger.asked import Asked

        asked = Asked(
            at_hz=tuple(hertz("--at", given) for given in at),
            unity=unity,
            peaking=peaking,
            impedances=impedance,
            swing_v=None if swing is None else _volt(swing),
            curve=None if curve is None else _measured(curve),
            loops=loop,
            wants=_wanted(want) if want else (),
        )
        return command(asked=asked, **others)

    for option in reversed(_OPTIONS):
        asking = option(asking)
    return asking


def _wanted(given: tuple[str, ...]) -> tuple[Want, ...]:
    from tauledger.commands.wanted import wanted

    return wanted(given)


def _volt(given: str) -> float:
    from tauledger.netlist.numbers import read_number

    number = read_number(given.strip())
    if number is None or number.tail or not 0.0 < number.value < float("inf"):
        raise InputError(f"--swing {given}: not a peak value in V", "give volts above 0 as a netlist would, e.g. 3")
    return number.value


def _measured(path: str) -> MeasuredCurve:
    from tauledger.answers.curve_file import read_curve

    try:
        data = Path(path).read_bytes()
    except OSError as error:
        hint = "give a CSV file with the columns f_hz, gain_db and, where measured, phase_deg"
        raise InputError(f"--curve {path}: cannot be read: {error.strerror}", hint) from error
    return read_curve(data, path)
