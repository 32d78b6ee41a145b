"""Mid-band, and what each capacitor and inductor does there: the whole, the upper and the lower network."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from tauledger.network.assemble import Network

BandClass = Literal["short", "open", "tuned"]


@dataclass(frozen=True, slots=True)
class MidBand:
    """The reference of all band edges.

    frequency_hz: 0 where the plateau reaches DC. from_hz, to_hz: the plateau's extent, 0 at DC, inf without
    upper limit,
    both None where there is no plateau. gain: complex H there.
    """

    frequency_hz: float
    from_hz: float | None
    to_hz: float | None
    gain: complex

    @property
    def plateau(self) -> bool:
        """Whether the reference lies on a plateau; else it is the maximum of |H|."""
        return self.from_hz is not None


@dataclass(frozen=True, slots=True)
class Bands:
    """The network seen from mid-band.

    class_of: "short", "open" or "tuned" by part name, for every capacitance, transcapacitance and inductance.
    ratio: the r of the rule that decided, by part name. merged: every node of the network → its node in `upper`
    (nodes joined by short capacitors share one; "0" wins).
    upper: short capacitors merged, open inductors taken out; at s = 0 it is the mid-band network.
    lower: open capacitors taken out, short inductors merged; for s → ∞ it is the mid-band network.
    sound: the real gain of the mid-band network is within 2 % of |H(f_mid)|; where not, no hand numbers.
    """

    network: Network
    midband: MidBand
    class_of: Mapping[str, BandClass]
    ratio: Mapping[str, float]
    merged: Mapping[str, str]
    upper: Network
    lower: Network
    sound: bool
