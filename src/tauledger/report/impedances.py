"""Input and output impedance as R ‖ C at mid-band and at f_H, exact, simulated, and at mid-band by hand."""

from __future__ import annotations

import math

from tauledger.record import ImpedanceFacts, Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, number

# R of R ‖ C above R of the series form.
WORTH_SAYING = 1.1
# Beyond this reactance over resistance it is the capacitance of an input, and no coupling.
MOSTLY_CAPACITOR = 3.0
SIDES = {"input": "seen by", "output": "out of"}


def impedances(review: Review) -> Section:
    """Give every impedance that was asked for, with the working of its value by hand."""
    if not review.impedances:
        return Section(())
    rows: list[Row] = []
    for one in review.impedances:
        rows.append(Row((title(one), *exact(one), number(one.hand_ohm, "Ω"))))
        if any(simulated(one)):
            rows.append(Row(("  simulated", *simulated(one), "")))
    blocks: list[Block] = [Table("l" + "r" * len(heads(review)), ("IMPEDANCES", *heads(review)), tuple(rows))]
    blocks.extend(Prose(text, lead="  ", hang=4) for text in in_series(review))
    blocks.extend(Prose(one.hand_text, lead="  ", hang=4) for one in review.impedances if one.hand_text)
    return Section(tuple(blocks), major=True)


def in_series(review: Review) -> tuple[str, ...]:
    """Say R and C in series where at mid-band a coupling capacitor still counts: paper takes it as a short."""
    told = []
    for one in review.impedances:
        at = one.points[0]
        if at.real_ohm is None or at.imag_ohm is None or at.parallel_ohm is None:
            continue
        counts = at.parallel_ohm > WORTH_SAYING * at.real_ohm and -at.imag_ohm < MOSTLY_CAPACITOR * at.real_ohm
        if at.imag_ohm < 0.0 < at.real_ohm and counts:
            farad = -1.0 / (2.0 * math.pi * at.hz * at.imag_ohm)
            series = f"{number(at.real_ohm, 'Ω')} in series with {number(farad, 'F', 3)}"
            told.append(f"{title(one)}: at mid-band the same as {series}")
    return tuple(told)


def heads(review: Review) -> tuple[str, ...]:
    """Head the columns: the frequencies, and the value by hand."""
    return (*(f"{point.at}, {number(point.hz, 'Hz', 3)}" for point in review.impedances[0].points), "by hand")


def title(one: ImpedanceFacts) -> str:
    """Say which impedance it is: "seen by VIN, beyond RS", "out of v(out), without RL, CL"."""
    return f"{SIDES[one.side]} {one.of}, {one.says}"


def exact(one: ImpedanceFacts) -> tuple[str, ...]:
    """Write the exact values at every frequency."""
    return tuple(parallel(point.parallel_ohm, point.parallel_farad, point.hz) for point in one.points)


def simulated(one: ImpedanceFacts) -> tuple[str, ...]:
    """Write ngspice's values at every frequency; empty where nothing was simulated."""
    return tuple(
        ""
        if point.simulated_real_ohm is None
        else parallel(point.simulated_parallel_ohm, point.simulated_parallel_farad, point.hz)
        for point in one.points
    )


def parallel(ohm: float | None, farad: float | None, hz: float) -> str:
    """Write R ‖ C, and R ‖ L where the reactance is inductive; what carries less than a millionth is left out."""
    if farad is None:
        return number(ohm, "Ω")
    siemens = 0.0 if ohm is None else 1.0 / ohm
    susceptance = 2.0 * math.pi * hz * farad
    terms = []
    if abs(siemens) > _NOTHING * abs(susceptance):
        terms.append(number(ohm, "Ω"))
    if abs(susceptance) > _NOTHING * abs(siemens):
        henry = -1.0 / (2.0 * math.pi * hz * susceptance)
        terms.append(number(farad, "F", 3) if farad > 0.0 else number(henry, "H", 3))
    return " ‖ ".join(terms) or NO_NUMBER


_NOTHING = 1e-6
