"""What the reader must know about the numbers: notes have no effect in per cent.

A hazardous supply is not a note but a caution: it concerns the reader, not the numbers.
"""

from __future__ import annotations

import math

import numpy as np

from tauledger.causes.cause import Note
from tauledger.causes.evidence import EdgeEvidence, Evidence, in_hertz, in_words
from tauledger.circuit import GROUND
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.midband import frequency_range
from tauledger.network.solve import response
from tauledger.quantity import engineering, percent

HALF_SHORT = (0.3, 0.95)
WORTH_A_SHARE = 0.02
PEAKS_DB = 0.5
# ln of a frequency: a pair of poles so near is what makes a peak.
NEXT_TO_THE_PEAK = 0.3
# Of residues, whose sum is known: more off than this, and poles lie too close for them.
SUM_HOLDS = 1e-6
STEP_POINTS = 2000
TOLD = 3
DRIVEN_TERMINALS = ("base", "gate", "emitter", "source")


def unstable(evidence: Evidence) -> Note | None:
    """A pole in the right half plane: no band edge has a meaning."""
    right = [complex(pole) for pole in evidence.poles if pole.real > 1e-9 * abs(pole) and pole.imag >= 0]
    if not right:
        return None
    at = ", ".join(in_hertz(abs(pole) / (2 * math.pi)) for pole in right[:3])
    return Note(
        "unstable",
        f"pole at {at}",
        f"pole in the right half plane at {at}: the circuit is not stable at this operating point, an AC response is "
        "calculated all the same but never settles to it",
    )


def stepped_operating_point(evidence: Evidence) -> Note | None:
    """The engine found the operating point only by gmin or source stepping."""
    if not evidence.stepped:
        return None
    return Note(
        "stepped-operating-point",
        "",
        "ngspice found the operating point only by stepping (gmin or sources): the circuit may have a second one; "
        "check the bias before trusting any figure",
    )


def no_plateau(evidence: Evidence) -> Note | None:
    """The response has no flat part; how much of the gain with ideal couplings is left where |H| is largest."""
    midband = evidence.bands.midband
    if midband.plateau:
        return None
    left = ""
    ideal = _ideal_gain(evidence)
    if ideal:
        loss = abs(midband.gain) / ideal - 1.0
        left = f" ({percent(loss)} against all couplings short and all device and load capacitances open)"
    return Note(
        "no-plateau",
        in_hertz(midband.frequency_hz),
        f"there is no plateau: the reference is |H| at {in_hertz(midband.frequency_hz)}{left}; band edges and shares "
        "refer to it, the tables by hand are withheld",
    )


def hand_withheld(evidence: Evidence) -> Note | None:
    """No choice of shorts and opens restores the mid-band gain within 2 %."""
    if evidence.bands.sound or not evidence.bands.midband.plateau:
        return None
    return Note(
        "hand-withheld",
        "",
        "taking every capacitor as a short or an open misses the mid-band gain by more than 2 %: the tables by hand "
        "are withheld",
    )


def levels_off_above(evidence: Evidence) -> Note | None:
    """Poles act above mid-band, but |H| never falls 3 dB below it."""
    combined = evidence.upper.combined
    acts = len(combined.roots.poles) > 0 if combined is not None else len(evidence.poles) > 0
    if evidence.upper.hz is not None or not acts or evidence.lines:
        return None
    reach = frequency_range(evidence.poles, evidence.zeros)
    if reach is None:
        return None
    level = abs(response(evidence.bands.network, np.array([reach[1]]))[0] / evidence.bands.midband.gain)
    return Note(
        "levels-off",
        "f_H",
        f"|H| levels off at {_decibel(level)} of mid-band and never falls 3 dB: there is no f_H, and a time constant "
        "here is no band edge",
    )


def levels_off_below(evidence: Evidence) -> Note | None:
    """The reference lies above DC, but |H| never falls 3 dB below it on the way down."""
    midband = evidence.bands.midband
    if evidence.lower.hz is not None or midband.reaches_dc or midband.from_hz == 0.0 or evidence.lines:
        return None
    reach = frequency_range(evidence.poles, evidence.zeros)
    if reach is None:
        return None
    level = abs(response(evidence.bands.network, np.array([reach[0]]))[0] / midband.gain)
    return Note(
        "levels-off",
        "f_L",
        f"|H| levels off towards DC at {_decibel(level)} of mid-band and never falls 3 dB: there is no f_L",
    )


def ill_conditioned_above(evidence: Evidence) -> Note | None:
    """|H| falls so slowly at f_H that small changes move it far."""
    return _ill_conditioned(evidence.upper)


def ill_conditioned_below(evidence: Evidence) -> Note | None:
    """|H| falls so slowly at f_L that small changes move it far."""
    return _ill_conditioned(evidence.lower)


def further_crossings_above(evidence: Evidence) -> Note | None:
    """|H| comes back within 3 dB of mid-band above f_H."""
    return _further(evidence.upper)


def further_crossings_below(evidence: Evidence) -> Note | None:
    """|H| comes back within 3 dB of mid-band below f_L."""
    return _further(evidence.lower)


def peaking_above(evidence: Evidence) -> Note | None:
    """|H| rises above mid-band before f_H."""
    return _peaking(evidence, evidence.upper)


def peaking_below(evidence: Evidence) -> Note | None:
    """|H| rises above mid-band before f_L."""
    return _peaking(evidence, evidence.lower)


def negative_share_above(evidence: Evidence) -> Note | None:
    """Capacitances of which more raises f_H."""
    return _speeds_up(evidence, evidence.upper)


def negative_share_below(evidence: Evidence) -> Note | None:
    """Capacitances of which more raises f_L."""
    return _speeds_up(evidence, evidence.lower)


def neither_short_nor_open(evidence: Evidence) -> Note | None:
    """Capacitors that are neither clearly short nor clearly open at mid-band (0.3 < r < 0.95)."""
    low, high = HALF_SHORT
    capacitors = {part.name for part in evidence.bands.network.parts if part.kind == "capacitance"}
    capacitors -= evidence.bands.gain_setting
    between = {name: ratio for name, ratio in evidence.bands.ratio.items() if name in capacitors and low < ratio < high}
    if not between:
        return None
    names = ", ".join(between)
    say = "is" if len(between) == 1 else "are"
    each = ", ".join(f"{ratio:.2f}" for ratio in between.values())
    return Note(
        "neither-short-nor-open",
        names,
        f"{names} {say} neither short nor open at {in_hertz(evidence.bands.midband.frequency_hz)} ({each} on a scale "
        "from 0, open, to 1, short): figures by hand are rough",
    )


def tuned(evidence: Evidence) -> Note | None:
    """Reactances in resonance at mid-band."""
    parts = evidence.bands.network.parts
    tied = {owner for part in parts if part.kind == "mutual inductance" for owner in (part.owner, *part.references)}
    loose = {part.name for part in parts if part.owner not in tied}
    names = [name for name, kind in evidence.bands.class_of.items() if kind == "tuned" and name in loose]
    if not names:
        return None
    told = ", ".join(names)
    return Note(
        "tuned",
        told,
        f"{told} {'is' if len(names) == 1 else 'are'} in resonance at "
        f"{in_hertz(evidence.bands.midband.frequency_hz)}: neither short nor open, no time constant by hand",
    )


def coupled(evidence: Evidence) -> Note | None:
    """Coupled inductors, which are taken as neither short nor open."""
    pairs = [part.references for part in evidence.bands.network.parts if part.kind == "mutual inductance"]
    names = ", ".join(dict.fromkeys(name for pair in pairs for name in pair))
    if not names:
        return None
    return Note(
        "coupled",
        names,
        f"{names} are coupled: neither short nor open at mid-band, they count in the response, the band edges and "
        "their shares, these with k held, and have no time constant by hand",
    )


def ideal_drive(evidence: Evidence) -> Note | None:
    """A driven voltage source sits on a transistor's input with no resistance in between, but the device's own."""
    network, merged = evidence.bands.network, evidence.bands.merged
    driven: dict[str, str] = {}
    for part in network.parts:
        if part.kind == "voltage source" and network.amplitude(part) != 0:
            driven |= {merged[node]: part.owner for node in part.nodes if merged[node] != GROUND}
    for device in evidence.devices:
        for terminal in device.terminals:
            source = driven.get(merged.get(terminal.outer, terminal.outer))
            if source is not None and device.cell is not None and terminal.word in DRIVEN_TERMINALS:
                own = (
                    "" if terminal.inner == terminal.outer else _own_resistance(network, terminal.outer, terminal.inner)
                )
                return _ideal(source, f"{terminal.word} of {device.name} ({terminal.outer})", own)
    charged = {node for part in evidence.bands.upper.parts if part.kind == "capacitance" for node in part.nodes}
    for part in network.parts:
        if part.kind == "transconductance" and not evidence.devices:
            for node in part.nodes[2:]:
                source = driven.get(merged[node])
                if source is not None and merged[node] in charged:
                    return _ideal(source, f"input of {part.owner} ({node})", "")
    return None


def model_without_charge(evidence: Evidence) -> Note | None:
    """Transistors whose model gives them no capacitance at all."""
    names = ", ".join(device.name for device in evidence.devices if device.without_charge)
    if not names:
        return None
    return Note(
        "model-without-charge",
        names,
        f"the model of {names} has no capacitance (no junction capacitance, no transit time): f_H leaves out the "
        "device altogether and comes out too high",
    )


def as_rebuilt(evidence: Evidence) -> Note | None:
    """What the device families say of how they rebuilt a device."""
    told = [device for device in evidence.devices if device.remarks]
    if not told:
        return None
    says = "; ".join(remark for device in told for remark in device.remarks)
    return Note("as-rebuilt", ", ".join(device.name for device in told), says)


def _ill_conditioned(edge: EdgeEvidence) -> Note | None:
    if edge.hz is None or edge.slope is None or edge.found is None or not edge.found.shallow:
        return None
    told = " and ".join(
        f"-{decibel} dB is at {in_hertz(hz)}" if hz is not None else f"-{decibel} dB is never reached"
        for decibel, hz in ((1, edge.found.minus_1_db_hz), (6, edge.found.minus_6_db_hz))
    )
    return Note(
        "ill-conditioned-edge",
        edge.quantity,
        f"the edge lies on a shelf: |H| falls by only {abs(edge.slope) * 20:.2g} dB per decade at {edge.quantity}, "
        f"small changes move it far, no node limits it; {told}",
    )


def _further(edge: EdgeEvidence) -> Note | None:
    if edge.found is None or not edge.found.further_hz:
        return None
    ways = ("comes back within 3 dB at", "falls again at")
    told = ", ".join(f"{ways[k % 2]} {in_hertz(hz)}" for k, hz in enumerate(edge.found.further_hz[:TOLD]))
    return Note("further-crossings", edge.quantity, f"beyond {edge.quantity} |H| {told}: {edge.quantity} is the first")


def _peaking(evidence: Evidence, edge: EdgeEvidence) -> Note | None:
    found = edge.found
    if found is None or found.peaking_at_hz is None or found.peaking_db < PEAKS_DB:
        return None
    peaks = f"|H| peaks {found.peaking_db:.3g} dB above mid-band at {in_hertz(found.peaking_at_hz)}"
    if evidence.lines:
        names = ", ".join(line.owner for line in evidence.lines)
        return Note("peaking", edge.quantity, f"{peaks}; reflections on {names} may make it")
    beside = 2.0 * np.pi * found.peaking_at_hz
    sharp = [p for p in evidence.poles if p.imag > 0.0 and abs(p) > np.sqrt(2.0) * abs(p.real)]
    pair = min(sharp, key=lambda p: abs(np.log(abs(p) / beside)), default=None)
    told = ""
    if pair is not None and abs(np.log(abs(pair) / beside)) < NEXT_TO_THE_PEAK and pair.real < 0.0:
        told = f", next to the pair of poles at {in_hertz(abs(pair) / (2.0 * np.pi))} with Q = {_quality(pair):.2f}"
    overshoot = _overshoot(evidence) if edge.edge == "f_high" else None
    step = f"; a step overshoots by {percent(overshoot).removeprefix('+')}" if overshoot is not None else ""
    return Note("peaking", edge.quantity, f"{peaks}{told}{step}")


def _quality(pole: complex) -> float:
    return float(abs(pole) / (-2.0 * pole.real))


def _overshoot(evidence: Evidence) -> float | None:
    """Give the overshoot of the step response as a fraction of its final value, exact, by residues.

    y(t) = 1 + Σ c·exp(p·t) with c = −Π(1 − p/z)/Π(1 − p/p_j) over the other poles. None where the band does not reach
    DC, where delays or a pole to the right of the axis leave no such sum, and where poles lie so close that the sum at
    t = 0 is not what the highest powers of s make it.
    """
    poles, zeros = evidence.poles, evidence.zeros
    rational = not evidence.bands.network.delayed and np.all(poles.real < 0.0) and np.all(zeros != 0.0)
    if evidence.bands.midband.from_hz != 0.0 or not rational or len(zeros) > len(poles):
        return None
    others = 1.0 - poles[:, None] / poles
    np.fill_diagonal(others, 1.0)
    if not np.all(others):
        return None
    c = -np.prod(1.0 - poles[:, None] / zeros, axis=1) / np.prod(others, axis=1)
    at_once = (np.prod(poles) / np.prod(zeros)).real if len(zeros) == len(poles) else 0.0
    if abs(1.0 + c.sum() - at_once) > SUM_HOLDS:
        return None
    slowest, fastest = np.min(-poles.real), np.max(np.abs(poles))
    ringing = np.min(np.abs(poles[poles.imag != 0.0]), initial=fastest)
    time = np.concatenate(
        [np.geomspace(1e-2 / fastest, 10.0 / slowest, STEP_POINTS), np.linspace(0.0, 40.0 / ringing, STEP_POINTS)]
    )
    response_to_step = 1.0 + (np.exp(np.multiply.outer(time, poles)) @ c).real
    return float(max(response_to_step.max() - 1.0, 0.0))


def _speeds_up(evidence: Evidence, edge: EdgeEvidence) -> Note | None:
    parts = {part.name: part for part in evidence.bands.network.parts if part.kind == "capacitance" and part.value > 0}
    raising = sorted(
        (name for name, share in edge.shares.items() if share <= -WORTH_A_SHARE and name in parts),
        key=lambda name: edge.shares[name],
    )[:TOLD]
    if not raising:
        return None
    named = ", ".join(f"{in_words(parts[name])} ({percent(edge.shares[name])})" for name in raising)
    has = "has a negative share" if len(raising) == 1 else "have negative shares"
    says = f"{named} {has} in {edge.quantity}: adding capacitance there raises the edge"
    return Note("negative-share", edge.quantity, says)


def _ideal_gain(evidence: Evidence) -> float | None:
    bands = evidence.bands
    if bands.upper is bands.network:
        return None
    try:
        return float(abs(response(bands.upper, np.zeros(1))[0]))
    except NetworkError:
        return None


def _own_resistance(network: Network, outer: str, inner: str) -> str:
    siemens = sum(
        part.value for part in network.parts if part.kind == "conductance" and set(part.nodes) == {outer, inner}
    )
    return f" but the device's own {engineering(1 / siemens, 'Ω', 3)}" if siemens > 0 else ""


def _ideal(source: str, where: str, own: str) -> Note:
    return Note(
        "ideal-drive",
        where,
        f"{source} drives the {where} with no resistance in between{own}: the capacitance there costs nothing, a real "
        "source does not do that; put its resistance into the netlist",
    )


def _decibel(level: float) -> str:
    return f"{20 * math.log10(level):+.2g} dB" if level > 0 else "at zero"
