"""The lower edge by hand: what each coupling or bypass capacitor, and each choke, faces, all others as at mid-band.

Source of the short-circuit time constants: Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated
Circuits, 5th ed., 2009, sec. 7.4.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tauledger.circuit import GROUND
from tauledger.devices.family import Device
from tauledger.errors import NetworkError
from tauledger.hand.budget import resistance_across
from tauledger.hand.combine import Combined
from tauledger.hand.equivalent import EquivalentCircuit, equivalent_circuit, joined
from tauledger.hand.estimate import LookingIn, LowerRow
from tauledger.hand.figures import plain
from tauledger.hand.nodes import node_name, node_title
from tauledger.network.bands import Bands
from tauledger.network.lower import ShortConstant, ShortConstants, short_constants
from tauledger.network.shares import zero_shares
from tauledger.network.transformers import LEAKAGE, MAGNETISING
from tauledger.quantity import engineering

OWNS = 0.5
ACCEPTED = 0.01


def lower_rows(
    bands: Bands, devices: tuple[Device, ...], constants: ShortConstants | None = None
) -> tuple[LowerRow, ...]:
    """Give one row per short capacitor, parallel ones taken together, then one per open inductor, in the file's order.

    constants: of `short_constants`, which says what belongs together, what counts and which zero each makes; here the
    resistance is added as looking-in rules give it, and with it the edge, 1/(2π·R·C) or R/(2π·L).
    Capacitors with both ends at one node make no row, nor those that face no resistance.
    Raises NetworkError where the mid-band circuit has no unique solution.
    """
    network = bands.network
    shorts = {
        p.name for p in network.parts if p.kind == "capacitance" and bands.class_of[p.name] == "short" and p.value
    }
    opens = {p.name for p in network.parts if p.kind in ("capacitance", "transcapacitance")} - shorts
    opens -= bands.gain_setting
    opens |= {p.name for p in network.parts if p.kind == "inductance" and bands.class_of[p.name] == "open"}
    found: list[LowerRow] = []
    for constant in (constants or short_constants(bands)).parts:
        if bands.gain_setting.issuperset(constant.names):
            found.append(_gain_row(constant))
            continue
        if math.isinf(constant.resistance_ohm):
            # with it taken out a node hangs on nothing: no resistance to look into, and no edge
            continue
        smaller, merged = joined(network, shorts - {*constant.names}, {*constant.names, *opens})
        circuit = equivalent_circuit(smaller, merged, devices, network, bands.s_mid)
        a, b = (circuit.at.get(node, GROUND) for node in constant.nodes)
        if a != b:
            found.append(_row(bands, circuit, (a, b), constant))
    return tuple(found)


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


def _row(bands: Bands, circuit: EquivalentCircuit, ends: tuple[str, str], constant: ShortConstant) -> LowerRow:
    seen = resistance_across(circuit, *ends)
    exact = constant.resistance_ohm
    if circuit.s_mid and abs(seen.ohm - exact) > ACCEPTED * abs(exact):
        seen = _solved(exact, "the capacitors that set the gain are part of it")
    inductive = bands.network.part(constant.names[0]).kind == "inductance"
    title = _inductor_title(circuit, ends, constant) if inductive else _title(circuit, ends, constant, bands)
    if not constant.in_path:
        named, _, how = title.partition(", ")
        title = f"{named}, decoupling {how.partition(' ')[2]}"
    return LowerRow(
        parts=constant.names,
        title=title,
        farad=0.0 if inductive else constant.value,
        henry=constant.value if inductive else 0.0,
        resistance=seen,
        resistance_exact_ohm=exact,
        edge_hand_hz=seen.ohm / (2.0 * math.pi * constant.value) if inductive else _edge(seen.ohm, constant.value),
        edge_exact_hz=constant.edge_hz,
        zero_hz=constant.zero_hz,
        in_path=constant.in_path,
    )


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


def _title(circuit: EquivalentCircuit, ends: tuple[str, str], constant: ShortConstant, bands: Bands) -> str:
    """Say "C2, bypass at emitter of Q1 (e)", "C1, coupling into base of Q1 (b)": into the end that rests when open.

    A capacitor between two live nodes that signal passes without it, as in series with a feedback resistor, is neither.

    Where other shorts join the capacitor with a better known node, its own node is named: it is soldered there.
    """
    names, passed = constant.names, constant.zero_hz
    live = [node for node in ends if node != GROUND]
    still = min(live, key=lambda node: abs(circuit.voltage[circuit.row[node]]))
    own = [node for node in bands.network.part(names[0]).nodes if circuit.at[node] == still]
    title = node_title(circuit, still) if node_name(circuit, still) in own or not own else f"node {own[0]}"
    if len(live) == 2 and passed != 0.0:
        far = next(node for node in live if node != still)
        return f"{' ‖ '.join(names)}, between {node_title(circuit, far)} and {title}"
    return f"{' ‖ '.join(names)}, {'coupling into' if passed == 0.0 else 'bypass at'} {title}"


def _inductor_title(circuit: EquivalentCircuit, ends: tuple[str, str], constant: ShortConstant) -> str:
    """Say "LC, choke at collector of Q1 (c)", "L1.l_m, magnetising inductance at p"."""
    owner, _, label = constant.names[0].partition(".")
    what = "magnetising inductance" if label == MAGNETISING else "leakage inductance" if label == LEAKAGE else "choke"
    live = [node for node in ends if node != GROUND]
    still = max(live, key=lambda node: abs(circuit.voltage[circuit.row[node]]))
    named = constant.names[0] if label else owner
    return f"{named}, {what} at {node_title(circuit, still)}"


def _edge(ohm: float, farad: float) -> float:
    return 0.0 if math.isinf(ohm) or not ohm else 1.0 / (2.0 * math.pi * ohm * farad)
