"""An empty page for one circuit: every figure that can be set beside hand and exact, each behind a #."""

from __future__ import annotations

import re
from collections.abc import Mapping

from tauledger.hand.estimate import SignalNode
from tauledger.paper.bench import bridging
from tauledger.paper.keys import unit_of

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_HEAD = """# Figures from paper for {title}
# Write what you worked out, take the # away, leave the rest; then:
#   tauledger review {netlist} --paper {page}
# Values are numbers in SI units, or texts as in a netlist: 605, "2.2k", "690k", "33p".
# Signs of gains do not matter; "61.5 dB" is a gain too. Each figure is set beside hand and exact; where it is
# off by more than 2 %, the known slips are tried and the one that gives it is named.

#f_high = ""          # Hz, -3 dB
#f_low = ""           # Hz, -3 dB
#gain = ""            # {unit}, mid-band
"""


def empty_page(
    *,
    title: str,
    netlist: str,
    page: str,
    gain_unit: str,
    nodes: tuple[SignalNode, ...],
    figures: Mapping[str, tuple[str, ...]],
) -> str:
    """Give the text of an empty page.

    nodes: the signal nodes; those off the path and second halves are left out, and the capacitance of one that has
    none. figures: keys by device name.
    """
    told = [_HEAD.format(title=_line(title) or "this circuit", netlist=netlist, page=page, unit=gain_unit or "V/V")]
    for row in nodes:
        if not row.in_path or row.second:
            continue
        half = f"; {row.image} alike, worked as a half circuit" if row.image else ""
        told.append(f"\n[node.{_key(row.name)}]          # {_line(row.title)}{half}\n")
        told.append('#resistance = ""      # ohm, to AC ground at mid-band\n')
        if row.time_constant_s > 0.0 and row.time_constant_exact_s > 0.0:
            told.append('#capacitance = ""     # F, with Miller\'s factors\n')
            told.append('#time_constant = ""   # s\n')
        main = bridging(row)
        if main is not None:
            told.append(f'#miller_gain = ""     # far end of {_line(main[1].part)} over this node\n')
    for name, keys in figures.items():
        told.append(f"\n[device.{_key(name)}]\n")
        for key in keys:
            entry = f'#{key} = ""'
            told.append(f"{entry:<22}# {unit_of(key).replace('Ω', 'ohm')}\n")
    return "".join(told)


def _key(name: str) -> str:
    if _BARE.fullmatch(name):
        return name
    return '"' + name.replace("\\", "\\\\").replace('"', '\\"') + '"'


def _line(text: str) -> str:
    """Keep what goes behind a # on one line, without what a terminal or TOML would take for a control."""
    return "".join(letter if letter.isprintable() else " " for letter in text)
