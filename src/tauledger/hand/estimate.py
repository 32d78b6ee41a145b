"""What the hand analysis gives: signal nodes with their working, time constants, steps and methods."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Literal

from msgspec import Struct

WorkingSource = Literal["rule", "loop", "branch", "solved"]
Edge = Literal["f_high", "f_low"]


class Resistance(Struct, frozen=True):
    """One of the resistances in parallel: a part's name ("RC") or a looking-in phrase ("into base of Q1"), in
    ohm."""

    name: str
    ohm: float


class MillerTerm(Struct, frozen=True):
    """One capacitance at a node: it counts as farad·factor there; `gain` is K from this node to its other end.

    text: the line for K as written on paper, empty where the other end is at AC ground. source: "rule", or "solved"
    where the hand gain misses 1 − K by more than 1 %. exact_factor: 1 − K with the exact gain driven from this node.
    """

    part: str
    farad: float
    factor: float
    gain: complex
    text: str = ""
    source: WorkingSource = "rule"
    exact_factor: float = 1.0


class LookingIn(Struct, frozen=True):
    """A driving-point resistance by hand, worked.

    ohm: the value used. rule: name of the rule or form. text: the line as written on paper. source: where `ohm`
    comes from.
    loop_gain: T of the one-loop form. rule_ohm: what the plain rule gives where it was not accepted.
    """

    ohm: float
    rule: str
    text: str
    resistances: tuple[Resistance, ...]
    source: WorkingSource
    loop_gain: float | None = None
    rule_ohm: float | None = None


class InnerLine(Struct, frozen=True):
    """One netlist or inner node of a signal node's row: its own looking-in resistance, Miller terms and exact values.

    node: as it is called on paper. at: its node in the upper network. why: the reason where R·C by hand and the exact
    constant differ by more than 2 %.
    """

    node: str
    at: str
    resistance: LookingIn
    resistance_exact_ohm: float
    capacitances: tuple[MillerTerm, ...]
    capacitance_f: float
    time_constant_s: float
    time_constant_exact_s: float
    why: str = ""


class SignalNode(Struct, frozen=True):
    """One row of the upper budget: nodes joined by mid-band shorts, with the devices' inner nodes folded in.

    name: the netlist's node (unique; "(inside Q2)" appended where two rows would share one).
    title: "base of Q1 (b)". role: what the node is ("base", "collector", "output", …).
    members: all network nodes in it, inner ones included.
    crossing: ρ = x·λ/(Z_nn·H), the relative gain lost if the node is shorted. moment: its signed fraction of Σ|w·τ|.
    in_path: the row counts. lines: one per node that carries capacitance, the dominant one first.
    resistance_hand_ohm, resistance_exact_ohm: of the dominant node.
    time_constant_s (hand), time_constant_exact_s: sums over the lines.
    capacitance_f = time_constant_s / resistance_hand_ohm.
    image: the same node of the other half in a balanced circuit, analysed as half circuits, empty elsewhere.
    second: this row is the second half's, equal to that of its image.
    """

    name: str
    title: str
    role: str
    owner: str
    members: tuple[str, ...]
    crossing: float
    moment: float
    in_path: bool
    lines: tuple[InnerLine, ...]
    resistance_hand_ohm: float
    resistance_exact_ohm: float
    capacitance_f: float
    time_constant_s: float
    time_constant_exact_s: float
    image: str = ""
    second: bool = False


class LowerRow(Struct, frozen=True):
    """One coupling or bypass capacitor (parallel ones taken together), or one inductor that is open at mid-band.

    Hand and exact resistance across it, edge and zero in Hz. henry: of an inductor, whose farad is 0.
    parts: names of the capacitors taken together. in_path: counts in the hand estimate.
    zero_hz: f_k·H(open)/H(short), the zero it makes alone with the other shorts shorted; 0 for a coupling
    capacitor.
    """

    parts: tuple[str, ...]
    title: str
    farad: float
    resistance: LookingIn
    resistance_exact_ohm: float
    edge_hand_hz: float
    edge_exact_hz: float
    zero_hz: float
    in_path: bool
    henry: float = 0.0


class InductorRow(Struct, frozen=True):
    """One inductor that is short at mid-band: H, the resistance that faces it, and L/R in s by hand and exact.

    in_path: counts in the hand estimate.
    """

    part: str
    title: str
    henry: float
    resistance: LookingIn
    resistance_exact_ohm: float
    time_constant_s: float
    time_constant_exact_s: float
    in_path: bool


class StageRow(Struct, frozen=True):
    """One node that all signal crosses, in signal order, with hand and exact gain from the one before.

    around: what the stage's transistor does with others, and feedback around it. why: the reason where hand and exact
    gain differ by more than 2 %. image: the same node of the other half, where half circuits are analysed.
    """

    node: str
    title: str
    role: str
    owner: str
    gain_hand: float | None
    gain_exact: float | None
    elements: tuple[str, ...]
    around: tuple[str, ...] = ()
    why: str = ""
    image: str = ""


class StepEstimate(Struct, frozen=True):
    """The estimate of one edge after one step of the way from paper to the full network; hz is None where there
    is no crossing.

    step: fixed id (lowest, all-nodes, exact-constants, two-coefficients, all-poles, zeros, full). why: reason in
    words.
    """

    edge: Edge
    step: str
    hz: float | None
    why: str


class MethodEstimate(Struct, frozen=True):
    """One classical method's answer for one edge, e.g. "sum of time constants"."""

    edge: Edge
    method: str
    hz: float | None
    recommended: bool = False


class HandEstimate(Struct, frozen=True):
    """All of the hand side.

    part_resistance: hand resistance across each open capacitance, by part name. sigma: b2 / Σ τ_i τ_j over the
    rows that count.
    hand_f_high_hz, hand_f_low_hz: the classical answers: lowest signal node alone, highest capacitor alone.
    no_method: why no method is recommended, by edge.
    """

    nodes: tuple[SignalNode, ...]
    lower: tuple[LowerRow, ...]
    stages: tuple[StageRow, ...]
    part_resistance: Mapping[str, LookingIn]
    steps: tuple[StepEstimate, ...]
    methods: tuple[MethodEstimate, ...]
    sigma: float | None
    hand_f_high_hz: float | None
    hand_f_low_hz: float | None
    inductors: tuple[InductorRow, ...] = ()
    no_method: Mapping[Edge, str] = {}
