"""The review as text for a reviewer with two minutes: the largest thing first, at most 80 columns.

Sections are data (summary, upper, steps, lower, poles, reasons); layout.py turns them into lines; colour comes last,
through rich, and only where it is asked for. Without colour the text is the same, character for character.
"""

from __future__ import annotations

from collections.abc import Sequence

from tauledger.record import NodeRow, Review
from tauledger.report import helps, large_signal, lower, poles, reasons, steps, summary, upper
from tauledger.report.layout import CAUTION, HEADING, STRONG, WARNING, Line, Section, lay_out
from tauledger.report.shown import unity_shown
from tauledger.report.working import workings

_PAGE = 60
_STYLES = {HEADING: "bold cyan", STRONG: "bold", WARNING: "bold red", CAUTION: "yellow", "": ""}


def render(
    review: Review,
    *,
    color: bool,
    unicode: bool,
    width: int = 80,
    verbose: bool = False,
    working: Sequence[NodeRow] = (),
) -> str:
    """Give the report as lines of text, each with its line end.

    color: with terminal colours. unicode: with µ, Ω, π, τ, ‖; else u, ohm, pi, tau, ||.
    verbose: every node, part, pole and zero, and the working of each node. working: nodes whose working is wanted
    beside the page.
    """
    sections = (
        reasons.warning(review),
        summary.headline(review),
        summary.band(review),
        *_asked_of_the_response(review, verbose=verbose),
        *_wanted(review),
        *_changed(review),
        summary.operating_points(review, verbose=verbose),
        *_brought_along(review),
        reasons.causes(review, verbose=verbose),
        *_loops(review),
        upper.upper_budget(review, verbose=verbose),
        steps.steps(review, "f_high"),
        steps.methods_table(review, "f_high") if verbose else Section(()),
        upper.upper_shares(review, verbose=verbose),
        *_who_makes_it(review, verbose=verbose),
        helps.what_would_help(review) if verbose else Section(()),
        lower.lower_edge(review, verbose=verbose),
        steps.steps(review, "f_low") if verbose else Section(()),
        steps.methods_table(review, "f_low") if verbose else Section(()),
        poles.poles_and_zeros(review, verbose=verbose),
        *_unity_budget(review),
        large_signal.large_signal(review, verbose=verbose),
        *_drives_and_outputs(review),
        *(workings(review, [node]) for node in working if not verbose),
        *(_read_past(review) if verbose else ()),
        reasons.closing(review),
    )
    lines = lay_out(sections, width=width, unicode=unicode, page=_PAGE)
    return _painted(lines) if color else "".join(f"{line.text}\n" for line in lines)


# What few reviews have is imported where there is any: most pages are printed without.


def _asked_of_the_response(review: Review, *, verbose: bool) -> tuple[Section, ...]:
    """Give unity gain where it is what the amplifier is about, and gain and phase at single frequencies."""
    without = review.f_unity is not None and bool(review.f_unity.none)
    if not unity_shown(review) and not review.at and not without:
        return ()
    from tauledger.report import at, unity

    return unity.unity_gain(review), at.gain_and_phase(review, verbose=verbose)


def _changed(review: Review) -> tuple[Section, ...]:
    if not review.settings and not review.added:
        return ()
    from tauledger.report import changed

    return (changed.changed(review),)


def _brought_along(review: Review) -> tuple[Section, ...]:
    """Give the reader's own page of figures, and their measured curve."""
    if not review.paper and review.curve is None:
        return ()
    from tauledger.report import curve, paper

    return paper.own_page(review), curve.measured_curve(review)


def _who_makes_it(review: Review, *, verbose: bool) -> tuple[Section, ...]:
    """Give who sets unity gain, and who makes the peaking."""
    if not unity_shown(review) and not review.peaking:
        return ()
    from tauledger.report import at, unity

    return unity.who_sets(review, verbose=verbose), at.peaking(review, verbose=verbose)


def _read_past(review: Review) -> tuple[Section, ...]:
    from tauledger.report import changed

    return (changed.read_past(review),)


def _loops(review: Review) -> tuple[Section, ...]:
    if not review.loops:
        return ()
    from tauledger.report import loop

    return (loop.loops(review),)


def _unity_budget(review: Review) -> tuple[Section, ...]:
    if review.phase_budget is None:
        return ()
    from tauledger.report import phase

    return (phase.phase_used(review),)


def _wanted(review: Review) -> tuple[Section, ...]:
    if not review.wants:
        return ()
    from tauledger.report import wants

    return (wants.what_it_takes(review),)


def _drives_and_outputs(review: Review) -> tuple[Section, ...]:
    """Give modes, further outputs and impedances, which few reviews have."""
    if not (review.modes or review.outputs or review.impedances):
        return ()
    from tauledger.report import impedances, modes

    return modes.modes(review), modes.further_outputs(review), impedances.impedances(review)


def _painted(lines: Sequence[Line]) -> str:
    from io import StringIO

    from rich.console import Console
    from rich.text import Text

    page = StringIO()
    widest = max(len(line.text) for line in lines) + 1
    console = Console(
        file=page, force_terminal=True, color_system="standard", width=2 * widest, legacy_windows=False, no_color=False
    )
    for line in lines:
        console.print(Text(line.text, style=_STYLES[line.style]), soft_wrap=True)
    return page.getvalue()
