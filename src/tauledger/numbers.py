"""The numbers of one circuit under one condition: operating point, rebuilt network, exact and simulated band edges.

`solve` takes a netlist and an engine, `solve_network` a network alone; `recompute` solves the rebuilt network again
with parts of other value, which is what "rerun" and "10 % less" mean.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.circuit import Change, Circuit
from tauledger.devices.catalogue import linearise
from tauledger.devices.family import Device, Linearised
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.errors import ElementError
from tauledger.netlist import Netlist, ac_range, at_element, elaborate
from tauledger.network.agreement import Agreement, agreement
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands, classify
from tauledger.network.edges import Edges, find_edges
from tauledger.network.midband import HIGHEST_HZ, MidBand, find_midband, frequency_range
from tauledger.network.poles import PoleZeroMap, find_poles
from tauledger.network.recompute import EdgeFrequencies, edge_frequencies, scaled
from tauledger.network.solve import Complex, response
from tauledger.network.unity import is_ratio
from tauledger.simulated import Simulated, simulate
from tauledger.solution import Bias

POINTS_PER_DECADE = 40
# Agreement above this: the rebuilt network is not the simulated circuit, and nothing that rests on it is given.
DISAGREES = 1e-3
BEYOND_THE_EDGES = 100.0


class Numbers(Struct, frozen=True):
    """All numbers of one circuit under one condition: what a tolerance draw needs.

    poles: of the full network, with zeros. circuit, bias, simulated, agreement: None without netlist and engine.
    midband_chosen: the user named the reference frequency.
    """

    network: Network
    midband: MidBand
    bands: Bands
    edges: Edges
    poles: PoleZeroMap
    devices: tuple[Device, ...] = ()
    circuit: Circuit | None = None
    bias: Bias | None = None
    simulated: Simulated | None = None
    agreement: Agreement | None = None
    midband_chosen: bool = False

    @property
    def trusted(self) -> bool:
        """Whether the rebuilt network is the simulated circuit, so that what rests on it may be given."""
        return self.agreement is None or self.agreement.max_relative_error <= DISAGREES


def solve(
    netlist: Netlist,
    change: Change,
    engine: Engine,
    *,
    drive: str | None = None,
    output: str | None = None,
    midband_hz: float | None = None,
    fold: Sequence[str] = (),
) -> Numbers:
    """Give the numbers of a netlist under one change: operating point, rebuilt network, exact and simulated edges.

    drive: the one source to drive with 1, None for all with an AC value. output: as on the command line, None for the
    netlist's own hints. midband_hz: reference frequency in Hz, None to find the plateau. fold: subcircuit instances to
    be taken as one part each; macromodels are without being named, "none" alone leaves all open.
    Raises NetlistError or InputError where the circuit cannot be built, EngineError where ngspice gives no result.
    """
    circuit = _per_unit(elaborate(netlist, change, drive=drive, output=output))
    bias = engine.operating_point(circuit)
    linearised = linearised_at(netlist, circuit, bias)
    if len(circuit.instances) > 1 or fold:
        from tauledger.network.folding import fold_instances

        linearised = fold_instances(circuit, linearised, fold)
    network = Network.from_parts(linearised.parts, output=circuit.output)
    asked = ac_range(netlist)
    numbers = solve_network(network, devices=linearised.devices, midband_hz=midband_hz, within_hz=asked)
    grid = _sweep_grid(numbers, asked)
    simulated = simulate(engine.sweep, grid, midband=numbers.midband, ripple_hz=_ripple_grids(numbers, grid))
    swept = simulated.all_of_it
    exact = response(network, swept.frequency_hz)
    agreed = agreement(swept.frequency_hz, exact, swept.response, numbers.midband.gain, _page_range(numbers, asked))
    if agreed.max_relative_error > DISAGREES:
        simulated = simulate(engine.sweep, grid, midband=None)
    return replace(numbers, circuit=circuit, bias=bias, simulated=simulated, agreement=agreed)


def linearised_at(netlist: Netlist, circuit: Circuit, bias: Bias) -> Linearised:
    """Linearise a circuit at its operating point.

    Raises NetlistError at the card of an element that has no small-signal network there.
    """
    try:
        return linearise(circuit, bias)
    except ElementError as error:
        raise at_element(netlist, circuit, error) from error


def solve_network(
    network: Network,
    *,
    devices: tuple[Device, ...] = (),
    midband_hz: float | None = None,
    within_hz: tuple[float, float] | None = None,
) -> Numbers:
    """Give the exact numbers of a network alone; nothing is simulated.

    within_hz: the range in Hz that is wanted; mid-band is looked for there first.
    Raises NetworkError where the network has no unique solution, InputError where nothing but a line holds a node.
    """
    if network.lines:
        from tauledger.network.lines import require_held_ends

        require_held_ends(network)
    if any(part.kind == "mutual inductance" for part in network.parts):
        from tauledger.network.transformers import drawn_out

        network = drawn_out(network)
    midband = find_midband(network, at_hz=midband_hz, within_hz=within_hz)
    return Numbers(
        network=network,
        midband=midband,
        bands=classify(network, midband),
        edges=find_edges(network, midband),
        poles=find_poles(network, floor_hz=midband.floor_hz),
        devices=devices,
        midband_chosen=midband_hz is not None,
    )


def _per_unit(circuit: Circuit) -> Circuit:
    """Let a lone source drive with 1, so that H is a gain; several sources keep what relates them."""
    if len(circuit.drive) != 1:
        return circuit
    return replace(circuit, drive=(replace(circuit.drive[0], amplitude=1.0),))


def recompute(numbers: Numbers, scale: Mapping[str, float]) -> EdgeFrequencies:
    """Give the exact band edges with the named parts' values multiplied: bias and plateau's frequency held.

    scale: factor by part name ("CL", "Q1.c_mu").
    Raises KeyError where a name belongs to no part.
    """
    return edge_frequencies(scaled(numbers.network, scale), numbers.midband)


def _sweep_grid(numbers: Numbers, asked: tuple[float, float] | None) -> NDArray[np.float64]:
    """Lay out the sweep: a decade beyond all poles, two beyond the band edges, unity gain, the netlist's own range."""
    roots: Complex = np.array([pole.s for pole in numbers.poles.poles], dtype=complex)
    if numbers.network.lines:
        from tauledger.network.lines import lumped
        from tauledger.network.spectrum import pole_frequencies

        roots = pole_frequencies(lumped(numbers.network))
    reach = frequency_range(roots, np.array([], dtype=complex)) or (1.0, 1e6)
    # the range is a thousand times wider than the poles; a hundredth of that is a decade beyond
    start, stop = reach[0] * 100.0, min(reach[1] / 100.0, HIGHEST_HZ)
    low, high = numbers.edges.f_low, numbers.edges.f_high
    if low is not None and low.hz is not None:
        start = min(start, low.hz / BEYOND_THE_EDGES)
    if high is not None and high.hz is not None:
        start = min(start, high.hz / 1e4)
        stop = max(stop, high.hz * BEYOND_THE_EDGES, _falls_to_one_hz(numbers, high.hz))
    if asked is not None:
        start, stop = min(start, asked[0]), max(stop, asked[1])
    return decades(start, max(stop, 10.0 * start), POINTS_PER_DECADE)


def _page_range(numbers: Numbers, asked: tuple[float, float] | None) -> tuple[float, float]:
    """Give the range in Hz on which the page rests: f_L/100 to 100·f_H, unity gain, and what the netlist asks for.

    A side without an edge has no end. Beyond, the sweep is as wide as the poles are, and two ways of rounding differ.
    """
    low, high = numbers.edges.f_low, numbers.edges.f_high
    start = low.hz / BEYOND_THE_EDGES if low is not None and low.hz is not None else 0.0
    stop = float("inf")
    if high is not None and high.hz is not None:
        stop = max(BEYOND_THE_EDGES * high.hz, _falls_to_one_hz(numbers, high.hz))
    if asked is not None:
        start, stop = min(start, asked[0]), max(stop, asked[1])
    return start, stop


def _falls_to_one_hz(numbers: Numbers, f_high_hz: float) -> float:
    """Give where the gain may be 1: one pole alone reaches it at the gain-bandwidth product; 0 of what is no ratio."""
    gain = abs(numbers.midband.gain) if is_ratio(numbers.network) else 0.0
    return min(2.0 * gain * f_high_hz, HIGHEST_HZ)


def _ripple_grids(numbers: Numbers, grid: NDArray[np.float64]) -> tuple[NDArray[np.float64], ...]:
    """Lay out what the sweep's grid (n,) misses of a line's ripple."""
    if not numbers.network.lines:
        return ()
    from tauledger.network.ripple import ripple_grids

    high = numbers.edges.f_high
    return ripple_grids(numbers.network, high.hz if high is not None else None, float(grid[-1]))
