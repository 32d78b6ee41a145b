"""Every figure of a page beside hand and exact; where it is off by more than 2 %, the slip that reproduces it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from msgspec import Struct

from tauledger.circuit import GROUND, fold
from tauledger.devices.family import Device
from tauledger.hand.branches import Branch, Walk, branches, total
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.estimate import HandEstimate, SignalNode
from tauledger.hand.mirror import find_mirror, half_circuit
from tauledger.network.bands import Bands
from tauledger.paper.bench import Worked, bridging, work
from tauledger.paper.page import SIGNED, Claim, Page, problem
from tauledger.paper.slips import OVERALL_GAIN, slips, thermal_voltage
from tauledger.quantity import engineering, percent
from tauledger.record import PaperFigure

OFF = 0.02
REPRODUCES = 0.01
UNITS = {"resistance": "Ω", "capacitance": "F", "time_constant": "s", "miller_gain": "", "f_high": "Hz", "f_low": "Hz"}
WORDS = {"resistance": "R", "capacitance": "C", "time_constant": "R·C", "miller_gain": "K"}
PREFIX_UNITS = {"i": "A", "v": "V", "r": "Ω", "c": "F", "f": "Hz", "g": "S"}
TWO_PI = 2.0 * math.pi


class Subject(Struct, frozen=True):
    """The reviewed circuit, as far as a page can speak of it.

    f_high, f_low: the edge that counts (simulated, else exact), Hz. hand: None where the hand side is withheld.
    """

    bands: Bands
    devices: tuple[Device, ...]
    hand: HandEstimate | None
    f_high: float | None
    f_low: float | None
    gain_unit: str
    temperature_c: float


class Beside(Struct, frozen=True):
    """What stands beside a figure: its title and unit, the value by hand and the exact one (None: there is none)."""

    title: str
    unit: str
    hand: float | None
    exact: float | None


class Candidate(Struct, frozen=True):
    """What a slip makes of a figure: its id, what was done, and the value."""

    slip: str
    says: str
    value: float


def compare(page: Page, subject: Subject) -> tuple[PaperFigure, ...]:
    """Set every figure of the page beside hand and exact, in the order of the page.

    Raises NetlistError, with the place on the page, for a node, device or figure that this circuit does not have.
    """
    beside = [_beside(page, claim, subject) for claim in page.claims]
    right = [_agrees(claim, at) for claim, at in zip(page.claims, beside, strict=True)]
    worked = {} if all(right) else _worked(subject)
    return tuple(
        _figure(claim, at, subject, worked, agrees=agrees)
        for claim, at, agrees in zip(page.claims, beside, right, strict=True)
    )


def _figure(
    claim: Claim, beside: Beside, subject: Subject, worked: Mapping[tuple[str, str], Worked], *, agrees: bool
) -> PaperFigure:
    reference = beside.exact if beside.exact is not None else beside.hand
    off = None if reference is None else _size(claim) / _matching(claim, reference) - 1.0
    slip, value, says = "", None, ""
    if reference is None:
        says = "there is nothing to set beside it"
    elif agrees:
        says = "agrees within 2 %"
    else:
        method = _method(claim, subject) or _elsewhere(claim, subject)
        slip, value, says = ("", None, method) if method else _named(claim, beside, subject, worked)
    return PaperFigure(
        where=claim.name,
        key=claim.key,
        title=beside.title,
        unit=beside.unit,
        line=claim.place.line,
        yours=claim.value,
        hand=beside.hand,
        exact=beside.exact,
        off=off,
        slip=slip,
        slip_gives=value,
        says=says,
    )


def _beside(page: Page, claim: Claim, subject: Subject) -> Beside:
    if claim.kind == "device":
        return _of_device(page, claim, subject)
    if claim.kind == "node":
        return _of_node(page, claim, subject)
    if claim.key == "gain":
        gains = [row.gain_hand for row in subject.hand.stages] if subject.hand else []
        known = [gain for gain in gains if gain is not None]
        by_hand = math.prod(known) if known and len(known) == len(gains) else None
        return Beside("gain", subject.gain_unit, by_hand, subject.bands.midband.gain.real)
    if subject.hand is None:
        by_hand = None
    else:
        by_hand = subject.hand.hand_f_high_hz if claim.key == "f_high" else subject.hand.hand_f_low_hz
    exact = subject.f_high if claim.key == "f_high" else subject.f_low
    if exact is None:
        side = "above" if claim.key == "f_high" else "below"
        raise problem(
            page.path,
            claim.place,
            f"this circuit has no {claim.key}: the gain {side} mid-band never falls by 3 dB",
            "leave the line out",
        )
    return Beside("f_H" if claim.key == "f_high" else "f_L", "Hz", by_hand, exact)


def _of_node(page: Page, claim: Claim, subject: Subject) -> Beside:
    row = _row(claim, subject)
    if row is None:
        names = ", ".join(node.name for node in subject.hand.nodes if not node.second) if subject.hand else ""
        raise problem(
            page.path,
            claim.place,
            f"there is no signal node {claim.name}",
            f"signal nodes here: {names}"
            if names
            else "hand analysis is withheld here; the notes of the review say why",
        )
    title = f"{WORDS[claim.key]} at {row.title}"
    if claim.key == "miller_gain":
        main = bridging(row)
        if main is None:
            raise problem(
                page.path,
                claim.place,
                f"no capacitance at {claim.name} bridges a stage",
                "leave the line out",
            )
        _, term = main
        return Beside(f"{title} across {term.part}", "", term.gain.real, 1.0 - term.exact_factor)
    by_hand = {
        "resistance": row.resistance_hand_ohm,
        "capacitance": row.capacitance_f,
        "time_constant": row.time_constant_s,
    }[claim.key]
    exact = {
        "resistance": row.resistance_exact_ohm,
        "capacitance": row.time_constant_exact_s / row.resistance_exact_ohm,
        "time_constant": row.time_constant_exact_s,
    }[claim.key]
    return Beside(title, UNITS[claim.key], by_hand, exact)


def _of_device(page: Page, claim: Claim, subject: Subject) -> Beside:
    device = next((one for one in subject.devices if fold(one.name) == fold(claim.name)), None)
    if device is None:
        names = ", ".join(one.name for one in subject.devices) or "none"
        raise problem(page.path, claim.place, f"there is no device {claim.name}", f"devices here: {names}")
    figures = dict(device.figures)
    if claim.key not in figures:
        known = ", ".join(figures) or "none"
        raise problem(page.path, claim.place, f"no such figure of {device.name}: {claim.key}", f"there are {known}")
    return Beside(f"{claim.key} of {device.name}", PREFIX_UNITS.get(claim.key[0], ""), None, figures[claim.key])


def _row(claim: Claim, subject: Subject) -> SignalNode | None:
    rows = subject.hand.nodes if subject.hand else ()
    wanted = fold(claim.name)
    named = [row for row in rows if fold(row.name) == wanted]
    return next(iter(named + [row for row in rows if wanted in {fold(member) for member in row.members}]), None)


def _size(claim: Claim) -> float:
    """Take gains and currents by size: on paper a sign is left off."""
    return abs(claim.value) if claim.key in SIGNED else claim.value


def _matching(claim: Claim, value: float) -> float:
    return abs(value) if claim.key in SIGNED else value


def _close(claim: Claim, value: float | None, tolerance: float) -> bool:
    if value is None or not math.isfinite(value):
        return False
    return abs(_size(claim) - _matching(claim, value)) <= tolerance * abs(value)


def _agrees(claim: Claim, beside: Beside) -> bool:
    return _close(claim, beside.exact if beside.exact is not None else beside.hand, OFF)


def _method(claim: Claim, subject: Subject) -> str:
    """Say which classical method gives an edge that is off: then the method is the reason and no slip."""
    methods = [row for row in subject.hand.methods if row.edge == claim.key] if subject.hand else []
    near = [row for row in methods if row.hz is not None and _close(claim, row.hz, OFF)]
    if not near:
        return ""
    best = min(near, key=lambda row: abs(claim.value / (row.hz or math.inf) - 1.0))
    return f"no slip: it is the {best.method}, {engineering(best.hz or 0.0, 'Hz')}, which is off by as much here"


def _elsewhere(claim: Claim, subject: Subject) -> str:
    """Say that a Miller gain is that of another capacitance of the same node, outside or inside r_b."""
    row = _row(claim, subject) if claim.key == "miller_gain" else None
    for line in row.lines if row is not None else ():
        for term in line.capacitances:
            if _close(claim, 1.0 - term.exact_factor, REPRODUCES) and term.exact_factor != 1.0:
                return f"no slip: it is the gain across {term.part}, from {line.node}"
    return ""


def _worked(subject: Subject) -> dict[tuple[str, str], Worked]:
    """Work the circuit once per slip; by (id, says). None where capacitors set the gain: it has no such mid-band."""
    if subject.hand is None or subject.bands.gain_setting:
        return {}
    circuit = upper_circuit(subject.bands, subject.devices)
    found: dict[tuple[str, str], Worked] = {}
    for slip in slips(subject.bands, circuit, temperature_c=subject.temperature_c):
        worked = work(subject.bands, subject.hand, slip.edit, slip.factor)
        if worked is not None:
            found[slip.id, slip.says] = worked
    if any(row.image for row in subject.hand.nodes):
        alone = work(subject.bands, subject.hand, {}, halves=False)
        if alone is not None:
            found["half-circuit-ignored", "one half driven alone, not both in opposite phase,"] = alone
    return found


def _named(
    claim: Claim, beside: Beside, subject: Subject, worked: Mapping[tuple[str, str], Worked]
) -> tuple[str, float | None, str]:
    """Name the slip whose value lies nearest to the figure, within 1 %, and that is itself off by more than 2 %."""
    right = beside.exact if beside.exact is not None else beside.hand
    candidates = [
        candidate
        for candidate in _candidates(claim, beside, subject, worked)
        if right and math.isfinite(candidate.value) and candidate.value
        if abs(_matching(claim, candidate.value) / _matching(claim, right) - 1.0) > OFF
        if _close(claim, candidate.value, REPRODUCES)
    ]
    if not candidates:
        return "", None, "none of the known slips gives it"
    candidates.sort(key=lambda one: abs(_size(claim) / _matching(claim, one.value) - 1.0))
    best = candidates[0]
    others = list(dict.fromkeys(one.says for one in candidates[1:] if one.slip != best.slip))
    within = percent(abs(_size(claim) / _matching(claim, best.value) - 1.0)).removeprefix("+")
    told = f"{best.says} gives {engineering(_matching(claim, best.value), beside.unit)}, yours within {within}"
    also = f"; so would: {', '.join(others[:2])}" if others else ""
    return best.slip, best.value, told + also


def _candidates(
    claim: Claim, beside: Beside, subject: Subject, worked: Mapping[tuple[str, str], Worked]
) -> list[Candidate]:
    found: list[Candidate] = []
    for (slip, says), work_done in worked.items():
        found += [Candidate(slip, says + how, value) for how, value in _values(claim, subject, slip, work_done)]
    return [*found, *_two_pi(claim, beside, subject), *_series(claim, subject), *_device_slips(claim, subject)]


def _values(claim: Claim, subject: Subject, slip: str, worked: Worked) -> list[tuple[str, float]]:
    """Give what the changed circuit makes of the figure; of an edge by every simple method."""
    if claim.key == "miller_gain" and slip == OVERALL_GAIN:
        return [("", worked.gain)]
    if claim.kind == "node":
        row = _row(claim, subject)
        value = getattr(worked.nodes[row.name], claim.key) if row is not None else None
        return [] if value is None else [("", float(value))]
    if claim.key == "gain":
        return [("", worked.gain)]
    if claim.kind == "whole":
        return [(f" ({method})", hz) for (edge, method), hz in worked.edges.items() if edge == claim.key]
    return []


def _two_pi(claim: Claim, beside: Beside, subject: Subject) -> list[Candidate]:
    """2π forgotten: rad/s for Hz, or a time constant from 1/f."""
    if beside.unit not in ("Hz", "s"):
        return []
    values = [value for value in (beside.exact, beside.hand) if value]
    if subject.hand is not None:
        values += [row.hz for row in subject.hand.methods if row.edge == claim.key and row.hz]
    return [
        Candidate("two-pi", f"the factor 2π {how}", value * factor)
        for value in values
        for how, factor in (("left out", TWO_PI), ("taken twice", 1.0 / TWO_PI))
    ]


def _series(claim: Claim, subject: Subject) -> list[Candidate]:
    """Parallel for series and the other way round, one pair at a time, at the node's own branches."""
    row = _row(claim, subject) if claim.kind == "node" else None
    if row is None or claim.key not in ("resistance", "time_constant") or subject.hand is None:
        return []
    circuit = _drawn(subject, row)
    if circuit is None or row.lines[0].at not in circuit.row:
        return []
    found = branches(circuit, row.lines[0].at, frozenset(), Walk())
    scale = 1.0 if claim.key == "resistance" else row.time_constant_s / row.resistance_hand_ohm
    candidates = []
    for k, branch in enumerate(found):
        others = [one for n, one in enumerate(found) if n != k]
        beyond = branch.ohm - branch.link_ohm if branch.link_ohm is not None else 0.0
        if branch.link_ohm and beyond > 0.0 and branch.far != GROUND:
            wrong = branch.link_ohm * beyond / branch.ohm
            value = total([*others, Branch(branch.name, wrong, branch.symbol)])
            candidates.append(Candidate("parallel-for-series", f"{branch.name} in parallel, not in series", value))
        for n, other in enumerate(found[k + 1 :], start=k + 1):
            rest = [one for m, one in enumerate(found) if m not in (k, n)]
            value = total([*rest, Branch(branch.name, branch.ohm + other.ohm, branch.symbol)])
            says = f"{branch.name} and {other.name} in series, not in parallel"
            candidates.append(Candidate("parallel-for-series", says, value))
    return [Candidate(one.slip, one.says, one.value * scale) for one in candidates]


def _drawn(subject: Subject, row: SignalNode) -> EquivalentCircuit | None:
    circuit = upper_circuit(subject.bands, subject.devices)
    mirror = find_mirror(circuit)
    if mirror is None:
        return circuit
    return half_circuit(circuit, mirror.other if row.second else mirror)


def _device_slips(claim: Claim, subject: Subject) -> list[Candidate]:
    """gm = I_C/V_T and r_π = β·V_T/I_C with a round V_T; f_T in rad/s."""
    device = next((one for one in subject.devices if fold(one.name) == fold(claim.name)), None)
    if claim.kind != "device" or device is None:
        return []
    figures = dict(device.figures)
    found: list[Candidate] = []
    for millivolt in (25, 26):
        ratio = thermal_voltage(subject.temperature_c) / (1e-3 * millivolt)
        says = f"V_T taken as {millivolt} mV"
        values = {"gm": [figures.get("gm", math.nan) * ratio], "r_pi": [figures.get("r_pi", math.nan) / ratio]}
        if "i_c" in figures and "gm" in figures:
            taken = abs(figures["i_c"]) / (1e-3 * millivolt)
            values["gm"].append(taken)
            values["r_pi"].append(figures.get("r_pi", math.nan) * figures["gm"] / taken)
        slip = f"thermal-voltage-{millivolt}"
        found += [Candidate(slip, says, value) for value in values.get(claim.key, [])]
    return found


def known_figures(devices: Sequence[Device]) -> Mapping[str, tuple[str, ...]]:
    """Give for every device the keys that a page may have for it."""
    return {device.name: tuple(symbol for symbol, _ in device.figures) for device in devices}
