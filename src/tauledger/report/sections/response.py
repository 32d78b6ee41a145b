"""The sections on the response: over frequency, at single frequencies, its peaking, and beside a measured curve."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.blocks import Block, Picture, Prose, Section
from tauledger.report.curve import differs_text, explains_text, level_text
from tauledger.report.shown import unity_shown
from tauledger.report.tables import at as frequencies
from tauledger.report.tables import curve as measured


def bode_section(review: Review) -> Section:
    """Give the frequency response."""
    if review.curves is None:
        return Section("bode", "", ())
    caption = (
        "Magnitude and phase over frequency; dotted lines at the band edges, poles × and zeros ○ at the foot of the "
        "magnitude, named as in the table of poles and zeros. Dashed, by hand: mid-band gain with a pole of its own "
        "for every node and every capacitor that counts, without zeros and without the load of one on the other; it "
        "serves near the band, and far from it is off by tens of dB. Phase: of the output against the drive at 0°."
    )
    if review.curve is not None:
        caption += " Squares: the measured curve at the level of the simulation."
        if review.curve.strays:
            caption += " Dotted: ngspice with the stray capacitance that explains it best."
    if unity_shown(review):
        caption += " A dotted line stands at f_u too; the bar on it is the phase margin."
    return Section("bode", "Frequency response", (Picture("bode", caption),), ("Pole, zero",))


def at_section(review: Review) -> Section:
    """Give gain and phase at each frequency that was asked for."""
    if not review.at:
        return Section("at", "", ())
    grids = [frequencies.at_elements(one) for one in review.at if one.elements]
    blocks: tuple[Block, ...] = (frequencies.gain_and_phase(review), *grids)
    return Section("at", "Gain and phase at a frequency", blocks)


def peaking_section(review: Review) -> Section:
    """Give each peak, and who makes it."""
    blocks: list[Block] = []
    for one in review.peaking:
        blocks.append(frequencies.peak(one))
        if one.elements:
            blocks.append(frequencies.peak_elements(one))
    return Section("peaking", "Peaking", tuple(blocks), ("Recomputed",) if blocks else ())


def curve_section(review: Review) -> Section:
    """Give the measured curve beside the simulation."""
    curve = review.curve
    if curve is None:
        return Section("measured", "", ())
    blocks: list[Block] = [measured.measured_edges(curve)] if curve.figures else []
    blocks += [Prose(level_text(curve)), Prose(differs_text(curve)), Prose(explains_text(review, curve))]
    return Section("measured", "The measured curve", tuple(blocks))
