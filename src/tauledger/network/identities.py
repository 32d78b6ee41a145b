"""What must come out equal in every run: a review checks itself before it speaks.

Each identity is exact algebra between two numbers that were reached by different ways; one that fails is a fault of
ours, never of the netlist.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from msgspec import Struct

from tauledger.devices.parts import voltage_source
from tauledger.errors import NetworkError
from tauledger.network.admittance import coordinates
from tauledger.network.assemble import Network, assemble
from tauledger.network.bands import Bands
from tauledger.network.constants import OpenConstants, group_delay
from tauledger.network.lower import ShortConstants
from tauledger.network.midband import MidBand
from tauledger.network.shares import Shares
from tauledger.network.solve import Solution, log_slope, on_axis, response, solve

SUMS = 1e-9
# A coupling capacitor of 100 µF is 10⁶ S at a few GHz: rounding alone makes 1e-8 of the currents beside it.
ON_THE_AXIS = 1e-6
POLES = 1e-6
# What rounding leaves of a capacitor between nodes that are held: no time constant of a board is a millionth of a ps.
HELD_S = 1e-18


class Identity(Struct, frozen=True):
    """Two numbers that must be equal: |left − right| ≤ tolerance · scale."""

    name: str
    left: float
    right: float
    tolerance: float
    scale: float

    @property
    def holds(self) -> bool:
        """Whether the two numbers agree; numbers that are not finite do not."""
        return abs(self.left - self.right) <= self.tolerance * self.scale

    def __str__(self) -> str:
        return f"{self.name}: {self.left:.12g} against {self.right:.12g} (tolerance {self.tolerance:g})"


def check(identities: Iterable[Identity]) -> tuple[Identity, ...]:
    """Give the identities back if all hold.

    Raises NetworkError that names each one that does not, with its two numbers.
    """
    checked = tuple(identities)
    failed = [identity for identity in checked if not identity.holds]
    if failed:
        raise NetworkError("an internal check failed: " + "; ".join(str(identity) for identity in failed))
    return checked


def open_identities(constants: OpenConstants) -> tuple[Identity, ...]:
    """Σ τ = tr(ZC) = Σ of the node constants = −Σ 1/p of the upper network, and Σ w·τ = group delay at mid-band."""
    scale = max(sum(abs(part.time_constant_s) for part in constants.parts), HELD_S)
    by_node = sum(constants.node_time_constant_s.values()) + sum(constants.branch_time_constant_s.values())
    weighted = sum(abs(part.delay_s) for part in constants.parts)
    return (
        Identity("sum of time constants = trace of ZC", constants.sum_s, constants.b1_s, SUMS, scale),
        Identity("node rows add to the trace of ZC", by_node, constants.b1_s, SUMS, scale),
        Identity("sum of time constants = -sum of 1/p", constants.sum_s, constants.inverse_pole_sum_s, POLES, scale),
        Identity(
            "weighted sum = group delay",
            sum(part.delay_s for part in constants.parts),
            constants.group_delay_s,
            SUMS,
            weighted,
        ),
    )


def weight_identities(bands: Bands, constants: OpenConstants) -> tuple[Identity, ...]:
    """w = 1 − H^i/H^0 with H^i solved anew, the part shorted by a source of 0 V: the heaviest part and the lightest.

    Two of them, for each costs a network; nothing where capacitors set the gain, for there the weights are complex.
    """
    if bands.s_mid:
        return ()
    rows = sorted(
        (row for row in constants.parts if row.kind == "capacitance" and row.time_constant_s > 0.0),
        key=lambda row: abs(row.delay_s),
    )
    upper = bands.upper
    gain = complex(response(upper, np.zeros(1))[0])
    found = []
    for row in dict.fromkeys((*rows[:1], *rows[-1:])):
        a, b = row.nodes
        short = voltage_source(f"short of {row.name}", a, b)
        shorted = complex(response(assemble((*upper.parts, short), upper.port, upper.amplitudes), np.zeros(1))[0])
        weight = 1.0 - (shorted / gain).real
        found.append(Identity(f"weight of {row.name} = gain lost when shorted", row.weight, weight, POLES, 1.0))
    return tuple(found)


def short_identities(constants: ShortConstants) -> tuple[Identity, ...]:
    """Σ f_k = −Σ p/2π of the lower network; nothing where capacitors alone form a loop."""
    if constants.sum_hz is None or constants.pole_sum_hz is None:
        return ()
    scale = sum(abs(part.edge_hz) for part in constants.parts)
    return (Identity("sum of short-circuit edges = -sum of p", constants.sum_hz, constants.pole_sum_hz, POLES, scale),)


def share_identities(shares: Shares) -> tuple[Identity, ...]:
    """Σ shares + defect = 1."""
    scale = 1.0 + sum(abs(value) for value in shares.parts.values())
    total = sum(shares.parts.values()) + shares.defect
    return (Identity("shares and defect add to 1", total, 1.0, ON_THE_AXIS, scale),)


def response_identities(network: Network, midband: MidBand) -> tuple[Identity, ...]:
    """eᵀx = λᵀb at mid-band, and the parts' delays add to the phase slope there."""
    at = solve(network, on_axis(midband.frequency_hz))
    forward, backward = complex(at.response[0]), complex(at.adjoint[0] @ network.drive)
    delays = group_delay(network, midband.frequency_hz)
    scale = sum(abs(value) for value in delays.values())
    size = abs(forward) + rounding(network, at) / SUMS
    identities = [
        Identity("output by x = output by the adjoint, real", forward.real, backward.real, SUMS, size),
        Identity("output by x = output by the adjoint, imaginary", forward.imag, backward.imag, SUMS, size),
    ]
    if midband.frequency_hz > 0.0:
        omega = 2.0 * np.pi * midband.frequency_hz
        slope = -float(log_slope(network, at)[0].imag) / omega
        identities.append(
            Identity("delays of all parts = group delay", sum(delays.values()), slope, ON_THE_AXIS, scale)
        )
    return tuple(identities)


def rounding(network: Network, at: Solution) -> float:
    """Bound what rounding alone does to an output that is solved at one frequency: n·ε·|λ|ᵀ|Y||x|.

    Source: Higham, "Accuracy and Stability of Numerical Algorithms", 2nd ed. 2002, section 7.2 (componentwise).
    """
    row, column, value = coordinates(network, complex(at.s[0]))
    size = np.abs(at.adjoint[0][row]) @ (np.abs(value) * np.abs(at.x[0][column]))
    return float(network.size * np.finfo(float).eps * size)
