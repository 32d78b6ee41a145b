"""Where the time goes: signal nodes with their working, parts with their shares, sums, stages, poles and zeros."""

from __future__ import annotations

from msgspec import Struct, field


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
