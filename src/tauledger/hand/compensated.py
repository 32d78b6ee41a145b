"""The compensated stage: an inverting stage with a capacitance, or that and a resistor, from its output to its input.

It is found among transistors, resistors and capacitances, never by a name; an inner node of a device is taken with its
outer one, as on paper. Of several the one whose input has the longest time constant R1·(C1 + C_c·(1 + A2)) is taken:
it makes the dominant pole.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping

from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.hand.compensation import dominant_pole_hz, loaded_pole_hz
from tauledger.hand.elements import Capacitor, Cell, Resistor
from tauledger.hand.equivalent import EquivalentCircuit
from tauledger.hand.nodes import groups, node_name

# A stage through which less of the signal goes stands beside the path; inside a loop it is 1/(1 + T) of it.
IN_PATH = 1e-4
# Below this the load makes the dominant pole as much as the input does, and no pole splits.
INVERTS = -5.0
# Capacitance to elsewhere at the node between R_z and C_c, against C_c: more of it and they are not in series.
STRAY = 0.1
AS_ONE_DEVICE = 0.01
# Drive by resistors and by mirrors that are a little uneven: still the gm of the input transistor.
AS_INPUT_DEVICE = 0.05
# The load's own R2·(C_c + C_L) is left out on paper below this part of the whole constant.
LOAD_COUNTS = 0.03
# Below this part of it the input makes no pole that counts: the load alone does.
INPUT_COUNTS = 0.15


class Places(Struct, frozen=True):
    """Hand nodes as paper sees them: `at` gives for each the one that stands for it and its devices' inner nodes.

    members: the hand nodes of each.
    """

    at: Mapping[str, str]
    members: Mapping[str, tuple[str, ...]]

    def of(self, node: str) -> str:
        """Give the place of a hand node, ground included."""
        return self.at.get(node, node)

    def ends(self, element: Capacitor | Resistor) -> frozenset[str]:
        """Give the one or two places between which an element stands."""
        return frozenset((self.of(element.a), self.of(element.b)))


class CompensatedStage(Struct, frozen=True):
    """One inverting stage with its compensation, by hand values.

    input, output: places, and input_name, output_name as the netlist calls them. owners: transistors of the stage, the
    first at the input. gm_2: S, from input to output. a_2: its gain by size.
    capacitors: names of the parts that are C_c, the largest first; c_c: F in series with r_z. c_direct: F straight
    across beside a branch with r_z, else 0. r_z: ohm, 0 without; resistor: its name.
    r_1, r_2: ohm at the input, and at the output with the input held. c_1, c_l: F from input and output to elsewhere.
    gm_1: S that feeds the input; first: the transistor whose gm that is, or "1/RS" of a resistor, empty where it is no
    single one's. to_output: gain by size from the stage's output on. parts: names of all capacitances that are in C1,
    C_c or C_L.
    """

    input: str
    output: str
    input_name: str
    output_name: str
    owners: tuple[str, ...]
    gm_2: float
    a_2: float
    capacitors: tuple[str, ...]
    c_c: float
    c_direct: float
    r_z: float
    resistor: str
    r_1: float
    c_1: float
    c_l: float
    gm_1: float
    first: str
    to_output: float
    r_2: float
    parts: frozenset[str]

    @property
    def across(self) -> float:
        """All that bridges the stage, F."""
        return self.c_c + self.c_direct

    @property
    def loaded(self) -> bool:
        """Whether R2·(C_c + C_L) counts in the dominant pole."""
        return 1.0 - self._of_input > LOAD_COUNTS

    @property
    def compensates(self) -> bool:
        """Whether the constant at the input is a good part of the whole."""
        return self._of_input >= INPUT_COUNTS

    @property
    def _of_input(self) -> float:
        at_input = self.r_1 * (self.c_1 + self.across * (1.0 + self.a_2))
        return at_input / (at_input + self.r_2 * (self.across + self.c_l))


class _Branch(Struct, frozen=True):
    capacitors: tuple[Capacitor, ...]
    resistor: Resistor | None = None

    @property
    def farad(self) -> float:
        return sum(capacitor.farad for capacitor in self.capacitors)


class _Inverting(Struct, frozen=True):
    """Hand nodes from which and to which the stage inverts, and its transistors."""

    start: str
    end: str
    owners: tuple[str, ...]


def find_compensated_stage(
    circuit: EquivalentCircuit, resistance_ohm: Mapping[str, float], response: complex
) -> CompensatedStage | None:
    """Find the bridged stage with the lowest pole; None where no inverting stage of the signal path is bridged.

    Where it does not compensate, the load alone makes that pole.

    circuit: the hand circuit, of a balanced one its half. resistance_ohm: by hand, by hand node; the exact one is taken
    where there is none. response: of the whole network, whose output may lie beyond the stage's.
    """
    places = find_places(circuit)
    found = [
        stage
        for inverting in _inverting(circuit, places)
        if (stage := _stage(circuit, places, inverting, resistance_ohm, response)) is not None
    ]
    return min(found, key=dominant_hz, default=None)


def dominant_hz(stage: CompensatedStage) -> float:
    """Give the stage's dominant pole by hand in Hz; with the load's own constant where that counts."""
    if stage.loaded:
        return loaded_pole_hz(stage.r_1, stage.c_1, stage.across, stage.a_2, stage.r_2, stage.c_l)
    return dominant_pole_hz(stage.r_1, stage.c_1, stage.across, stage.a_2)


def find_places(circuit: EquivalentCircuit) -> Places:
    """Take every inner node of a device with its outer one."""
    rows = groups(circuit)
    return Places({node: row.nodes[0] for row in rows for node in row.nodes}, {row.nodes[0]: row.nodes for row in rows})


def farads_at(circuit: EquivalentCircuit, places: Places, place: str, without: frozenset[str] = frozenset()) -> float:
    """Give the capacitance in F from a place to all others, taken as standing still; a mirror image counts twice."""
    return sum(
        capacitor.farad * (2.0 if capacitor.mirrored else 1.0)
        for capacitor in capacitors_at(circuit, places, place)
        if capacitor.part not in without
    )


def capacitors_at(circuit: EquivalentCircuit, places: Places, place: str) -> tuple[Capacitor, ...]:
    """Give the capacitances from a place to all others."""
    return tuple(c for c in circuit.capacitors if place in (ends := places.ends(c)) and len(ends) > 1)


def _inverting(circuit: EquivalentCircuit, places: Places) -> tuple[_Inverting, ...]:
    """Give every inverting stage: one transistor or several side by side, or a follower and the one that it drives."""
    found: dict[tuple[str, str], _Inverting] = {}
    for path in _paths(circuit.cells, places):
        start, end = path[0].control, path[-1].output
        ends = places.of(start), places.of(end)
        if ends[0] == ends[1] or GROUND in ends or circuit.gain(start, end) >= INVERTS:
            continue
        known = found.get(ends, _Inverting(start, end, ()))
        owners = tuple(dict.fromkeys((*known.owners, *(cell.owner for cell in path))))
        found[ends] = _Inverting(known.start, known.end, owners)
    return tuple(found.values())


def _paths(cells: tuple[Cell, ...], places: Places) -> Iterator[tuple[Cell, ...]]:
    for cell in cells:
        yield (cell,)
    for follower in cells:
        for cell in cells:
            if cell is not follower and places.of(follower.common) == places.of(cell.control) != GROUND:
                yield follower, cell


def _stage(
    circuit: EquivalentCircuit,
    places: Places,
    inverting: _Inverting,
    resistance_ohm: Mapping[str, float],
    response: complex,
) -> CompensatedStage | None:
    start, end = inverting.start, inverting.end
    here, there = places.of(start), places.of(end)
    across = _Branch(tuple(c for c in circuit.capacitors if places.ends(c) == {here, there}))
    through = _series(circuit, places, here, there)
    branch = through if through is not None and through.farad > across.farad else across
    if not branch.farad:
        return None
    i, k = circuit.row[start], circuit.row[end]
    # a stage inverts with a gain, so that its input is held by no source; in a loop resistances may turn negative
    z_in, gain = circuit.z(start, start), circuit.gain(start, end)
    z_out = circuit.z(end, end) - circuit.z(start, end) * circuit.z(end, start) / z_in
    if z_in <= 0.0 or z_out <= 0.0:
        return None
    transfer = -gain / z_out
    passed = transfer * circuit.voltage[i] * circuit.adjoint[k]
    if abs(passed) < IN_PATH * abs(circuit.response):
        return None
    named = frozenset(c.part for one in (across, branch) for c in one.capacitors)
    norton = float(abs(circuit.voltage[i])) / abs(z_in)
    gm_1, first = input_device(circuit, places, here, norton)
    reached = float(abs(circuit.voltage[k]))
    series = branch.resistor
    return CompensatedStage(
        input=here,
        output=there,
        input_name=node_name(circuit, here),
        output_name=node_name(circuit, there),
        owners=inverting.owners,
        gm_2=_gm_of(circuit, inverting.owners, transfer),
        a_2=-gain,
        capacitors=tuple(c.part for c in sorted(branch.capacitors, key=lambda c: -c.farad)),
        c_c=branch.farad,
        c_direct=across.farad if series is not None else 0.0,
        r_z=series.ohm if series is not None else 0.0,
        resistor=series.name if series is not None else "",
        r_1=resistance_ohm.get(start, abs(z_in)),
        c_1=farads_at(circuit, places, here, named),
        c_l=farads_at(circuit, places, there, named),
        gm_1=gm_1,
        first=first or _resistor_of(circuit, places, here, norton),
        to_output=abs(response) / reached if reached else math.nan,
        r_2=z_out,
        parts=frozenset(c.part for at in (here, there) for c in capacitors_at(circuit, places, at)) | named,
    )


def _series(circuit: EquivalentCircuit, places: Places, here: str, there: str) -> _Branch | None:
    """Find a resistor and capacitors in series between two places; nothing else of note may hang in between."""
    for near, far in ((here, there), (there, here)):
        for resistor in circuit.resistors:
            ends = places.ends(resistor)
            if near not in ends or len(ends) == 1:
                continue
            (between,) = ends - {near}
            touching = circuit.resistors_at.get(between, ())
            if between in (GROUND, far) or circuit.cells_at.get(between) or len(touching) > 1:
                continue
            capacitors = tuple(c for c in circuit.capacitors if places.ends(c) == {between, far})
            farad = sum(c.farad for c in capacitors)
            strays = farads_at(circuit, places, between, frozenset(c.part for c in capacitors))
            if farad and strays <= STRAY * farad:
                return _Branch(capacitors, resistor)
    return None


def _gm_of(circuit: EquivalentCircuit, owners: tuple[str, ...], transfer: float) -> float:
    """Give gm of the stage as paper has it: that of its transistors where this is all, else what it comes to."""
    alone = sum(cell.gm for cell in circuit.cells if cell.owner in owners)
    return alone if abs(alone - transfer) <= AS_ONE_DEVICE * abs(transfer) else transfer


def input_device(circuit: EquivalentCircuit, places: Places, place: str, norton: float) -> tuple[float, str]:
    """Give gm1 in S and whose it is: of the transistor whose gm, or half of it, is what the drive sends to a place.

    A mirror's output and a current source bring current there too, but their controls are no input. Without such a
    transistor gm1 is `norton` itself, and no name.
    """
    ending = [c for c in circuit.cells if places.of(c.output) == place and not _mirrors(circuit, places, c)]
    through = {places.of(c.common) for c in ending} - {GROUND}
    near = [c for c in circuit.cells if {places.of(c.common), places.of(c.output)} & through]
    folded = {places.of(c.common) for c in near} - {GROUND}
    far = [c for c in circuit.cells if places.of(c.common) in folded]
    for part, said in ((1.0, "{}"), (0.5, "half of {}'s")):
        for cell in (*ending, *near, *far):
            gm = part * abs(cell.gm)
            known = abs(gm - norton) <= AS_INPUT_DEVICE * norton
            if known and _moved(circuit, cell) and not _mirrors(circuit, places, cell):
                return gm, said.format(cell.owner)
    return norton, ""


def _moved(circuit: EquivalentCircuit, cell: Cell) -> bool:
    """Whether the drive moves the control of a transistor."""
    if cell.control != GROUND:
        return bool(abs(circuit.voltage[circuit.row[cell.control]]) > 0.0)
    outer = [t.netlist_node for t in circuit.terminals if t.owner == cell.owner and t.word == cell.words[0]]
    return not outer or outer[0] in circuit.driven


def _mirrors(circuit: EquivalentCircuit, places: Places, cell: Cell) -> bool:
    """Whether a transistor's control hangs at a diode: a mirror, its diode, or a current source."""
    at = places.of(cell.control)
    return at != GROUND and any(places.of(c.control) == at == places.of(c.output) for c in circuit.cells)


def _resistor_of(circuit: EquivalentCircuit, places: Places, place: str, norton: float) -> str:
    """Give "1/RS" where what feeds a place is the drive, or half of it, through a resistor."""
    for resistor in circuit.resistors:
        if places.ends(resistor) != {place, GROUND}:
            continue
        for part, said in ((1.0, "1/{}"), (2.0, "1/(2·{})")):
            if abs(part * norton * resistor.ohm - 1.0) <= AS_ONE_DEVICE:
                return said.format(resistor.name)
    return ""
