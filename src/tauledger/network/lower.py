"""Short-circuit time constants: what each coupling and bypass capacitor does to the lower band edge.

R_k is the resistance across capacitor k while all other mid-band shorts are shorted and all opens open; then Σ
1/(R_k·C_k) = −Σ p of the lower network exactly (inductors that are open at mid-band: R/L), unless capacitors alone
form a loop. Alone, capacitor k makes a pole at f_k = 1/(2πR_kC_k) and a zero at f_k·H(open)/H(short).

Source: Gray, Hurst, Lewis and Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed., 2009, section
7.3.6 (short-circuit time constants).

A capacitor that sets the mid-band gain is no short. Of the poles below s₀ = jω_mid it holds the part ω²·C·Re Z_low of
−Σ p, Z_low being what those poles make of the impedance across it: R_F·C_F of a charge amplifier.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from msgspec import Struct

from tauledger.devices.parts import Part
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network, incidence
from tauledger.network.bands import BandClass, Bands, joined_nodes, lower_nodes, midband_network, midband_nodes
from tauledger.network.constants import inverse
from tauledger.network.gain_setting import impedance_below
from tauledger.network.merge import passes
from tauledger.network.reactances import reactances
from tauledger.network.spectrum import pole_frequencies

IN_PATH_WEIGHT = 0.05
IN_PATH_MOMENT = 0.02
NOTHING = 1e-12


class ShortConstant(Struct, frozen=True):
    """Capacitors in parallel that are short at mid-band or set its gain, taken together, or one inductor open there.

    value: F (their sum) or H. resistance_ohm: across them, all others in their mid-band state; 0 where they close a
    loop of capacitors. edge_hz: 1/(2πRC) or R/(2πL). zero_hz: edge_hz · H(without)/H(mid-band), signed as H is.
    weight: 1 − H(without)/H(mid-band), "without" being the capacitor opened or the inductor shorted.
    """

    names: tuple[str, ...]
    nodes: tuple[str, ...]
    value: float
    resistance_ohm: float
    edge_hz: float
    zero_hz: float
    weight: float
    in_path: bool


class ShortConstants(Struct, frozen=True):
    """The ledger of the lower network: sum_hz = Σ f_k, pole_sum_hz = −Σ p/2π.

    Both None where capacitors alone form a loop, where a tuned part belongs to neither side, and where capacitors set
    the gain.
    """

    parts: tuple[ShortConstant, ...]
    sum_hz: float | None
    pole_sum_hz: float | None


def short_constants(bands: Bands) -> ShortConstants:
    """Give R, edge and zero of every mid-band short (inductors: open) in the lower network, and the sum of the edges.

    Capacitors that set the gain come last. A row is in the path where taking it away lowers the gain by 5 % or
    more, or where |weight·edge| is above 2 % of their sum. Decoupling behind a choke or a resistor is not: without
    it the gain even rises.
    Raises NetworkError where the mid-band network has no unique solution.
    """
    network, s = bands.network, bands.s_mid
    gain = inverse(midband_network(bands.network, bands.class_of), s).gain
    groups = coupling_groups(bands)
    groups += [
        (part,)
        for part in network.parts
        if part.kind == "inductance" and bands.class_of[part.name] == "open" and part.name not in bands.aids
    ]
    facts = [_alone(network, bands.class_of, group, gain, s) for group in groups]
    setting = parallel(bands, [part for part in network.parts if part.name in bands.gain_setting])
    if setting:
        facts += _setting(bands, setting, gain)
        groups += setting
    total = sum(abs((1.0 - left) * edge) for _, edge, left in facts if np.isfinite(edge))
    rows = tuple(
        ShortConstant(
            names=tuple(part.name for part in group),
            nodes=group[0].nodes,
            value=sum(part.value for part in group),
            resistance_ohm=ohm,
            edge_hz=edge,
            zero_hz=edge * left if abs(left) > NOTHING else 0.0,
            weight=1.0 - left,
            in_path=1.0 - left >= IN_PATH_WEIGHT or abs((1.0 - left) * edge) > IN_PATH_MOMENT * total,
        )
        for group, (ohm, edge, left) in zip(groups, facts, strict=True)
    )
    edges = [row.edge_hz for row in rows]
    listed = {name for row in rows for name in row.names}
    if setting or not np.all(np.isfinite(edges)) or {part.name for part in reactances(bands.lower).parts} != listed:
        return ShortConstants(rows, None, None)
    poles = pole_frequencies(bands.lower)
    return ShortConstants(rows, float(sum(edges)), float(0.0 - np.sum(poles).real / (2.0 * np.pi)))


def coupling_groups(bands: Bands) -> list[tuple[Part, ...]]:
    """Give the capacitors that are short at mid-band, parallel ones taken together; measuring aids are none of them."""
    shorts = [
        part
        for part in bands.network.parts
        if part.kind == "capacitance"
        and part.value != 0.0
        and bands.class_of[part.name] == "short"
        and part.name not in bands.aids
    ]
    return parallel(bands, shorts)


def parallel(bands: Bands, shorts: list[Part]) -> list[tuple[Part, ...]]:
    """Group capacitors whose ends are the same once undriven voltage sources and short inductors are taken as wires."""
    network = bands.network
    wires = [part for part in network.parts if part.kind == "voltage source" and network.amplitude(part) == 0.0]
    wires += [part for part in network.parts if passes(network, part) and bands.class_of[part.name] != "open"]
    tied = joined_nodes(network, wires)
    groups: dict[frozenset[str], list[Part]] = {}
    for part in shorts:
        groups.setdefault(frozenset(tied[node] for node in part.nodes), []).append(part)
    return [tuple(group) for group in groups.values()]


def _alone(
    network: Network, class_of: Mapping[str, BandClass], group: tuple[Part, ...], gain: complex, s: complex
) -> tuple[float, float, float]:
    """Give resistance in ohm, edge in Hz and H(without)/H(mid-band) of one row, all others in their mid-band state."""
    value = sum(part.value for part in group)
    if group[0].kind == "inductance":
        ohm = _across(network, class_of, group[0], s)
        without = inverse(midband_network(network, {**class_of, group[0].name: "short"}), s).gain
        return ohm, ohm / (2.0 * np.pi * value), float((without / gain).real)
    opened: dict[str, BandClass] = {**class_of, **{part.name: "open" for part in group}}
    ohm = _across(network, opened, group[0], s)
    if not np.isfinite(ohm):
        return ohm, 0.0, 1.0
    without = inverse(midband_network(network, opened), s).gain
    edge = 1.0 / (2.0 * np.pi * ohm * value) if ohm else float("inf")
    return ohm, edge, float((without / gain).real)


def _setting(bands: Bands, groups: list[tuple[Part, ...]], gain: complex) -> list[tuple[float, float, float]]:
    """Give the same three for capacitors that set the gain: their part of the poles below mid-band, as R, edge, left.

    Infinite resistance and edge 0 where they hold nothing of those poles.
    """
    lower, s = bands.lower, bands.s_mid
    tied = lower_nodes(bands.network, bands.class_of, bands.aids)
    z = impedance_below(lower, s)
    found = []
    for group in groups:
        d = incidence(lower, *(tied[node] for node in group[0].nodes))
        value = sum(part.value for part in group)
        edge = abs(s) ** 2 * value * float((d @ z @ d).real) / (2.0 * np.pi)
        opened: dict[str, BandClass] = {**bands.class_of, **{part.name: "open" for part in group}}
        try:
            without = inverse(midband_network(bands.network, opened), s).gain
        except NetworkError:
            without = 0j
        held = abs(edge) > NOTHING * abs(s)
        ohm = 1.0 / (2.0 * np.pi * edge * value) if held else float("inf")
        found.append((ohm, edge if held else 0.0, float((without / gain).real)))
    return found


def _across(network: Network, class_of: Mapping[str, BandClass], part: Part, s: complex) -> float:
    """Give the resistance across an open part; infinite where nothing else joins its ends, 0 where sources fix them.

    Where capacitors set the gain, the one of the parallel equivalent of the impedance there: 1/Re(1/Z).
    """
    merged = midband_nodes(network, class_of)
    a, b = (merged[node] for node in part.nodes)
    mid = midband_network(network, class_of)
    tied = joined_nodes(mid, [other for other in mid.parts if other.kind == "voltage source"])
    if not {a, b} <= tied.keys():
        return float("inf")
    if tied[a] == tied[b]:
        return 0.0
    try:
        if not s:
            return inverse(mid).across(a, b)
        siemens = (1.0 / inverse(mid, s).whole_across(a, b)).real
        return float(1.0 / siemens) if siemens else float("inf")
    except NetworkError:
        return float("inf")
