"""The whole walk: netlist → circuit → operating point → network → exact numbers → sweep → hand, causes → review.

`solve` gives the numbers, `recompute` solves the rebuilt network again with parts of other value, `explain` adds the
workings, causes and notes, `review` is all of it. `review_network` enters the walk without netlist and engine:
simulated values are None and differences are against exact.
"""

from __future__ import annotations

from pathlib import Path

from tauledger.circuit import NO_CHANGE, Change
from tauledger.compose.review import compose
from tauledger.devices.family import Device
from tauledger.engine.client import Engine, start_engine
from tauledger.explain import explain
from tauledger.netlist import read
from tauledger.network.assemble import Network
from tauledger.numbers import Numbers, recompute, solve, solve_network
from tauledger.record import Review

__all__ = ["Numbers", "explain", "recompute", "review", "review_network", "solve", "solve_network"]


def review(
    path: str | Path,
    *,
    engine: Engine | None = None,
    drive: str | None = None,
    output: str | None = None,
    midband_hz: float | None = None,
    change: Change = NO_CHANGE,
    timeout_s: float = 60.0,
    library: str | None = None,
) -> Review:
    """Review the netlist at `path`.

    engine: one that was started, to be used again; None starts one for this review, with `timeout_s` for each request
    and the ngspice library at `library` (None: the system's own).
    drive: the one source to drive with 1, None for all with an AC value. output: "out", "v(a,b)" or "i(vload)", None
    for the netlist's own hints. midband_hz: reference frequency in Hz, None to find the plateau.
    Raises NetlistError, InputError, EngineError (EngineMissing, EngineTimeout).
    """
    if engine is None:
        with start_engine(library=library, timeout_s=timeout_s) as own:
            return review(path, engine=own, drive=drive, output=output, midband_hz=midband_hz, change=change)
    netlist = read(path)
    numbers = solve(netlist, change, engine, drive=drive, output=output, midband_hz=midband_hz)
    return compose(numbers, explain(numbers), netlist=netlist)


def review_network(
    network: Network, *, devices: tuple[Device, ...] = (), midband_hz: float | None = None, title: str = ""
) -> Review:
    """Review a network that was built from parts, without netlist and engine.

    Raises NetworkError where the network has no unique solution.
    """
    numbers = solve_network(network, devices=devices, midband_hz=midband_hz)
    return compose(numbers, explain(numbers), title=title)
