"""What a reader asks beyond the band edges: one record behind the questions of `tauledger review`."""

from __future__ import annotations

from msgspec import Struct


class Asked(Struct, frozen=True):
    """The questions of one review; each field is one option, and empty where it was not asked.

    at_hz: frequencies in Hz at which gain and phase are wanted.
    """

    at_hz: tuple[float, ...] = ()


NOTHING_ASKED = Asked()
