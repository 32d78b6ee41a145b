"""Sentences for a reader: causes and notes in plain words, what drives, and how far it is to be believed."""

from __future__ import annotations

import math
import re

from tauledger.record import CauseFacts, NoteFacts, Review
from tauledger.report.tables.setting import output_text
from tauledger.report.wording import (
    AGREEMENT_WARNS,
    network_rejected,
    nominal,
    part_unit,
    retitled,
    symbol,
)

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_INNER = re.compile(r"\b[cC]_(?:pi|mu)\b")
ESTIMATE = "All of it rests on the models in the netlist: an estimate, which does not replace measuring the board."


def drive_sentence(review: Review) -> str:
    """Say what drives, through what, where the output is taken and what loads it."""
    drives = []
    for drive in review.drive:
        through = f" through {nominal(drive.resistance_ohm, 'Ω')}" if drive.resistance_ohm is not None else ""
        drives.append(f"{drive.source}{through}")
    loads = review.output.load
    load = " ‖ ".join(f"{part.name} {nominal(part.value, part_unit(part.kind))}" for part in loads)
    loaded = f", loaded with {load}" if load else ", without a load to ground"
    return f"Driven by {' and '.join(drives) or 'nothing'}; output {output_text(review.output)}{loaded}."


def cause_text(cause: CauseFacts, review: Review) -> str:
    """Write a cause as sentences: what makes hand and simulation differ, and what to do instead."""
    instead = f" {sentence(cause.instead)}" if cause.instead else ""
    return plain(sentence(cause.says) + instead, review)


def note_text(note: NoteFacts, review: Review) -> str:
    """Write a note, its place before it unless the sentence names it."""
    placed = f"{note.where}: {note.says}" if note.where and note.where not in note.says else note.says
    return plain(sentence(placed), review)


def plain(text: str, review: Review) -> str:
    """Write the names of a device's own capacitances as the trade does."""
    return _INNER.sub(lambda found: symbol(found.group()), retitled(text, review.parts))


def sentence(text: str) -> str:
    """Open with a capital unless the first word is a name or a symbol, close with a full stop."""
    start = text[:1].upper() if text[1:2].islower() else text[:1]
    return start + text[1:] + ("" if text.endswith((".", "!", "?")) else ".")


def power_of_ten(value: float) -> str:
    """Write a small number as 1.2·10⁻¹⁰."""
    if not math.isfinite(value) or value == 0.0:
        return f"{value:g}"
    mantissa, exponent = f"{value:.1e}".split("e")
    return f"{mantissa}·10{str(int(exponent)).translate(_RAISED)}"


def believed(review: Review) -> str:
    """Say how well the rebuilt network and ngspice agree, and that this is an estimate."""
    facts = review.agreement
    if facts is None or review.engine is None:
        return f"No simulation was run: all numbers come from the network as given. {ESTIMATE}"
    engine = f"{review.engine.name} {review.engine.version}"
    error = f"{power_of_ten(facts.max_relative_error)} at {facts.points} frequencies"
    if network_rejected(review):
        return f"No. The rebuilt network differs from the sweep of {engine} by {error}; only the sweep counts here."
    if facts.max_relative_error > AGREEMENT_WARNS:
        return f"With care. The rebuilt network differs from the sweep of {engine} by {error}. {ESTIMATE}"
    return (
        f"The network rebuilt from the operating point agrees with the sweep of {engine} to {error}, so the exact "
        f"numbers are those of the simulation. {ESTIMATE}"
    )
