"""The keys of a device's figures on a page: bare in TOML, with the unit each is in."""

from __future__ import annotations

from collections.abc import Mapping

from tauledger.devices.family import Device

SPELLED = {"gm/I": "gm_over_i"}
UNITS = {"gm_over_i": "1/V"}
PREFIX_UNITS = {"i": "A", "v": "V", "r": "Ω", "c": "F", "f": "Hz", "g": "S"}
SIGNED_PREFIXES = ("i_", "v_")


def figures_by_key(device: Device) -> Mapping[str, float]:
    """Give the figures of a device's operating point that are not 0, by the key that a page has for each."""
    return {key_of(symbol): value for symbol, value in device.figures if value}


def key_of(symbol: str) -> str:
    """Give the key for a figure's symbol: "gm_over_i" for "gm/I", else the symbol itself."""
    return SPELLED.get(symbol, symbol)


def symbol_of(key: str) -> str:
    """Give the symbol that a key stands for."""
    return next((symbol for symbol, spelled in SPELLED.items() if spelled == key), key)


def unit_of(key: str) -> str:
    """Give the unit of a device's figure by its key; empty where it has none."""
    return UNITS.get(key, PREFIX_UNITS.get(key[:1], ""))
