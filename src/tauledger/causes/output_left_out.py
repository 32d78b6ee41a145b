"""The output node is left out: only the node with the lowest pole by hand is taken."""

from __future__ import annotations

import math

from tauledger.causes.advice import advice
from tauledger.causes.cause import Cause
from tauledger.causes.evidence import Evidence, in_hertz, in_seconds, move, rows_of_the_edge
from tauledger.hand.estimate import InductorRow, SignalNode
from tauledger.record import NamedNumber


def output_left_out(evidence: Evidence) -> Cause | None:
    """The largest time constant beside the lowest node is the output's. Effect: all nodes ÷ lowest node alone."""
    rows = rows_of_the_edge(evidence)
    if len(rows) < 2 or not _is_output(rows[1], evidence):
        return None
    return _left_out(evidence, rows, "output-left-out", f"the output node, {rows[1].title}")


def other_node_left_out(evidence: Evidence) -> Cause | None:
    """The largest time constant beside the lowest node is at a node inside. Effect: all nodes ÷ lowest node alone."""
    rows = rows_of_the_edge(evidence)
    if len(rows) < 2 or _is_output(rows[1], evidence):
        return None
    return _left_out(evidence, rows, "other-node-left-out", rows[1].title)


def _left_out(evidence: Evidence, rows: list[SignalNode | InductorRow], cause: str, who: str) -> Cause | None:
    effect = move(evidence.upper, "all-nodes", "lowest")
    combined = evidence.upper.combined
    if effect is None or combined is None or combined.lowest is None:
        return None
    total = math.fsum(row.time_constant_s for row in rows)
    left = rows[1].time_constant_s
    each = (
        "" if combined.all_nodes is None else f"; each node with a pole of its own gives {in_hertz(combined.all_nodes)}"
    )
    return Cause(
        cause=cause,
        quantity="f_H",
        effect=effect,
        where=rows[1].title,
        says=f"{rows[0].title} alone gives {in_hertz(combined.lowest)} and leaves out {who}, "
        f"which takes {in_seconds(left)} of {in_seconds(total)}{each}",
        instead=advice(evidence.upper, combined.lowest),
        numbers=(
            NamedNumber("time constant left out", left, "s"),
            NamedNumber("sum of time constants", total, "s"),
            NamedNumber("lowest node alone", combined.lowest, "Hz"),
            *((NamedNumber("all nodes together", combined.all_nodes, "Hz"),) if combined.all_nodes is not None else ()),
        ),
    )


def _is_output(row: SignalNode | InductorRow, evidence: Evidence) -> bool:
    if isinstance(row, InductorRow):
        return False
    port = evidence.bands.network.port
    if port.kind == "current":
        return row.role == "output"
    return row.role == "output" or port.plus in row.members or port.minus in row.members
