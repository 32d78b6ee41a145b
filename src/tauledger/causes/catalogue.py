"""Which causes and notes there are, and what a review asks: why do the numbers differ, what must be known of them."""

from __future__ import annotations

from collections.abc import Callable

from tauledger.causes import notes
from tauledger.causes.capacitors_left_out import other_capacitors_left_out
from tauledger.causes.cause import Cause, Note
from tauledger.causes.complex_poles import complex_poles_above, complex_poles_below
from tauledger.causes.edges_interact import lower_edge_near_upper, upper_edge_near_lower
from tauledger.causes.evidence import EdgeEvidence, Evidence
from tauledger.causes.feedback_ignored import loop_ignored, positive_gain_bridging
from tauledger.causes.further_poles import further_poles_above, further_poles_below
from tauledger.causes.gain_falls_first import gain_falls_first
from tauledger.causes.interaction import interaction_above, interaction_below
from tauledger.causes.line_left_out import (
    another_dip,
    line_left_out_above,
    line_left_out_below,
    lines_as_at_dc,
    ripple_followed_so_far,
)
from tauledger.causes.no_dominant_pole import no_dominant_pole_above, no_dominant_pole_below
from tauledger.causes.on_paper import base_resistance, degeneration_ignored
from tauledger.causes.output_left_out import other_node_left_out, output_left_out
from tauledger.causes.region import region_where_signal_passes
from tauledger.causes.zero_near_edge import zero_near_lower_edge, zero_near_upper_edge

CAUSES: tuple[Callable[[Evidence], Cause | None], ...] = (
    output_left_out,
    other_node_left_out,
    other_capacitors_left_out,
    gain_falls_first,
    interaction_above,
    interaction_below,
    further_poles_above,
    further_poles_below,
    no_dominant_pole_above,
    no_dominant_pole_below,
    complex_poles_above,
    complex_poles_below,
    zero_near_upper_edge,
    zero_near_lower_edge,
    upper_edge_near_lower,
    lower_edge_near_upper,
    line_left_out_above,
    line_left_out_below,
    base_resistance,
    degeneration_ignored,
    loop_ignored,
    positive_gain_bridging,
)

NOTES: tuple[Callable[[Evidence], Note | None], ...] = (
    notes.unstable,
    notes.stepped_operating_point,
    notes.no_plateau,
    notes.hand_withheld,
    notes.levels_off_above,
    notes.levels_off_below,
    notes.ill_conditioned_above,
    notes.ill_conditioned_below,
    notes.further_crossings_above,
    notes.further_crossings_below,
    notes.peaking_above,
    notes.peaking_below,
    notes.negative_share_above,
    notes.negative_share_below,
    notes.neither_short_nor_open,
    notes.tuned,
    notes.coupled,
    lines_as_at_dc,
    another_dip,
    ripple_followed_so_far,
    notes.ideal_drive,
    notes.model_without_charge,
    notes.as_rebuilt,
    region_where_signal_passes,
)

WORTH_TELLING = 0.02
# Not on the way from the dominant time constant alone, which is the figure by hand, to the exact edge.
OF_ANOTHER_METHOD = frozenset({"no-dominant-pole"})


def find_causes(evidence: Evidence) -> tuple[Cause, ...]:
    """Give the causes that move an edge by 2 % or more, the largest effect first.

    Those on the way from the dominant time constant alone to the exact edge come before those that say why another
    method misses; what paper may leave out is last. None is given of an edge that paper meets within 2 %: there is no
    difference to explain, however the steps between cancel.
    """
    found = [cause for cause in (look(evidence) for look in CAUSES) if cause is not None]
    met = {edge.quantity for edge in (evidence.upper, evidence.lower) if _met(edge)}
    worth = [
        cause for cause in found if abs(cause.effect) >= WORTH_TELLING and (cause.on_paper or cause.quantity not in met)
    ]
    return tuple(sorted(worth, key=_rank))


def _met(edge: EdgeEvidence) -> bool:
    """Whether the classical estimate, the dominant time constant alone, lies within 2 % of the exact edge."""
    by_hand = edge.combined.lowest if edge.combined is not None else None
    return by_hand is not None and edge.hz is not None and abs(by_hand / edge.hz - 1.0) < WORTH_TELLING


def _rank(cause: Cause) -> tuple[bool, bool, float]:
    return cause.on_paper, cause.cause in OF_ANOTHER_METHOD, -abs(cause.effect)


def find_notes(evidence: Evidence) -> tuple[Note, ...]:
    """Give the notes, in the order of `NOTES`: what forbids trust first."""
    return tuple(note for note in (look(evidence) for look in NOTES) if note is not None)
