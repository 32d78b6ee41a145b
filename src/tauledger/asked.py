"""What a reader asks beyond the band edges: one record behind the questions of `tauledger review`."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct


class MeasuredCurve(Struct, frozen=True):
    """A curve from the bench: path as typed, frequency_hz ascending (k,), gain_db (k,), phase_deg (k,) or None."""

    path: str
    frequency_hz: tuple[float, ...]
    gain_db: tuple[float, ...]
    phase_deg: tuple[float, ...] | None


class Want(Struct, frozen=True):
    """A figure that is wanted: margin in degrees, gain_margin in dB, f_u, f_h or f_l in Hz."""

    quantity: Literal["margin", "gain_margin", "f_u", "f_h", "f_l"]
    value: float


class Asked(Struct, frozen=True):
    """The questions of one review; each field is one option, and empty where it was not asked.

    at_hz: frequencies in Hz at which gain and phase are wanted. curve: to be set beside ngspice.
    swing_v: peak at the output in V for the large-signal figures, None for 1 V. outputs: further outputs, as typed.
    impedances: input and output impedance are wanted. unity: who sets unity gain and margin is wanted wherever there is
    one. peaking: who makes the peaking is wanted. loops: places at which the return ratio is wanted, as typed.
    miller: Miller's factor over frequency, for formats that can show it. wants: figures that the amplifier should have.
    """

    at_hz: tuple[float, ...] = ()
    curve: MeasuredCurve | None = None
    swing_v: float | None = None
    outputs: tuple[str, ...] = ()
    impedances: bool = False
    unity: bool = False
    peaking: bool = False
    loops: tuple[str, ...] = ()
    miller: bool = False
    wants: tuple[Want, ...] = ()


NOTHING_ASKED = Asked()
