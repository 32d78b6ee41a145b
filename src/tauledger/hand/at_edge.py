"""Miller's factor at the band edge: 1 − K(jω), complex, where the gain has begun to fall and to turn."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from tauledger.circuit import GROUND
from tauledger.errors import NetworkError
from tauledger.hand.estimate import SignalNode
from tauledger.hand.halves import images
from tauledger.network.bands import Bands
from tauledger.network.solve import admittance


def edge_factors(bands: Bands, nodes: Sequence[SignalNode], hz: float) -> Mapping[tuple[str, str], complex]:
    """Give 1 − K at `hz` by (node of the upper network, part), K = Z_ji/Z_ii driven from that node alone.

    In a half circuit the image is driven the other way. Capacitances to AC ground have no entry.
    Raises NetworkError where the upper network has no unique solution at `hz`.
    """
    network, opposite = bands.upper, images(nodes)
    try:
        z = np.linalg.inv(admittance(network, np.array([2j * np.pi * hz]))[0])
    except np.linalg.LinAlgError as error:
        raise NetworkError(f"the upper network has no unique solution at {hz:g} Hz") from error
    found: dict[tuple[str, str], complex] = {}
    for line in (line for node in nodes for line in node.lines):
        i = network.index(line.at)
        column = z[:, i]
        if line.at in opposite:
            column = column - z[:, network.index(opposite[line.at])]
        for term in line.capacitances:
            ends = {bands.merged[end] for end in bands.network.part(term.part).nodes} - {line.at, GROUND}
            if len(ends) == 1 and column[i]:
                found[line.at, term.part] = complex(1.0 - column[network.index(ends.pop())] / column[i])
    return found
