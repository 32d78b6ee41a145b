"""What a reader asks beyond the band edges: one record behind the questions of `tauledger review`."""

from __future__ import annotations

from msgspec import Struct


class MeasuredCurve(Struct, frozen=True):
    """A curve from the bench: path as typed, frequency_hz ascending (k,), gain_db (k,), phase_deg (k,) or None."""

    path: str
    frequency_hz: tuple[float, ...]
    gain_db: tuple[float, ...]
    phase_deg: tuple[float, ...] | None


class Asked(Struct, frozen=True):
    """The questions of one review; each field is one option, and empty where it was not asked.

    at_hz: frequencies in Hz at which gain and phase are wanted. curve: to be set beside ngspice.
    """

    at_hz: tuple[float, ...] = ()
    curve: MeasuredCurve | None = None


NOTHING_ASKED = Asked()
