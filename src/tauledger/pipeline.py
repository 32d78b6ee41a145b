"""The whole walk: netlist → circuit → operating point → network → exact numbers → sweep → hand, causes → review.

`solve` gives the numbers, `recompute` solves the rebuilt network again with parts of other value, `explain` adds the
workings, causes and notes, `review` is all of it. `review_network` enters the walk without netlist and engine:
simulated values are None and differences are against exact.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from msgspec.structs import replace

from tauledger.answers.answer import Subject, answer, with_unity_gain
from tauledger.asked import NOTHING_ASKED, Asked
from tauledger.circuit import GROUND, NO_CHANGE, Change, Port, joined
from tauledger.compose.review import compose
from tauledger.compose.setting import unit_of
from tauledger.devices.family import Device
from tauledger.devices.parts import Part
from tauledger.engine.client import Engine, start_engine
from tauledger.errors import InputError, NetlistError
from tauledger.explain import Explanation, explain
from tauledger.netlist import elaborate, read
from tauledger.network.assemble import Network
from tauledger.numbers import Numbers, linearised_at, recompute, solve, solve_network
from tauledger.record import DevicesTable, Review, known_hz

if TYPE_CHECKING:
    from tauledger.paper.page import Page

__all__ = [
    "Numbers",
    "devices",
    "explain",
    "page_for",
    "recompute",
    "review",
    "review_elements",
    "review_network",
    "solve",
    "solve_network",
]


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
    page: Page | None = None,
    settings: Sequence[str] = (),
    add: Sequence[str] = (),
    allow: Sequence[str | Path] = (),
    fold: Sequence[str] = (),
    asked: Asked = NOTHING_ASKED,
) -> Review:
    """Review the netlist at `path`.

    engine: one that was started, to be used again; None starts one for this review, with `timeout_s` for each request
    and the ngspice library at `library` (None: the system's own).
    drive: the one source to drive with 1, None for all with an AC value. output: "out", "v(a,b)" or "i(vload)", None
    for the netlist's own hints. midband_hz: reference frequency in Hz, None to find the plateau.
    page: the designer's own figures, of `paper.page.read_page`, to be set beside hand and exact.
    settings: "R3=4.7k", "load=2k", "nsmall.bf=100": set beyond `change`, and the headline is told before and after.
    add: "out=12p", "out=10meg,12p": resistance and capacitance from a node to ground, told before and after likewise.
    allow: folders beside the netlist's own from which files may be included.
    fold: subcircuit instances to be taken as one part each, beside macromodels; "none": leave all open.
    asked: what is asked beyond the band edges.
    Raises NetlistError, InputError, EngineError (EngineMissing, EngineTimeout).
    """
    if engine is None:
        with start_engine(library=library, timeout_s=timeout_s) as own:
            return review(
                path,
                engine=own,
                drive=drive,
                output=output,
                midband_hz=midband_hz,
                change=change,
                page=page,
                settings=settings,
                add=add,
                allow=allow,
                fold=fold,
                asked=asked,
            )
    netlist = read(path, allow=allow)
    before: Review | None = None
    if settings or add:
        from tauledger.netlist.added import added
        from tauledger.netlist.settings import change_of

        setting = joined(change_of(netlist, settings), added(netlist, add))
        unset = solve(netlist, change, engine, drive=drive, output=output, midband_hz=midband_hz, fold=fold)
        explained = explain(unset)
        subject = Subject(unset, explained, netlist, change, engine)
        before = with_unity_gain(compose(unset, explained, netlist=netlist), subject, asked=False)
        change = joined(change, setting)
    numbers = solve(netlist, change, engine, drive=drive, output=output, midband_hz=midband_hz, fold=fold)
    explanation = explain(numbers)
    found = compose(numbers, explanation, netlist=netlist)
    if page is not None:
        found = _with_page(found, page, numbers, explanation)
    found = answer(found, Subject(numbers, explanation, netlist, change, engine), asked)
    if before is None:
        return found
    from tauledger.compose.changed import added_parts, moved_figures, set_values

    moved = moved_figures(before, found)
    return replace(found, settings=set_values(setting), added=added_parts(setting), moved=moved)


def devices(
    path: str | Path,
    *,
    engine: Engine,
    drive: str | None = None,
    output: str | None = None,
    change: Change = NO_CHANGE,
    settings: Sequence[str] = (),
    allow: Sequence[str | Path] = (),
) -> DevicesTable:
    """Give every transistor and diode of the netlist at `path` at its operating point; nothing is swept.

    settings: "R3=4.7k", "nsmall.bf=100", "Q1.area=2": set beyond `change`. allow: folders beside the netlist's own from
    which files may be included.
    A netlist that drives nothing or names no output will do, with a note that says what is not judged then.
    Raises NetlistError, InputError, EngineError (EngineMissing, EngineTimeout).
    """
    from tauledger.compose.devices import devices_table

    netlist = read(path, allow=allow)
    if settings:
        from tauledger.netlist.settings import change_of

        change = joined(change, change_of(netlist, settings))
    try:
        circuit = elaborate(netlist, change, drive=drive, output=output)
    except NetlistError:
        raise
    except InputError:
        if drive is not None or output is not None:
            raise
        circuit = elaborate(netlist, change, purpose="reading")
    bias = engine.operating_point(circuit)
    return devices_table(netlist, circuit, bias, linearised_at(netlist, circuit, bias))


def review_network(
    network: Network,
    *,
    devices: tuple[Device, ...] = (),
    midband_hz: float | None = None,
    title: str = "",
    page: Page | None = None,
    asked: Asked = NOTHING_ASKED,
) -> Review:
    """Review a network that was built from parts, without netlist and engine.

    Raises NetworkError where the network has no unique solution, NetlistError where the page does not fit it.
    """
    numbers = solve_network(network, devices=devices, midband_hz=midband_hz)
    explanation = explain(numbers)
    found = compose(numbers, explanation, title=title)
    if page is not None:
        found = _with_page(found, page, numbers, explanation)
    return answer(found, Subject(numbers, explanation), asked)


def review_elements(
    *elements: Part | Device,
    output: str,
    minus: str = GROUND,
    midband_hz: float | None = None,
    title: str = "",
) -> Review:
    """Review a network that is given element by element, without netlist and engine; values are small-signal ones.

    elements: parts ("resistance", "capacitance", "voltage_source" and the like) and transistors ("bipolar",
    "field_effect"); supplies are ground, "0". The response is the voltage from `output` to `minus` per drive.
    Raises NetworkError where the network has no unique solution, or names a node twice or one that is not there.
    """
    devices = tuple(element for element in elements if isinstance(element, Device))
    parts = [part for element in elements for part in (element.parts if isinstance(element, Device) else (element,))]
    network = Network.from_parts(parts, output=Port(output, minus, "voltage"))
    return review_network(network, devices=devices, midband_hz=midband_hz, title=title)


def page_for(
    path: str | Path,
    *,
    page: str,
    engine: Engine,
    drive: str | None = None,
    output: str | None = None,
    midband_hz: float | None = None,
    allow: Sequence[str | Path] = (),
) -> str:
    """Give the text of an empty page for the netlist at `path`; `page` is the name that it will have.

    allow: folders beside the netlist's own from which files may be included.
    Raises NetlistError, InputError, EngineError.
    """
    from tauledger.paper.compare import known_figures
    from tauledger.paper.empty import empty_page

    netlist = read(path, allow=allow)
    numbers = solve(netlist, NO_CHANGE, engine, drive=drive, output=output, midband_hz=midband_hz)
    explanation = explain(numbers)
    return empty_page(
        title=netlist.title,
        netlist=str(path),
        page=page,
        gain_unit=unit_of(numbers),
        nodes=explanation.hand.nodes if explanation.hand else (),
        figures=known_figures(numbers.devices),
    )


def _with_page(found: Review, page: Page, numbers: Numbers, explanation: Explanation) -> Review:
    """Set the page's figures beside hand and exact; nothing can be said where the network is not trusted."""
    from tauledger.paper.compare import Reviewed, compare

    if not numbers.trusted:
        raise InputError(f"{page.path}: no figure can be checked", "the rebuilt network is not the simulated circuit")
    reviewed = Reviewed(
        bands=numbers.bands,
        devices=numbers.devices,
        hand=explanation.hand,
        f_high=known_hz(found.f_high),
        f_low=known_hz(found.f_low),
        gain_unit=found.midband.unit,
        temperature_c=found.temperature_c,
    )
    return replace(found, paper=compare(page, reviewed))
