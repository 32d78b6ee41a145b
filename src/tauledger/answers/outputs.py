"""Further outputs: mid-band gain and both band edges of each, as a review with that output would give them."""

from __future__ import annotations

import math

import numpy as np
from msgspec.structs import replace

from tauledger.answers.answer import Subject, restore
from tauledger.circuit import Circuit, Port, fold
from tauledger.compose.setting import unit_of
from tauledger.devices.parts import WITH_BRANCH
from tauledger.engine.grid import decades
from tauledger.errors import InputError
from tauledger.netlist.ports import port_of
from tauledger.network.assemble import Network
from tauledger.network.edges import Edges, find_edges
from tauledger.network.midband import MidBand, find_midband
from tauledger.network.ripple import ripple_grids
from tauledger.network.solve import on_axis, solve
from tauledger.numbers import POINTS_PER_DECADE, Numbers
from tauledger.record import OutputRow
from tauledger.simulated import Simulated, simulate

# Of the largest signal in the network; what is smaller is rounding.
NOTHING = 1e-12


def output_rows(subject: Subject, outputs: tuple[str, ...]) -> tuple[OutputRow, ...]:
    """Give one row per output as typed: "c", "v(a,b)", "i(vload)", each against its own plateau.

    Raises InputError where there is no such node or current, where it is inside an instance taken as one part, where
    the drive does not reach it, and for a network without netlist.
    """
    numbers, circuit = subject.numbers, subject.numbers.circuit
    if circuit is None:
        raise InputError("further outputs are read from a netlist", "review the network once per output")
    ports = [_port(numbers.network, circuit, output) for output in outputs]
    rows = tuple(_row(subject, circuit, port) for port in ports)
    restore(subject)
    return rows


def _port(network: Network, circuit: Circuit, output: str) -> Port:
    port = port_of(circuit, output)
    nodes = {node for part in network.parts for node in part.nodes}
    branches = {fold(part.owner) for part in network.parts if part.kind in WITH_BRANCH}
    known = fold(port.through) in branches if port.kind == "current" else {port.plus, port.minus} <= nodes | {"0"}
    if not known:
        raise InputError(f"--output {output}: this is inside an instance that is taken as one part", "add --fold none")
    return port


def _row(subject: Subject, circuit: Circuit, port: Port) -> OutputRow:
    numbers = subject.numbers
    network = Network.from_parts(numbers.network.parts, output=port, drive=numbers.network.amplitudes)
    at_hz = numbers.midband.frequency_hz if numbers.midband_chosen else None
    midband = find_midband(network, at_hz=at_hz, within_hz=numbers.midband.within_hz)
    largest = np.abs(solve(network, on_axis(midband.frequency_hz)).x).max()
    if abs(midband.gain) <= NOTHING * largest:
        raise InputError(f"--output {port}: the drive does not reach it", "leave it out: what is there is rounding")
    edges = find_edges(network, midband)
    simulated = _simulated(subject, replace(circuit, output=port), midband, edges)
    low, high = edges.f_low, edges.f_high
    return OutputRow(
        name=str(port),
        unit=unit_of(replace(numbers, network=network)),
        frequency_hz=midband.frequency_hz,
        gain_real=midband.gain.real,
        gain_imag=midband.gain.imag,
        gain_db=20.0 * math.log10(abs(midband.gain)),
        simulated_db=20.0 * math.log10(abs(simulated.midband.gain)) if simulated is not None else None,
        f_low_exact_hz=low.hz if low is not None else None,
        f_low_simulated_hz=simulated.f_low_hz if simulated is not None else None,
        f_high_exact_hz=high.hz if high is not None else None,
        f_high_simulated_hz=simulated.f_high_hz if simulated is not None else None,
    )


def _simulated(subject: Subject, circuit: Circuit, midband: MidBand, edges: Edges) -> Simulated | None:
    if subject.engine is None:
        return None
    subject.engine.bias(circuit, ())
    grid, high = _grid(subject.numbers, edges), edges.f_high
    ripple_hz = ripple_grids(subject.numbers.network, high.hz if high is not None else None, float(grid[-1]))
    return simulate(subject.engine.sweep, grid, midband=midband, ripple_hz=ripple_hz)


def _grid(numbers: Numbers, edges: Edges) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Lay out the sweep as for the reviewed output, and two decades beyond this one's edges."""
    assert numbers.simulated is not None
    swept = numbers.simulated.sweep.frequency_hz
    start, stop = float(swept[0]), float(swept[-1])
    if edges.f_low is not None and edges.f_low.hz is not None:
        start = min(start, edges.f_low.hz / 100.0)
    if edges.f_high is not None and edges.f_high.hz is not None:
        stop = max(stop, edges.f_high.hz * 100.0)
    return decades(start, stop, POINTS_PER_DECADE)
