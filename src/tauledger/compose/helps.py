"""What would help: what 10 % less of each element does to f_H, f_L and gain, and the largest three computed again."""

from __future__ import annotations

from msgspec.structs import replace

from tauledger.devices.parts import Part
from tauledger.network.assemble import Network
from tauledger.network.first_order import RESISTIVE, Sensitivity, rerun, sensitivities
from tauledger.numbers import Numbers
from tauledger.record import Help

LESS = 0.1
WORTH_A_ROW = 0.005
RERUN = 3
# a resistor that carries less than this has no part in the operating point
NO_VOLT = 1e-6
UNITS = {"capacitance": "F", "inductance": "H", "conductance": "Ω", "line": "s", "mutual inductance": "H"}


def helps(numbers: Numbers) -> tuple[Help, ...]:
    """Give the elements of which 10 % less moves an edge by 0.5 % or more, those that one may choose freely first.

    First the cards that leave the operating point alone, then resistors that carry direct current and the gm of
    transistors, then the capacitances of transistors; in each group the largest effect first. The first three are
    computed again as proof, with the operating point held. Nothing where the network is not trusted.
    """
    if not numbers.trusted:
        return ()
    network, midband, edges = numbers.network, numbers.midband, numbers.edges
    elements = all_elements(network)
    found = sensitivities(network, midband, edges, elements)
    rows = [
        row
        for row in (_row(part, found[part.name], numbers) for part in elements)
        if max(abs(row.f_high or 0.0), abs(row.f_low or 0.0)) >= WORTH_A_ROW
    ]
    rows.sort(key=_order)
    proven: list[Help] = []
    for row in rows[:RERUN]:
        factor = 1.0 / (1.0 - LESS) if row.unit == "Ω" else 1.0 - LESS
        exact = rerun(network, midband, edges, {row.name: factor})
        gain = exact.gain / abs(midband.gain) - 1.0
        proven.append(replace(row, f_high_rerun_hz=exact.f_high, f_low_rerun_hz=exact.f_low, gain_rerun=gain))
    return (*proven, *rows[RERUN:])


def is_card(part: Part) -> bool:
    """Whether a part is a card of the netlist and not inside a device; a line's delay and a transformer's L are."""
    return part.name == part.owner or part.kind in ("line", "inductance")


def all_elements(network: Network) -> list[Part]:
    """Give the parts to choose or to blame in the network's order; of couplings those that may be 10 % less."""
    found = [part for part in network.parts if is_element(part)]
    if not any(part.kind == "mutual inductance" for part in found):
        return found
    from tauledger.network.transformers import loose_couplings

    loose = loose_couplings(network)
    return [part for part in found if part.kind != "mutual inductance" or part.name in loose]


def is_element(part: Part) -> bool:
    """Whether a part is something to choose or to blame: a card, a device's capacitance or its gm."""
    card = is_card(part)
    if part.kind in ("capacitance", "inductance", "line"):
        return part.value > 0.0
    if part.kind == "mutual inductance":
        return part.value != 0.0
    if part.kind == "conductance":
        return card and part.value > 0.0
    return part.kind in RESISTIVE and (card or part.label == "gm") and part.value != 0.0


def _row(part: Part, change: Sensitivity, numbers: Numbers) -> Help:
    # a resistance is the inverse of the part's value: less of it is more conductance
    sign = LESS if part.kind == "conductance" else -LESS
    card, bias = is_card(part), moves_bias(part, numbers)
    return Help(
        name=part.name,
        owner=part.owner,
        nodes=part.nodes,
        value=1.0 / part.value if part.kind == "conductance" else part.value,
        unit=UNITS.get(part.kind, "S"),
        free=card and not bias,
        moves_bias=bias,
        f_high=None if change.f_high is None else sign * change.f_high,
        f_low=None if change.f_low is None else sign * change.f_low,
        gain=sign * change.gain,
    )


def moves_bias(part: Part, numbers: Numbers) -> bool:
    """Whether the element takes part in the operating point: a resistor that carries direct current, and any gm."""
    if part.kind in ("capacitance", "inductance", "line", "mutual inductance"):
        return False
    if part.kind != "conductance":
        return True
    if numbers.bias is None or numbers.circuit is None:
        return False
    at = {node: k for k, node in enumerate(numbers.circuit.nodes)}
    a, b = (float(numbers.bias.voltages[at[node]]) if node in at else 0.0 for node in part.nodes[:2])
    return abs(a - b) > NO_VOLT


def _order(row: Help) -> tuple[bool, bool, float]:
    return not row.free, not row.moves_bias, -max(abs(row.f_high or 0.0), abs(row.f_low or 0.0))
