"""How fast a node can be moved at full size: what its transistor can deliver, over what must be charged there.

A transistor in class A can fall by its whole standing current and no further, so that C·dv/dt ≤ I; a pair whose mirror
ends at a node gives it the tail current. Where more than these move a node (push-pull), it is not judged.

Source: Solomon, "The monolithic op amp: a tutorial study", IEEE J. Solid-State Circuits SC-9(6), 1974: SR = I/C.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping, Sequence

import numpy as np
from msgspec import Struct

from tauledger.circuit import GROUND
from tauledger.devices.family import Device, Transconductor
from tauledger.hand.estimate import SignalNode
from tauledger.hand.nodes import block_of
from tauledger.network.bands import Bands
from tauledger.network.solve import on_axis, solve

STANDING = ("i_c", "i_d")
SOURCES = ("transconductance", "delayed transconductance", "voltage gain", "current gain", "transresistance")
# A transistor that gives less than this part of the largest signal current at a node does not drive it.
DRIVES = 0.1
# One whose mid-band current is less than this part of the largest is reached through capacitances alone: a load.
REACHED = 1e-3
# A node behind resistors is moved together with the one before them where at least half of the signal arrives.
ARRIVES = 0.5
# An emitter is led by its base where that moves at least half as far; else it is a load there.
LEADS = 0.5
# A control terminal below this part of its common terminal's signal stands still: common base or gate.
STILL = 0.05


class Slew(Struct, frozen=True):
    """One node that transistors move.

    node, title: of the row in the budget. drivers: the transistor, or the two of a pair whose mirror ends here.
    current_a: what can be delivered. capacitance_f: what must be charged, as it counts at this node. behind: the nodes
    behind resistors that count in it. ratio: |v(node)| per volt at the output, mid-band.
    cut_off_v: peak at the output from which a transistor here is cut off in mid-band already.
    """

    node: str
    title: str
    drivers: tuple[str, ...]
    current_a: float
    capacitance_f: float
    behind: tuple[str, ...]
    ratio: float
    cut_off_v: float

    @property
    def output_slew_v_per_s(self) -> float:
        """Slew rate at the output in V/s, SR = I/C by the ratio of the two voltages."""
        return self.current_a / (self.capacitance_f * self.ratio)


class Slewing(Struct, frozen=True):
    """The nodes of the signal path that can be judged, the slowest first, and titles of those that cannot.

    may_be_slower: titles of those not judged that transistors move and that the least standing current there could move
    slower than every judged one, and of the output: then none of the judged is known to be the limit.
    """

    nodes: tuple[Slew, ...]
    not_judged: tuple[str, ...]
    may_be_slower: tuple[str, ...] = ()


class _Driver(Struct, frozen=True):
    """One transistor that moves a row: its standing current and its signal current in A, by emitter or by collector."""

    name: str
    kind: str
    cell: Transconductor
    standing_a: float
    signal_a: float
    follows: bool


class _Scene(Struct, frozen=True):
    """What all rows are judged by.

    at: row by its number, by every node in it. voltage, moving: signal by node of the whole network at mid-band and at
    f_H (there the currents are those that charge capacitances), V. charge: C·v by row, what flows into its capacitances
    per rad/s. links: rows joined by resistors, by row. ending: devices with their output or common terminal there, by
    row. standing: current by device, A. active: devices that carry signal into what they are connected to; others are
    loads.
    """

    at: Mapping[str, int]
    voltage: Mapping[str, complex]
    moving: Mapping[str, complex]
    charge: tuple[complex, ...]
    links: Mapping[int, frozenset[int]]
    ending: Mapping[int, tuple[Device, ...]]
    standing: Mapping[str, float]
    active: frozenset[str]


def slewing(
    bands: Bands,
    devices: Sequence[Device],
    rows: Sequence[SignalNode],
    *,
    f_high_hz: float | None,
    lines: Collection[str] = (),
) -> Slewing:
    """Judge every row that counts and that a transistor with a known standing current moves; the output is a voltage.

    f_high_hz: where it is looked at which transistors bring the current, None where there is no f_H. lines: nodes at
    which a transmission line ends; it is no capacitance, so that what moves it is not judged.
    Raises NetworkError where the network has no solution at mid-band.
    """
    scene = _scene(bands, devices, rows, f_high_hz or bands.midband.frequency_hz)
    drivers = {k: found for k in range(len(rows)) if (found := _drivers(k, scene))}
    ideal = _moved_by_sources(bands, scene)
    output = abs(bands.midband.gain)
    nodes: list[Slew] = []
    not_judged: list[str] = []
    least: list[tuple[str, float]] = []
    ends = {scene.at[node] for node in (bands.network.port.plus, bands.network.port.minus) if node in scene.at}
    for k, row in enumerate(rows):
        if not row.in_path or row.second:
            continue
        if k not in drivers:
            if k in ideal:
                not_judged.append(row.title)
            continue
        behind = _behind(k, rows, scene, drivers)
        moved = {k, *(behind or ())}
        current = _delivered(drivers[k], scene)
        if behind is None or current is None or moved & {scene.at[node] for node in lines if node in scene.at}:
            not_judged.append(row.title)
            least.append((row.title, 0.0 if k in ends else _least_v_per_s(k, rows, scene, drivers[k], output)))
            continue
        size = abs(scene.voltage[row.members[0]])
        charge = float(abs(sum(scene.charge[other] for other in (k, *behind))))
        if not size or not charge:
            continue
        most = max(driver.signal_a / driver.standing_a for driver in drivers[k])
        nodes.append(
            Slew(
                node=row.name,
                title=row.title,
                drivers=current[1],
                current_a=current[0],
                capacitance_f=charge / size,
                behind=tuple(rows[other].name for other in behind),
                ratio=size / output,
                cut_off_v=output / most if most else math.inf,
            )
        )
    nodes.sort(key=lambda slew: slew.output_slew_v_per_s)
    slowest = nodes[0].output_slew_v_per_s if nodes else math.inf
    slower = tuple(title for title, v_per_s in least if v_per_s < slowest)
    return Slewing(tuple(nodes), tuple(not_judged), slower)


def _least_v_per_s(
    k: int, rows: Sequence[SignalNode], scene: _Scene, drivers: Sequence[_Driver], output: float
) -> float:
    """Give the slew rate at the output in V/s with the least standing current of those that move a row."""
    charge = abs(scene.charge[k])
    size = abs(scene.voltage[rows[k].members[0]])
    if not charge or not size:
        return math.inf
    return min(driver.standing_a for driver in drivers) / charge * output


def _scene(bands: Bands, devices: Sequence[Device], rows: Sequence[SignalNode], at_hz: float) -> _Scene:
    network, upper = bands.network, bands.upper
    x = solve(network, on_axis(np.array([bands.midband.frequency_hz, at_hz]))).x
    voltage, moving = (
        {node: complex(at[k]) for k, node in enumerate(network.unknowns[: network.n_nodes])} | {GROUND: 0j} for at in x
    )
    names = upper.unknowns[: upper.n_nodes]
    v = np.array([*(voltage[node] for node in names), *[0j] * (upper.size - upper.n_nodes)])
    charge = dict(zip(upper.unknowns, upper.capacitance.dense(upper.size) @ v, strict=True))
    at = {member: k for k, row in enumerate(rows) for member in row.members}
    resistors = [
        part.nodes
        for part in network.parts
        if part.kind in ("conductance", "inductance") and not part.label and GROUND not in part.nodes
    ]
    links: dict[int, set[int]] = {}
    for a, b in resistors:
        if a in at and b in at and at[a] != at[b]:
            links.setdefault(at[a], set()).add(at[b])
            links.setdefault(at[b], set()).add(at[a])
    ending: dict[int, list[Device]] = {}
    for device in devices:
        if device.cell is not None:
            for k in {at[node] for node in (device.cell.output, device.cell.common) if node in at}:
                ending.setdefault(k, []).append(device)
    return _Scene(
        at=at,
        voltage=voltage,
        moving=moving,
        charge=tuple(
            sum((charge[node] for node in {bands.merged[m] for m in row.members} if node in charge), 0j) for row in rows
        ),
        links={k: frozenset(others) for k, others in links.items()},
        ending={k: tuple(some) for k, some in ending.items()},
        standing={
            device.name: abs(value) for device in devices for symbol, value in device.figures if symbol in STANDING
        },
        active=_active([device.cell for device in devices if device.cell is not None], at, moving),
    )


def _active(cells: Sequence[Transconductor], at: Mapping[str, int], moving: Mapping[str, complex]) -> frozenset[str]:
    """Give the owners of those cells whose control carries signal, or whose common terminal another such cell moves."""

    def carries(cell: Transconductor) -> bool:
        return abs(moving[cell.control]) > STILL * abs(moving[cell.common])

    active = [cell for cell in cells if carries(cell)]
    while True:
        moved = {at[node] for cell in active for node in (cell.output, cell.common) if node in at}
        more = [cell for cell in cells if cell not in active and at.get(cell.common) in moved]
        if not more:
            return frozenset(cell.owner for cell in active)
        active += more


def _moved_by_sources(bands: Bands, scene: _Scene) -> frozenset[int]:
    """Give the rows that controlled sources or the inside of a folded instance move: no current is known there."""
    found: set[int] = set()
    for part in bands.network.parts:
        if part.owner in scene.standing:
            continue
        if part.kind == "block":
            found |= {scene.at[node] for node in part.nodes if block_of(node) and node in scene.at}
        elif part.kind in SOURCES:
            found |= {scene.at[node] for node in part.nodes[:2] if node in scene.at}
    return frozenset(found)


def _drivers(k: int, scene: _Scene) -> tuple[_Driver, ...]:
    """Give the transistors that move a row: by the collector, or by the emitter where the base carries signal."""
    found: list[tuple[float, _Driver]] = []
    for device in scene.ending.get(k, ()):
        cell = device.cell
        assert cell is not None
        by_output, by_common = scene.at.get(cell.output) == k, scene.at.get(cell.common) == k
        diode = by_output and scene.at.get(cell.control) == k
        if by_output == by_common or diode or device.name not in scene.active:
            continue
        if not scene.standing.get(device.name):
            continue
        control, common = abs(scene.moving[cell.control]), abs(scene.moving[cell.common])
        if by_common and control < LEADS * common:
            continue
        pull_a = _signal_a(cell, scene.moving) if by_output else cell.gm * control
        signal_a = _signal_a(cell, scene.voltage)
        found.append(
            (pull_a, _Driver(device.name, device.kind, cell, scene.standing[device.name], signal_a, by_common))
        )
    largest, in_band = max((pull for pull, _ in found), default=0.0), max((d.signal_a for _, d in found), default=0.0)
    return tuple(
        driver for pull, driver in found if pull and pull >= DRIVES * largest and driver.signal_a >= REACHED * in_band
    )


def _signal_a(cell: Transconductor, voltage: Mapping[str, complex]) -> float:
    common = voltage[cell.common]
    return abs(cell.gm * (voltage[cell.control] - common) + cell.g_mb * (voltage[cell.body or GROUND] - common))


def _delivered(drivers: Sequence[_Driver], scene: _Scene) -> tuple[float, tuple[str, ...]] | None:
    """Give the current in A that the drivers of one row can deliver, and who they are; None where that is not known."""
    if len(drivers) == 1:
        one = drivers[0]
        if one.follows:
            row = scene.at[one.cell.common]
            alone = not [d for d in scene.ending[row] if d.name != one.name and _common_row(d, scene) == row]
            return (one.standing_a, (one.name,)) if alone else None
        limits = [one.standing_a, *_before(one, scene)]
        partner = _partner(one, scene)
        if partner is not None:
            limits.append(scene.standing[partner.name])
        return min(limits), (one.name,)
    if len(drivers) == 2:
        for pair, mirror in (drivers, drivers[::-1]):
            partner = _partner(pair, scene)
            if partner is not None and _mirrors(mirror, partner, scene):
                tail = pair.standing_a + scene.standing[partner.name]
                return tail * min(1.0, mirror.standing_a / pair.standing_a), (pair.name, partner.name)
        for through, other in (drivers, drivers[::-1]):
            folded = _through_cascodes(through, other, scene)
            if folded is not None:
                return folded
    return None


def _through_cascodes(through: _Driver, other: _Driver, scene: _Scene) -> tuple[float, tuple[str, ...]] | None:
    """Give what a pair delivers through a cascode, folded or not, while its mirror brings the partner's share.

    Folded, a transistor of the pair takes its current from the cascode's: no more can go either way than both have.
    """
    for pair in _feeding(through, scene):
        partner = _partner(pair, scene)
        if partner is None or not any(_mirrors_through(one, partner, scene) for one in _feeding(other, scene)):
            continue
        tail = pair.standing_a + scene.standing[partner.name]
        return min(tail, pair.standing_a + through.standing_a), (pair.name, partner.name)
    return None


def _feeding(driver: _Driver, scene: _Scene) -> tuple[_Driver, ...]:
    """Give the transistors that a common-base transistor passes on; another one is its own."""
    control, common = (abs(scene.moving[node]) for node in (driver.cell.control, driver.cell.common))
    row = scene.at.get(driver.cell.common)
    if row is None or driver.follows or control > STILL * common:
        return (driver,)
    return tuple(other for other in _drivers(row, scene) if not other.follows)


def _mirrors_through(mirror: _Driver, partner: Device, scene: _Scene) -> bool:
    """Whether a transistor mirrors the partner's current, with cascodes in the way of either."""
    assert partner.cell is not None
    control = scene.at.get(mirror.cell.control)
    reached = _onwards(scene.at.get(partner.cell.output), scene)
    if control is None or control not in reached:
        return False
    diodes = [d.cell for some in scene.ending.values() for d in some if d.cell is not None]
    return any(
        scene.at.get(cell.control) == control
        and scene.at.get(cell.common) != control
        and control in _onwards(scene.at.get(cell.output), scene)
        for cell in diodes
    )


def _onwards(row: int | None, scene: _Scene) -> frozenset[int]:
    """Give a row and those to which transistors pass the current whose control stands still."""
    if row is None:
        return frozenset()
    found, ahead = {row}, [row]
    while ahead:
        here = ahead.pop()
        for device in scene.ending.get(here, ()):
            cell = device.cell
            assert cell is not None
            end = scene.at.get(cell.output)
            still = abs(scene.voltage[cell.control]) <= STILL * abs(scene.voltage[cell.common])
            if scene.at.get(cell.common) == here and end is not None and end not in found and still:
                found.add(end)
                ahead.append(end)
    return frozenset(found)


def _before(driver: _Driver, scene: _Scene) -> list[float]:
    """Give the standing currents of those that feed the emitter of a common-base transistor: it passes what they do."""
    control, common = (abs(scene.moving[node]) for node in (driver.cell.control, driver.cell.common))
    row = scene.at.get(driver.cell.common)
    if row is None or control > STILL * common:
        return []
    return [other.standing_a for other in _drivers(row, scene) if not other.follows]


def _partner(driver: _Driver, scene: _Scene) -> Device | None:
    """Give the other transistor of a pair: of the same kind, its emitter at the same node or joined by resistors."""
    meeting = _reached(driver.cell.common, scene)
    near = {row for one in meeting for row in (one, *scene.links.get(one, ()))}
    for device in (device for row in sorted(near) for device in scene.ending.get(row, ())):
        cell = device.cell
        assert cell is not None
        other = device.kind == driver.kind and cell.control != driver.cell.control
        if other and scene.standing.get(device.name) and meeting & _reached(cell.common, scene):
            return device
    return None


def _reached(node: str, scene: _Scene) -> frozenset[int]:
    """Give the row of a node with all that resistors join to it; none where the node is at AC ground."""
    row = scene.at.get(node)
    return frozenset() if row is None else scene.links.get(row, frozenset()) | {row}


def _mirrors(mirror: _Driver, partner: Device, scene: _Scene) -> bool:
    """Whether a transistor mirrors the partner's current: its control is where the partner and a diode end."""
    assert partner.cell is not None
    at = scene.at.get(partner.cell.output)
    if at is None or scene.at.get(mirror.cell.control) != at:
        return False
    cells = [device.cell for device in scene.ending.get(at, ()) if device.cell is not None]
    return any(scene.at.get(cell.control) == at == scene.at.get(cell.output) for cell in cells)


def _common_row(device: Device, scene: _Scene) -> int | None:
    return None if device.cell is None else scene.at.get(device.cell.common)


def _behind(
    k: int, rows: Sequence[SignalNode], scene: _Scene, drivers: Mapping[int, Sequence[_Driver]]
) -> tuple[int, ...] | None:
    """Give the rows behind resistors that are moved together with row k; None where two followers share them."""
    follows = any(driver.follows for driver in drivers[k])
    size = abs(scene.voltage[rows[k].members[0]])
    found: list[int] = []
    ahead = [k]
    while ahead:
        for other in sorted(scene.links.get(ahead.pop(), frozenset()) - {k, *found}):
            if abs(scene.voltage[rows[other].members[0]]) < ARRIVES * size:
                continue
            if other in drivers:
                if follows and any(driver.follows for driver in drivers[other]):
                    return None
                continue
            found.append(other)
            ahead.append(other)
    return tuple(found)
