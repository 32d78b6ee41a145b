"""The lower edge by hand: per coupling or bypass capacitor the resistance that it faces, all other shorts shorted.

Source of the short-circuit time constants: Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated
Circuits, 5th ed., 2009, sec. 7.4.
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
from tauledger.hand.combine import Combined
from tauledger.hand.equivalent import EquivalentCircuit, equivalent_circuit, joined, joined_nodes
from tauledger.hand.estimate import LookingIn, LowerRow
from tauledger.hand.figures import plain
from tauledger.hand.nodes import node_name, node_title
from tauledger.network.bands import Bands
from tauledger.network.lower import ShortConstant, coupling_groups, short_constants
from tauledger.network.shares import zero_shares
from tauledger.network.solve import response
from tauledger.quantity import engineering

WEIGHT_IN_PATH = 0.05
EDGE_IN_PATH = 0.02
OWNS = 0.5
BLOCKS = 1e-6
ACCEPTED = 0.01


def lower_rows(bands: Bands, devices: tuple[Device, ...]) -> tuple[LowerRow, ...]:
    """Give one row per short capacitor, parallel ones taken together, in the order of the file.

    Hand: the resistance across it by looking-in rules, edge 1/(2π·R·C). zero_hz = f_k·H(open)/H(short) is the zero
    that it makes alone. A row counts if the gain is at least 5 % lower with the capacitor open, or if its part of Σ
    |f_k·(1 − H(open)/H(short))| is at least 2 %: supply decoupling, which the signal does not need, does not.
    Capacitors with both ends at one node make no row.
    Raises NetworkError where the mid-band circuit has no unique solution.
    """
    network = bands.network
    shorts = {
        p.name for p in network.parts if p.kind == "capacitance" and bands.class_of[p.name] == "short" and p.value
    }
    opens = {p.name for p in network.parts if p.kind in ("capacitance", "transcapacitance")} - shorts
    opens -= bands.gain_setting
    chokes = {p.name for p in network.parts if p.kind == "inductance" and bands.class_of[p.name] == "open"}
    direct = _direct_nodes(bands)
    found: list[tuple[LowerRow, float]] = []
    for group in coupling_groups(bands):
        ends = sorted(direct[node] for node in group[0].nodes)
        if ends[0] == ends[1]:
            continue
        names = tuple(part.name for part in group)
        smaller, merged = joined(network, shorts - {*names}, {*names, *opens, *chokes})
        circuit = equivalent_circuit(smaller, merged, devices, network, bands.s_mid)
        a, b = (circuit.at[node] for node in ends)
        if a == b:
            continue
        found.append(_row(bands, circuit, (a, b), names, sum(part.value for part in group)))
    setting = _setting(bands) if bands.gain_setting else ()
    scale = sum(abs(weight * row.edge_exact_hz) for row, weight in found)
    scale += sum(abs(constant.weight * constant.edge_hz) for constant in setting)
    return (*(_judged(row, weight, scale) for row, weight in found), *map(_gain_row, setting))


def zero_owner(bands: Bands, rows: Sequence[LowerRow], zero: complex) -> LowerRow | None:
    """Give the row whose capacitors a zero (rad/s) of the lower network depends on by half or more, else None."""
    try:
        shares = zero_shares(bands.lower, zero)
    except NetworkError:
        return None
    held = {row: math.fsum(shares.get(name, 0.0) for name in row.parts) for row in rows if row.in_path}
    owner = max(held, key=lambda row: held[row], default=None)
    return owner if owner is not None and held[owner] >= OWNS else None


def nearest_zero_owner(bands: Bands, rows: Sequence[LowerRow], combined: Combined) -> LowerRow | None:
    """Give the owner of the highest visible zero of the lower network, the one nearest mid-band."""
    zeros = combined.roots.zeros[combined.roots.zeros != 0]
    return zero_owner(bands, rows, complex(zeros[np.argmax(np.abs(zeros))])) if len(zeros) else None


def _row(
    bands: Bands, circuit: EquivalentCircuit, ends: tuple[str, str], names: tuple[str, ...], farad: float
) -> tuple[LowerRow, float]:
    """Give the row, not yet judged, and its weight 1 − H(open)/H(short)."""
    seen = resistance_across(circuit, *ends)
    exact = circuit.across(*ends)
    if circuit.s_mid:
        exact = _parallel_ohm(circuit, *ends)
        if abs(seen.ohm - exact) > ACCEPTED * abs(exact):
            seen = _solved(exact, "the capacitors that set the gain are part of it")
    edge = _edge(exact, farad)
    passed = _gain_left(bands, circuit)
    row = LowerRow(
        parts=names,
        title=_title(circuit, ends, passed, bands, names),
        farad=farad,
        resistance=seen,
        resistance_exact_ohm=exact,
        edge_hand_hz=_edge(seen.ohm, farad),
        edge_exact_hz=edge,
        zero_hz=edge * passed,
        in_path=True,
    )
    return row, 1.0 - passed


def _setting(bands: Bands) -> tuple[ShortConstant, ...]:
    return tuple(row for row in short_constants(bands).parts if bands.gain_setting.issuperset(row.names))


def _gain_row(constant: ShortConstant) -> LowerRow:
    """Give the row of capacitors that set the gain: what they hold of the poles below mid-band."""
    return LowerRow(
        parts=constant.names,
        title=f"gain-setting {' ‖ '.join(constant.names)}",
        farad=constant.value,
        resistance=_solved(constant.resistance_ohm, f"its part of the poles below mid-band, {_hertz(constant)}"),
        resistance_exact_ohm=constant.resistance_ohm,
        edge_hand_hz=constant.edge_hz,
        edge_exact_hz=constant.edge_hz,
        zero_hz=constant.zero_hz,
        in_path=constant.in_path and constant.edge_hz > 0.0,
    )


def _hertz(constant: ShortConstant) -> str:
    return engineering(constant.edge_hz, "Hz", 3)


def _solved(ohm: float, why: str) -> LookingIn:
    return LookingIn(ohm, "solved", f"R = {plain(ohm)}, solved: {why}", (), "solved")


def _parallel_ohm(circuit: EquivalentCircuit, a: str, b: str) -> float:
    """Give 1/Re(1/Z) in ohm, Z the complex impedance between two nodes at mid-band."""
    rows = [(circuit.row[node], sign) for node, sign in ((a, 1.0), (b, -1.0)) if node != GROUND]
    z = sum(si * sj * complex(circuit.whole[i, j]) for i, si in rows for j, sj in rows)
    siemens = (1.0 / z).real if z else math.inf
    return 1.0 / siemens if siemens else math.inf


def _judged(row: LowerRow, weight: float, scale: float) -> LowerRow:
    part = abs(weight * row.edge_exact_hz) / scale if scale else 0.0
    if weight >= WEIGHT_IN_PATH or part >= EDGE_IN_PATH:
        return row
    named, _, how = row.title.partition(", ")
    where = how.partition(" ")[2]
    return replace(row, title=f"{named}, decoupling {where}", in_path=False)


def _gain_left(bands: Bands, circuit: EquivalentCircuit) -> float:
    """Give H(open)/H(short): the part of the mid-band gain that is left with the capacitor open."""
    at_hz = bands.midband.frequency_hz if bands.gain_setting else 0.0
    short = complex(response(bands.upper, np.array([at_hz]))[0])
    left = float((circuit.response / short).real)
    return 0.0 if abs(left) < BLOCKS else left


def _title(
    circuit: EquivalentCircuit, ends: tuple[str, str], passed: float, bands: Bands, names: tuple[str, ...]
) -> str:
    """Say "C2, bypass at emitter of Q1 (e)", "C1, coupling into base of Q1 (b)": into the end that rests when open.

    A capacitor between two live nodes that signal passes without it, as in series with a feedback resistor, is neither.

    Where other shorts join the capacitor with a better known node, its own node is named: it is soldered there.
    """
    live = [node for node in ends if node != GROUND]
    still = min(live, key=lambda node: abs(circuit.voltage[circuit.row[node]]))
    own = [node for node in bands.network.part(names[0]).nodes if circuit.at[node] == still]
    title = node_title(circuit, still) if node_name(circuit, still) in own or not own else f"node {own[0]}"
    if len(live) == 2 and passed != 0.0:
        far = next(node for node in live if node != still)
        return f"{' ‖ '.join(names)}, between {node_title(circuit, far)} and {title}"
    return f"{' ‖ '.join(names)}, {'coupling into' if passed == 0.0 else 'bypass at'} {title}"


def _direct_nodes(bands: Bands) -> Mapping[str, str]:
    """Give every node's group with nothing joined but sources and short inductors."""
    network = bands.network
    joins = {p.name for p in network.parts if p.kind == "inductance" and bands.class_of[p.name] != "open"}
    joins |= {p.name for p in network.parts if p.kind == "voltage source" and not network.amplitude(p)}
    return joined_nodes(network, joins)


def _edge(ohm: float, farad: float) -> float:
    return 0.0 if math.isinf(ohm) or not ohm else 1.0 / (2.0 * math.pi * ohm * farad)
