"""Numbers → the explanation beside them: shares, time constants, hand estimate with its working, causes, notes.

Every identity that the algebra promises is checked here in every run; one that fails is a fault of the program and ends
it. Where the rebuilt network does not agree with ngspice, nothing is explained.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Literal

import numpy as np
from msgspec import Struct

from tauledger.causes.catalogue import find_causes, find_notes
from tauledger.causes.cause import Cause, Note
from tauledger.causes.evidence import EdgeEvidence, Evidence
from tauledger.causes.line_left_out import in_words
from tauledger.devices.family import Device
from tauledger.hand.at_edge import edge_factors
from tauledger.hand.budget import part_resistances, signal_nodes
from tauledger.hand.combine import Combined, combine_lower, combine_upper
from tauledger.hand.effects import pole_effects
from tauledger.hand.estimate import Edge as EdgeName
from tauledger.hand.estimate import HandEstimate, InductorRow
from tauledger.hand.halves import images
from tauledger.hand.lower import lower_rows, nearest_zero_owner
from tauledger.hand.methods import methods, none_recommended, weighted_lower, weighted_upper
from tauledger.hand.poles import HandPole, hand_poles
from tauledger.hand.stages import stage_rows
from tauledger.hand.steps import lower_steps, upper_steps
from tauledger.network.bands import Bands
from tauledger.network.constants import OpenConstants, open_constants
from tauledger.network.edges import Edge
from tauledger.network.identities import (
    ON_THE_AXIS,
    Identity,
    check,
    open_identities,
    response_identities,
    share_identities,
    short_identities,
    weight_identities,
)
from tauledger.network.lines import at_rest
from tauledger.network.lower import ShortConstants, short_constants
from tauledger.network.recompute import EdgeFrequencies, each_scaled, edge_frequencies
from tauledger.network.shares import Shares, find_shares
from tauledger.network.solve import Complex
from tauledger.network.spectrum import pole_frequencies, zero_frequencies
from tauledger.numbers import Numbers
from tauledger.quantity import percent

TEN_PERCENT_LESS = 0.9
LINES_MATTER = 0.10


class Explanation(Struct, frozen=True):
    """What `explain` adds to the numbers.

    shares_high, shares_low: None where there is no such edge. ten_percent_less: both edges with one part at a time 10 %
    smaller, by part name. open, short: time constants of the upper and lower network, None where the hand side is
    withheld, as hand is. pole_effects: what each visible pole does to its band edge.
    edge_factors: 1 − K at f_H by node of the upper network and part.
    """

    shares_high: Shares | None
    shares_low: Shares | None
    ten_percent_less: Mapping[str, EdgeFrequencies]
    open: OpenConstants | None
    short: ShortConstants | None
    hand: HandEstimate | None
    hand_poles: tuple[HandPole, ...]
    pole_effects: Mapping[complex, float]
    causes: tuple[Cause, ...]
    notes: tuple[Note, ...]
    edge_factors: Mapping[tuple[str, str], complex] = {}


NOTHING = Explanation(None, None, {}, None, None, None, (), {}, (), ())


def explain(numbers: Numbers) -> Explanation:
    """Explain the numbers; `NOTHING` where the network is not trusted.

    Raises NetworkError where an identity does not hold.
    """
    if not numbers.trusted:
        return NOTHING
    network, midband, bands, edges = numbers.network, numbers.midband, numbers.bands, numbers.edges
    check(response_identities(network, midband))
    shares_high, shares_low = _shares(numbers, edges.f_high), _shares(numbers, edges.f_low)
    poles, zeros = _roots(numbers)
    worked = midband.plateau and bands.sound and numbers.poles.stable
    rest = _at_rest(numbers)
    open_rows, short_rows, hand, upper, lower = None, None, None, None, None
    if worked:
        open_rows, short_rows = open_constants(bands), short_constants(bands)
        left_out = _left_out(numbers, rest, {"f_high": shares_high, "f_low": shares_low})
        check((*open_identities(open_rows), *weight_identities(bands, open_rows), *short_identities(short_rows)))
        hand, upper, lower = _by_hand(numbers, open_rows, short_rows, rest, left_out)
    less = each_scaled(network, midband, edges, TEN_PERCENT_LESS)
    evidence = Evidence(
        bands=bands,
        poles=poles,
        zeros=zeros,
        devices=numbers.devices,
        nodes=hand.nodes if hand else (),
        capacitors=hand.lower if hand else (),
        inductors=hand.inductors if hand else (),
        upper=_evidence("f_high", edges.f_high, hand, upper, shares_high, rest.f_high if rest else None),
        lower=_evidence("f_low", edges.f_low, hand, lower, shares_low, rest.f_low if rest else None),
        stepped=numbers.bias is not None and numbers.bias.stepped,
        images=images(hand.nodes) if hand else {},
        lines=network.lines,
        followed_to_hz=_followed_to_hz(numbers),
        ten_percent_less={name: pair.f_high for name, pair in less.items()} if network.lines else {},
    )
    effects: dict[complex, float] = {}
    for combined, is_lower in ((upper, False), (lower, True)):
        if combined is not None:
            effects.update(pole_effects(combined.roots, lower=is_lower))
    return Explanation(
        shares_high=shares_high,
        shares_low=shares_low,
        ten_percent_less=less,
        open=open_rows,
        short=short_rows,
        hand=hand,
        hand_poles=_poles_by_hand(numbers, poles, hand, upper, lower),
        pole_effects=effects,
        causes=find_causes(evidence),
        notes=find_notes(evidence),
        edge_factors=_edge_factors(numbers, hand),
    )


def _inductors(bands: Bands, devices: tuple[Device, ...], constants: OpenConstants) -> tuple[InductorRow, ...]:
    if not any(part.kind == "inductance" for part in constants.parts):
        return ()
    from tauledger.hand.inductors import inductor_rows

    return inductor_rows(bands, devices, constants)


def _poles_by_hand(
    numbers: Numbers, poles: Complex, hand: HandEstimate | None, upper: Combined | None, lower: Combined | None
) -> tuple[HandPole, ...]:
    cancelled = [pole.s for pole in numbers.poles.poles if pole.cancelled]
    told = hand_poles(
        poles,
        np.array(cancelled, dtype=complex),
        midband_hz=numbers.midband.frequency_hz,
        upper=upper.coefficients if upper else None,
        lower=lower.coefficients if lower else None,
    )
    edge = 2.0 * np.pi * numbers.midband.frequency_hz
    if hand is None or not hand.lower or all(one.formula for one in told if abs(one.pole) <= edge):
        return told
    from tauledger.hand.lower_poles import with_lower_poles

    owners = {pole.s: pole.owners for pole in numbers.poles.poles}
    return with_lower_poles(told, cancelled, numbers.bands, numbers.devices, hand.lower, owners)


def _edge_factors(numbers: Numbers, hand: HandEstimate | None) -> Mapping[tuple[str, str], complex]:
    high = numbers.edges.f_high
    if hand is None or high is None or high.hz is None:
        return {}
    return edge_factors(numbers.bands, hand.nodes, high.hz)


def _shares(numbers: Numbers, edge: Edge | None) -> Shares | None:
    if edge is None or edge.hz is None:
        return None
    shares = find_shares(numbers.network, numbers.midband, edge.hz, numbers.bands.class_of)
    # the edge's slope was reached by another solution than the shares'
    same_slope = Identity("slope by the shares = slope at the edge", shares.slope, edge.slope or 0.0, ON_THE_AXIS, 1.0)
    check((*share_identities(shares), same_slope))
    return shares


def _roots(numbers: Numbers) -> tuple[Complex, Complex]:
    """Give poles and zeros of the full network in rad/s, both members of every complex pair."""
    both = [
        [s for root in roots for s in ((root.s, root.s.conjugate()) if root.paired else (root.s,))]
        for roots in (numbers.poles.poles, numbers.poles.zeros)
    ]
    return np.array(both[0], dtype=complex), np.array(both[1], dtype=complex)


def _at_rest(numbers: Numbers) -> EdgeFrequencies | None:
    """Give the band edges with every line as at DC, mid-band frequency held; None without lines."""
    if not numbers.network.lines:
        return None
    return edge_frequencies(at_rest(numbers.network), numbers.midband)


def _followed_to_hz(numbers: Numbers) -> float | None:
    """Give where the scan stops following the ripple of lines; None where it follows it to its end."""
    if not numbers.network.lines:
        return None
    from tauledger.network.ripple import followed_to_hz

    limit = followed_to_hz(numbers.network)
    return limit if limit is not None and limit < float(numbers.edges.frequency_hz[-1]) else None


def _left_out(
    numbers: Numbers, rest: EdgeFrequencies | None, shares: Mapping[EdgeName, Shares | None]
) -> dict[EdgeName, str]:
    """Say for each edge what lines do to it, where they have or move a tenth of it: no method has them."""
    if rest is None:
        return {}
    lines = numbers.network.lines
    names = f"{', '.join(line.owner for line in lines)}, {'a line' if len(lines) == 1 else 'lines'}"
    edges, at_rest = numbers.edges, {"f_high": rest.f_high, "f_low": rest.f_low}
    found: dict[EdgeName, str] = {}
    for edge, known in shares.items():
        of = edges.f_high if edge == "f_high" else edges.f_low
        before = at_rest[edge]
        if known is None or of is None or of.hz is None or before is None:
            continue
        share, moved = sum(known.parts[line.name] for line in lines), of.hz / before - 1.0
        if max(abs(share), abs(moved)) >= LINES_MATTER:
            has, moves = ("has", "moves") if len(lines) == 1 else ("have", "move")
            found[edge] = (
                f"{names}, {moves} it by {percent(moved)} and {has} a share of {percent(share).removeprefix('+')}, "
                "which no time constant sees"
            )
    return found


def _by_hand(
    numbers: Numbers,
    constants: OpenConstants,
    shorts: ShortConstants,
    rest: EdgeFrequencies | None,
    left_out: Mapping[EdgeName, str],
) -> tuple[HandEstimate, Combined, Combined]:
    bands, devices, edges = numbers.bands, numbers.devices, numbers.edges
    high, low = (edge.hz if edge is not None else None for edge in (edges.f_high, edges.f_low))
    whole, of_lines = EdgeFrequencies(low, high), EdgeFrequencies(None, None)
    if rest is not None:
        whole, of_lines = rest, whole
    why = f"{in_words(numbers.network.lines)}, till here as at DC"
    nodes, capacitors = signal_nodes(bands, devices), lower_rows(bands, devices, shorts)
    upper_poles, lower_poles = pole_frequencies(bands.upper), pole_frequencies(bands.lower)
    upper_zeros, lower_zeros = zero_frequencies(bands.upper, upper_poles), zero_frequencies(bands.lower, lower_poles)
    if bands.gain_setting:
        # Both networks hold the capacitors that set the gain, and with them poles of both edges.
        omega = abs(bands.s_mid)
        upper_poles, upper_zeros = (roots[np.abs(roots) > omega] for roots in (upper_poles, upper_zeros))
        lower_poles, lower_zeros = (roots[np.abs(roots) < omega] for roots in (lower_poles, lower_zeros))
    inductors = _inductors(bands, devices, constants)
    upper = combine_upper(nodes, upper_poles, upper_zeros, inductors)
    lower = combine_lower(capacitors, lower_poles, lower_zeros)
    estimates = methods(
        upper,
        lower,
        upper_hz=high,
        lower_hz=low,
        upper_weighted_hz=weighted_upper(constants.weighted_sum_s),
        lower_weighted_hz=weighted_lower(capacitors),
        left_out=left_out,
    )
    hand = HandEstimate(
        nodes=nodes,
        lower=capacitors,
        stages=stage_rows(bands, devices),
        part_resistance=part_resistances(bands, devices),
        steps=(
            *upper_steps(
                nodes,
                upper,
                full_hz=whole.f_high,
                stable=numbers.poles.stable,
                lines=(why, of_lines.f_high) if rest is not None else None,
                inductors=inductors,
            ),
            *lower_steps(
                capacitors,
                lower,
                full_hz=whole.f_low,
                stable=numbers.poles.stable,
                zero_owner=nearest_zero_owner(bands, capacitors, lower),
                lines=(why, of_lines.f_low) if rest is not None else None,
            ),
        ),
        methods=estimates,
        sigma=upper.sigma,
        hand_f_high_hz=upper.lowest,
        hand_f_low_hz=lower.lowest,
        inductors=inductors,
        no_method=none_recommended(estimates, upper, lower, left_out),
    )
    return hand, upper, lower


def _evidence(
    name: Literal["f_high", "f_low"],
    edge: Edge | None,
    hand: HandEstimate | None,
    combined: Combined | None,
    shares: Shares | None,
    at_rest_hz: float | None,
) -> EdgeEvidence:
    return EdgeEvidence(
        at_rest_hz=at_rest_hz,
        edge=name,
        hz=edge.hz if edge else None,
        slope=edge.slope if edge else None,
        combined=combined,
        steps=tuple(step for step in hand.steps if step.edge == name) if hand else (),
        found=edge,
        shares=shares.parts if shares is not None else {},
        recommended=next((m for m in hand.methods if m.edge == name and m.recommended), None) if hand else None,
    )
