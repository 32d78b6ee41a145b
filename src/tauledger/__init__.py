"""tauledger reconciles the hand analysis of a transistor amplifier with its SPICE simulation.

`review(path)` is the whole walk; `review_elements(...)` enters it with elements given by keyword calls, and
`Network.from_parts(...)` with part records, without netlist and engine.
Names are imported when they are first used, so that `tauledger --help` stays quick.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from tauledger.circuit import Change, Circuit
    from tauledger.devices.by_keyword import bipolar, field_effect
    from tauledger.devices.parts import (
        capacitance,
        current_source,
        inductance,
        resistance,
        transconductance,
        voltage_source,
    )
    from tauledger.errors import InputError, NetlistError, TauledgerError
    from tauledger.netlist.elaborate import elaborate
    from tauledger.netlist.reader import read
    from tauledger.network.assemble import Network
    from tauledger.pipeline import review, review_elements, review_network
    from tauledger.record import Review
    from tauledger.report.json import to_json
    from tauledger.report.terminal import render

__version__ = "0.1.0"

_HOMES = {
    "Change": "tauledger.circuit",
    "Circuit": "tauledger.circuit",
    "InputError": "tauledger.errors",
    "NetlistError": "tauledger.errors",
    "Network": "tauledger.network.assemble",
    "Review": "tauledger.record",
    "TauledgerError": "tauledger.errors",
    "bipolar": "tauledger.devices.by_keyword",
    "capacitance": "tauledger.devices.parts",
    "current_source": "tauledger.devices.parts",
    "elaborate": "tauledger.netlist.elaborate",
    "field_effect": "tauledger.devices.by_keyword",
    "inductance": "tauledger.devices.parts",
    "read": "tauledger.netlist.reader",
    "render": "tauledger.report.terminal",
    "resistance": "tauledger.devices.parts",
    "review": "tauledger.pipeline",
    "review_elements": "tauledger.pipeline",
    "review_network": "tauledger.pipeline",
    "to_json": "tauledger.report.json",
    "transconductance": "tauledger.devices.parts",
    "voltage_source": "tauledger.devices.parts",
}

__all__ = [
    "Change",
    "Circuit",
    "InputError",
    "NetlistError",
    "Network",
    "Review",
    "TauledgerError",
    "bipolar",
    "capacitance",
    "current_source",
    "elaborate",
    "field_effect",
    "inductance",
    "read",
    "render",
    "resistance",
    "review",
    "review_elements",
    "review_network",
    "to_json",
    "transconductance",
    "voltage_source",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
