"""Unity gain with its margins, who sets it, the phase budget there, and what a wanted figure takes."""

from __future__ import annotations

from msgspec import Struct


class UnityElement(Struct, frozen=True):
    """What one element does to unity gain, exact to first order; a resistor by its resistance, value in `unit`.

    name, free, moves_bias: as in `Help`. f_unity, gain_bandwidth: shares, −∂ln f_u/∂ln(value) and that of |A_mid|·f_H.
    phase_margin_deg, gain_margin_db: change of the margins per per cent more of it. *_rerun*: f_u and phase margin
    computed again with 10 % less of it, the operating point held; None where that was not done.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    free: bool
    moves_bias: bool
    f_unity: float
    phase_margin_deg: float
    gain_margin_db: float | None
    gain_bandwidth: float | None
    f_unity_rerun_hz: float | None = None
    phase_margin_rerun_deg: float | None = None


class UnityNode(Struct, frozen=True):
    """What a capacitance from one node to ground costs: per_farad ∂f_u/∂C in Hz/F, margin_slope in degrees per farad.

    one_picofarad_*: f_u and phase margin computed again with 1 pF there,
    gain margin too.
    """

    node: str
    title: str
    per_farad: float
    margin_slope: float
    one_picofarad_hz: float | None
    one_picofarad_margin_deg: float | None
    one_picofarad_gain_margin_db: float | None = None


class HalfTurnFacts(Struct, frozen=True):
    """A frequency where the phase from nominal polarity is −180° or a whole turn beyond, and |H| in dB there; exact."""

    hz: float
    gain_db: float


class UnityFacts(Struct, frozen=True):
    """The unity gain frequency f_u: the first |H| = 1 beyond mid-band, of a ratio that exceeds 1 there.

    hand_hz: by hand_formula, which is mid-band gain times f_H by hand where empty, as one dominant pole has it; None
    where that is off by more than a factor 3; difference: hand_hz/simulated_hz − 1 (against
    exact where nothing was simulated). slope: d ln|H|/d ln f there, exact. phase_margin_deg: the
    smallest 180° plus phase from nominal polarity of all |H| = 1, at margin_at_hz (exact), None where the polarity is
    not clear; gain_margin_db: the distance of |H| from 1 at the half turn beyond which the follower changes between
    stable and not, below 0 where it is not, None where there is none; both simulated, *_exact_* by algebra.
    gain_bandwidth_hz: |A_mid|·f_H, simulated. further_hz: later |H| = 1, exact. half_turns: all of them, exact.
    follower_stable: closed around with a gain of 1 no pole lies to the right, None where that was not decided.
    midband_phase_deg: from which the polarity is read. none: why there is no f_u where it was asked for, else empty.
    elements, nodes: given where the review has a section on unity gain, the largest effect first.
    """

    simulated_hz: float | None
    exact_hz: float | None
    hand_hz: float | None
    difference: float | None
    slope: float | None
    phase_margin_deg: float | None
    phase_margin_exact_deg: float | None
    gain_margin_db: float | None
    gain_margin_exact_db: float | None
    gain_margin_at_hz: float | None
    gain_margin_exact_at_hz: float | None
    gain_bandwidth_hz: float | None
    gain_bandwidth_exact_hz: float | None
    further_hz: tuple[float, ...] = ()
    elements: tuple[UnityElement, ...] = ()
    nodes: tuple[UnityNode, ...] = ()
    margin_at_hz: float | None = None
    half_turns: tuple[HalfTurnFacts, ...] = ()
    follower_stable: bool | None = None
    midband_phase_deg: float | None = None
    none: str = ""
    hand_formula: str = ""


class PhaseRow(Struct, frozen=True):
    """What one pole or zero (of a complex pair the one above the axis, standing for both) uses of the phase at f_u.

    name: by the formula that it belongs to ("dominant pole"), else "pole", "zero", "pole pair". real_hz, imag_hz: s/2π,
    exact. used_deg: exact; negative where it gives phase. hand_*: by hand_formula with the operands in hand_values,
    hand_hz of a pair its f0, of a zero negative in the left half plane; None where no formula fits. difference:
    |hand_hz|/|exact| − 1.
    """

    name: str
    kind: str
    real_hz: float
    imag_hz: float
    used_deg: float
    hand_formula: str = ""
    hand_values: str = ""
    hand_hz: float | None = None
    hand_deg: float | None = None
    difference: float | None = None


class UnityStep(Struct, frozen=True):
    """f_u or phase margin by hand beside exact: figure ("f_u", "phase margin"), unit Hz or °, why they differ."""

    figure: str
    unit: str
    formula: str
    values: str
    hand: float
    exact: float
    why: str


class PhaseBudget(Struct, frozen=True):
    """The phase used up at f_u: rows, others and rest add to 180° − margin_deg, exact.

    rows: the poles and zeros that are seen there, the lowest first. others_deg: all others together, so many
    roots; rest_deg: what delays do beside poles and zeros; midband_deg: what is used at mid-band already, where roots
    cannot be counted from their asymptotes. stage: the compensated stage in words, empty without one.
    """

    at_hz: float
    margin_deg: float
    rows: tuple[PhaseRow, ...]
    others: int
    others_deg: float
    rest_deg: float
    stage: str
    by_hand: tuple[UnityStep, ...]
    midband_deg: float = 0.0


class WantChange(Struct, frozen=True):
    """One change of a remedy. name: part, of owner; new: it is put in, a resistor in series with the part `beside`, a
    capacitor "out to b". before: None where new.

    value: what it must be, in `unit`, exact. first_order: what the slope alone would say, None where it leads nowhere.
    over_gm: of a resistor that is put in, times the gm of the stage.
    """

    name: str
    unit: str
    before: float | None
    value: float
    first_order: float | None = None
    new: bool = False
    beside: str = ""
    owner: str = ""
    over_gm: float | None = None


class Remedy(Struct, frozen=True):
    """One way to a wanted figure, computed again with the operating point held.

    reaches: the wanted figure is met. figure: what comes of it, exact, and simulated_figure by ngspice with the changed
    circuit, None where that was not run. f_unity_hz, phase_margin_deg, gain_margin_db, f_high_hz, f_low_hz, gain_db:
    the others, exact. moves_bias: a change that moves the operating point too. says: what must be known beside it.
    """

    changes: tuple[WantChange, ...]
    reaches: bool
    figure: float | None
    simulated_figure: float | None
    f_unity_hz: float | None
    phase_margin_deg: float | None
    gain_margin_db: float | None
    f_high_hz: float | None
    f_low_hz: float | None
    gain_db: float
    moves_bias: bool = False
    says: str = ""


class WantFacts(Struct, frozen=True):
    """A figure that was wanted (margin, gain_margin, f_u, f_h, f_l) in `unit` (°, dB, Hz) and what it takes.

    now: as the circuit is, None where it has no end or cannot be known (`says`). met: nothing is to be done; slack: by
    how much, in `unit`. remedies: what reaches it first. gain_db: at mid-band as the circuit is.
    """

    quantity: str
    unit: str
    wanted: float
    now: float | None
    met: bool
    slack: float | None
    remedies: tuple[Remedy, ...] = ()
    says: str = ""
    gain_db: float | None = None
