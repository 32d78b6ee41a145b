"""The report as data: sections in the order in which a reviewer asks, each with tables, figures and sentences.

HTML and Markdown print the same document; a figure is named here and drawn where the format can show it.
"""

from __future__ import annotations

from msgspec import Struct

from tauledger.record import Review
from tauledger.report.blocks import Section
from tauledger.report.headline import KeyFigure, headline, key_figures
from tauledger.report.questions import Answer, answers
from tauledger.report.sections import circuit, evidence, feedback, ports, response, upper
from tauledger.report.sentences import believed, drive_sentence
from tauledger.report.wording import AGREEMENT_WARNS


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
        ports.drive_section(review),
        evidence.set_section(review),
        upper.budget_section(review),
        upper.time_section(review),
        upper.shares_section(review),
        upper.way_section(review),
        response.bode_section(review),
        upper.causes_section(review),
        upper.helps_section(review),
        feedback.unity_section(review),
        feedback.phase_section(review),
        feedback.wants_section(review),
        feedback.loops_section(review),
        response.at_section(review),
        response.peaking_section(review),
        ports.large_signal_section(review),
        ports.modes_section(review),
        ports.outputs_section(review),
        ports.impedances_section(review),
        evidence.own_section(review),
        response.curve_section(review),
        circuit.lower_section(review),
        circuit.stages_section(review),
        circuit.devices_section(review),
        circuit.roots_section(review),
        evidence.lines_section(review),
        evidence.proof_section(review),
        evidence.trust_section(review),
    )
    rejected = review.agreement is not None and review.agreement.max_relative_error > AGREEMENT_WARNS
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
