"""Miller's factor beyond mid-band: 1 − K(jω), complex, where the gain has begun to fall and to turn."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from tauledger.circuit import GROUND
from tauledger.errors import NetworkError
from tauledger.hand.estimate import SignalNode
from tauledger.hand.halves import images
from tauledger.network.bands import Bands
from tauledger.network.solve import Complex, admittance, on_axis


def edge_factors(bands: Bands, nodes: Sequence[SignalNode], hz: float) -> Mapping[tuple[str, str], complex]:
    """Give 1 − K at one frequency in Hz, as `factors_over` does.

    Raises NetworkError where the upper network has no unique solution at `hz`.
    """
    found = factors_over(bands, nodes, np.array([hz]))
    return {place: complex(factor[0]) for place, factor in found.items()}


def factors_over(
    bands: Bands, nodes: Sequence[SignalNode], frequency_hz: NDArray[np.float64]
) -> Mapping[tuple[str, str], Complex]:
    """Give 1 − K (k,) at every frequency (k,) in Hz by (node of the upper network, part).

    K = Z_ji/Z_ii driven from that node alone. In a half circuit the image is driven the other way. Capacitances to AC
    ground have no entry, nor those at a node that is held, nor those that an inductor parts from the node.
    Raises NetworkError where the upper network has no unique solution at one of them.
    """
    network, opposite = bands.upper, images(nodes)
    try:
        z = np.linalg.inv(admittance(network, on_axis(frequency_hz)))
    except np.linalg.LinAlgError as error:
        where = (
            f"{frequency_hz[0]:g} Hz" if len(frequency_hz) == 1 else f"{frequency_hz[0]:g} to {frequency_hz[-1]:g} Hz"
        )
        raise NetworkError(f"the upper network has no unique solution at {where}") from error
    found: dict[tuple[str, str], Complex] = {}
    for line in (line for node in nodes for line in node.lines):
        i = network.index(line.at)
        column = z[:, :, i]
        if line.at in opposite:
            column = column - z[:, :, network.index(opposite[line.at])]
        own = column[:, i]
        for term in line.capacitances:
            ends = {bands.merged[end] for end in bands.network.part(term.part).nodes}
            far = ends - {line.at, GROUND}
            if line.at in ends and len(far) == 1 and np.all(own):
                found[line.at, term.part] = np.asarray(1.0 - column[:, network.index(far.pop())] / own)
    return found
