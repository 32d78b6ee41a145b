"""A measured curve beside the simulation: its band edges, where it leaves, and the stray that would explain it."""

from __future__ import annotations

import math

from tauledger.record import CurveFacts, CurveFigure, CurveLeaves, Review, StrayFacts
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, move, network_rejected, number

FIGURES = {"f_low": "f_L", "f_high": "f_H", "f_unity": "f_u"}
OFF_BY = {"gain": "1 dB in gain", "phase": "5° in phase"}
# A probe or a transformer that is turned round, and not one that is late.
INVERTED_DEG = 150.0
# Less than what is printed of them.
SAME_DB, SAME_DEG = 0.005, 0.05


def measured_curve(review: Review) -> Section:
    """Give the measured band edges beside the simulated ones, and below them what differs and what would explain it."""
    curve = review.curve
    if curve is None:
        return Section(())
    rows = tuple(
        Row((FIGURES[figure.figure], number(figure.measured_hz, "Hz"), number(figure.simulated_hz, "Hz"), off(figure)))
        for figure in curve.figures
    )
    blocks: list[Block] = [Table("lrrr", ("MEASURED CURVE", "measured", curve.against, "off by"), rows)]
    told = (level_text(curve), differs_text(curve), explains_text(review, curve))
    blocks += [Prose(text, lead="  ", hang=4) for text in told]
    return Section(tuple(blocks), major=True)


def off(figure: CurveFigure) -> str:
    """Write by how much a measured frequency lies off the simulated one."""
    return move(figure.measured_hz / figure.simulated_hz - 1.0) if figure.simulated_hz else NO_NUMBER


def level_text(curve: CurveFacts) -> str:
    """Say what was read, and the level at mid-band that was taken out."""
    first, last = curve.points[0], curve.points[-1]
    read = f"{curve.file}: {len(curve.points)} points, {number(first.frequency_hz, 'Hz', 3)} to "
    read += number(last.frequency_hz, "Hz", 3)
    told = []
    if abs(curve.offset_db) >= SAME_DB:
        told.append(f"{abs(curve.offset_db):.2f} dB {'above' if curve.offset_db > 0.0 else 'below'}")
    turned, inverted = curve.offset_deg, False
    if turned is not None and abs(turned) >= INVERTED_DEG:
        turned, inverted = turned - math.copysign(180.0, turned), True
    if turned is not None and abs(turned) >= SAME_DEG:
        told.append(f"{abs(turned):.1f}° {'ahead of' if turned > 0.0 else 'behind'}")
    if not told and not inverted:
        return f"{read}; at mid-band the same as {_against(curve)}."
    where = f"at {number(curve.level_from_hz, 'Hz', 3)}"
    if curve.level_to_hz > curve.level_from_hz:
        where = f"from {number(curve.level_from_hz, 'Hz', 3)} to {number(curve.level_to_hz, 'Hz', 3)}"
    lies = f"lies {' and '.join(told)} {_against(curve)}" if told else ""
    said = ", and ".join(filter(None, ("is inverted" if inverted else "", lies)))
    return f"{read}; {where} it {said}, which is taken out."


def differs_text(curve: CurveFacts) -> str:
    """Say where the curve leaves the simulation, and its largest differences."""
    phase = curve.largest_deg is not None
    if curve.leaves:
        places = " and ".join(_leaves(place) for place in curve.leaves)
        text = f"Leaves {_against(curve)} {places}"
    else:
        text = f"Nowhere off by {OFF_BY['gain']}{' or ' + OFF_BY['phase'] if phase else ''}"
    told = []
    if abs(curve.largest_db) >= SAME_DB:
        told.append(f"{curve.largest_db:+.2f} dB at {number(curve.largest_db_at_hz, 'Hz', 3)}")
    if curve.largest_deg is not None and abs(curve.largest_deg) >= SAME_DEG:
        told.append(f"{curve.largest_deg:+.1f}° at {number(curve.largest_deg_at_hz, 'Hz', 3)}")
    return f"{text}; largest difference {' and '.join(told)}." if told else f"{text}."


def explains_text(review: Review, curve: CurveFacts) -> str:
    """Say which stray capacitance would explain the curve best, how well, and what proves it; or that none does."""
    if curve.rms_db is None:
        return "Fewer than three points from mid-band up: no stray capacitance is looked for."
    if curve.explains == "not sought" or network_rejected(review):
        return "No stray capacitance is looked for, for the rebuilt network is not ngspice's."
    points = f"over {curve.fitted_points} points from mid-band up"
    if curve.explains == "nothing to explain":
        return f"Nothing to explain: the rms difference is {curve.rms_db:.2f} dB {points}."
    if not curve.strays:
        return f"No single capacitance explains it: none halves the rms difference of {curve.rms_db:.2f} dB {points}."
    best, *others = curve.strays
    falls = f"{curve.rms_db:.2f} dB → {best.rms_db:.2f} dB"
    text = f"{place_text(best)} would explain it best: rms difference {falls} {points}"
    if best.rerun:
        measured = next((figure.measured_hz for figure in curve.figures if figure.figure == "f_high"), None)
        text += "; run in ngspice with it"
        if best.f_high_rerun_hz is not None:
            text += f": f_H {number(best.f_high_rerun_hz, 'Hz')}"
            text += "" if measured is None else f", measured {number(measured, 'Hz')}"
    text += "".join(f". Hardly worse: {place_text(other)}, {other.rms_db:.2f} dB" for other in others)
    return f"{text}."


def place_text(stray: StrayFacts) -> str:
    """Write a capacitance with its place: "12.0 pF from out to ground"."""
    farad = number(stray.capacitance_f, "F", 3)
    return (
        f"{farad} from {stray.plus} to ground"
        if stray.minus == "0"
        else f"{farad} between {stray.plus} and {stray.minus}"
    )


def _leaves(place: CurveLeaves) -> str:
    return f"{place.side} {number(place.frequency_hz, 'Hz', 3)} (off by {OFF_BY[place.by]})"


def _against(curve: CurveFacts) -> str:
    return "ngspice" if curve.against == "simulated" else "the exact curve"
