"""The marks of elements that one is not free to change: § takes part in the operating point, ¶ inside a device."""

from __future__ import annotations

from collections.abc import Sequence

from tauledger.record import Help, UnityElement

BIAS, DEVICE = "§", "¶"


def kind(one: Help | UnityElement) -> str:
    """Say how free one is to change an element: "free", "bias" where that moves the operating point, "device"."""
    if one.free:
        return "free"
    return "bias" if one.moves_bias else "device"


def mark(one: Help | UnityElement) -> str:
    """Give the mark of an element, empty where one is free to change it."""
    return {"free": "", "bias": BIAS, "device": DEVICE}[kind(one)]


def in_short(elements: Sequence[Help | UnityElement]) -> tuple[str, ...]:
    """Say what the marks of these elements mean, for a page of few words."""
    return _told(
        elements,
        bias="takes part in the operating point, and moves it",
        device="inside a device: another device, or another bias",
    )


def at_length(elements: Sequence[Help | UnityElement]) -> tuple[str, ...]:
    """Say what the marks of these elements mean in sentences, for a report."""
    return _told(
        elements,
        bias="takes part in the operating point: changed on the board it moves that too.",
        device="inside a device: another device or another bias, no change of a value.",
    )


def _told(elements: Sequence[Help | UnityElement], *, bias: str, device: str) -> tuple[str, ...]:
    kinds = {kind(one) for one in elements}
    said = (("bias", f"{BIAS} {bias}"), ("device", f"{DEVICE} {device}"))
    return tuple(text for which, text in said if which in kinds)
