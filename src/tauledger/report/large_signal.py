"""What the stages can deliver at full size: one line for the first limit, a table of all nodes on request."""

from __future__ import annotations

from tauledger.record import Review, SlewFacts, known_hz
from tauledger.report.layout import CAUTION, Block, Prose, Row, Section, Table
from tauledger.report.wording import nominal, number

# Unit, its size and the slew rate in V/s from which on it is used.
_SLEW_UNITS = (("V/ns", 1e9, 1e9), ("V/µs", 1e6, 1e4), ("V/ms", 1e3, 0.0))


def large_signal(review: Review, *, verbose: bool = False) -> Section:
    """Give the node with the lowest full-power bandwidth; verbose: every node that could be judged."""
    facts = review.large_signal
    if facts is None or (not facts.nodes and not verbose):
        return Section(())
    if not facts.nodes:
        return Section((Prose(f"not judged: {', '.join(facts.not_judged)}", lead="LARGE SIGNAL ", hang=2),))
    below = any(cause.cause == "slews-first" for cause in review.causes)
    blocks: list[Block] = [Prose(first_limit(review), lead="LARGE SIGNAL ", style=CAUTION if below else "", hang=2)]
    if verbose:
        head = ("  at", "by", "can give", "into", "slew rate", "to the output", "full power")
        rows = tuple(Row(cells(node)) for node in facts.nodes)
        blocks.append(Table("llrrrrr", head, rows))
    return Section(tuple(blocks))


def first_limit(review: Review) -> str:
    """Say who moves the slowest node, how fast, up to where at the stated amplitude, and whether that is beyond f_H."""
    facts = review.large_signal
    assert facts is not None
    slowest = facts.nodes[0]
    at_node = slew_rate(slowest.slew_v_per_s)
    if abs(slowest.volt_per_output_volt - 1.0) > 0.05:
        at_node = f"{at_node} there, {slew_rate(slowest.output_slew_v_per_s)} at the output"
    text = (
        f"{movers(slowest)}'s {number(slowest.current_a, 'A', 3)} into {number(slowest.capacitance_f, 'F', 3)}: "
        f"{at_node}; {nominal(facts.swing_v, 'V')} peak to {number(slowest.full_power_hz, 'Hz', 3)}"
    )
    # of an amplifier that is meant to be closed around, f_H is no bandwidth that anybody uses
    open_loop = review.f_unity is not None and bool(review.f_unity.elements)
    edge, name = (known_hz(review.f_unity), "f_u") if open_loop else (known_hz(review.f_high), "f_H")
    if edge is not None:
        part = slowest.full_power_hz / edge
        text += f", {part:.2g}·{name}" if part < 99.5 else f", {part:.0f}·{name}"
        text += " only" if part < 1.0 and not open_loop else ""
    weak = min(facts.nodes, key=lambda node: node.cut_off_v or float("inf"))
    if weak.cut_off_v is not None and weak.cut_off_v <= facts.swing_v:
        text += f"; {movers(weak)} is cut off from {number(weak.cut_off_v, 'V', 3)} peak on, in mid-band already"
    if facts.supplies_v is not None and 2.0 * facts.swing_v > facts.supplies_v[1] - facts.supplies_v[0]:
        low, high = (number(volt, "V", 3) for volt in facts.supplies_v)
        text += f"; supplies from {low} to {high} do not allow {nominal(facts.swing_v, 'V')} peak"
    if facts.not_judged:
        text += f"; not judged: {', '.join(facts.not_judged)}"
    return text


def cells(node: SlewFacts) -> tuple[str, ...]:
    """Give one node as cells: where, by whom, current, capacitance, slew rate there and at the output, bandwidth."""
    at = node.node + (f" with {', '.join(node.behind)}" if node.behind else "")
    return (
        at,
        movers(node),
        number(node.current_a, "A", 3),
        number(node.capacitance_f, "F", 3),
        slew_rate(node.slew_v_per_s),
        slew_rate(node.output_slew_v_per_s),
        number(node.full_power_hz, "Hz", 3),
    )


def movers(node: SlewFacts) -> str:
    """Name the transistor, or the pair whose tail current it is."""
    return node.drivers[0] if len(node.drivers) == 1 else f"tail of {', '.join(node.drivers)}"


def slew_rate(v_per_s: float) -> str:
    """Write a slew rate in V/µs, as data sheets do; in V/ns where that is shorter, in V/ms where it is small."""
    unit, size, _ = next(one for one in _SLEW_UNITS if v_per_s >= one[2])
    return f"{v_per_s / size:.3g} {unit}"
