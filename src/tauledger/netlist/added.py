"""NODE=VALUES as a user writes it → a resistance and a capacitance to ground, as of a probe."""

from __future__ import annotations

import math
from collections.abc import Sequence

from tauledger.circuit import GROUND, Change, Load, fold
from tauledger.errors import InputError
from tauledger.netlist.diagnostics import nearest, visible
from tauledger.netlist.elaborate import elaborate
from tauledger.netlist.netlist import Netlist
from tauledger.netlist.numbers import read_number

# No probe has less than 1 Ω, and none has a millifarad: a number alone says what it is.
LEAST_OHM = 1.0
MOST_FARAD = 1e-3
WRITE = "write a capacitance, a resistance, or both: --add out=12p, --add out=10meg,12p"


def added(netlist: Netlist, texts: Sequence[str]) -> Change:
    """Give the change that "out=12p", "out=10meg" or "X1.b=10meg,12p" ask for; values as in a netlist, each to ground.

    From 1 on a value is a resistance in ohm, up to 1m a capacitance in farad.
    Raises InputError where one is not NODE=VALUES, and where no node is called so (with the nearest name).
    """
    nodes = elaborate(netlist, purpose="reading").nodes
    names = {fold(node): node for node in nodes if node != GROUND}
    loads: list[Load] = []
    for text in texts:
        name, equals, values = text.rpartition("=")
        if not equals or not name.strip():
            raise InputError(f"--add {visible(text)}: not NODE=VALUES", WRITE)
        key = fold(name.strip())
        if key in (GROUND, "gnd"):
            raise InputError(f"--add {visible(text)}: both ends would be ground", "name another node")
        if key not in names:
            known = ", ".join(list(names.values())[:12])
            raise InputError(
                f"--add {visible(text)}: no node is called {visible(name.strip())!r}",
                nearest(name.strip(), names.values(), otherwise=f"there are {known or 'none'}"),
            )
        loads += _loads(text, names[key], values)
    return Change(loads=tuple(loads))


def _loads(text: str, node: str, values: str) -> list[Load]:
    parts = values.split(",")
    if len(parts) > 2:
        raise InputError(f"--add {visible(text)}: {len(parts)} values", WRITE)
    loads = [_load(text, node, part.strip()) for part in parts]
    if len({load.kind for load in loads}) < len(loads):
        words = "resistances" if loads[0].kind == "R" else "capacitances"
        raise InputError(f"--add {visible(text)}: two {words}", WRITE)
    return loads


def _load(text: str, node: str, written: str) -> Load:
    number = read_number(written)
    if number is None or number.tail:
        raise InputError(f"--add {visible(text)}: {visible(written)!r} is no number", WRITE)
    value = number.value
    if not 0.0 < value < math.inf:
        raise InputError(f"--add {visible(text)}: {visible(written)} is not above 0", WRITE)
    if MOST_FARAD < value < LEAST_OHM:
        raise InputError(
            f"--add {visible(text)}: {visible(written)} is no resistance from 1 ohm on and no capacitance up to 1 mF",
            "in SPICE M is milli: 10 megohm are 10meg",
        )
    return Load("R" if value >= LEAST_OHM else "C", node, GROUND, value)
