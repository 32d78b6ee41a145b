"""Every figure of a page beside hand and exact; where it is off by more than 2 %, the slip that reproduces it."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.devices.family import Device
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.estimate import HandEstimate, SignalNode
from tauledger.network.bands import Bands
from tauledger.paper.bench import Worked, bridging, work
from tauledger.paper.keys import figures_by_key, symbol_of, unit_of
from tauledger.paper.page import Claim, Page, is_signed, problem
from tauledger.paper.series import drawn, series_slips
from tauledger.paper.slips import GM_FOR_G_M, INPUT_LEFT_OUT, OVERALL_GAIN, bias_network, slips, thermal_voltage
from tauledger.quantity import engineering, percent
from tauledger.record import PaperFigure

OFF = 0.02
REPRODUCES = 0.01
UNITS = {"resistance": "Ω", "capacitance": "F", "time_constant": "s", "miller_gain": "", "f_high": "Hz", "f_low": "Hz"}
WORDS = {"resistance": "R", "capacitance": "C", "time_constant": "R·C", "miller_gain": "K"}
TWO_PI = 2.0 * math.pi

_OWN = re.compile(r"r_(?!π)\w+\(.*\)")


class Reviewed(Struct, frozen=True):
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


class SlipWorked(Struct, frozen=True):
    """The circuit worked with one slip: its id, what was done, and all that it gives; at_nodes: only nodes' count."""

    slip: str
    says: str
    worked: Worked
    at_nodes: bool = False


def compare(page: Page, reviewed: Reviewed) -> tuple[PaperFigure, ...]:
    """Set every figure of the page beside hand and exact, in the order of the page.

    Raises NetlistError, with the place on the page, for a node, device or figure that this circuit does not have.
    """
    beside = [_beside(page, claim, reviewed) for claim in page.claims]
    said = [_said(claim, at, reviewed) for claim, at in zip(page.claims, beside, strict=True)]
    # every slip works the circuit once more: only for a figure that nothing else explains
    worked = _worked(reviewed) if "" in said else ()
    return tuple(
        _figure(claim, at, reviewed, worked, says) for claim, at, says in zip(page.claims, beside, said, strict=True)
    )


def _said(claim: Claim, beside: Beside, reviewed: Reviewed) -> str:
    """Say what is to be said of a figure without any slip; empty where it takes one."""
    if not (beside.exact if beside.exact is not None else beside.hand):
        return "there is nothing to set beside it"
    if _agrees(claim, beside):
        return "agrees within 2 %"
    return (
        _method(claim, reviewed)
        or _by_hand(claim, beside)
        or _elsewhere(claim, reviewed)
        or _plain_sum(claim, reviewed)
    )


def _figure(claim: Claim, beside: Beside, reviewed: Reviewed, worked: Sequence[SlipWorked], says: str) -> PaperFigure:
    reference = beside.exact if beside.exact is not None else beside.hand
    off = None if not reference else _size(claim) / _matching(claim, reference) - 1.0
    slip, value = "", None
    if not says:
        slip, value, says = _named(claim, beside, reviewed, worked)
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


def _beside(page: Page, claim: Claim, reviewed: Reviewed) -> Beside:
    if claim.kind == "device":
        return _of_device(page, claim, reviewed)
    if claim.kind == "node":
        return _of_node(page, claim, reviewed)
    if claim.key == "gain":
        gains = [row.gain_hand for row in reviewed.hand.stages] if reviewed.hand else []
        known = [gain for gain in gains if gain is not None]
        by_hand = math.prod(known) if known and len(known) == len(gains) else None
        return Beside("gain", reviewed.gain_unit, by_hand, reviewed.bands.midband.gain.real)
    if reviewed.hand is None:
        by_hand = None
    else:
        by_hand = reviewed.hand.hand_f_high_hz if claim.key == "f_high" else reviewed.hand.hand_f_low_hz
    exact = reviewed.f_high if claim.key == "f_high" else reviewed.f_low
    if exact is None:
        side = "above" if claim.key == "f_high" else "below"
        raise problem(
            page.path,
            claim.place,
            f"this circuit has no {claim.key}: the gain {side} mid-band never falls by 3 dB",
            "leave the line out",
        )
    return Beside("f_H" if claim.key == "f_high" else "f_L", "Hz", by_hand, exact)


def _of_node(page: Page, claim: Claim, reviewed: Reviewed) -> Beside:
    row = _row(claim, reviewed)
    if row is None:
        names = ", ".join(node.name for node in reviewed.hand.nodes if not node.second) if reviewed.hand else ""
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


def _of_device(page: Page, claim: Claim, reviewed: Reviewed) -> Beside:
    device = next((one for one in reviewed.devices if fold(one.name) == fold(claim.name)), None)
    if device is None:
        names = ", ".join(one.name for one in reviewed.devices) or "none"
        raise problem(page.path, claim.place, f"there is no device {claim.name}", f"devices here: {names}")
    figures = figures_by_key(device)
    if claim.key not in figures:
        known = ", ".join(figures) or "none"
        raise problem(page.path, claim.place, f"no such figure of {device.name}: {claim.key}", f"there are {known}")
    return Beside(f"{symbol_of(claim.key)} of {device.name}", unit_of(claim.key), None, figures[claim.key])


def _row(claim: Claim, reviewed: Reviewed) -> SignalNode | None:
    rows = reviewed.hand.nodes if reviewed.hand else ()
    wanted = fold(claim.name)
    named = [row for row in rows if fold(row.name) == wanted]
    return next(iter(named + [row for row in rows if wanted in {fold(member) for member in row.members}]), None)


def _size(claim: Claim) -> float:
    """Take gains and currents by size: on paper a sign is left off."""
    return abs(claim.value) if is_signed(claim.key) else claim.value


def _matching(claim: Claim, value: float) -> float:
    return abs(value) if is_signed(claim.key) else value


def _close(claim: Claim, value: float | None, tolerance: float) -> bool:
    if value is None or not math.isfinite(value):
        return False
    return abs(_size(claim) - _matching(claim, value)) <= tolerance * abs(value)


def _agrees(claim: Claim, beside: Beside) -> bool:
    return _close(claim, beside.exact if beside.exact is not None else beside.hand, OFF)


def _method(claim: Claim, reviewed: Reviewed) -> str:
    """Say which classical method gives an edge that is off: then the method is the reason and no slip."""
    methods = [row for row in reviewed.hand.methods if row.edge == claim.key] if reviewed.hand else []
    near = [row for row in methods if row.hz is not None and _close(claim, row.hz, OFF)]
    if not near:
        return ""
    best = min(near, key=lambda row: abs(claim.value / (row.hz or math.inf) - 1.0))
    method = best.method if best.method.startswith("all ") else f"the {best.method}"
    return f"no slip: it is {method}, {engineering(best.hz or 0.0, 'Hz')}, which is off by as much here"


def _by_hand(claim: Claim, beside: Beside) -> str:
    """Say that the figure is the one by hand: then the rules that hand analysis has are the reason and no slip."""
    if not _close(claim, beside.hand, REPRODUCES):
        return ""
    return "no slip: it is the value by hand, which is off by as much here"


def _elsewhere(claim: Claim, reviewed: Reviewed) -> str:
    """Say that a Miller gain is that of another capacitance of the same node, outside or inside r_b."""
    row = _row(claim, reviewed) if claim.key == "miller_gain" else None
    for line in row.lines if row is not None else ():
        for term in line.capacitances:
            if _close(claim, 1.0 - term.exact_factor, REPRODUCES) and term.exact_factor != 1.0:
                return f"no slip: it is the gain across {term.part}, from {line.node}"
    return ""


def _plain_sum(claim: Claim, reviewed: Reviewed) -> str:
    """Say that a capacitance is the sum of the parts with Miller's factors, those behind r_b taken in full."""
    row = _row(claim, reviewed) if claim.key in ("capacitance", "time_constant") else None
    if row is None:
        return ""
    plain = math.fsum(line.capacitance_f for line in row.lines)
    exact = math.fsum(term.farad * term.exact_factor for line in row.lines for term in line.capacitances)
    ohm = 1.0 if claim.key == "capacitance" else row.resistance_exact_ohm
    if not any(_close(claim, ohm * value, OFF) for value in (plain, exact)):
        return ""
    sum_ = f"the plain sum of the parts, {engineering(plain, 'F')}"
    says = sum_ if claim.key == "capacitance" else f"R times {sum_}"
    effective = engineering(row.capacitance_f, "F")
    return f"no slip: it is {says}; those that see a smaller resistance count less, in all {effective}"


def _worked(reviewed: Reviewed) -> Sequence[SlipWorked]:
    """Work the circuit once per slip. Nothing where capacitors set the gain: it has no such mid-band."""
    if reviewed.hand is None or reviewed.bands.gain_setting:
        return ()
    circuit = upper_circuit(reviewed.bands, reviewed.devices)
    found: list[SlipWorked] = []
    for slip in slips(reviewed.bands, circuit, temperature_c=reviewed.temperature_c):
        worked = work(reviewed.bands, reviewed.hand, slip.edit, slip.factor)
        if worked is not None:
            found.append(SlipWorked(slip.id, slip.says, worked, slip.at_nodes))
    if any(row.image for row in reviewed.hand.nodes):
        alone = work(reviewed.bands, reviewed.hand, {}, halves=False)
        if alone is not None:
            says = "one half driven alone, not both in opposite phase,"
            found.append(SlipWorked("half-circuit-ignored", says, alone))
    return found


def _named(
    claim: Claim, beside: Beside, reviewed: Reviewed, worked: Sequence[SlipWorked]
) -> tuple[str, float | None, str]:
    """Name the slip whose value lies nearest to the figure, within 1 %, and that is itself off by more than 2 %."""
    right = beside.exact if beside.exact is not None else beside.hand
    candidates = [
        candidate
        for candidate in _candidates(claim, beside, reviewed, worked)
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


def _candidates(claim: Claim, beside: Beside, reviewed: Reviewed, worked: Sequence[SlipWorked]) -> list[Candidate]:
    found: list[Candidate] = []
    for one in worked:
        if one.at_nodes and claim.kind != "node":
            continue
        values = _values(claim, reviewed, one.slip, one.worked)
        found += [Candidate(one.slip, one.says + how, value) for how, value in values]
    if claim.key == "gain" and beside.exact is not None:
        found += _by_stage(reviewed, worked, beside.exact)
    return [*found, *_two_pi(claim, beside, reviewed), *_series(claim, reviewed), *_device_slips(claim, reviewed)]


def _values(claim: Claim, reviewed: Reviewed, slip: str, worked: Worked) -> list[tuple[str, float]]:
    """Give what the changed circuit makes of the figure; of an edge by every simple method."""
    row = _row(claim, reviewed) if claim.kind == "node" else None
    if row is not None:
        at = worked.nodes[row.name]
        values = [getattr(at, claim.key)]
        if claim.key == "miller_gain" and slip in (OVERALL_GAIN, GM_FOR_G_M) and at.miller_factor is not None:
            values = [at.miller_gain, 1.0 - at.miller_factor]
        if claim.key == "capacitance":
            values.append(at.plain)
        if claim.key == "time_constant":
            values.append(at.resistance * at.plain)
        return [("", float(value)) for value in values if value is not None]
    if claim.key == "gain":
        return [("", worked.gain)]
    if claim.kind == "whole":
        return [(f" ({method})", hz) for (edge, method), hz in worked.edges.items() if edge == claim.key]
    return []


def _by_stage(reviewed: Reviewed, worked: Sequence[SlipWorked], gain: float) -> list[Candidate]:
    """Scale the gain by the load of the stage from which an input resistance is left out, as on paper."""
    rows = [row for row in reviewed.hand.nodes if row.in_path] if reviewed.hand else []
    found = []
    for one in worked:
        if one.slip == INPUT_LEFT_OUT:
            ratios = [one.worked.nodes[row.name].resistance / row.resistance_exact_ohm for row in rows]
            found.append(Candidate(one.slip, one.says, gain * max(ratios, default=1.0)))
    return found


def _two_pi(claim: Claim, beside: Beside, reviewed: Reviewed) -> list[Candidate]:
    """2π forgotten: rad/s for Hz, or a time constant from 1/f."""
    if beside.unit not in ("Hz", "s"):
        return []
    values = [value for value in (beside.exact, beside.hand) if value]
    if reviewed.hand is not None:
        values += [row.hz for row in reviewed.hand.methods if row.edge == claim.key and row.hz]
    return [
        Candidate("two-pi", f"the factor 2π {how}", value * factor)
        for value in values
        for how, factor in (("left out", TWO_PI), ("taken twice", 1.0 / TWO_PI))
    ]


def _series(claim: Claim, reviewed: Reviewed) -> list[Candidate]:
    """Parallel for series and the other way round, one pair at a time, at the node's own branches."""
    row = _row(claim, reviewed) if claim.kind == "node" else None
    if row is None or claim.key not in ("resistance", "time_constant") or reviewed.hand is None:
        return []
    circuit = drawn(reviewed.bands, reviewed.devices, second=row.second)
    own = {resistor.name for resistor in circuit.resistors if _OWN.fullmatch(resistor.name)}
    scale = 1.0 if claim.key == "resistance" else row.time_constant_s / row.resistance_hand_ohm
    wrong = series_slips(circuit, row.lines[0].at, own, bias_network(reviewed.bands, circuit))
    return [Candidate("parallel-for-series", says, ohm * scale) for says, ohm in wrong]


def _device_slips(claim: Claim, reviewed: Reviewed) -> list[Candidate]:
    """gm = I_C/V_T and r_π = β·V_T/I_C with a round V_T; f_T in rad/s."""
    device = next((one for one in reviewed.devices if fold(one.name) == fold(claim.name)), None)
    if claim.kind != "device" or device is None:
        return []
    figures = dict(device.figures)
    found: list[Candidate] = []
    for millivolt in (25, 26):
        ratio = thermal_voltage(reviewed.temperature_c) / (1e-3 * millivolt)
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
    """Give for every device with figures the keys that a page may have for it."""
    return {device.name: tuple(figures_by_key(device)) for device in devices}
