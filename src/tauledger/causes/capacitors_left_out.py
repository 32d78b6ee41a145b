"""The other capacitors are left out: only the one with the highest edge by hand is taken for f_L."""

from __future__ import annotations

from tauledger.causes.advice import advice
from tauledger.causes.cause import Cause
from tauledger.causes.evidence import Evidence, in_hertz, move
from tauledger.hand.estimate import LowerRow
from tauledger.record import NamedNumber

TOLD = 3


def other_capacitors_left_out(evidence: Evidence) -> Cause | None:
    """Beside the capacitor with the highest edge others count. Effect: all capacitors ÷ the highest alone, by hand."""
    rows = [row for row in evidence.capacitors if row.in_path and row.edge_hand_hz > 0.0]
    rows.sort(key=lambda row: -row.edge_hand_hz)
    edge = evidence.lower
    effect, combined = move(edge, "all-nodes", "lowest"), edge.combined
    if len(rows) < 2 or effect is None or combined is None or combined.lowest is None or combined.all_nodes is None:
        return None
    first, others = rows[0], rows[1:]
    told = [f"{_named(row)} at {in_hertz(row.edge_hand_hz)}" for row in others[:TOLD]]
    if len(others) > TOLD:
        told.append(f"{len(others) - TOLD} more")
    listed = told[0] if len(told) == 1 else f"{', '.join(told[:-1])} and {told[-1]}"
    return Cause(
        cause="other-capacitors-left-out",
        quantity="f_L",
        effect=effect,
        where=", ".join(_named(row) for row in others),
        says=f"{_named(first)} alone gives {in_hertz(combined.lowest)} and leaves out {listed}; "
        f"each capacitor with a pole of its own gives {in_hertz(combined.all_nodes)}",
        instead=advice(edge, combined.lowest),
        numbers=(
            NamedNumber("highest capacitor alone", combined.lowest, "Hz"),
            *(NamedNumber(f"edge of {_named(row)}", row.edge_hand_hz, "Hz") for row in others),
            NamedNumber("all capacitors together", combined.all_nodes, "Hz"),
        ),
    )


def _named(row: LowerRow) -> str:
    return " ‖ ".join(row.parts)
