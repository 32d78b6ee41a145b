"""At the ports: large signal, further outputs, both modes of two sources, input and output impedance."""

from __future__ import annotations

from msgspec import Struct


class SlewFacts(Struct, frozen=True):
    """How fast transistors can move one node at full size: SR = I/C, and the full-power bandwidth SR/(2π·V_peak).

    drivers: the transistor, or the two of a pair that gives its tail current. current_a: what can be delivered.
    capacitance_f: what is charged, counted at this node; behind: nodes behind resistors that count in it.
    volt_per_output_volt: |v(node)/v(output)|, mid-band. *_v_per_s: slew rate at the node, and as the output shows it.
    full_power_hz: at the amplitude of `LargeSignal`. cut_off_v: peak at the output from which a transistor here is cut
    off in mid-band already, None where the signal does not move its current.
    """

    node: str
    title: str
    drivers: tuple[str, ...]
    current_a: float
    capacitance_f: float
    behind: tuple[str, ...]
    volt_per_output_volt: float
    slew_v_per_s: float
    output_slew_v_per_s: float
    full_power_hz: float
    cut_off_v: float | None


class LargeSignal(Struct, frozen=True):
    """The nodes of the signal path by their full-power bandwidth, the lowest first.

    swing_v: peak at the output. asked: the user gave it. not_judged: titles of nodes where no one current is the limit;
    without any `nodes` one of them may be the slowest, and no rate is given. supplies_v: the lowest and highest voltage
    that sources hold, None where the output may swing beyond them or they are not known.
    """

    swing_v: float
    asked: bool
    nodes: tuple[SlewFacts, ...]
    not_judged: tuple[str, ...]
    supplies_v: tuple[float, float] | None = None


class OutputRow(Struct, frozen=True):
    """A further output of the same run, against its own plateau: gain, f_L and f_H, exact and simulated.

    simulated_db: of the gain at frequency_hz.
    """

    name: str
    unit: str
    frequency_hz: float
    gain_real: float
    gain_imag: float
    gain_db: float
    simulated_db: float | None
    f_low_exact_hz: float | None
    f_low_simulated_hz: float | None
    f_high_exact_hz: float | None
    f_high_simulated_hz: float | None


class ModeRow(Struct, frozen=True):
    """Differential and common-mode gain at one frequency ("mid-band" or "f_H"), in dB; None where it is nothing at all.

    cmrr_db: the one less the other.
    """

    at: str
    hz: float
    differential_db: float
    common_db: float | None
    cmrr_db: float | None
    differential_simulated_db: float | None
    common_simulated_db: float | None
    cmrr_simulated_db: float | None


class ModesFacts(Struct, frozen=True):
    """Gain from plus less minus, and from both moved together, of two sources; unit as of the mid-band gain."""

    plus: str
    minus: str
    unit: str
    rows: tuple[ModeRow, ...]


class ImpedancePoint(Struct, frozen=True):
    """An impedance at one frequency ("mid-band" or "f_H"), and as R in parallel with C; negative farad: inductive.

    exact and simulated; None where it is not finite, where no current is in phase, at DC, or where nothing was
    simulated.
    """

    at: str
    hz: float
    real_ohm: float | None
    imag_ohm: float | None
    parallel_ohm: float | None
    parallel_farad: float | None
    simulated_real_ohm: float | None = None
    simulated_imag_ohm: float | None = None
    simulated_parallel_ohm: float | None = None
    simulated_parallel_farad: float | None = None


class ImpedanceCurvePoint(Struct, frozen=True):
    """An impedance at one frequency of a curve as size and angle; None where it is not finite or not simulated."""

    hz: float
    exact_ohm: float | None
    exact_deg: float | None
    simulated_ohm: float | None
    simulated_deg: float | None


class ImpedanceFacts(Struct, frozen=True):
    """An impedance that the drive or the load sees.

    name: tells it from the others. side: input or output. of: the source, or the output. says: what is in it or left
    out, by name in left_out. hand_ohm, hand_text: at mid-band by looking in; None where no rule gives it.
    """

    name: str
    side: str
    of: str
    says: str
    left_out: tuple[str, ...]
    points: tuple[ImpedancePoint, ...]
    hand_ohm: float | None
    hand_text: str
    curve: tuple[ImpedanceCurvePoint, ...]
