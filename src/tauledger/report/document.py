"""The report as data: sections in the order in which a reviewer asks, each with tables, figures and sentences.

HTML and Markdown print the same document; a figure is named here and drawn where the format can show it.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Literal

from msgspec import Struct

from tauledger.record import CauseFacts, Review
from tauledger.report.charts.bars import bars_text
from tauledger.report.curve import differs_text, explains_text, level_text
from tauledger.report.drawing.stage import MOST_STAGES, drawable
from tauledger.report.sentences import (
    Answer,
    KeyFigure,
    answers,
    believed,
    cause_text,
    drive_sentence,
    headline,
    key_figures,
    note_text,
    plain,
    sentence,
    unity_shown,
)
from tauledger.report.tables import at as frequencies
from tauledger.report.tables import curve as measured
from tauledger.report.tables import helps, large_signal, lower, outside, phase, roots, setting, unity, upper, wants, way
from tauledger.report.tables.grid import Grid
from tauledger.report.tables.working import Lines, working
from tauledger.report.wording import EDGE, fraction, move, withheld
from tauledger.report.working import node_title

FigureName = Literal["time", "shares", "way", "bode", "stages", "plane", "loop", "impedance"]


class Prose(Struct, frozen=True):
    """A paragraph."""

    text: str


class Picture(Struct, frozen=True):
    """A figure: which one, and its caption."""

    name: FigureName
    caption: str


class Item(Struct, frozen=True):
    """One cause, note or caution: what leads it ("f_H −25 %"), the sentences."""

    lead: str
    text: str


class Items(Struct, frozen=True):
    """A list of causes, notes or cautions."""

    items: tuple[Item, ...]


class Folded(Struct, frozen=True):
    """Something a reader opens: its title, and what is in it."""

    title: str
    blocks: tuple[Prose | Lines | Grid, ...]


Block = Prose | Picture | Items | Folded | Grid


class Section(Struct, frozen=True):
    """One section; terms: those that first come up here, by name."""

    key: str
    title: str
    blocks: tuple[Block, ...]
    terms: tuple[str, ...] = ()


class Document(Struct, frozen=True):
    """The whole report; warning: what must be read before anything else."""

    title: str
    subtitle: str
    headline: str
    figures: tuple[KeyFigure, ...]
    answers: tuple[Answer, ...]
    sections: tuple[Section, ...]
    warning: str = ""


def document(review: Review) -> Document:
    """Arrange a review for reading."""
    sections = (
        _drive(review),
        _set(review),
        _budget(review),
        _time(review),
        _shares(review),
        _unity(review),
        _at(review),
        _peaking(review),
        _way(review),
        _bode(review),
        _causes(review),
        _loops(review),
        _helps(review),
        _large_signal(review),
        _modes(review),
        _outputs(review),
        _impedances(review),
        _own(review),
        _curve(review),
        _lower(review),
        _stages(review),
        _devices(review),
        _roots(review),
        _phase(review),
        _wants(review),
        _lines(review),
        _proof(review),
        _trust(review),
    )
    rejected = review.agreement is not None and review.agreement.max_relative_error > 1e-6
    return Document(
        title=review.netlist.title or "(no title)",
        subtitle=_subtitle(review),
        headline=headline(review),
        figures=key_figures(review),
        answers=answers(review),
        sections=tuple(section for section in sections if section.blocks),
        warning=believed(review) if rejected else "",
    )


def _subtitle(review: Review) -> str:
    path = review.netlist.path or "network built from parts"
    return f"{path} at {review.temperature_c:.4g} °C. {drive_sentence(review)}"


def _drive(review: Review) -> Section:
    return Section(
        "drive",
        "Drive and load",
        (setting.drive_and_load(review),),
        ("Mid-band", "Band edge", "By hand, exact, simulated"),
    )


def _budget(review: Review) -> Section:
    blocks: list[Block] = []
    if withheld(review):
        blocks.append(Prose(withheld(review)))
    nodes = upper.counting_nodes(review)
    if nodes:
        blocks.append(upper.budget(review))
        blocks.extend(
            Folded(
                f"Working, in Ω and S: {node_title(node)}, share of f_H {fraction(node.share.f_high)}",
                working(node, review),
            )
            for node in nodes
            if node.working is not None
        )
    rest = upper.smaller_nodes(review)
    if rest.rows:
        blocks.append(Folded(rest.caption, (rest,)))
    return Section(
        "budget",
        "The time-constant budget of the upper edge",
        tuple(blocks),
        ("Signal node", "R", "Time constant", "Miller factor", "1 pF more", *_charges(review)),
    )


def _charges(review: Review) -> tuple[str, ...]:
    """Give the terms of a bipolar transistor's capacitances that no schematic shows."""
    said = (("c_bx", "C_bx"), ("cexbc", "dQ_be/dV_bc"))
    return tuple(term for label, term in said if any(part.name == f"{part.owner}.{label}" for part in review.parts))


def _time(review: Review) -> Section:
    picture = Picture(
        "time",
        "R·C of every capacitance that matters, by hand above exact, under the node where it counts most. With "
        "those too small to show the bars add up to the sum of time constants." + bars_text(review),
    )
    return Section("time", "Where the time goes", (picture,) if upper.counting_nodes(review) else ())


def _shares(review: Review) -> Section:
    if not upper.by_share(review):
        return Section("shares", "", ())
    picture = Picture(
        "shares",
        "Share of f_H, exact, taken at the edge itself. The order may differ from that of the time constants above, "
        "which hold at mid-band: between there and f_H the gain that multiplies a capacitance falls.",
    )
    return Section("shares", "Whose capacitance sets f_H", (picture, upper.shares(review)), ("Share", "Recomputed"))


def _unity(review: Review) -> Section:
    facts = review.f_unity
    if facts is None or not facts.elements:
        return Section("unity", "", ())
    blocks: list[Block] = [unity.unity_gain(facts), unity.who_sets(facts)]
    if facts.nodes:
        blocks.append(unity.at_nodes(facts))
    return Section("unity", "Unity gain", tuple(blocks), ("Unity gain, phase margin, gain margin", "Recomputed"))


def _at(review: Review) -> Section:
    if not review.at:
        return Section("at", "", ())
    grids = [frequencies.at_elements(one) for one in review.at if one.elements]
    blocks: tuple[Block, ...] = (frequencies.gain_and_phase(review), *grids)
    return Section("at", "Gain and phase at a frequency", blocks)


def _peaking(review: Review) -> Section:
    blocks: list[Block] = []
    for one in review.peaking:
        blocks.append(frequencies.peak(one))
        if one.elements:
            blocks.append(frequencies.peak_elements(one))
    return Section("peaking", "Peaking", tuple(blocks), ("Recomputed",) if blocks else ())


def _way(review: Review) -> Section:
    blocks: list[Block] = []
    if way.way(review, "f_high"):
        blocks.append(Picture("way", "Estimates of f_H, each with one more thing taken into account."))
        blocks.append(way.way_table(review, "f_high"))
        methods = way.methods_table(review, "f_high")
        if methods.rows:
            blocks.append(Folded(methods.caption, (methods,)))
    title = "From paper to simulation"
    return Section(
        "way", title, tuple(blocks), ("Slowest node alone", "Sum of time constants", "Coefficients b₁, b₂", "σ")
    )


def _bode(review: Review) -> Section:
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


def _causes(review: Review) -> Section:
    if withheld(review):
        return Section("causes", "", ())
    differ = _items([cause for cause in review.causes if not cause.on_paper], review)
    kept = _items([cause for cause in review.causes if cause.on_paper], review)
    blocks: list[Block] = [Items(differ) if differ else Prose("Nothing of note above 2 %.")]
    if kept:
        blocks += [
            Prose("The figures by hand here take the following into account; paper that leaves it out is off by:"),
            Items(kept),
        ]
    return Section("causes", "Why paper and simulation differ", tuple(blocks))


def _loops(review: Review) -> Section:
    if not review.loops:
        return Section("loop", "", ())
    from tauledger.report.tables import loop

    blocks: list[Block] = []
    for k, facts in enumerate(review.loops):
        blocks.append(loop.figures(facts))
        if k == 0:
            margin = "|T| = 1 at the dot, where the phase is above -180° by the margin."
            blocks.append(Picture("loop", f"Return ratio T, {loop.place(facts)}: {margin}"))
        told = [Item(lead, text) for lead, texts in loop.told(facts) for text in texts]
        if told:
            blocks.append(Items(tuple(told)))
        if facts.estimates:
            blocks.append(loop.estimates(facts))
    return Section("loop", "Feedback", tuple(blocks), ("Return ratio",))


def _items(causes: Iterable[CauseFacts], review: Review) -> tuple[Item, ...]:
    return tuple(
        Item(f"{EDGE.get(cause.quantity, cause.quantity)} {move(cause.effect)}", cause_text(cause, review))
        for cause in causes
    )


def _modes(review: Review) -> Section:
    from tauledger.report.tables import modes

    return Section("modes", "Differential and common mode", (modes.modes(review),) if review.modes else ())


def _outputs(review: Review) -> Section:
    from tauledger.report.tables import modes

    return Section("outputs", "Further outputs", (modes.further_outputs(review),) if review.outputs else ())


def _impedances(review: Review) -> Section:
    from tauledger.report.tables import impedances

    if not review.impedances:
        return Section("impedances", "", ())
    caption = (
        "Size and angle over frequency, exact. The output's without its load is that of the circuit alone, its bias "
        "held; the input's is what the drive sees, all other sources as they are."
    )
    blocks: list[Block] = [Picture("impedance", caption), impedances.impedances(review)]
    lines = impedances.workings(review)
    if lines:
        blocks.append(Folded("Working by hand, in Ω and S, at mid-band", (Lines(lines),)))
    return Section("impedances", "Input and output impedance", tuple(blocks))


def _large_signal(review: Review) -> Section:
    facts = review.large_signal
    if facts is None:
        return Section("large", "", ())
    blocks = (Prose(sentence(large_signal.first_limit(review))), large_signal.large_signal(facts))
    return Section("large", "Large signal", blocks)


def _helps(review: Review) -> Section:
    return Section("helps", "What would help", (helps.what_would_help(review),) if review.helps else ())


def _own(review: Review) -> Section:
    if not review.paper:
        return Section("own", "", ())
    items = tuple(Item(name, sentence(plain(says, review))) for name, says in outside.verdicts(review))
    blocks: tuple[Block, ...] = (outside.own_figures(review), *((Items(items),) if items else ()))
    return Section("own", "Your own figures", blocks)


def _curve(review: Review) -> Section:
    curve = review.curve
    if curve is None:
        return Section("measured", "", ())
    blocks: list[Block] = [measured.measured_edges(curve)] if curve.figures else []
    blocks += [Prose(level_text(curve)), Prose(differs_text(curve)), Prose(explains_text(review, curve))]
    return Section("measured", "The measured curve", tuple(blocks))


def _set(review: Review) -> Section:
    blocks = (outside.set_values(review),) if review.settings or review.added else ()
    return Section("set", "What was changed" if review.added else "What was set", blocks)


def _lower(review: Review) -> Section:
    blocks: list[Block] = []
    if review.f_low is not None and lower.lower_parts(review):
        blocks.append(lower.lower_edge(review))
        if way.way(review, "f_low"):
            blocks.append(way.way_table(review, "f_low"))
        methods = way.methods_table(review, "f_low")
        if methods.rows:
            blocks.append(Folded(methods.caption, (methods,)))
    if lower.aside(review):
        blocks.append(Prose(lower.aside(review)))
    return Section("lower", "The lower edge", tuple(blocks), ("Edge alone", "Bypass zero"))


def _stages(review: Review) -> Section:
    blocks: list[Block] = [setting.stages(review)] if review.stages else []
    drawn = drawable(review)
    if drawn:
        caption = (
            "The small-signal circuit of the hand analysis, stage by stage: at every node its resistance and its "
            "capacitances with their Miller part, R_Th the resistance at the input. Gm·v, with Gm = gain over R, gives "
            "the gain in the table. Where the node is marked inside, R is that behind the series resistance of the "
            "device, and Gm the gain over that R; a capacitance with “at … Ω” faces that one instead, and counts "
            "in the C of the next drawing as R·C over R."
        )
        if len(drawn) == MOST_STAGES < len(review.stages):
            caption += f" Drawn: the first {len(drawn)} nodes of {len(review.stages)}."
        blocks.append(Picture("stages", caption))
    elif upper.counting_nodes(review):
        blocks.append(upper.equivalent(review))
    return Section("stages", "Stages" if review.stages else "The network of the hand analysis", tuple(blocks))


def _devices(review: Review) -> Section:
    symbols = {figure.symbol for device in review.devices for figure in device.figures}
    terms = (("r_pi", "gm, r_π, r_o, C_π, C_μ, f_T"), ("c_gs", "gm, g_mb, r_o, C_gs, C_gd, f_T"))
    wanted = tuple(term for symbol, term in terms if symbol in symbols)
    return Section("devices", "Devices", setting.devices(review), wanted)


def _roots(review: Review) -> Section:
    if not roots.near_roots(review):
        return Section("roots", "", ())
    # Real roots alone are one line, which the frequency response shows better.
    pairs = any(root.imag_hz for root in roots.near_roots(review))
    caption = (
        "Poles × and zeros ○ in the s-plane. Each circle is one decade farther out, so that DC itself lies beyond the "
        "innermost one; the angle is true."
    )
    picture = (Picture("plane", caption),) if pairs else ()
    return Section("roots", "Poles and zeros", (*picture, roots.roots_table(review)))


def _phase(review: Review) -> Section:
    return Section("phase", "Phase used up at unity gain", phase.budget_grids(review))


def _wants(review: Review) -> Section:
    verdicts = (Prose(f"Wanted: {wants.verdict(want)}.") for want in review.wants)
    blocks: tuple[Block, ...] = (*verdicts, *wants.what_it_takes(review))
    return Section("wants", "What it takes", blocks)


def _lines(review: Review) -> Section:
    return Section("lines", "The netlist lines that matter", (setting.source_lines(review),) if review.lines else ())


def _proof(review: Review) -> Section:
    grids = [grid for grid in (way.reruns(review), setting.sums(review)) if grid.rows]
    return Section("proof", "What was computed again as proof", tuple(grids))


def _trust(review: Review) -> Section:
    blocks: list[Block] = [Prose(believed(review))]
    cautions = [Item("Caution", text) for text in review.cautions]
    notes = [Item("Note", note_text(note, review)) for note in review.notes]
    if cautions or notes:
        blocks.append(Items((*cautions, *notes)))
    blocks.append(setting.versions(review))
    return Section("trust", "Agreement, versions, cautions", tuple(blocks), ("Agreement",))
