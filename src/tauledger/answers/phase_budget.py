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
    MIRROR_POLE,
    PHASE_MARGIN,
    UNITY_GAIN,
    UNITY_GAIN_WITH_ROOTS,
    phase_used_deg,
    unity_gain_hz,
    unity_gain_with_roots_hz,
)
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.estimate import HandEstimate
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.hand.poles import HandPole
from tauledger.hand.roots import ExactRoot, HandRoot, belonging, hand_roots
from tauledger.network.identities import check
from tauledger.network.phase import PhaseUse, PhaseUsed, phase_identities, phase_used
from tauledger.network.unity import HALF_TURN_DEG
from tauledger.numbers import Numbers
from tauledger.quantity import engineering
from tauledger.record import PhaseBudget, PhaseRow, Review, UnityStep

SEEN_DEG = 1.0
WITH_A_FORMULA_DEG = 0.1
SAME = 0.02
# Beyond a gain of this from the stage's output on, another stage follows, and its poles are not those of paper here.
FOLLOWED_BY = (0.3, 2.1)
UNITY_FROM_ONE = 0.01


def phase_budget(found: Review, subject: Subject) -> PhaseBudget | None:
    """Give the phase budget; None where there is no unity gain frequency or the network is not trusted.

    Raises NetworkError where the degrees do not add up to 180° less the margin.
    """
    unity, numbers = found.f_unity, subject.numbers
    if unity is None or unity.exact_hz is None or unity.phase_margin_exact_deg is None or not numbers.trusted:
        return None
    hz, margin = unity.exact_hz, unity.phase_margin_exact_deg
    mid = numbers.midband.frequency_hz
    used_deg = HALF_TURN_DEG - margin
    used = phase_used(numbers.poles, midband_hz=mid, hz=hz, used_deg=used_deg)
    check(phase_identities(used, used_deg, rational=_rational(numbers)))
    paper = paper_roots(subject)
    stage, by_hand = paper.stage, paper.roots
    shown, rows = _rows(used, by_hand, subject.explanation.hand_poles, mid, hz)
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
        stage="" if stage is None or not _makes_a_pole(rows) else _stage_text(stage),
        by_hand=() if stage is None else _steps(stage, by_hand, rows, hz, margin),
    )


class PaperRoots(Struct, frozen=True):
    """The compensated stage, or None, and the poles and zeros that paper knows; halves: of one half circuit of two."""

    stage: CompensatedStage | None
    roots: tuple[HandRoot, ...]
    halves: bool


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
    stage = find_compensated_stage(circuit, _resistances(hand), whole)
    return PaperRoots(stage, hand_roots(circuit, stage), mirror is not None)


def _rational(numbers: Numbers) -> bool:
    """Whether poles and zeros are all there is: no delay, and no servo loop of measuring aids far below the band."""
    return not (numbers.network.delayed or numbers.network.lines or numbers.midband.aids)


def _resistances(hand: HandEstimate) -> Mapping[str, float]:
    return {line.at: line.resistance.ohm for node in hand.nodes for line in node.lines}


def _rows(
    used: PhaseUsed, by_hand: Sequence[HandRoot], two: Sequence[HandPole], mid_hz: float, hz: float
) -> tuple[list[PhaseUse], tuple[PhaseRow, ...]]:
    """Give the roots that have a row of their own, and the rows, the lowest first."""
    seen = [
        *((one, ExactRoot("pole", one.root.s, one.paired)) for one in used.poles if _is_seen(one)),
        *((one, ExactRoot("zero", one.root.s, one.paired)) for one in used.zeros if _is_seen(one)),
    ]
    seen.sort(key=lambda pair: (abs(pair[1].s), pair[1].kind))
    formulas = belonging([root for _, root in seen], by_hand)
    of_two = {one.pole: one for one in two if one.hz is not None}
    rows: list[PhaseRow] = []
    shown: list[PhaseUse] = []
    for k, (one, root) in enumerate(seen):
        formula = formulas.get(k, ())
        if not formula and abs(one.degrees) < SEEN_DEG:
            continue
        shown.append(one)
        if formula:
            rows.append(_with_formula(one, root, formula, mid_hz, hz))
        elif root.kind == "pole" and not root.paired and root.s in of_two:
            rows.append(_of_two_coefficients(one, root, of_two[root.s], mid_hz, hz))
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


def _with_formula(one: PhaseUse, root: ExactRoot, by_hand: tuple[HandRoot, ...], mid_hz: float, hz: float) -> PhaseRow:
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
        hand_deg=phase_used_deg(hz, poles, zeros) - phase_used_deg(mid_hz, poles, zeros),
        difference=abs(hand_hz) / root.hz - 1.0,
    )


def _of_two_coefficients(one: PhaseUse, root: ExactRoot, by_hand: HandPole, mid_hz: float, hz: float) -> PhaseRow:
    assert by_hand.hz is not None
    return replace(
        _bare(one, root),
        # "1/(2π·b1), -20 % off": how far it is off has its own column
        hand_formula=by_hand.formula.partition(", ")[0],
        hand_hz=by_hand.hz,
        hand_deg=phase_used_deg(hz, [by_hand.hz], []) - phase_used_deg(mid_hz, [by_hand.hz], []),
        difference=by_hand.hz / root.hz - 1.0,
    )


def _makes_a_pole(rows: Sequence[PhaseRow]) -> bool:
    return any(DOMINANT_POLE.written in row.hand_formula or DOMINANT_POLE.name in row.hand_formula for row in rows)


def _stage_text(stage: CompensatedStage) -> str:
    series = f" and {stage.resistor}" if stage.resistor else ""
    across = f"from {stage.output_name} to {stage.input_name}"
    return f"{', '.join(stage.owners)}, bridged by {', '.join(stage.capacitors)}{series} {across}"


def _steps(
    stage: CompensatedStage, by_hand: Sequence[HandRoot], rows: Sequence[PhaseRow], hz: float, margin: float
) -> tuple[UnityStep, ...]:
    """Give f_u from gm1 and C_c, f_u with the further roots, and the margin; nothing where the stage makes no f_u."""
    known = {row.hand_formula for row in rows}
    low, high = FOLLOWED_BY
    if DOMINANT_POLE.written not in known or not low <= stage.to_output <= high:
        return ()
    counted = [
        one
        for one in by_hand
        if one.formula is not DOMINANT_POLE
        # the mirror's zero belongs to its pole: where the one is seen, paper counts both
        and (one.of == "stage" or (one.of == "mirror" and MIRROR_POLE.written in known))
    ]
    poles = [one.hz for one in counted if one.kind == "pole"]
    zeros = [one.hz for one in counted if one.kind == "zero"]
    single = unity_gain_hz(stage.gm_1 * stage.to_output, stage.across)
    refined = unity_gain_with_roots_hz(single, poles, zeros)
    who = stage.first or f"what drives {stage.input_name}"
    values = f"gm1 = {engineering(stage.gm_1, 'S', 3)} ({who}), C_c = {engineering(stage.across, 'F', 3)}"
    if abs(stage.to_output - 1.0) > UNITY_FROM_ONE:
        values += f", times {stage.to_output:.3g} from {stage.output_name} to the output"
    steps = [UnityStep("f_u", "Hz", UNITY_GAIN.written, values, single, hz, _why_single(single, hz, counted))]
    if refined is None:
        return tuple(steps)
    steps.append(UnityStep("f_u", "Hz", UNITY_GAIN_WITH_ROOTS.written, "", refined, hz, ""))
    by_paper = HALF_TURN_DEG - phase_used_deg(refined, [dominant_hz(stage), *poles], zeros)
    why = _why_margin(by_paper - margin, rows)
    steps.append(UnityStep("phase margin", "°", PHASE_MARGIN.written, "", by_paper, margin, why))
    return tuple(steps)


def _why_single(single: float, hz: float, roots: Sequence[HandRoot]) -> str:
    """Say which pole or zero moves f_u away from that of the dominant pole alone."""
    if abs(single / hz - 1.0) <= SAME or not roots:
        return ""
    kind = "pole" if hz < single else "zero"
    nearest = min((root for root in roots if root.kind == kind), key=lambda root: abs(root.hz), default=None)
    if nearest is None:
        return ""
    ratio = abs(nearest.hz) / single
    where = "sits below it" if ratio < 1.0 else f"sits at {ratio:.2g} times it"
    return f"the {nearest.formula.name}, {engineering(abs(nearest.hz), 'Hz', 3)}, {where}"


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
