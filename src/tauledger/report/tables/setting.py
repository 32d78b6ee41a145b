"""Tables of what surrounds the numbers: drive and load, stages, devices, lines of the netlist, versions."""

from __future__ import annotations

import math
import re

from tauledger.record import DeviceFacts, DriveFacts, OutputFacts, Review
from tauledger.report.tables.grid import Column, Grid, GridRow, said
from tauledger.report.tables.upper import counting_nodes, resistors_at
from tauledger.report.wording import NO_NUMBER, figure_symbols, fraction, group_delay, nominal, number, part_unit

# More columns than these are wider than a page.
FIGURES_A_TABLE = 9


def drive_and_load(review: Review) -> Grid:
    """Give the driven sources, the output with its load, and the conditions."""
    rows = [GridRow((f"Drive {drive.source}", _drive(drive))) for drive in review.drive]
    rows.append(GridRow(("Output", output_text(review.output))))
    load = review.output.load
    loads = " ‖ ".join(f"{part.name} {nominal(part.value, part_unit(part.kind))}" for part in load)
    rows.append(GridRow(("Load", loads or "none to ground")))
    rows.append(GridRow(("Mid-band", _plateau(review))))
    rows.append(GridRow(("Temperature", f"{review.temperature_c:.4g} °C")))
    return Grid("Drive, load and conditions", (Column("", "l"), Column("", "l")), tuple(rows))


def output_text(output: OutputFacts) -> str:
    """Write the output as on the command line: v(out), v(a,b) or i(vload)."""
    if output.kind == "current":
        return f"i({output.through})"
    return f"v({output.plus})" if output.minus == "0" else f"v({output.plus},{output.minus})"


def stages(review: Review) -> Grid:
    """Give the gain from each node that all signal crosses to the next."""
    titles = {node.name: node.title for node in review.nodes}
    rows = []
    before = "the source"
    for stage in review.stages:
        what = f"{stage.role} {stage.owner}".strip()
        rows.append(
            GridRow(
                (
                    titles.get(stage.node, stage.node),
                    f"from {before}",
                    what,
                    number(stage.gain_hand, ""),
                    number(stage.gain_exact, ""),
                    ", ".join(stage.elements) or NO_NUMBER,
                ),
                part=stage.node,
            )
        )
        before = stage.node
    heads = (
        Column("Node", "l"),
        Column("gain", "l"),
        Column("stage", "l"),
        Column("by hand"),
        Column("exact"),
        Column("parts at the node", "l"),
    )
    return Grid(
        "Stages in the order of the signal, and the mid-band voltage ratio from each node to the next",
        heads,
        tuple(rows),
    )


def devices(review: Review) -> tuple[Grid, ...]:
    """Give every device at its operating point, devices with the same figures in one table."""
    groups: dict[tuple[str, ...], list[DeviceFacts]] = {}
    for device in review.devices:
        groups.setdefault(figure_symbols(device), []).append(device)
    grids = []
    for symbols, members in groups.items():
        tables = max(1, math.ceil(len(symbols) / FIGURES_A_TABLE))
        size = max(1, math.ceil(len(symbols) / tables))
        for start in range(0, max(len(symbols), 1), size):
            part = slice(start, start + size)
            heads = (Column("Device", "l"), *map(Column, (_together(label) for label in symbols[part])))
            rows = tuple(
                GridRow((_device(device), *(number(figure.value, figure.unit, 3) for figure in device.figures[part])))
                for device in members
            )
            grids.append(Grid("Operating points and small-signal parameters", heads, rows))
    return tuple(grids)


def source_lines(review: Review) -> Grid:
    """Give the lines of the netlist that matter, with the share of their element in both edges."""
    rows = []
    for line in review.lines:
        name = re.match(r"\S*", line.text)
        owner = name.group().casefold() if name else ""
        rows.append(
            GridRow(
                (
                    f"{line.file}:{line.line}",
                    line.text,
                    _makes(review, owner),
                    _share(review, owner, "f_high"),
                    _share(review, owner, "f_low"),
                )
            )
        )
    heads = (
        Column("Line", "l"),
        Column("text", "l"),
        Column("makes R at", "l"),
        Column("share of f_H"),
        Column("share of f_L"),
    )
    caption = "Lines of the netlist that matter, and the resistors that make an R of the upper edge"
    return said(Grid(caption, heads, tuple(rows)))


def _makes(review: Review, owner: str) -> str:
    """Name the nodes of the upper edge whose resistance a resistor makes."""
    told = []
    for node in counting_nodes(review):
        lines = node.working.lines if node.working is not None else ()
        terms = [term for line in lines for term in line.resistances]
        if any(name.rsplit(".", 1)[-1].casefold() == owner for name in resistors_at(terms, review)):
            told.append(node.name)
    return ", ".join(told)


def versions(review: Review) -> Grid:
    """Give what made this report: program, engine, netlist with its checksum."""
    engine = f"{review.engine.name} {review.engine.version}" if review.engine else "none: nothing was simulated"
    rows = [GridRow(("tauledger", review.tauledger)), GridRow(("Simulator", engine))]
    if review.netlist.path:
        rows.append(GridRow(("Netlist", review.netlist.path)))
    if review.netlist.sha256:
        rows.append(GridRow(("SHA-256 of all files read", review.netlist.sha256)))
    if review.netlist.read_past:
        rows.append(GridRow(("Cards that nothing here rests on", review.netlist.read_past)))
    return Grid("Versions", (Column("", "l"), Column("", "l")), tuple(rows))


def sums(review: Review) -> Grid:
    """Set sums beside what they must equal: both are computed in different ways."""
    rows = []
    upper, lower = review.budget.upper, review.budget.lower
    if upper is not None:
        rows.append(
            ("Sum of R·C over all parts", number(upper.sum_s, "s"), "−Σ 1/pole", number(upper.inverse_pole_sum_s, "s"))
        )
        rows.append(
            (
                *("Weighted sum of R·C", number(upper.weighted_sum_s, "s")),
                *(group_delay(review), number(upper.group_delay_s, "s")),
            )
        )
    if lower is not None and lower.sum_hz and lower.pole_sum_hz is not None:
        rows.append(("Sum of lower edges", number(lower.sum_hz, "Hz"), "−Σ pole/2π", number(lower.pole_sum_hz, "Hz")))
    heads = (Column("Sum", "l"), Column("value"), Column("must equal", "l"), Column("value"))
    return Grid("Sums that must come out the same two ways", heads, tuple(map(GridRow, rows)))


def _together(label: str) -> str:
    return "C_μ + C_bx" if label == "C_μ+bx" else label


def _device(device: DeviceFacts) -> str:
    region = "" if device.region == "active" else f", {device.region}"
    return f"{device.name} {device.kind}{region}"


def _drive(drive: DriveFacts) -> str:
    amplitude = complex(drive.amplitude_real, drive.amplitude_imag)
    text = number(abs(amplitude), "A" if drive.kind == "current" else "V")
    text += " AC, small-signal"
    angle = math.degrees(math.atan2(amplitude.imag, amplitude.real))
    if angle:
        text += f" at {angle:.4g}°"
    if drive.resistance_ohm is not None:
        return f"{text} through {nominal(drive.resistance_ohm, 'Ω')}"
    return f"{text}, {drive.kind} source" + ("" if drive.kind == "current" else " without series resistor")


def _plateau(review: Review) -> str:
    midband = review.midband
    at = "DC" if midband.frequency_hz == 0.0 else number(midband.frequency_hz, "Hz")
    if midband.from_hz is None:
        return f"{at}, the highest gain: there is no plateau"
    start = "DC" if midband.from_hz == 0.0 else number(midband.from_hz, "Hz", 3)
    end = "without upper limit" if midband.to_hz is None else f"to {number(midband.to_hz, 'Hz', 3)}"
    return f"{at}; flat, with a slope of at most 2 dB a decade, from {start} {end}"


def _share(review: Review, owner: str, edge: str) -> str:
    shares = [
        part.share.f_high if edge == "f_high" else part.share.f_low
        for part in review.parts
        if part.owner.rsplit(".", 1)[-1].casefold() == owner
    ]
    told = [share for share in shares if share is not None]
    if not told:
        return NO_NUMBER
    return fraction(math.fsum(told))
