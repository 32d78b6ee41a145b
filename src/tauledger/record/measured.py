"""A measured curve beside the simulated one, and the stray capacitance that would explain it."""

from __future__ import annotations

from msgspec import Struct


class CurvePoint(Struct, frozen=True):
    """One point of a measured curve as it stands in the file, and the response that it is set against.

    difference_*: measured less that, the level taken out. explained_db: with the best stray capacitance in place, at
    the level of the measured curve.
    """

    frequency_hz: float
    gain_db: float
    phase_deg: float | None
    reference_db: float
    reference_deg: float
    difference_db: float
    difference_deg: float | None
    explained_db: float | None


class CurveFigure(Struct, frozen=True):
    """One figure of a measured curve (f_low, f_high, f_unity), its level taken out, in Hz beside the simulated one."""

    figure: str
    measured_hz: float
    simulated_hz: float | None


class CurveLeaves(Struct, frozen=True):
    """Where a measured curve first leaves the simulated one. side: below or above mid-band. by: gain or phase."""

    side: str
    by: str
    frequency_hz: float


class StrayFacts(Struct, frozen=True):
    """A capacitance from plus to minus ("0": ground) that would explain a measured curve.

    rms_db: the rms difference that is left. rerun: ngspice was run with it; f_high_rerun_hz: the f_H that it gave.
    """

    plus: str
    minus: str
    capacitance_f: float
    rms_db: float
    f_high_rerun_hz: float | None = None
    rerun: bool = False


class CurveFacts(Struct, frozen=True):
    """A measured curve beside the simulated one (`against` "exact" where nothing was simulated).

    offset_*: measured less simulated over the points from level_from_hz to level_to_hz, at mid-band where the curve
    reaches it; taken out of all differences. leaves: where the gain is off by 1 dB or the phase by 5°. rms_db: over
    the `fitted_points` from mid-band upwards that lie within 40 dB of it; None where there are fewer than three.
    explains: "stray", "no single capacitance" (none halves rms_db), "nothing to explain" (0.1 dB at most) or "not
    sought". strays: the best one, then the runner-up where it is as good.
    """

    file: str
    against: str
    offset_db: float
    offset_deg: float | None
    level_from_hz: float
    level_to_hz: float
    largest_db: float
    largest_db_at_hz: float
    largest_deg: float | None
    largest_deg_at_hz: float | None
    figures: tuple[CurveFigure, ...]
    leaves: tuple[CurveLeaves, ...]
    rms_db: float | None
    fitted_points: int
    explains: str
    strays: tuple[StrayFacts, ...]
    points: tuple[CurvePoint, ...]
