"""Poles and zeros that paper knows of a circuit: each with its formula, and which exact one it belongs to."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from typing import Literal

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.hand.compensated import (
    CompensatedStage,
    Places,
    capacitors_at,
    dominant_hz,
    farads_at,
    find_places,
)
from tauledger.hand.compensation import (
    BASE_COLLECTOR_ZERO,
    BIPOLAR_MIRROR_POLE,
    BRIDGED_RESISTOR_ZERO,
    CASCODE_POLE,
    DEGENERATION_ZERO,
    DOMINANT_POLE,
    FOLLOWER_ZERO,
    GATE_DRAIN_ZERO,
    LOAD_POLE,
    LOADED_POLE,
    LOADED_SECOND_POLE,
    MIRROR_POLE,
    MIRROR_ZERO,
    NULLED_ZERO,
    RIGHT_HALF_PLANE_ZERO,
    SECOND_POLE,
    THIRD_POLE,
    Formula,
    bridged_resistor_zero_hz,
    cascode_pole_hz,
    follower_zero_hz,
    load_pole_hz,
    loaded_second_pole_hz,
    mirror_pole_hz,
    mirror_zero_hz,
    nulled_zero_hz,
    right_half_plane_zero_hz,
    second_pole_hz,
    third_pole_hz,
)
from tauledger.hand.elements import Cell
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.load_compensated import LoadedOutput
from tauledger.hand.nodes import CROSSING_IN_PATH, crossing
from tauledger.quantity import engineering

RootKind = Literal["pole", "zero"]
# The capacitances of a formula own at least so much of the pole that it is said of.
OWNS = 0.3
# As far as a formula may miss its pole or zero and still be the one meant, as a factor.
BELONGS = {"stage": 1.5, "mirror": 1.5, "cascode": 1.5, "": 1.3}


class HandRoot(Struct, frozen=True):
    """One pole or zero by hand. hz: a pole by its size, a zero positive in the right half plane, else negative.

    formula: what it comes from. values: its operands as text. of: "stage", "mirror", "cascode" or empty, from where it
    is known. parts: of a pole, the capacitances in the formula.
    """

    kind: RootKind
    hz: float
    formula: Formula
    values: str
    of: str = ""
    parts: frozenset[str] = frozenset()


class ExactRoot(Struct, frozen=True):
    """One pole or zero of the network, s in rad/s; of a complex pair the one above the axis.

    owners: of a pole, the part that each capacitance has in it; empty where that is not known.
    """

    kind: RootKind
    s: complex
    paired: bool
    owners: Mapping[str, float] = {}

    @property
    def hz(self) -> float:
        """|s|/2π in Hz."""
        return abs(self.s) / (2.0 * math.pi)


def hand_roots(
    circuit: EquivalentCircuit, stage: CompensatedStage | None, load: LoadedOutput | None = None
) -> tuple[HandRoot, ...]:
    """Give the poles and zeros that paper knows: of the compensated stage or the load, of mirrors and cascodes, of what
    passes forward.

    circuit: of a balanced circuit its half.
    """
    places = find_places(circuit)
    found = [] if stage is None else list(_of_stage(stage))
    if load is not None:
        values = f"R_out = {engineering(load.r_out, 'Ω', 3)}, C_L = {engineering(load.c_l, 'F', 3)} at {load.name}"
        found.append(HandRoot("pole", load_pole_hz(load.r_out, load.c_l), LOAD_POLE, values, "stage", load.parts))
    found += _of_mirrors(circuit, places)
    found += _of_cascodes(circuit, places)
    found += _forward(circuit, places, stage)
    return tuple(root for root in found if math.isfinite(root.hz))


def belonging(
    exact: Sequence[ExactRoot], by_hand: Sequence[HandRoot], *, owns: float = OWNS
) -> dict[int, tuple[HandRoot, ...]]:
    """Give for the exact ones, by position, what they are by hand: one formula each, the best matches first.

    A formula belongs where it misses by less than a factor 1.5 (stage, mirror) or 1.3 (others), on the same side of
    the axis, and to a pole only where the formula's capacitances own so much of it. Two poles by hand belong to a
    complex pair together, by their geometric mean.
    """
    trials = [
        (off, k, one)
        for k, root in enumerate(exact)
        if root.s
        for one in _candidates(root, by_hand)
        if _owned(root, one) >= owns
        if (off := abs(math.log(_together(one) / root.hz))) <= math.log(max(BELONGS[h.of] for h in one))
    ]
    found: dict[int, tuple[HandRoot, ...]] = {}
    taken: set[int] = set()
    # what is known of the stage goes first: a chance match of another formula must not take its pole
    for _, k, one in sorted(trials, key=lambda trial: (all(h.of != "stage" for h in trial[2]), trial[0])):
        if k not in found and not taken & {id(h) for h in one}:
            found[k] = one
            taken |= {id(h) for h in one}
    return found


def _owned(root: ExactRoot, one: tuple[HandRoot, ...]) -> float:
    parts = frozenset[str]().union(*(h.parts for h in one))
    return sum(abs(root.owners.get(part, 0.0)) for part in parts) if root.owners and parts else 1.0


def _together(roots: tuple[HandRoot, ...]) -> float:
    return math.prod(abs(root.hz) for root in roots) ** (1.0 / len(roots))


def _candidates(root: ExactRoot, by_hand: Sequence[HandRoot]) -> Iterator[tuple[HandRoot, ...]]:
    same = [one for one in by_hand if one.kind == root.kind]
    if not root.paired:
        right = root.kind == "zero" and root.s.real > 0.0
        yield from ((one,) for one in same if one.kind == "pole" or (one.hz > 0.0) == right)
    elif root.kind == "pole":
        yield from ((one, other) for k, one in enumerate(same) for other in same[k + 1 :])


def _of_stage(stage: CompensatedStage) -> Iterator[HandRoot]:
    gm_2 = f"gm2 = {engineering(stage.gm_2, 'S', 3)} ({', '.join(stage.owners)})"
    c_c, c_1, c_l = (engineering(farad, "F", 3) for farad in (stage.across, stage.c_1, stage.c_l))
    r_1 = engineering(stage.r_1, "Ω", 3)
    values = f"R1 = {r_1} at {stage.input_name}, C1 = {c_1}, C_c = {c_c}, A2 = {stage.a_2:.3g}"
    dominant, second = DOMINANT_POLE, SECOND_POLE
    second_hz = second_pole_hz(stage.gm_2, stage.c_1, stage.c_l, stage.across)
    of_second = f"{gm_2}, C_L = {c_l} at {stage.output_name}"
    if stage.loaded:
        dominant, second = LOADED_POLE, LOADED_SECOND_POLE
        figures = (stage.r_1, stage.c_1, stage.across, stage.a_2, stage.r_2, stage.c_l)
        second_hz = loaded_second_pole_hz(*figures)
        of_second = ""
        values += f", R2 = {engineering(stage.r_2, 'Ω', 3)}, C_L = {c_l} at {stage.output_name}"
    yield HandRoot("pole", dominant_hz(stage), dominant, values, "stage", stage.parts)
    yield HandRoot("pole", second_hz, second, of_second, "stage", stage.parts)
    if not stage.r_z:
        zero = right_half_plane_zero_hz(stage.gm_2, stage.across)
        yield HandRoot("zero", zero, RIGHT_HALF_PLANE_ZERO, f"{gm_2}, C_c = {c_c}", "stage")
        return
    r_z = f"R_z = {engineering(stage.r_z, 'Ω', 3)} ({stage.resistor})"
    nulled = nulled_zero_hz(stage.gm_2, stage.c_c, stage.r_z)
    yield HandRoot("zero", nulled, NULLED_ZERO, f"{r_z}, 1/gm2 = {engineering(1.0 / stage.gm_2, 'Ω', 3)}", "stage")
    if stage.c_1:
        yield HandRoot(
            "pole", third_pole_hz(stage.r_z, stage.c_1), THIRD_POLE, f"{r_z}, C1 = {c_1}", "stage", stage.parts
        )


def _of_mirrors(circuit: EquivalentCircuit, places: Places) -> Iterator[HandRoot]:
    for diode in circuit.cells:
        at = places.of(diode.control)
        if at == GROUND or _rail(diode, circuit) != GROUND or not _closed(circuit, places, diode):
            continue
        driven = any(
            c is not diode and places.of(c.control) == at and _rail(c, circuit) == GROUND for c in circuit.cells
        )
        farad = farads_at(circuit, places, at)
        if not driven or not farad or not _crossed(circuit, places, at):
            continue
        values = f"gm = {engineering(diode.gm, 'S', 3)} ({diode.owner}), C_m = {engineering(farad, 'F', 3)}"
        parts = frozenset(c.part for c in capacitors_at(circuit, places, at))
        formula = BIPOLAR_MIRROR_POLE if diode.words[0] == "base" else MIRROR_POLE
        yield HandRoot("pole", mirror_pole_hz(diode.gm, farad), formula, values, "mirror", parts)
        yield HandRoot("zero", mirror_zero_hz(diode.gm, farad), MIRROR_ZERO, values, "mirror")


def _closed(circuit: EquivalentCircuit, places: Places, cell: Cell) -> bool:
    """Whether a transistor is a diode: its output is its control, at once or through a cascode."""
    at, end = places.of(cell.control), places.of(cell.output)
    return end == at or any(
        places.of(c.common) == end and places.of(c.output) == at and places.of(c.control) == GROUND
        for c in circuit.cells
    )


def _of_cascodes(circuit: EquivalentCircuit, places: Places) -> Iterator[HandRoot]:
    """The source (emitter) of a transistor whose gate stands still and whose drain goes on."""
    for cell in circuit.cells:
        at = places.of(cell.common)
        if places.of(cell.control) != GROUND or GROUND in (at, places.of(cell.output)):
            continue
        # a second transistor with its emitter there is a pair
        if any(c is not cell and places.of(c.common) == at for c in circuit.cells):
            continue
        farad = farads_at(circuit, places, at)
        if not farad or not _crossed(circuit, places, at) or places.of(cell.output) == at:
            continue
        values = f"gm = {engineering(cell.gm, 'S', 3)}"
        values += f", g_mb = {engineering(cell.body_gm, 'S', 3)}" if cell.body_gm else ""
        values += f" ({cell.owner}), C_node = {engineering(farad, 'F', 3)}"
        parts = frozenset(c.part for c in capacitors_at(circuit, places, at))
        yield HandRoot("pole", cascode_pole_hz(cell.gm, cell.body_gm, farad), CASCODE_POLE, values, "cascode", parts)


def _crossed(circuit: EquivalentCircuit, places: Places, place: str) -> bool:
    """Whether the signal crosses a place."""
    return any(abs(crossing(circuit, node)) >= CROSSING_IN_PATH for node in places.members[place])


def _rail(cell: Cell, circuit: EquivalentCircuit) -> str:
    """Give the place of the common terminal, behind the transistor's own series resistance."""
    terminal = [t.outer for t in circuit.terminals if t.owner == cell.owner and t.inner == cell.common]
    return terminal[0] if terminal else cell.common


def _forward(circuit: EquivalentCircuit, places: Places, stage: CompensatedStage | None) -> Iterator[HandRoot]:
    """What passes forward beside a transistor or a resistor: C_gd, C_gs of a follower, C beside R."""

    def bridging(one: str, other: str) -> float:
        return sum(c.farad for c in circuit.capacitors if places.ends(c) == {one, other})

    for cell in circuit.cells:
        control, common, output = (places.of(node) for node in (cell.control, _rail(cell, circuit), cell.output))
        if control in (output, GROUND):
            continue
        gm = f"gm = {engineering(cell.gm, 'S', 3)} ({cell.owner})"
        if not _crossed(circuit, places, control):
            continue
        own = stage is not None and cell.owner in stage.owners
        if output != GROUND and common == GROUND and not own and (farad := bridging(control, output)):
            formula = BASE_COLLECTOR_ZERO if cell.words[0] == "base" else GATE_DRAIN_ZERO
            values = f"{gm}, {formula.name.rpartition(' ')[2]} = {engineering(farad, 'F', 3)}"
            yield HandRoot("zero", right_half_plane_zero_hz(cell.gm, farad), formula, values)
        if common != GROUND and output == GROUND and (farad := bridging(control, common)):
            values = f"{gm}, C = {engineering(farad, 'F', 3)}"
            yield HandRoot("zero", follower_zero_hz(cell.gm, cell.r_pi, farad), FOLLOWER_ZERO, values)
    commons = {places.of(cell.common) for cell in circuit.cells if places.of(cell.output) != GROUND}
    for resistor in circuit.resistors:
        ends = places.ends(resistor)
        if len(ends) < 2 or resistor.inside or (GROUND in ends and not commons & ends - {GROUND}):
            continue
        farad = bridging(*sorted(ends))
        if farad:
            formula = DEGENERATION_ZERO if GROUND in ends else BRIDGED_RESISTOR_ZERO
            values = f"R = {engineering(resistor.ohm, 'Ω', 3)} ({resistor.name}), C = {engineering(farad, 'F', 3)}"
            yield HandRoot("zero", bridged_resistor_zero_hz(resistor.ohm, farad), formula, values)
