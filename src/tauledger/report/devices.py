"""`tauledger devices` as text and as JSON: one row per device, devices with the same figures in one table."""

from __future__ import annotations

import msgspec

from tauledger.record import DeviceFacts, DevicesTable, Figure
from tauledger.report.json import finite
from tauledger.report.layout import STRONG, WARNING, Block, Prose, Row, Section, Table, lay_out
from tauledger.report.wording import figure_symbols, number

# What stands beside the region; the rest, resistances, capacitances and f_T, in a second table.
_BIAS = ("i", "v")
_BESIDE = ("gm", "g_mb", "gm/I")
# gmin of 1e-12 S is the least conductance that ngspice itself puts anywhere.
_NO_CURRENT_OHM = 1e15


def render(found: DevicesTable, *, unicode: bool, width: int = 80) -> str:
    """Give the devices as lines of text, each with its line end."""
    head = (
        Prose(found.netlist.title or "(no title)", style=STRONG),
        Prose(f"{found.netlist.path} at {found.temperature_c:.4g} °C, {found.engine.name} {found.engine.version}"),
    )
    tables: list[Block] = []
    groups: dict[tuple[str, ...], list[DeviceFacts]] = {}
    for device in found.devices:
        groups.setdefault(figure_symbols(device), []).append(device)
    for devices in groups.values():
        symbols = tuple(figure.symbol for figure in devices[0].figures)
        bias = [name for name in symbols if name[0] in _BIAS or name in _BESIDE]
        tables.append(_table(devices, bias, with_region=True))
        rest = [name for name in symbols if name not in bias]
        if rest:
            tables.append(_table(devices, rest, with_region=False))
    if not found.devices:
        tables.append(Prose("no transistor and no diode in this netlist"))
    notes = tuple(Prose(note.says, lead="NOTE  ", style=WARNING) for note in found.notes)
    sections = (Section(head), Section(tuple(tables), major=True), Section(notes))
    lines = lay_out(sections, width=width, unicode=unicode, page=10_000)
    return "".join(f"{line.text}\n" for line in lines)


def to_json(found: DevicesTable) -> bytes:
    """Give the devices as one line of UTF-8 JSON, document `tauledger.devices/1`: plain SI numbers."""
    return msgspec.json.encode(finite(msgspec.to_builtins(found))) + b"\n"


def _figure(figure: Figure) -> str:
    """Write a figure; a resistance that is rounding of an infinite one as such."""
    if figure.unit == "Ω" and figure.value > _NO_CURRENT_OHM:
        return "∞"
    return number(figure.value, figure.unit, 3)


def _table(devices: list[DeviceFacts], symbols: list[str], *, with_region: bool) -> Table:
    lead = ("DEVICE", "region") if with_region else ("DEVICE",)
    heads = dict(zip((figure.symbol for figure in devices[0].figures), figure_symbols(devices[0]), strict=True))
    rows = []
    for device in devices:
        value = {figure.symbol: figure for figure in device.figures}
        first = (f"{device.name} {device.kind}", device.region) if with_region else (device.name,)
        rows.append(Row((*first, *(_figure(value[name]) for name in symbols))))
    return Table("l" * len(lead) + "r" * len(symbols), (*lead, *(heads[name] for name in symbols)), tuple(rows))
