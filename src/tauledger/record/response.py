"""How it responds: mid-band, band edges, agreement, curves, gain and phase at a frequency, peaking."""

from __future__ import annotations

from msgspec import Struct

from tauledger.record.unity import UnityFacts


class MidbandFacts(Struct, frozen=True):
    """The reference of all band edges: the plateau of highest gain.

    from_hz, to_hz: its extent, both None where there is no plateau; 0 where it reaches DC; `to_hz` None with `from_hz`
    set where it has no upper limit. unit: V/V, Ω, S or A/A. chosen: the user named the frequency.
    """

    frequency_hz: float
    from_hz: float | None
    to_hz: float | None
    gain_real: float
    gain_imag: float
    gain_db: float
    unit: str
    chosen: bool = False


class AgreementFacts(Struct, frozen=True):
    """Largest |ΔH| / max(|H|, 1e-6·|H_mid|) between the rebuilt network and ngspice's sweep, and where."""

    max_relative_error: float
    at_hz: float
    points: int


class EdgeFacts(Struct, frozen=True):
    """One band edge: first -3 dB crossing going outwards from mid-band.

    slope: d ln|H| / d ln f there. phase_deg: phase beyond mid-band. peaking_db: above mid-band on this side.
    rise_time_s: 10-90 %, 0.35/f_H.
    """

    simulated_hz: float | None
    exact_hz: float | None
    hand_hz: float | None
    difference: float | None
    slope: float | None
    phase_deg: float | None
    peaking_db: float
    peaking_at_hz: float | None = None
    rise_time_s: float | None = None


class Curves(Struct, frozen=True):
    """Responses over frequency as magnitude in dB and phase in degrees (unwrapped); None where a source is
    missing."""

    frequency_hz: tuple[float, ...]
    simulated_db: tuple[float, ...] | None
    simulated_deg: tuple[float, ...] | None
    exact_db: tuple[float, ...] | None
    exact_deg: tuple[float, ...] | None
    hand_db: tuple[float, ...] | None
    hand_deg: tuple[float, ...] | None


class AtElement(Struct, frozen=True):
    """What one element does at a frequency, exact to first order; a resistor by its resistance, value in `unit`.

    gain: ∂ln|H|/∂ln(value). phase_deg: change of the phase per per cent more of it.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    gain: float
    phase_deg: float


class AtFacts(Struct, frozen=True):
    """Gain and phase at one frequency that was asked for.

    *_db: |H| in decibel. *_beyond_deg: phase less that at mid-band, continuous; *_deg: phase of the output against the
    drive, continuous from mid-band. elements: the largest effect first.
    """

    hz: float
    simulated_db: float | None
    simulated_deg: float | None
    simulated_beyond_deg: float | None
    exact_db: float | None
    exact_deg: float | None
    exact_beyond_deg: float | None
    elements: tuple[AtElement, ...] = ()


class PeakElement(Struct, frozen=True):
    """What one element does to the peaking; peaking_db: change in dB per per cent more of it, exact to first order.

    rerun_db: the peaking computed again with 10 % less of it; None where that was not done.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    peaking_db: float
    rerun_db: float | None = None


class PeakFacts(Struct, frozen=True):
    """The highest gain of one side ("f_high" or "f_low") above mid-band, simulated and exact, and where in Hz."""

    edge: str
    simulated_db: float | None
    simulated_at_hz: float | None
    exact_db: float
    exact_at_hz: float
    elements: tuple[PeakElement, ...] = ()


def known_hz(facts: EdgeFacts | UnityFacts | None) -> float | None:
    """Give the frequency in Hz that counts: simulated, exact where nothing was simulated, None where there is none."""
    if facts is None:
        return None
    return facts.simulated_hz if facts.simulated_hz is not None else facts.exact_hz
