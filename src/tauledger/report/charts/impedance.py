"""Input and output impedance over frequency: size above angle, exact; input and output by colour."""

from __future__ import annotations

import textwrap

from tauledger.record import ImpedanceFacts, Review
from tauledger.report.charts.bode import over_frequency
from tauledger.report.charts.style import blank, light, styled, to_svg
from tauledger.report.impedances import SIDES
from tauledger.report.wording import number

# Two longer ones do not fit beside each other.
WIDEST_NAME, NARROW_NAME = 40, 34
COLORS = {"input": "exact", "output": "faster"}
DASHES = ("-", (0, (5, 2)), (0, (1, 1.4)), (0, (5, 2, 1, 2)))


def impedance_chart(review: Review, *, narrow: bool = False) -> str:
    """Draw |Z| and its angle as SVG; empty where no impedance was asked for."""
    drawn = [one for one in review.impedances if len(one.curve) > 1]
    if not drawn:
        return ""
    with styled():
        from matplotlib.ticker import FuncFormatter, NullLocator

        figure = blank(4.8, narrow=narrow)
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(1.5, 1.0))
        count = dict.fromkeys(COLORS, 0)
        for one in drawn:
            dashes = DASHES[count[one.side] % len(DASHES)]
            count[one.side] += 1
            look = {"color": light(COLORS[one.side]), "linewidth": 1.6}
            hz, ohm, deg = _finite(one)
            name = f"{SIDES[one.side]} {one.name}"
            label = textwrap.fill(name, NARROW_NAME) if narrow else name
            upper.plot(hz, ohm, label=label, linestyle=dashes, **look)
            lower.plot(hz, deg, linestyle=dashes, **look)
        upper.set_xscale("log")
        upper.set_yscale("log")
        upper.set_xlim(drawn[0].curve[0].hz, drawn[0].curve[-1].hz)
        upper.yaxis.set_major_formatter(FuncFormatter(lambda ohm, _: number(ohm, "Ω", 1)))
        upper.yaxis.set_minor_locator(NullLocator())
        upper.set_ylabel("|Z|")
        lower.set_ylabel("angle in degrees")
        over_frequency(upper, lower, narrow=narrow)
        columns = 1 if narrow or max(len(one.name) for one in drawn) > WIDEST_NAME else 2
        upper.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=columns, frameon=False, borderpad=0.0)
        told = "Input and output impedance, size and angle over frequency"
        return to_svg(figure, key="impedance", title=told, narrow=narrow)


def _finite(one: ImpedanceFacts) -> tuple[list[float], list[float], list[float]]:
    found = [
        (point.hz, point.exact_ohm, point.exact_deg)
        for point in one.curve
        if point.exact_ohm is not None and point.exact_deg is not None
    ]
    return [hz for hz, _, _ in found], [ohm for _, ohm, _ in found], [deg for _, _, deg in found]
