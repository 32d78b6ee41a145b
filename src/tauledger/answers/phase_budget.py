"""The phase budget at the unity gain frequency: what each pole and zero uses, exact, and what paper says of it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from msgspec import Struct
from msgspec.structs import replace

from tauledger.answers.answer import Subject
from tauledger.hand.compensated import CompensatedStage, dominant_hz, find_compensated_stage
from tauledger.hand.compensation import (
    DOMINANT_POLE,
    LOAD_POLE,
    LOADED_POLE,
    PHASE_MARGIN,
    UNITY_GAIN,
    UNITY_GAIN_LOADED,
    UNITY_GAIN_OF_LOAD,
    UNITY_GAIN_WITH_ROOTS,
    Formula,
    load_pole_hz,
    phase_used_deg,
    unity_gain_hz,
    unity_gain_with_roots_hz,
)
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import HandEstimate
from tauledger.hand.load_compensated import LoadedOutput, find_loaded_output
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.hand.poles import HandPole
from tauledger.hand.roots import OWNS, ExactRoot, HandRoot, belonging, hand_roots
from tauledger.network.follower import polarity_offset_deg
from tauledger.network.identities import check
from tauledger.network.phase import PhaseUse, PhaseUsed, phase_identities, phase_used
from tauledger.network.poles import Pole
from tauledger.network.unity import HALF_TURN_DEG
from tauledger.numbers import Numbers
from tauledger.quantity import engineering
from tauledger.record import PhaseBudget, PhaseRow, Review, UnityStep

SEEN_DEG = 1.0
WITH_A_FORMULA_DEG = 0.1
SAME = 0.02
# Beyond a gain of this from the stage's output on, another stage follows, and its poles are not those of paper here.
FOLLOWED_BY = (0.3, 2.1)
DOMINANT = (DOMINANT_POLE.name, LOADED_POLE.name)
# A pole that capacitances off the signal path own, and the zero beside it.
OWNED_ASIDE, DOUBLET = 0.5, 0.3
UNITY_FROM_ONE = 0.01


def phase_budget(found: Review, subject: Subject) -> PhaseBudget | None:
    """Give the phase budget; None where there is no unity gain frequency or the network is not trusted.

    Raises NetworkError where the degrees do not add up to 180° less the margin.
    """
    unity, numbers = found.f_unity, subject.numbers
    if unity is None or unity.exact_hz is None or unity.phase_margin_exact_deg is None or not numbers.trusted:
        return None
    hz, margin = unity.margin_at_hz or unity.exact_hz, unity.phase_margin_exact_deg
    offset = polarity_offset_deg(numbers.midband.gain) or 0.0
    mid = numbers.midband.frequency_hz
    used_deg = HALF_TURN_DEG - margin
    used = phase_used(numbers.poles, midband_hz=mid, hz=hz, used_deg=used_deg, offset_deg=offset)
    check(phase_identities(used, used_deg, rational=_rational(numbers)))
    paper = paper_roots(subject)
    stage, by_hand = paper.stage, paper.roots
    shown, rows = _rows(used, paper, subject.explanation.hand_poles, hz)
    rows = _set_aside(rows, shown, _off_the_path(subject))
    rest = [one for one in (*used.poles, *used.zeros) if one not in shown]
    # what measuring aids make far below the band are poles and zeros too, which the map leaves out
    of_aids = used.rest if not (numbers.network.delayed or numbers.network.lines) else 0.0
    return PhaseBudget(
        at_hz=hz,
        margin_deg=margin,
        rows=rows,
        others=len(rest),
        others_deg=sum(one.degrees for one in rest) + of_aids,
        rest_deg=used.rest - of_aids,
        midband_deg=used.before,
        stage=_stage_text(stage) if stage is not None and _makes_a_pole(rows) else _load_text(paper.load, rows),
        by_hand=_steps(_single(paper, rows), by_hand, rows, hz, margin) if hz == unity.exact_hz else (),
    )


class PaperRoots(Struct, frozen=True):
    """The compensated stage, or None, and the poles and zeros that paper knows; halves: of one half circuit of two.

    load: the output, where what stands there makes the dominant pole instead. bridged: the stage whether it compensates
    or not.
    """

    stage: CompensatedStage | None
    roots: tuple[HandRoot, ...]
    halves: bool
    load: LoadedOutput | None = None
    bridged: CompensatedStage | None = None


def paper_roots(subject: Subject) -> PaperRoots:
    """Find the compensated stage, and the poles and zeros that paper knows; nothing where the hand side is withheld."""
    hand, numbers = subject.explanation.hand, subject.numbers
    if hand is None or numbers.bands.s_mid:
        return PaperRoots(None, (), False)
    circuit = upper_circuit(numbers.bands, numbers.devices)
    whole = circuit.response
    mirror = find_mirror(circuit)
    if mirror is not None:
        circuit = half_circuit(circuit, mirror)
    bridged = find_compensated_stage(circuit, _resistances(hand), whole)
    load = _load(circuit, whole, numbers, halves=mirror is not None)
    stage = bridged if bridged is not None and bridged.compensates and load is None else None
    return PaperRoots(stage, hand_roots(circuit, stage, load), mirror is not None, load, bridged)


def _load(circuit: EquivalentCircuit, response: complex, numbers: Numbers, *, halves: bool) -> LoadedOutput | None:
    mid = 2.0 * math.pi * numbers.midband.frequency_hz
    poles = [pole for pole in numbers.poles.poles if not pole.cancelled and abs(pole.s) > mid]
    first = min(poles, key=lambda pole: abs(pole.s), default=None)
    if first is None or first.paired:
        return None
    return find_loaded_output(circuit, response, abs(first.s) / (2.0 * math.pi), first.owners, halves=halves)


def _off_the_path(subject: Subject) -> frozenset[str]:
    """Give the capacitances of which neither end is a node that the signal crosses."""
    hand = subject.explanation.hand
    if hand is None:
        return frozenset()
    crossed = {member for node in hand.nodes if node.in_path for member in node.members}
    parts = subject.numbers.network.parts
    return frozenset(p.name for p in parts if p.kind == "capacitance" and not crossed & set(p.nodes))


def _set_aside(rows: tuple[PhaseRow, ...], shown: Sequence[PhaseUse], aside: frozenset[str]) -> tuple[PhaseRow, ...]:
    """Say of a pole without a formula that parts off the path own, and of the zero beside it, where they belong."""
    zeros = [k for k, one in enumerate(shown) if rows[k].kind == "zero" and not rows[k].hand_formula]
    named: set[int] = set()
    for k, one in enumerate(shown):
        if rows[k].kind != "pole" or rows[k].hand_formula or not isinstance(one.root, Pole):
            continue
        if sum(part for name, part in one.root.owners.items() if name in aside) < OWNED_ASIDE:
            continue
        p = one.root.s
        near = min((z for z in zeros if z not in named), key=lambda z: abs(shown[z].root.s - p), default=None)
        if near is not None and abs(shown[near].root.s - p) <= DOUBLET * abs(p):
            named |= {k, near}
    return tuple(
        replace(row, name=f"{row.name} off the signal path") if k in named else row for k, row in enumerate(rows)
    )


def _rational(numbers: Numbers) -> bool:
    """Whether poles and zeros are all there is: no delay, and no servo loop of measuring aids far below the band."""
    return not (numbers.network.delayed or numbers.network.lines or numbers.midband.aids)


def _resistances(hand: HandEstimate) -> Mapping[str, float]:
    return {line.at: line.resistance.ohm for node in hand.nodes for line in node.lines}


def _rows(
    used: PhaseUsed, paper: PaperRoots, two: Sequence[HandPole], hz: float
) -> tuple[list[PhaseUse], tuple[PhaseRow, ...]]:
    """Give the roots that have a row of their own, and the rows, the lowest first."""
    seen = [
        *(
            (one, ExactRoot("pole", one.root.s, one.paired, one.root.owners if isinstance(one.root, Pole) else {}))
            for one in used.poles
            if _is_seen(one)
        ),
        *((one, ExactRoot("zero", one.root.s, one.paired)) for one in used.zeros if _is_seen(one)),
    ]
    seen.sort(key=lambda pair: (abs(pair[1].s), pair[1].kind))
    # the other half owns as much of a pole of both
    owns = OWNS / 2.0 if paper.halves else OWNS
    roots = [root for _, root in seen]
    formulas = belonging(roots, paper.roots, owns=owns)
    if paper.stage is not None and not any(h.formula.name in DOMINANT for one in formulas.values() for h in one):
        # a stage that does not make the dominant pole splits none
        others = [root for root in paper.roots if root.of != "stage" or root.kind == "zero"]
        formulas = belonging(roots, others, owns=owns)
    of_two = {one.pole: one for one in two if one.hz is not None}
    rows: list[PhaseRow] = []
    shown: list[PhaseUse] = []
    for k, (one, root) in enumerate(seen):
        formula = formulas.get(k, ())
        if not formula and abs(one.degrees) < SEEN_DEG:
            continue
        shown.append(one)
        if formula:
            rows.append(_with_formula(one, root, formula, hz))
        elif root.kind == "pole" and not root.paired and root.s in of_two:
            rows.append(_of_two_coefficients(one, root, of_two[root.s], hz))
        else:
            rows.append(_bare(one, root))
    return shown, tuple(rows)


def _is_seen(one: PhaseUse) -> bool:
    return not one.root.cancelled and abs(one.degrees) >= WITH_A_FORMULA_DEG


def _bare(one: PhaseUse, root: ExactRoot) -> PhaseRow:
    name = f"{root.kind} pair" if root.paired else root.kind
    return PhaseRow(
        name=name,
        kind=root.kind,
        real_hz=root.s.real / (2.0 * math.pi),
        imag_hz=root.s.imag / (2.0 * math.pi),
        used_deg=one.degrees,
    )


def _with_formula(one: PhaseUse, root: ExactRoot, by_hand: tuple[HandRoot, ...], hz: float) -> PhaseRow:
    bare = _bare(one, root)
    first = by_hand[0]
    alone = len(by_hand) == 1
    hand_hz = first.hz if alone else math.prod(abs(root.hz) for root in by_hand) ** (1.0 / len(by_hand))
    poles = [root.hz for root in by_hand if root.kind == "pole"]
    zeros = [root.hz for root in by_hand if root.kind == "zero"]
    return replace(
        bare,
        name=first.formula.name if alone else bare.name,
        hand_formula=first.formula.written if alone else f"√({' · '.join(root.formula.name for root in by_hand)})",
        hand_values="; ".join(root.values for root in by_hand),
        hand_hz=hand_hz,
        hand_deg=phase_used_deg(hz, poles, zeros) - phase_used_deg(one.start_hz, poles, zeros),
        difference=abs(hand_hz) / root.hz - 1.0,
    )


def _of_two_coefficients(one: PhaseUse, root: ExactRoot, by_hand: HandPole, hz: float) -> PhaseRow:
    assert by_hand.hz is not None
    return replace(
        _bare(one, root),
        # "1/(2π·b1), -20 % off": how far it is off has its own column
        hand_formula=by_hand.formula.partition(", ")[0],
        hand_hz=by_hand.hz,
        hand_deg=phase_used_deg(hz, [by_hand.hz], []) - phase_used_deg(one.start_hz, [by_hand.hz], []),
        difference=by_hand.hz / root.hz - 1.0,
    )


def _makes_a_pole(rows: Sequence[PhaseRow]) -> bool:
    return any(row.name == name or name in row.hand_formula for row in rows for name in DOMINANT)


def _stage_text(stage: CompensatedStage) -> str:
    series = f" and {stage.resistor}" if stage.resistor else ""
    across = f"from {stage.output_name} to {stage.input_name}"
    return f"{', '.join(stage.owners)}, bridged by {', '.join(stage.capacitors)}{series} {across}"


def _load_text(load: LoadedOutput | None, rows: Sequence[PhaseRow]) -> str:
    if load is None or all(row.name != LOAD_POLE.name for row in rows):
        return ""
    return f"no compensated stage, the load at {load.name} makes the dominant pole"


class _Single(Struct, frozen=True):
    """f_u of the dominant pole alone: its formula with the operands, Hz, and the dominant pole by hand in Hz.

    sends: what gm1 stands for, where it is not quite that of its transistor.
    """

    formula: Formula
    values: str
    hz: float
    pole_hz: float
    sends: str = ""


def _single(paper: PaperRoots, rows: Sequence[PhaseRow]) -> _Single | None:
    """Give f_u of the dominant pole alone; None where neither the stage nor the load makes the dominant pole."""
    known = {row.name for row in rows}
    stage, load = paper.stage, paper.load
    low, high = FOLLOWED_BY
    if load is not None and LOAD_POLE.name in known:
        values = f"gm1 = {engineering(load.gm_1, 'S', 3)} ({load.first or 'drive to output'})"
        values += f", C_L = {engineering(load.c_l, 'F', 3)} at {load.name}" + _times(load.between, load.name)
        hz = unity_gain_hz(load.gm_1 * load.between, load.c_l)
        sends = ""
        if abs(load.gm_1 / load.sent - 1.0) > SAME / 2.0:
            sends = f"1 V of drive sends {engineering(load.sent, 'A', 3)} to {load.name}, not gm1 alone"
        return _Single(UNITY_GAIN_OF_LOAD, values, hz, load_pole_hz(load.r_out, load.c_l), sends)
    if stage is None or not known & set(DOMINANT) or not low <= stage.to_output <= high:
        return None
    pole = dominant_hz(stage)
    gm_1 = engineering(stage.gm_1, "S", 3)
    who = stage.first or f"what drives {stage.input_name}"
    values = f"gm1 = {who} = {gm_1}" if who.startswith("1/") else f"gm1 = {gm_1} ({who})"
    if stage.loaded:
        values += f", R1 = {engineering(stage.r_1, 'Ω', 3)}, A2 = {stage.a_2:.3g}, b1 = "
        values += engineering(1.0 / (2.0 * math.pi * pole), "s", 3)
        hz = stage.gm_1 * stage.r_1 * stage.a_2 * stage.to_output * pole
        return _Single(UNITY_GAIN_LOADED, values + _times(stage.to_output, stage.output_name), hz, pole)
    values += f", C_c = {engineering(stage.across, 'F', 3)}" + _times(stage.to_output, stage.output_name)
    return _Single(UNITY_GAIN, values, unity_gain_hz(stage.gm_1 * stage.to_output, stage.across), pole)


def _times(gain: float, name: str) -> str:
    return f", times {gain:.3g} from {name} to the output" if abs(gain - 1.0) > UNITY_FROM_ONE else ""


def _counted(rows: Sequence[PhaseRow], by_hand: Sequence[HandRoot], above_hz: float) -> tuple[HandRoot, ...]:
    """Give the poles and zeros by hand of the rows beyond the dominant pole, each member of a pair by itself."""
    known = {values for row in rows for values in row.hand_values.split("; ")}
    counted: list[HandRoot] = []
    for row in rows:
        if row.hand_hz is None or row.name in (*DOMINANT, LOAD_POLE.name) or abs(row.hand_hz) <= above_hz:
            continue
        named = row.hand_formula.partition("√(")[2].rstrip(")").split(" · ")
        values = row.hand_values.split("; ")
        members = [one for one in by_hand if one.formula.name in named and one.values in values]
        if not members:
            name = row.name if row.hand_values else f"{row.name} {row.hand_formula}"
            members = [HandRoot("pole" if row.kind == "pole" else "zero", row.hand_hz, Formula(name, "", "", ""), "")]
        counted += [one for one in members if one.formula.name not in (*DOMINANT, LOAD_POLE.name)]
    # the mirror's zero belongs to its pole: where the one is seen, paper counts both
    told = {one.formula.name for one in counted}
    zeros = [one for one in by_hand if one.of == "mirror" and one.kind == "zero" and one.values in known]
    return (*counted, *(one for one in zeros if one.formula.name not in told))


def _steps(
    single: _Single | None, by_hand: Sequence[HandRoot], rows: Sequence[PhaseRow], hz: float, margin: float
) -> tuple[UnityStep, ...]:
    """Give f_u of the dominant pole alone, f_u with the further roots, and the margin."""
    if single is None:
        return ()
    counted = _counted(rows, by_hand, single.pole_hz)
    poles = [one.hz for one in counted if one.kind == "pole"]
    zeros = [one.hz for one in counted if one.kind == "zero"]
    refined = unity_gain_with_roots_hz(single.hz, poles, zeros)
    why = _why_single(single, refined, hz, counted) or _without_formula(single, hz, rows)
    steps = [UnityStep("f_u", "Hz", single.formula.written, single.values, single.hz, hz, why)]
    if refined is None or not counted:
        return tuple(steps)
    steps.append(UnityStep("f_u", "Hz", UNITY_GAIN_WITH_ROOTS.written, "", refined, hz, ""))
    by_paper = HALF_TURN_DEG - phase_used_deg(refined, [single.pole_hz, *poles], zeros)
    why = _why_margin(by_paper - margin, rows)
    steps.append(UnityStep("phase margin", "°", PHASE_MARGIN.written, "", by_paper, margin, why))
    return tuple(steps)


def _why_single(single: _Single, refined: float | None, hz: float, roots: Sequence[HandRoot]) -> str:
    """Say which pole or zero moves f_u away from that of the dominant pole alone, or what gm1 leaves out."""
    off = math.log(hz / single.hz)
    if abs(single.hz / hz - 1.0) <= SAME:
        return ""
    moved = math.log(refined / single.hz) if refined is not None else off
    # the further roots must explain at least half of it
    if moved * off <= 0.0 or abs(moved) < 0.5 * abs(off):
        return single.sends
    kind = "pole" if hz < single.hz else "zero"
    nearest = min((root for root in roots if root.kind == kind), key=lambda root: abs(root.hz), default=None)
    if nearest is None:
        return single.sends
    ratio = abs(nearest.hz) / single.hz
    where = "sits below it" if ratio < 1.0 else f"sits at {ratio:.2g} times it"
    return f"the {nearest.formula.name}, {engineering(abs(nearest.hz), 'Hz', 3)}, {where}"


def _without_formula(single: _Single, hz: float, rows: Sequence[PhaseRow]) -> str:
    """Name the first pole that has no formula, where f_u by hand is too high."""
    if single.hz / hz - 1.0 <= SAME:
        return ""
    bare = [row for row in rows if row.kind == "pole" and row.hand_hz is None]
    sizes = [(math.hypot(row.real_hz, row.imag_hz), row.name) for row in bare]
    at, name = min((one for one in sizes if one[0] > single.pole_hz), default=(math.inf, ""))
    return f"the {name} at {engineering(at, 'Hz', 3)} has no formula" if at < 2.0 * single.hz else ""


def _why_margin(off: float, rows: Sequence[PhaseRow]) -> str:
    """Say what makes most of the difference between the margin by hand and the exact one."""
    if abs(off) < SEEN_DEG:
        return ""
    bare = [row.used_deg for row in rows if row.hand_deg is None]
    told = {f"{len(bare)} poles and zeros without a formula use {_degrees(sum(bare))}": sum(bare)}
    for row in rows:
        if row.hand_deg is not None:
            more = row.used_deg - row.hand_deg
            told[f"{row.name} uses {_degrees(row.used_deg)}, by hand {_degrees(row.hand_deg)}"] = more
    says = max(told, key=lambda text: told[text] * math.copysign(1.0, off))
    return says if told[says] * off > 0.0 else ""


def _degrees(value: float) -> str:
    return f"{value:.1f}°".replace("-", "−")
