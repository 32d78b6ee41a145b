"""The Review record: the JSON document `tauledger.review/1`, field for field.

Plain SI numbers; None where there is none; fixed order. `hand` is what an engineer would write on paper, `exact` is
algebra on the rebuilt network, `simulated` is ngspice. `difference` is hz/simulated - 1 (against exact where nothing
was simulated).
`share`, `weight` and `effect` are fractions. Poles and zeros in Hz are s/2π. Frequencies of DC and of "no upper
limit" in a plateau's extent are 0 and None. Renderers get this record and nothing else.
"""

from __future__ import annotations

from msgspec import Struct, field

SCHEMA = "tauledger.review/1"


class EngineFacts(Struct, frozen=True):
    """Which engine answered."""

    name: str
    version: str


class NetlistFacts(Struct, frozen=True):
    """The netlist: path as typed, title, SHA-256 of all files read in order, and what was read past, by word and
    count.

    passed: the same card by card, "board.cir:12: .ac dec 10 1 1meg".
    """

    path: str
    title: str
    sha256: str
    read_past: str = ""
    passed: tuple[str, ...] = ()


class DriveFacts(Struct, frozen=True):
    """One driven source; resistance_ohm is the single resistor in series with it, None where there is no such
    one."""

    source: str
    kind: str
    amplitude_real: float
    amplitude_imag: float
    resistance_ohm: float | None = None


class LoadFacts(Struct, frozen=True):
    """One passive from the output straight to ground: its name, kind (R, C, L) and value."""

    name: str
    kind: str
    value: float


class OutputFacts(Struct, frozen=True):
    """Where the response is taken. kind: voltage or current; plus and minus are nodes, through the source of a
    current."""

    plus: str
    minus: str
    kind: str
    through: str = ""
    load: tuple[LoadFacts, ...] = ()


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


class Estimate(Struct, frozen=True):
    """One method's answer for one edge ("f_high" or "f_low")."""

    edge: str
    method: str
    hz: float | None
    difference: float | None
    recommended: bool = False


class NoMethod(Struct, frozen=True):
    """Why no method by hand is recommended for one edge ("f_high" or "f_low")."""

    edge: str
    why: str


class Step(Struct, frozen=True):
    """One step from paper to simulation: the estimate after it, the factor by which it moved, and why."""

    edge: str
    step: str
    hz: float | None
    factor: float | None
    why: str


class EdgePair(Struct, frozen=True):
    """One number for each band edge, None where the edge does not exist."""

    f_high: float | None
    f_low: float | None


class ResistanceTerm(Struct, frozen=True):
    """One of the resistances in parallel at a node: a resistor's name or a looking-in phrase such as "into base
    of Q1"."""

    name: str
    ohm: float


class CapacitanceTerm(Struct, frozen=True):
    """One capacitance at a node with its Miller factor: it counts as farad·factor there; gain_* is K to its other end.

    time_constant_s: what it adds to the node's row, with the resistance at its own place (an inner node of a device
    faces another one than the outer). text: how K came about, empty where the other end is at AC ground.
    edge_factor_*: 1 − K at f_H, None where the other end is at AC ground or there is no f_H. gain_source: of K, rule
    or solved.
    """

    part: str
    farad: float
    factor: float
    gain_real: float
    gain_imag: float
    time_constant_s: float | None = None
    text: str = ""
    edge_factor_real: float | None = None
    edge_factor_imag: float | None = None
    gain_source: str = "rule"


class WorkingLine(Struct, frozen=True):
    """One node of a row by itself, an inner node of a device where there is a series resistance.

    source: as in `Working`. why: the reason where R·C by hand and exact differ by more than 2 %.
    """

    node: str
    text: str
    source: str
    resistance_hand_ohm: float
    resistance_exact_ohm: float
    resistances: tuple[ResistanceTerm, ...]
    capacitances: tuple[CapacitanceTerm, ...]
    time_constant_s: float
    time_constant_exact_s: float
    why: str = ""


class Working(Struct, frozen=True):
    """How the hand resistance and capacitance of a node came about.

    source: rule, loop, branch or solved (the exact value, because no rule fits). loop_gain: T of the one-loop
    form, else None. lines: the nodes of the row one by one, the one with the longest time constant first.
    """

    rule: str
    text: str
    resistances: tuple[ResistanceTerm, ...]
    capacitances: tuple[CapacitanceTerm, ...]
    loop_gain: float | None
    source: str
    lines: tuple[WorkingLine, ...] = ()


class NodeRow(Struct, frozen=True):
    """One signal node in the time-constant budget; `time_constant_s` is by hand, `time_constant_exact_s` is exact.

    name: the netlist's node. title: as the trade says it, "base of Q1 (b)". per_farad: ∂f/∂C in Hz/F for
    capacitance to ground.
    in_path: the row counts in the hand estimate.
    image: in a balanced circuit, worked as half circuits, the same node of the other half; second: this is that of the
    second half, and counts in no sum.
    """

    name: str
    title: str
    members: tuple[str, ...]
    role: str
    in_path: bool
    resistance_hand_ohm: float | None
    resistance_exact_ohm: float | None
    capacitance_f: float | None
    time_constant_s: float | None
    time_constant_exact_s: float | None
    share: EdgePair
    per_farad: EdgePair
    working: Working | None
    image: str = ""
    second: bool = False


class InductorFacts(Struct, frozen=True):
    """One inductor that is short at mid-band, in the upper budget: `time_constant_s` is L/R by hand, beside it exact.

    title: as the trade says it. source: where R by hand comes from, as in `Working`; text: how.
    """

    part: str
    title: str
    in_path: bool
    henry: float
    resistance_hand_ohm: float
    resistance_exact_ohm: float
    time_constant_s: float
    time_constant_exact_s: float
    source: str
    text: str


class TenPercent(Struct, frozen=True):
    """Band edges recomputed with this part 10 % smaller, bias frozen."""

    f_high_hz: float | None
    f_low_hz: float | None


class PartRow(Struct, frozen=True):
    """One capacitance, inductance, transcapacitance (four nodes: output pair, control pair) or line (near, far pair).

    klass, "class" in JSON: short, open, gain, tuned, line. edge_hz: 1/(2πRC) of a coupling or bypass capacitor;
    zero_hz: the zero that it makes alone. time_constant_s = resistance_exact_ohm · value. aid: a measuring aid, open
    or short by its size: without share, and in no table.
    """

    name: str
    owner: str
    kind: str
    nodes: tuple[str, ...]
    value: float
    klass: str = field(name="class")
    in_path: bool
    weight: float | None
    resistance_hand_ohm: float | None
    resistance_exact_ohm: float | None
    time_constant_s: float | None
    edge_hz: float | None
    zero_hz: float | None
    share: EdgePair
    ten_percent_less: TenPercent
    aid: bool = False


class UpperBudget(Struct, frozen=True):
    """Sums over the upper network, in s: over all open parts, −Σ1/p, over the rows that count, weighted, and the
    phase slope."""

    sum_s: float
    inverse_pole_sum_s: float
    path_sum_s: float | None
    weighted_sum_s: float
    group_delay_s: float


class LowerBudget(Struct, frozen=True):
    """Sums over the lower network in Hz: short-circuit time constants, and −Σp/2π; None where an all-capacitor
    loop exists."""

    sum_hz: float | None
    pole_sum_hz: float | None


class Budget(Struct, frozen=True):
    """Both time-constant budgets; None where the reference has no plateau."""

    upper: UpperBudget | None
    lower: LowerBudget | None


class Owner(Struct, frozen=True):
    """A part that a pole depends on: d ln|p| / d ln(value), sign turned so that "owns all of it" is 1."""

    part: str
    share: float


class PoleFacts(Struct, frozen=True):
    """One pole (of a complex pair the one above the axis). hand_hz: |p|/2π by the formula named in `hand_formula`.

    effect: change of the band edge in per unit if the pole were absent (None where it is not near the band).
    hidden: cancelled by a zero.
    f0_hz, q: of a complex pair.
    """

    real_hz: float
    imag_hz: float
    hand_hz: float | None
    hand_formula: str
    effect: float | None
    owners: tuple[Owner, ...]
    cancelled: bool = False
    f0_hz: float | None = None
    q: float | None = None


class ZeroFacts(Struct, frozen=True):
    """One zero in Hz (of a complex pair the one above the axis)."""

    real_hz: float
    imag_hz: float
    cancelled: bool = False


class Stage(Struct, frozen=True):
    """One node that all signal crosses, in signal order, with the gain from the one before it.

    around: what its transistor does with others, and feedback around it, in words. why: the reason where hand and exact
    gain differ by more than 2 %. image: in a balanced circuit the same node of the other half.
    """

    node: str
    role: str
    owner: str
    gain_hand: float | None
    gain_exact: float | None
    elements: tuple[str, ...]
    around: tuple[str, ...] = ()
    why: str = ""
    image: str = ""


class Figure(Struct, frozen=True):
    """One figure of a device's operating point: trade symbol (i_c, v_ce, gm, r_pi, r_o, c_pi, c_mu, f_t), value,
    unit."""

    symbol: str
    value: float
    unit: str


class DeviceFacts(Struct, frozen=True):
    """One device at its operating point. c_mu_with_bx: c_mu is C_μ and C_bx together, which the model keeps apart."""

    name: str
    kind: str
    region: str
    figures: tuple[Figure, ...]
    c_mu_with_bx: bool = False


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


class SourceLine(Struct, frozen=True):
    """A line of the netlist that the review refers to."""

    file: str
    line: int
    text: str


class NamedNumber(Struct, frozen=True):
    """A number with its name and unit."""

    name: str
    value: float
    unit: str


class CauseFacts(Struct, frozen=True):
    """Why hand and simulation differ. cause: fixed id. effect: fraction by which it moves `quantity`. says,
    instead: sentences. on_paper: holds for paper that leaves out what the hand side here has."""

    cause: str
    quantity: str
    effect: float
    where: str
    says: str
    instead: str
    numbers: tuple[NamedNumber, ...]
    on_paper: bool = False


class NoteFacts(Struct, frozen=True):
    """What the reader must know about the numbers. note: fixed id."""

    note: str
    where: str
    says: str


class PaperFigure(Struct, frozen=True):
    """One figure of the designer's own page beside hand and exact.

    where: node or device as the page names it, empty for the whole circuit. key: as on the page. line: where it stands.
    hand: None where paper reads it from the operating point. exact: of an edge the simulated value where there is one.
    off: yours/exact − 1, of gains by size. slip: id of the slip that reproduces it within 1 %, empty where it agrees or
    none does; slip_gives: what that slip gives. says: the verdict in words.
    """

    where: str
    key: str
    title: str
    unit: str
    line: int
    yours: float
    hand: float | None
    exact: float | None
    off: float | None
    slip: str
    slip_gives: float | None
    says: str


class SetValue(Struct, frozen=True):
    """One value that was set from outside of the netlist: a parameter, an element, or a parameter of a model."""

    name: str
    value: float


class MovedFigure(Struct, frozen=True):
    """One figure of the headline as the netlist gives it and as it is with what was set; None where there is none."""

    figure: str
    unit: str
    before: float | None
    after: float | None


class Help(Struct, frozen=True):
    """What 10 % less of one element does, to first order: f_high, f_low and gain as fractions of f_H, f_L and |H_mid|.

    name: part, "RC", "CL", "Q1.gm", "Q1.c_mu"; a resistor by its resistance, value in `unit`. free: a card of the board
    that leaves the operating point alone. moves_bias: it takes part in the operating point, which is held here.
    *_rerun*: computed again with 10 % less, the operating point held; None where that was not done or there is no edge.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    free: bool
    moves_bias: bool
    f_high: float | None
    f_low: float | None
    gain: float
    f_high_rerun_hz: float | None = None
    f_low_rerun_hz: float | None = None
    gain_rerun: float | None = None


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

    swing_v: peak at the output. asked: the user gave it. not_judged: titles of nodes where no one current is the limit.
    """

    swing_v: float
    asked: bool
    nodes: tuple[SlewFacts, ...]
    not_judged: tuple[str, ...]


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


class AddedPart(Struct, frozen=True):
    """A resistance (R, ohm) or capacitance (C, farad) added from a node to ground, as of a probe."""

    node: str
    kind: str
    value: float


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

    one_picofarad_*: f_u and phase margin computed again with 1 pF there.
    """

    node: str
    title: str
    per_farad: float
    margin_slope: float
    one_picofarad_hz: float | None
    one_picofarad_margin_deg: float | None


class UnityFacts(Struct, frozen=True):
    """The unity gain frequency f_u: the first |H| = 1 beyond mid-band, of a ratio that exceeds 1 there.

    hand_hz: mid-band gain times f_H by hand, as one dominant pole has it; difference: hand_hz/simulated_hz − 1 (against
    exact where nothing was simulated). slope: d ln|H|/d ln f there, exact. phase_margin_deg: 180° plus the phase beyond
    mid-band; gain_margin_db: how far |H| is below 1 where that phase first reaches −180°, None where it never does;
    both simulated, *_exact_* by algebra. gain_bandwidth_hz: |A_mid|·f_H, simulated. further_hz: later |H| = 1, exact.
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
    roots; rest_deg: what delays do beside poles and zeros. stage: the compensated stage in words, empty without one.
    """

    at_hz: float
    margin_deg: float
    rows: tuple[PhaseRow, ...]
    others: int
    others_deg: float
    rest_deg: float
    stage: str
    by_hand: tuple[UnityStep, ...]


class WantChange(Struct, frozen=True):
    """One change of a remedy. name: part, of owner; new: it is put in, a resistor in series with the part `beside`, a
    capacitor "out to b". before: None where new.

    value: what it must be, in `unit`, exact. first_order: what the slope alone would say, None where it leads nowhere.
    """

    name: str
    unit: str
    before: float | None
    value: float
    first_order: float | None = None
    new: bool = False
    beside: str = ""
    owner: str = ""


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
    how much, in `unit`. remedies: what reaches it first.
    """

    quantity: str
    unit: str
    wanted: float
    now: float | None
    met: bool
    slack: float | None
    remedies: tuple[Remedy, ...] = ()
    says: str = ""


class LoopStageFacts(Struct, frozen=True):
    """One factor of T₀ by hand: the gain to this node from the one before; the first in Ω, from the source's output."""

    node: str
    hand: float
    exact: float


class LoopNodeFacts(Struct, frozen=True):
    """One node of the opened loop by hand: R in Ω, C in F, R·C in s."""

    node: str
    ohm: float
    farad: float
    time_constant_s: float


class LoopEstimate(Struct, frozen=True):
    """What a loop says of f_H by one method; difference: hz/simulated − 1 (against exact without simulation)."""

    method: str
    hz: float | None
    difference: float | None


class AmplifierFacts(Struct, frozen=True):
    """An instance by itself, output open, other pins at AC ground: a₀, first pole, a₀·pole, second pole.

    loaded: taken as it stands instead, its output being one of its inputs; the pole is that of the opened loop.
    """

    name: str
    open_loop_gain: float | None
    first_pole_hz: float | None
    gain_bandwidth_hz: float | None
    second_pole_hz: float | None
    loaded: bool = False


class LoopFacts(Struct, frozen=True):
    """A loop without cutting it: return ratio T at one place, its margins, and what it makes of the closed gain.

    loop: as named ("M6", "Q1.base"). kind: source, admittance (of a bilateral element, against none) or wire (double
    injection). where: in words. found: not asked for. through: signal nodes that it passes. return_ratio_*: T at at_hz
    (mid-band), positive for negative feedback; *_simulated: by double injection in ngspice, None where no wire carries
    that T alone. crossover: the last |T| = 1 above mid-band; lower_crossover below it. open_edge_hz: −3 dB of T.
    closing_source: for which H = ideal_gain·T/(1 + T) + feedthrough/(1 + T) = closed_gain at at_hz, with
    closing_return_ratio for T; identity_error: largest relative error of that against the network. noise_gain: 1/β of
    an amplifier, noise_gain_edge_hz its gain-bandwidth product over that. hand_return_ratio: hand_siemens·Π hand of
    hand_stages. hand_open_edge_hz: 1/(2π·Σ R·C) of the opened loop, hand_open_nodes those that take 1 % of it or more.
    """

    loop: str
    kind: str
    where: str
    found: bool
    through: tuple[str, ...]
    at_hz: float
    return_ratio_real: float
    return_ratio_imag: float
    return_ratio_simulated: float | None
    crossover_hz: float | None
    phase_margin_deg: float | None
    crossover_simulated_hz: float | None
    phase_margin_simulated_deg: float | None
    gain_margin_db: float | None
    gain_margin_at_hz: float | None
    gain_margin_simulated_db: float | None
    lower_crossover_hz: float | None
    lower_phase_margin_deg: float | None
    open_edge_hz: float | None
    unit: str
    closing_source: str = ""
    closing_return_ratio: float | None = None
    ideal_gain: float | None = None
    feedthrough: float | None = None
    closed_gain: float | None = None
    identity_error: float | None = None
    noise_gain: float | None = None
    noise_gain_edge_hz: float | None = None
    amplifier: AmplifierFacts | None = None
    hand_return_ratio: float | None = None
    hand_siemens: float | None = None
    hand_stages: tuple[LoopStageFacts, ...] = ()
    hand_ideal_gain: float | None = None
    hand_ideal_text: str = ""
    hand_open_edge_hz: float | None = None
    hand_open_nodes: tuple[LoopNodeFacts, ...] = ()
    estimates: tuple[LoopEstimate, ...] = ()
    why: tuple[str, ...] = ()
    says: tuple[str, ...] = ()


class LoopCurve(Struct, frozen=True):
    """T over frequency of one loop: magnitude in dB, phase in degrees from negative feedback, exact."""

    loop: str
    frequency_hz: tuple[float, ...]
    ratio_db: tuple[float, ...]
    phase_deg: tuple[float, ...]


class MillerCurve(Struct, frozen=True):
    """1 − K over frequency of one capacitance at one node. row: of the budget. node: the node itself, an inner one of a
    device where there is a series resistance. factor: 1 − K at mid-band, by hand."""

    row: str
    node: str
    part: str
    factor: float
    factor_real: tuple[float, ...]
    factor_imag: tuple[float, ...]


class MillerCurves(Struct, frozen=True):
    """Exact 1 − K of the largest capacitances between two nodes, over frequencies from mid-band up."""

    frequency_hz: tuple[float, ...]
    curves: tuple[MillerCurve, ...]


class Review(Struct, frozen=True):
    """One review of one netlist under one condition."""

    schema: str
    tauledger: str
    engine: EngineFacts | None
    netlist: NetlistFacts
    temperature_c: float
    drive: tuple[DriveFacts, ...]
    output: OutputFacts
    midband: MidbandFacts
    agreement: AgreementFacts | None
    f_high: EdgeFacts | None
    f_low: EdgeFacts | None
    estimates: tuple[Estimate, ...]
    steps: tuple[Step, ...]
    nodes: tuple[NodeRow, ...]
    parts: tuple[PartRow, ...]
    budget: Budget
    poles: tuple[PoleFacts, ...]
    zeros: tuple[ZeroFacts, ...]
    stages: tuple[Stage, ...]
    devices: tuple[DeviceFacts, ...]
    curves: Curves | None
    lines: tuple[SourceLine, ...]
    causes: tuple[CauseFacts, ...]
    notes: tuple[NoteFacts, ...]
    cautions: tuple[str, ...] = ()
    paper: tuple[PaperFigure, ...] = ()
    settings: tuple[SetValue, ...] = ()
    moved: tuple[MovedFigure, ...] = ()
    helps: tuple[Help, ...] = ()
    curve: CurveFacts | None = None
    large_signal: LargeSignal | None = None
    outputs: tuple[OutputRow, ...] = ()
    modes: ModesFacts | None = None
    impedances: tuple[ImpedanceFacts, ...] = ()
    added: tuple[AddedPart, ...] = ()
    f_unity: UnityFacts | None = None
    at: tuple[AtFacts, ...] = ()
    peaking: tuple[PeakFacts, ...] = ()
    phase_budget: PhaseBudget | None = None
    wants: tuple[WantFacts, ...] = ()
    loops: tuple[LoopFacts, ...] = ()
    loop_curves: tuple[LoopCurve, ...] = ()
    miller: MillerCurves | None = None
    inductors: tuple[InductorFacts, ...] = ()
    no_method: tuple[NoMethod, ...] = ()


DEVICES_SCHEMA = "tauledger.devices/1"


class DevicesTable(Struct, frozen=True):
    """Every transistor and diode at its operating point, and the notes that it calls for."""

    schema: str
    tauledger: str
    engine: EngineFacts
    netlist: NetlistFacts
    temperature_c: float
    devices: tuple[DeviceFacts, ...]
    notes: tuple[NoteFacts, ...]
