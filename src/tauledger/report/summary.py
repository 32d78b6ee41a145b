"""What was reviewed and how it came out: netlist, drive, output, mid-band, band edges, operating points."""

from __future__ import annotations

import math

from tauledger.quantity import decibel_unit
from tauledger.record import DeviceFacts, DriveFacts, EdgeFacts, MidbandFacts, OutputFacts, Review, Stage
from tauledger.report.layout import STRONG, Block, Prose, Row, Section, Table
from tauledger.report.wording import NO_NUMBER, figure_symbols, move, nominal, number, part_unit

_FIGURES_A_LINE = 9
_STAGES_WORTH_TELLING = 3


def headline(review: Review) -> Section:
    """Name the netlist, the drive with its source resistance, the output with its load, and the temperature."""
    drive = ", ".join(_drive(source, alone=len(review.drive) == 1) for source in review.drive) or "nothing"
    read_past = f"; read past: {review.netlist.read_past}" if review.netlist.read_past else ""
    return Section(
        (
            Prose(review.netlist.title or "(no title)", style=STRONG),
            Prose(f"{review.netlist.path} at {review.temperature_c:.4g} °C{read_past}"),
            Prose(f"{drive}; output {_output(review.output)}", lead="Drive "),
        )
    )


def band(review: Review) -> Section:
    """Give mid-band gain with the plateau's extent, and both band edges from three sources."""
    blocks: list[Block] = [Prose(_midband(review.midband), lead="Mid-band ", style=STRONG)]
    rows = []
    remarks = []
    for name, edge in (("f_L", review.f_low), ("f_H", review.f_high)):
        if edge is None:
            rows.append(Row((name, "none", *[""] * 5)))
            if not any(note.where == name and note.note != "peaking" for note in review.notes):
                remarks.append(_no_edge(name, review.midband))
            continue
        rows.append(_edge_row(name, edge))
        if edge.peaking_at_hz is not None and edge.peaking_db >= 0.01:
            at = number(edge.peaking_at_hz, "Hz")
            remarks.append(f"{name}: the gain rises {edge.peaking_db:.3g} dB above mid-band at {at} first.")
        if edge.hand_hz is not None:
            remarks.extend(_without_lines(name, review))
    head = ("BAND EDGES", "simulated", "exact", "by hand", "phase shift", "peak", "rise time")
    blocks.append(Table("lrrrrrr", head, tuple(rows)))
    blocks.extend(Prose(remark, lead="  ") for remark in remarks)
    return Section(tuple(blocks))


def _without_lines(name: str, review: Review) -> list[str]:
    """Say that a figure by hand leaves out lines that move the edge: what it misses is no fault of the rules."""
    return [
        f"{name}: by hand without {cause.where}, as lines are at DC; that moves it by {move(cause.effect)}."
        for cause in review.causes
        if cause.cause == "line-left-out" and cause.quantity == name
    ]


def operating_points(review: Review, *, verbose: bool = False) -> Section:
    """Give every device's operating point, devices with the same figures in one table, and the stages between them."""
    blocks: list[Block] = []
    groups: dict[tuple[str, ...], list[DeviceFacts]] = {}
    for device in review.devices:
        groups.setdefault(figure_symbols(device), []).append(device)
    for symbols, devices in groups.items():
        for start in range(0, max(len(symbols), 1), _FIGURES_A_LINE):
            part = slice(start, start + _FIGURES_A_LINE)
            head = ("BIAS" if not blocks else "", *symbols[part])
            rows = tuple(
                Row((_device(device), *(number(f.value, f.unit, 3) for f in device.figures[part])))
                for device in devices
            )
            blocks.append(Table("l" + "r" * (len(head) - 1), head, rows))
    halves = any(stage.image for stage in review.stages)
    if review.stages and (len(review.stages) >= _STAGES_WORTH_TELLING or verbose or halves):
        blocks.append(Prose(_stages(review), lead="Stages  "))
    if verbose:
        blocks.extend(Prose(_stage(stage), lead="  ", hang=4) for stage in review.stages)
    return Section(tuple(blocks))


def _stages(review: Review) -> str:
    """Give the gain from each node that all signal crosses to the next; by hand too where that is not the same."""
    told = []
    for stage in review.stages:
        exact, hand = stage.gain_exact, stage.gain_hand
        gain = NO_NUMBER if exact is None else number(exact, "")
        if exact is not None and hand is not None and abs(hand - exact) > 0.01 * abs(exact):
            gain += f" (hand {number(hand, '')})"
        told.append(f"{stage.node} {gain}")
    half = ", in each half" if any(stage.image for stage in review.stages) else ""
    return " → ".join(told) + half


def _stage(stage: Stage) -> str:
    """Say what one stage is, out of what, and why its gain by hand is not the exact one where it is not."""
    of = f" {stage.owner}" if stage.owner else ""
    by_hand = "" if stage.gain_hand is None else f"{number(stage.gain_hand, '')} by hand, "
    gains = f"{by_hand}{number(stage.gain_exact, '')} exact"
    around = f"; {', '.join(stage.around)}" if stage.around else ""
    why = f"; {stage.why}" if stage.why else ""
    there = f" ({stage.image} alike)" if stage.image else ""
    return f"{stage.node}{there}: {stage.role}{of}, gain {gains}; with {', '.join(stage.elements)}{around}{why}"


def _drive(drive: DriveFacts, *, alone: bool) -> str:
    amplitude = complex(drive.amplitude_real, drive.amplitude_imag)
    text = drive.source
    if not alone or amplitude != 1.0:
        unit = "A" if drive.kind == "current" else "V"
        sign = "-" if amplitude.real < 0.0 and amplitude.imag == 0.0 else ""
        text += f" {sign}{nominal(abs(amplitude), unit)}"
        if amplitude.imag:
            text += f" at {math.degrees(math.atan2(amplitude.imag, amplitude.real)):.4g}°"
    if drive.resistance_ohm is not None:
        return f"{text} through {nominal(drive.resistance_ohm, 'Ω')}"
    return f"{text} (current)" if drive.kind == "current" else f"{text} without series resistor"


def _output(output: OutputFacts) -> str:
    if output.kind == "current":
        return f"i({output.through})"
    port = f"v({output.plus})" if output.minus == "0" else f"v({output.plus},{output.minus})"
    if not output.load:
        return f"{port}, no load to ground"
    loads = " ‖ ".join(f"{load.name} {nominal(load.value, part_unit(load.kind))}" for load in output.load)
    return f"{port}, load {loads}"


def _midband(midband: MidbandFacts) -> str:
    gain = complex(midband.gain_real, midband.gain_imag)
    decibel = f"{midband.gain_db:.2f} {decibel_unit(midband.unit)}"
    if abs(gain.imag) <= 1e-2 * abs(gain.real):
        size = number(gain.real, midband.unit)
    else:
        size = f"{number(abs(gain), midband.unit)} at {math.degrees(math.atan2(gain.imag, gain.real)):.3g}°"
    at = "DC" if midband.frequency_hz == 0.0 else number(midband.frequency_hz, "Hz")
    if midband.from_hz is None:
        why = "as asked, on no plateau" if midband.chosen else "the highest gain: there is no plateau"
        return f"{decibel} ({size}) at {at}, {why}"
    start = "DC" if midband.from_hz == 0.0 else number(midband.from_hz, "Hz", 3)
    end = "without upper limit" if midband.to_hz is None else f"to {number(midband.to_hz, 'Hz', 3)}"
    return f"{decibel} ({size}) at {at}, plateau from {start} {end}"


def _edge_row(name: str, edge: EdgeFacts) -> Row:
    phase = NO_NUMBER if edge.phase_deg is None else f"{edge.phase_deg:+.1f}°"
    peak = f"{edge.peaking_db:.2f} dB" if edge.peaking_db >= 0.01 else "none"
    rise = "" if edge.rise_time_s is None else number(edge.rise_time_s, "s", 3)
    hand = number(edge.hand_hz, "Hz") + ("" if edge.difference is None else f" ({move(edge.difference)})")
    return Row((name, number(edge.simulated_hz, "Hz"), number(edge.exact_hz, "Hz"), hand, phase, peak, rise))


def _no_edge(name: str, midband: MidbandFacts) -> str:
    if name == "f_L" and midband.from_hz == 0.0:
        return "f_L: none, the plateau reaches down to DC."
    if name == "f_H" and midband.from_hz is not None and midband.to_hz is None:
        return "f_H: none, the plateau has no upper limit."
    side = "below" if name == "f_L" else "above"
    return f"{name}: none, the gain {side} mid-band never falls by 3 dB."


def _device(device: DeviceFacts) -> str:
    return (
        f"{device.name} {device.kind}" if device.region == "active" else f"{device.name} {device.kind}, {device.region}"
    )
