"""Poles below the first of the lower edge: which capacitor makes each, and the resistance that it then faces.

Going down, the capacitor of every pole passed has opened: a2 = Σ 1/(τ_i·τ_j) with τ_j taken while i is open, so that
a_k/a_(k−1) ≈ 1/(R·C) of the next capacitor with those of the higher poles open and those of the lower ones short.

Source: Cochrun and Grabel, IEEE Trans. Circuit Theory CT-20(1), 1973, with 1/s for s; Hajimiri, IEEE Trans. Circuits
Syst. I 57(6), 2010.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np
from msgspec.structs import replace

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.errors import NetworkError
from tauledger.hand.budget import resistance_across
from tauledger.hand.equivalent import equivalent_circuit, joined
from tauledger.hand.estimate import LowerRow
from tauledger.hand.poles import MISSES, HandPole
from tauledger.network.bands import Bands

# Below this share the resistances at two capacitors make the pole together, and no one's R·C is it.
OWNS = 0.6
# Of poles a factor of 4 apart a quotient of coefficients misses by a few per cent; nearer ones pull each other.
APART = 4.0


def with_lower_poles(
    told: Sequence[HandPole],
    cancelled: Sequence[complex],
    bands: Bands,
    devices: tuple[Device, ...],
    rows: Sequence[LowerRow],
    owners: Mapping[complex, Mapping[str, float]],
) -> tuple[HandPole, ...]:
    """Give the poles with a formula for those below mid-band that have none yet and lie within 20 % of one.

    told: of `hand_poles`. cancelled: poles with a zero on top, which get none. owners: by pole, the share of each part.
    The formula is 1/(2π·R·C) of the capacitor that owns 60 % of the pole or more (R/(2π·L) of an inductor); where none
    does, a_k/(2π·a_(k−1)) for a pole that lies apart from its neighbours by a factor of 4. None where capacitors set
    the gain.
    """
    edge = 2.0 * math.pi * bands.midband.frequency_hz
    below = [p for p in told if abs(p.pole) <= edge and p.pole not in cancelled and p.pole != 0]
    below.sort(key=lambda p: -abs(p.pole))
    if bands.s_mid or any(p.pole.imag for p in below):
        return tuple(told)
    opened: list[LowerRow] = []
    found: dict[complex, HandPole] = {}
    for k, pole in enumerate(below):
        row = _owner(rows, owners.get(pole.pole, {}))
        if not pole.formula:
            by_hand = _alone(pole, bands, devices, row, opened) if row is not None else None
            by_hand = by_hand or _by_coefficients(below, k)
            if by_hand is not None and by_hand.hz is not None:
                off = by_hand.hz * 2.0 * math.pi / abs(pole.pole) - 1.0
                found |= {pole.pole: by_hand} if abs(off) <= MISSES else {}
        opened += [row] if row is not None and row not in opened else []
    return tuple(found.get(p.pole, p) for p in told)


def _owner(rows: Sequence[LowerRow], shares: Mapping[str, float]) -> LowerRow | None:
    held = [(math.fsum(shares.get(name, 0.0) for name in row.parts), k) for k, row in enumerate(rows)]
    share, k = max(held, default=(0.0, 0))
    return rows[k] if share >= OWNS else None


def _alone(
    pole: HandPole,
    bands: Bands,
    devices: tuple[Device, ...],
    row: LowerRow,
    opened: Sequence[LowerRow],
) -> HandPole | None:
    """Work the pole of one row with the rows in `opened` as they are below their own poles."""
    if row in opened:
        return None
    network = bands.network
    gone = {name for one in opened for name in one.parts}
    shorts = {
        p.name for p in network.parts if p.kind == "capacitance" and bands.class_of[p.name] == "short" and p.value
    }
    coils = {p.name for p in network.parts if p.kind == "inductance" and bands.class_of[p.name] == "open"}
    # a choke has become a short below its own edge, a capacitor an open
    joining = (shorts - gone - {*row.parts}) | (coils & gone)
    removed = {p.name for p in network.parts if p.kind in ("capacitance", "transcapacitance")} - joining
    try:
        smaller, merged = joined(network, joining, removed | {*row.parts} | (coils - gone))
        circuit = equivalent_circuit(smaller, merged, devices, network)
        a, b = (circuit.at.get(node, GROUND) for node in network.part(row.parts[0]).nodes)
        ohm = resistance_across(circuit, a, b).ohm
    except NetworkError:
        return None
    if not ohm or math.isinf(ohm):
        return None
    hz = ohm / (2.0 * math.pi * row.henry) if row.henry else 1.0 / (2.0 * math.pi * ohm * row.farad)
    names = " ‖ ".join(row.parts)
    formula = f"R/(2π·{names})" if row.henry else f"1/(2π·R·{names})"
    where = _state([" ‖ ".join(one.parts) for one in opened if not one.henry], "open")
    where += _state([one.parts[0] for one in opened if one.henry], "short")
    return replace(pole, hz=hz, formula=f"{formula}{', R' if where else ''}{where}")


def _state(names: Sequence[str], word: str) -> str:
    return f" with {' and '.join(names)} {word}" if names else ""


def _by_coefficients(below: Sequence[HandPole], k: int) -> HandPole | None:
    """Give a_k/(2π·a_(k−1)), counted from 1, for a pole that lies apart from those on either side."""
    size = [abs(p.pole) for p in below]
    beside = [size[j] for j in (k - 1, k + 1) if 0 <= j < len(size)]
    if any(max(size[k] / other, other / size[k]) < APART for other in beside):
        return None
    a = np.abs(np.poly([-p.pole.real for p in below]))
    order = k + 1
    lower = f"a{k}" if k else "1"
    formula = f"a{order}/(2π·{lower})" if k else "a1/2π"
    return replace(below[k], hz=float(a[order] / a[k]) / (2.0 * math.pi), formula=formula)
