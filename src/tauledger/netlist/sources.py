"""Independent sources: DC, AC and a time function in any order; without DC the function's value at t = 0 counts."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from msgspec import Struct

from tauledger.circuit import fold
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.elements import multiplicity, parted_number
from tauledger.netlist.formulas import Formula
from tauledger.netlist.items import Function, Group, Item, Setting, Value, Word, flattened
from tauledger.netlist.letters import SOURCES, TIME_FUNCTIONS
from tauledger.netlist.numbers import read_number
from tauledger.netlist.scopes import Scope, find, number_of

REFUSED_WORDS = frozenset({"external", "portnum", "z0"})
WITH_LIST = TIME_FUNCTIONS | {"dc", "ac", "distof1", "distof2"}
SHAPE = "V1 n+ n- DC value AC magnitude phase"


class SourceCard(Struct, frozen=True):
    """V or I: nodes, DC value in V or A, AC magnitude and phase in degrees (magnitude None without AC), and m."""

    nodes: tuple[Word, Word]
    dc: float
    ac_magnitude: float | None
    ac_phase: float
    m: float


def source(site: Site, items: tuple[Item, ...], letter: str, scope: Scope) -> SourceCard:
    """Read a V or I card; raises NetlistError at what has no meaning there."""
    flat = _opened(items[1:])
    places = [item for item in flat[:2] if isinstance(item, Word)]
    if len(places) < 2:
        raise site.fault(
            len(site.card.text) if len(flat) < 2 else flat[1], f"a {SOURCES[letter]} has two nodes", f"write {SHAPE}"
        )
    dc: float | None = None
    at_start: float | None = None
    ac: tuple[float, float] | None = None
    m = 1.0
    rest = flat[2:]
    while rest:
        item = rest[0]
        word = _keyword(item)
        if word == "dc":
            if dc is not None:
                raise site.fault(item, "the DC value is given twice")
            values, rest = _values(rest, 1, scope)
            if not values:
                raise site.fault(item, "the DC value is missing", f"write {SHAPE}")
            dc = number_of(site, values[0], scope)
        elif word == "ac":
            if ac is not None:
                raise site.fault(item, "the AC value is given twice")
            values, rest = _values(rest, 2, scope)
            numbers = [number_of(site, value, scope) for value in values]
            ac = (numbers[0] if numbers else 1.0, numbers[1] if len(numbers) > 1 else 0.0)
        elif word in TIME_FUNCTIONS and at_start is None and isinstance(item, Word):
            values, rest = _values(rest, len(rest), scope)
            at_start = _at_start(site, item, word, [number_of(site, value, scope) for value in values])
        elif word in ("distof1", "distof2"):
            _, rest = _values(rest, 2, scope)
        elif word == "m" and letter == "I" and isinstance(item, Setting):
            m, rest = multiplicity(site, item, scope), rest[1:]
        elif word in ("r", "td") and isinstance(item, Setting) and at_start is not None:
            # Repetition and delay of a piecewise linear function do not touch its value at t = 0.
            rest = rest[1:]
        elif (
            len(rest) == len(flat) - 2 and not isinstance(item, Group | Setting | Function) and _is_number(item, scope)
        ):
            dc, rest = number_of(site, item, scope), rest[1:]
        else:
            raise _unexpected(site, flat[len(flat) - len(rest) - 1], item, word, letter)
    magnitude, phase = ac if ac is not None else (None, 0.0)
    if dc is None and at_start is not None and math.isnan(at_start):
        raise site.fault(flat[2], "the value at t = 0 is drawn at random", f"write {SHAPE}")
    value = dc if dc is not None else at_start if at_start is not None else 0.0
    return SourceCard((places[0], places[1]), value, magnitude, phase, m)


def _opened(items: Sequence[Item]) -> list[Item]:
    """Take parentheses off, but leave the argument list behind a keyword together."""
    flat: list[Item] = []
    for item in items:
        if not isinstance(item, Group) or (len(flat) >= 2 and _keyword(flat[-1]) in WITH_LIST):
            flat.append(item)
        else:
            flat.extend(_opened(item.items))
    return flat


def _keyword(item: Item) -> str:
    if isinstance(item, Word):
        return fold(item.text)
    return fold(item.name.text) if isinstance(item, Setting) else ""


def _is_number(item: Item, scope: Scope) -> bool:
    if isinstance(item, Word):
        return read_number(item.text) is not None or find(scope, fold(item.text)) is not None
    return isinstance(item, Formula)


def _values(rest: list[Item], most: int, scope: Scope) -> tuple[list[Value], list[Item]]:
    """Take up to `most` values behind a keyword, or all of a parenthesis; give them and what is left."""
    values: list[Value] = []
    keyword, rest = rest[0], rest[1:]
    if isinstance(keyword, Setting):
        values.append(keyword.value)
    elif rest and isinstance(rest[0], Group):
        inside = [item for item in flattened(rest[0].items) if not isinstance(item, Setting)]
        return inside, rest[1:]
    while (
        rest
        and len(values) < most
        and not isinstance(rest[0], Group | Setting | Function)
        and _is_number(rest[0], scope)
    ):
        values.append(rest[0])
        rest = rest[1:]
    return values, rest


def _unexpected(site: Site, before: Item, item: Item, word: str, letter: str) -> Exception:
    last = before.value if isinstance(before, Setting) else before
    if (parted := parted_number(site, last, item)) is not None:
        return parted
    if word in REFUSED_WORDS:
        return site.fault(item, f"{word} is not supported by this version", f"write {SHAPE}")
    if word in TIME_FUNCTIONS:
        return site.fault(item, "a source has one time function")
    if isinstance(item, Word) and read_number(item.text) is not None:
        return site.fault(item, "this number has no meaning here", f"write {SHAPE}")
    return site.fault(item, f"this has no meaning on a {SOURCES[letter]}", f"write {SHAPE}")


def _at_start(site: Site, item: Word, word: str, numbers: list[float]) -> float:
    """Give a time function's value at t = 0, as the operating point takes it."""
    function, least = _START[word]
    if len(numbers) < least:
        raise site.fault(item, f"{item.text} needs at least {least} numbers, not {len(numbers)}")
    if word == "pwl" and len(numbers) % 2:
        raise site.fault(item, f"{item.text} needs pairs of time and value", "write PWL(0 0 1u 5)")
    if any(numbers[place] < 0.0 for place in _DELAYS.get(word, ()) if place < len(numbers)):
        hint = "leave the delay out, or write the operating point as DC value and take the function out"
        raise site.fault(item, "a negative delay is not supported by this version", hint)
    return function(numbers)


def _sine(numbers: list[float]) -> float:
    phase = numbers[5] if len(numbers) > 5 else 0.0
    return numbers[0] + numbers[1] * math.sin(math.radians(phase))


def _piecewise(numbers: list[float]) -> float:
    """Interpolate between (time, value) pairs at t = 0; before the first and behind the last pair their value holds."""
    times, values = numbers[0::2], numbers[1::2]
    if times[0] >= 0.0:
        return values[0]
    for k in range(1, len(values)):
        if times[k] >= 0.0:
            span = times[k] - times[k - 1]
            return values[k] if span <= 0.0 else values[k - 1] - times[k - 1] * (values[k] - values[k - 1]) / span
    return values[-1]


def _modulated_frequency(numbers: list[float]) -> float:
    carrier = numbers[5] if len(numbers) > 5 else 0.0
    signal = numbers[6] if len(numbers) > 6 else 0.0
    return numbers[0] + numbers[1] * math.sin(math.radians(carrier) + numbers[3] * math.sin(math.radians(signal)))


_START: dict[str, tuple[Callable[[list[float]], float], int]] = {
    "pulse": (lambda numbers: numbers[0], 2),
    "exp": (lambda numbers: numbers[0], 2),
    "sin": (_sine, 2),
    "sine": (_sine, 2),
    "pwl": (_piecewise, 2),
    "sffm": (_modulated_frequency, 5),
    "trnoise": (lambda _numbers: 0.0, 2),
    "trrandom": (lambda _numbers: math.nan, 2),
    "am": (lambda _numbers: 0.0, 3),
}

# Where the delays stand in the argument list; with a negative one the function has begun before t = 0.
_DELAYS = {"pulse": (2,), "exp": (2, 4), "sin": (3,), "sine": (3,)}
