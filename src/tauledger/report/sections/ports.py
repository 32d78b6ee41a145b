"""The sections on drive and output: what drives and loads, large signals, both modes, further outputs, impedances."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.blocks import Block, Folded, Picture, Prose, Section
from tauledger.report.large_signal import first_limit
from tauledger.report.sentences import sentence
from tauledger.report.tables import large_signal, setting
from tauledger.report.tables.working import Lines


def drive_section(review: Review) -> Section:
    """Give drive, output, load and conditions."""
    return Section(
        "drive",
        "Drive and load",
        (setting.drive_and_load(review),),
        ("Mid-band", "Band edge", "By hand, exact, simulated"),
    )


def large_signal_section(review: Review) -> Section:
    """Give slew rates and full-power bandwidth."""
    facts = review.large_signal
    if facts is None or not facts.nodes:
        return Section("large", "", ())
    blocks = (Prose(sentence(first_limit(review))), large_signal.large_signal(facts))
    return Section("large", "Large signal", blocks)


def modes_section(review: Review) -> Section:
    """Give differential and common mode."""
    from tauledger.report.tables import modes

    return Section("modes", "Differential and common mode", (modes.modes(review),) if review.modes else ())


def outputs_section(review: Review) -> Section:
    """Give the further outputs."""
    from tauledger.report.tables import modes

    return Section("outputs", "Further outputs", (modes.further_outputs(review),) if review.outputs else ())


def impedances_section(review: Review) -> Section:
    """Give input and output impedance."""
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
