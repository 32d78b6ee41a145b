"""What each capacitor and inductor does at mid-band: the whole, the upper and the lower network."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from typing import Literal

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from tauledger.circuit import fold
from tauledger.devices.parts import Part
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network, assemble
from tauledger.network.gain_setting import gain_setting, parts_at
from tauledger.network.lines import at_rest
from tauledger.network.merge import joined_nodes as joined_nodes
from tauledger.network.merge import passes, renamed
from tauledger.network.midband import MidBand as MidBand
from tauledger.network.midband import find_midband as find_midband
from tauledger.network.reactances import Reactances, reactances, stamped
from tauledger.network.solve import Complex, admittance, response
from tauledger.network.spectrum import pole_frequencies

BandClass = Literal["short", "open", "gain", "tuned"]

SHORT_ABOVE = 1.0 / np.sqrt(2.0)
TUNED_ABOVE = 1.3
GAIN_TOLERANCE = 0.02
BEYOND_ALL_POLES = 1e4
NEARER = (1.0, 0.7, 0.3, 0.1, 0.01)


class Bands(Struct, frozen=True):
    """The network seen from mid-band.

    class_of: "short", "open", "gain" or "tuned" by part name, for every capacitance, transcapacitance and inductance.
    Capacitors of class "gain" set the mid-band gain and stay in all networks as they are.
    ratio: the r of the rule that decided, by part name, for every capacitance and inductance (0 at DC).
    repaired: capacitors shorted against the rule because only that restores the gain.
    merged: every node of the network → its node in `upper` (nodes joined by short capacitors share one; "0" wins).
    upper: short capacitors merged, open inductors taken out; at `s_mid` it is the mid-band network.
    lower: open capacitors taken out, short inductors merged; for s → ∞ (with class "gain": at s_mid) likewise.
    sound: the gain of the mid-band network is within 2 % of |H(f_mid)|, and where capacitors set it no resonance lies
    at mid-band; where not, no hand numbers, and where the merged network cannot even be built, upper and lower are the
    whole network.
    """

    network: Network
    midband: MidBand
    class_of: Mapping[str, BandClass]
    ratio: Mapping[str, float]
    merged: Mapping[str, str]
    upper: Network
    lower: Network
    sound: bool
    repaired: tuple[str, ...] = ()

    @property
    def aids(self) -> frozenset[str]:
        """Names of the measuring aids: open or short in both networks, and in no table."""
        return frozenset(self.midband.aids)

    @property
    def gain_setting(self) -> frozenset[str]:
        """Names of the capacitors that set the mid-band gain."""
        return frozenset(name for name, kind in self.class_of.items() if kind == "gain")

    @property
    def s_mid(self) -> complex:
        """Where the mid-band network is taken, rad/s: 0, or jω_mid where capacitors set the gain."""
        return 2j * np.pi * self.midband.frequency_hz if self.gain_setting else 0j


def classify(network: Network, midband: MidBand) -> Bands:
    """Decide for every capacitor and inductor whether it is a short or an open at mid-band, and build both networks.

    A capacitor is short where r = |jω·Z(jω)| / lim s·Z(s) > 0.707, Z being the impedance across it with the capacitor
    itself in place: for one resistance across it r = x/√(1 + x²) with x = ωRC, and capacitors in parallel share one r.
    The limit is taken in the network of those capacitors that a first round with all of them found short; a capacitor
    that larger shorts bridge by way of a driven source counts for itself, r = |jωC·Z(jω)|.
    Measuring aids are open or short by what they are, and a capacitor across one of them is open.
    Coupled inductors are neither: they stay as they are, class "tuned".
    An inductor is open where the dual with the admittance of its branch exceeds 0.707. r > 1.3 is resonance: tuned.
    Before that, a capacitor on which the mid-band gain depends is of class "gain" (gain_setting.py).
    The gain of the merged network is then compared with |H(f_mid)|; while it is more than 2 % off, the open capacitor
    is shorted (beside others of class "gain": or taken as one) that halves the error at least.
    Lines are taken as at DC.
    """
    network = at_rest(network)
    ratio = _ratios(network, midband.frequency_hz)
    setting = gain_setting(network, midband)
    coupled = _coupled(network)
    class_of: dict[str, BandClass] = {}
    for part in network.parts:
        if part.kind in ("transcapacitance", "block"):
            class_of[part.name] = "open"
        elif part.kind == "mutual inductance" or fold(part.owner) in coupled:
            class_of[part.name] = "tuned"
        elif part.kind in ("capacitance", "inductance"):
            class_of[part.name] = "gain" if part.name in setting else _class(part, ratio[part.name])
    if midband.aids:
        class_of |= _beside_aids(network, midband.aids)
    error = _gain_error(network, midband, class_of)
    repaired: list[str] = []
    while midband.plateau and error > GAIN_TOLERANCE:
        opens = [part.name for part in network.parts if part.kind == "capacitance" and class_of[part.name] == "open"]
        kinds: tuple[BandClass, ...] = ("short", "gain") if setting else ("short",)
        trials = [(name, kind) for name in opens for kind in kinds]
        errors = {(name, kind): _gain_error(network, midband, {**class_of, name: kind}) for name, kind in trials}
        best = min(errors, key=lambda trial: errors[trial], default=None)
        if best is None or errors[best] > error / 2.0:
            break
        class_of[best[0]], error = best[1], errors[best]
        repaired.append(best[0])
    if setting:
        error = max(error, _resistive_error(network, midband, class_of))
    merged = merged_nodes(network, class_of)
    try:
        upper, lower = upper_network(network, class_of, merged), lower_network(network, class_of, midband.aids)
    except NetworkError:
        upper, lower, error = network, network, float("inf")
        merged = {node: node for node in merged}
    if setting and not all(parts_at(one, 2j * np.pi * midband.frequency_hz) for one in (upper, lower)):
        error = float("inf")
    return Bands(
        network=network,
        midband=midband,
        class_of=class_of,
        ratio=ratio,
        merged=merged,
        upper=upper,
        lower=lower,
        sound=bool(error <= GAIN_TOLERANCE),
        repaired=tuple(repaired),
    )


def upper_network(network: Network, class_of: Mapping[str, BandClass], merged: Mapping[str, str]) -> Network:
    """Merge the short capacitors and take out the open inductors.

    Raises NetworkError where nothing is left at the output.
    """
    kept = [part for part in network.parts if not passes(network, part) or class_of.get(part.name) != "open"]
    return renamed(network, kept, merged)


def lower_network(network: Network, class_of: Mapping[str, BandClass], aids: Collection[str] = ()) -> Network:
    """Take out the open capacitors and merge the short inductors; measuring aids are as ideal here as in the upper one.

    Raises NetworkError where nothing is left at the output.
    """
    opens = {name for name, kind in class_of.items() if kind == "open"}
    kept = [part for part in network.parts if part.kind != "inductance" or part.name not in aids]
    return renamed(network, _without_charge(kept, opens), lower_nodes(network, class_of, aids))


def lower_nodes(network: Network, class_of: Mapping[str, BandClass], aids: Collection[str] = ()) -> dict[str, str]:
    """Give for every node the one that stands for all that short inductors and measuring capacitors join with it."""
    joining = [
        part
        for part in network.parts
        if (passes(network, part) and class_of.get(part.name) == "short")
        or (part.kind == "capacitance" and part.name in aids)
    ]
    return joined_nodes(network, joining)


def midband_network(network: Network, class_of: Mapping[str, BandClass]) -> Network:
    """Merge all shorts and take out all opens, capacitors and inductors alike: what is left is resistive.

    Capacitors of class "gain" stay. Tuned parts are taken as at DC.
    Raises NetworkError where nothing is left at the output.
    """
    uncharged = _without_charge(network.parts, {name for name, kind in class_of.items() if kind != "gain"})
    kept = [part for part in uncharged if not passes(network, part) or class_of[part.name] != "open"]
    return renamed(network, kept, midband_nodes(network, class_of))


def midband_nodes(network: Network, class_of: Mapping[str, BandClass]) -> dict[str, str]:
    """Give for every node the one that stands for all that short capacitors and inductors join with it."""
    return joined_nodes(network, [part for part in network.parts if _wire(network, part, class_of)])


def _without_charge(parts: Iterable[Part], names: Collection[str]) -> list[Part]:
    """Take out those capacitances and transcapacitances that are named; a block keeps its conductances."""
    return [
        replace(part, value=0.0) if part.kind == "block" else part
        for part in parts
        if part.kind not in ("capacitance", "transcapacitance") or part.name not in names
    ]


def merged_nodes(network: Network, class_of: Mapping[str, BandClass]) -> dict[str, str]:
    """Give for every node, ground included, the node that stands for all that short capacitors join with it.

    Ground stands before the output, the output before the first in the order of the network.
    """
    shorts = [part for part in network.parts if part.kind == "capacitance" and class_of[part.name] == "short"]
    return joined_nodes(network, shorts)


def _beside_aids(network: Network, aids: Collection[str]) -> dict[str, BandClass]:
    """Give the class of the measuring aids, and of the capacitors whose ends they join or tie to a source."""
    sources = [part for part in network.parts if part.kind == "voltage source"]
    tied = joined_nodes(network, [*sources, *(network.part(name) for name in aids if _is_capacitor(network, name))])
    found: dict[str, BandClass] = {}
    for part in network.parts:
        if part.name in aids:
            found[part.name] = "open" if part.kind == "inductance" else "short"
        elif part.kind == "capacitance" and tied[part.nodes[0]] == tied[part.nodes[1]]:
            found[part.name] = "open"
    return found


def _is_capacitor(network: Network, name: str) -> bool:
    return network.part(name).kind == "capacitance"


def _class(part: Part, ratio: float) -> BandClass:
    if ratio > TUNED_ABOVE:
        return "tuned"
    passes_above = part.kind == "capacitance"
    return "short" if (ratio > SHORT_ABOVE) == passes_above else "open"


def _wire(network: Network, part: Part, class_of: Mapping[str, BandClass]) -> bool:
    """Whether this part is a wire at mid-band; a tuned inductor counts as one."""
    if part.kind == "capacitance":
        return class_of[part.name] == "short"
    return passes(network, part) and class_of[part.name] != "open"


def _ratios(network: Network, frequency_hz: float) -> dict[str, float]:
    """Give r for every capacitance and inductance."""
    parts = [part for part in network.parts if part.kind in ("capacitance", "inductance")]
    if frequency_hz == 0.0 or not parts:
        return {part.name: 0.0 for part in parts}
    terms = reactances(network)
    value = dict(zip(terms.names, terms.value, strict=True))
    s = 2.0 * np.pi * frequency_hz
    seen = dict(zip(terms.names, s * np.abs(_immittance(network, 1j * s, terms)), strict=True))
    beyond, immittance = _beyond_all_poles(network, s, terms)
    first = dict(zip(terms.names, beyond * np.abs(immittance), strict=True))
    fixed = joined_nodes(network, [part for part in network.parts if part.kind == "voltage source"])
    idle = {part.name for part in parts if part.value == 0.0 or fixed[part.nodes[0]] == fixed[part.nodes[1]]}
    tied = _coupled(network)
    coupling = {part.name for part in network.parts if part.kind == "mutual inductance" or fold(part.owner) in tied}
    idle |= coupling
    acting = [part for part in parts if part.name not in idle and seen[part.name] > SHORT_ABOVE * first[part.name]]
    bridged = _bridged_by_the_drive(network, acting)
    # Beyond all poles a small capacitor is bridged by others that are open at mid-band: they do not stand beside it.
    acts = ({part.name for part in acting} - bridged) | coupling
    try:
        limit = dict(zip(terms.names, beyond * np.abs(_limited(network, beyond, terms, acts)), strict=True))
    except NetworkError:
        limit = first
    alone = {part.name: seen[part.name] * abs(value[part.name]) for part in parts if part.name in bridged}
    # An inductor whose current an open capacitor alone can carry has no limit beyond all poles: it is as if alone.
    alone |= {
        part.name: seen[part.name] * abs(value[part.name])
        for part in parts
        if part.name not in idle and limit[part.name] == 0.0
    }
    ratios = {
        part.name: float(seen[part.name] / limit[part.name])
        for part in parts
        if part.name not in idle and part.name not in alone
    }
    return {part.name: 0.0 for part in parts} | ratios | alone


def _coupled(network: Network) -> set[str]:
    """Give the folded owners of the inductors that are coupled with others."""
    return {fold(owner) for part in network.parts if part.kind == "mutual inductance" for owner in part.references}


def _bridged_by_the_drive(network: Network, acting: list[Part]) -> set[str]:
    """Give the capacitors whose ends larger shorts tie to a driven voltage source: shorting them would short it.

    Such a loop of capacitors and a source gives them all one r, though a small one beside a coupling does nothing.
    """
    sources = [part for part in network.parts if part.kind == "voltage source"]
    wires = [part for part in sources if network.amplitude(part) == 0.0]
    bridged: set[str] = set()
    for part in sorted(acting, key=lambda part: -part.value):
        if part.kind != "capacitance":
            continue
        with_drive = joined_nodes(network, [*sources, *wires])
        without_drive = joined_nodes(network, wires)
        a, b = part.nodes
        if with_drive[a] == with_drive[b] and without_drive[a] != without_drive[b]:
            bridged.add(part.name)
        else:
            wires.append(part)
    return bridged


def _beyond_all_poles(network: Network, s: float, terms: Reactances) -> tuple[float, Complex]:
    """Give a real s in rad/s far beyond all poles and mid-band, and the immittances there, (m,).

    Rounding there can leave exactly nothing of what holds a node: then it is taken nearer.
    Raises NetworkError where the network has no unique solution at any of them.
    """
    highest = max(float(np.abs(pole_frequencies(network)).max()), s)
    for nearer in NEARER[:-1]:
        try:
            return BEYOND_ALL_POLES * nearer * highest, _immittance(network, BEYOND_ALL_POLES * nearer * highest, terms)
        except NetworkError:
            continue
    beyond = BEYOND_ALL_POLES * NEARER[-1] * highest
    return beyond, _immittance(network, beyond, terms)


def _immittance(network: Network, s: complex, terms: Reactances) -> Complex:
    """Give controlᵀ Y(s)⁻¹ out of every reactive part, (m,): impedance across it, or admittance of its branch."""
    try:
        solved = np.linalg.solve(admittance(network, np.array([s], dtype=complex))[0], terms.out)
    except np.linalg.LinAlgError as error:
        raise NetworkError("the small-signal network has no unique solution") from error
    return np.asarray(np.sum(terms.control * solved, axis=0), dtype=np.complex128)


def _limited(network: Network, s: complex, terms: Reactances, acting: set[str]) -> Complex:
    """Give the immittance of every part in the network of those that act, with the part itself in place, (m,)."""
    acts = np.array([part.name in acting for part in terms.parts])
    kept = replace(network, capacitance=stamped(terms, np.where(acts, terms.value, 0.0)))
    immittance = _immittance(kept, s, terms)
    return np.where(acts, immittance, immittance / (1.0 + s * terms.value * immittance))


def _gain_error(network: Network, midband: MidBand, class_of: Mapping[str, BandClass]) -> float:
    """Give | |H of the merged network at mid-band| / |H(f_mid)| − 1 |, infinite where it has none."""
    try:
        upper, frequency_hz = upper_network(network, class_of, merged_nodes(network, class_of)), 0.0
        if "gain" in class_of.values():
            kept = _without_charge(upper.parts, {name for name, kind in class_of.items() if kind == "open"})
            upper, frequency_hz = assemble(tuple(kept), upper.port, upper.amplitudes), midband.frequency_hz
        gain = abs(response(upper, np.array([frequency_hz]))[0])
    except NetworkError:
        return float("inf")
    return float(abs(gain / abs(midband.gain) - 1.0))


def _resistive_error(network: Network, midband: MidBand, class_of: Mapping[str, BandClass]) -> float:
    """Give the error of the gain once short inductors are wires and tuned parts gone too: one of them may set it."""
    try:
        gain = abs(response(midband_network(network, class_of), np.array([midband.frequency_hz]))[0])
    except NetworkError:
        return float("inf")
    return float(abs(gain / abs(midband.gain) - 1.0))
