"""An operational amplifier by itself: open-loop gain, gain-bandwidth product and second pole, and its noise gain."""

from __future__ import annotations

import numpy as np

from tauledger.answers.loop_places import Amplifier
from tauledger.circuit import GROUND, Port
from tauledger.devices.parts import voltage_source
from tauledger.errors import NetworkError
from tauledger.network.assemble import Network
from tauledger.network.poles import find_poles
from tauledger.network.return_ratio import Opening, asymptotic, ratio_to
from tauledger.network.solve import on_axis, response
from tauledger.record import AmplifierFacts

DRIVE = "loop'in"
FLAT = 1.1
LOOKED_AT = 25
FAR_BELOW = 1e7


def amplifier(one: Amplifier) -> AmplifierFacts:
    """Give the figures of an amplifier taken out of its board: output open, supplies and other pins at AC ground.

    The input pair is driven by 1 V, its second pin at ground; a first pole p and a gain a₀ make the gain-bandwidth
    product a₀·|p|/2π.
    """
    plus, minus = one.control
    if plus == GROUND:
        driven, grounded, sign = minus, plus, -1.0
    else:
        driven, grounded, sign = plus, minus, 1.0
    still = [node for node in (grounded, *one.others) if node != GROUND]
    parts = (
        *one.parts,
        voltage_source(DRIVE, driven, GROUND, sign),
        *(voltage_source(f"{DRIVE}{k}", node, GROUND) for k, node in enumerate(still)),
    )
    try:
        network = Network.from_parts(parts, output=Port(one.output))
        gain = complex(response(network, np.zeros(1))[0]).real
        roots = find_poles(network).poles
    except NetworkError:
        return AmplifierFacts(one.name, None, None, None, None)
    poles = sorted(abs(pole.s) / (2.0 * np.pi) for pole in roots if not pole.cancelled and pole.s != 0.0)
    if not poles:
        return AmplifierFacts(one.name, gain, None, None, None)
    second = poles[1] if len(poles) > 1 else None
    return AmplifierFacts(one.name, gain, poles[0], abs(gain) * poles[0], second)


def noise_gain(opening: Opening, one: Amplifier, at_hz: float) -> float | None:
    """Give 1/β: the amplifier's output voltage over what of it comes back to its input, its source acting alone.

    T = a·β with a its open-loop gain as loaded; the ratio does not depend on that gain.
    """
    if len(opening.terms) != 1 or one.output not in opening.network.unknowns:
        return None
    ratio = complex(ratio_to(opening, one.output, GROUND, on_axis(at_hz))[0])
    return abs(ratio) if np.isfinite(ratio) else None


def where_noise_gain_tells(
    opening: Opening, one: Amplifier, own: AmplifierFacts, between_hz: tuple[float, float], *, whole: bool
) -> str:
    """Say why gain-bandwidth over noise gain is not f_H; empty where it is.

    It is where the amplifier has one pole up to |T| = 1, and noise gain and ideal gain are flat up to there.
    between_hz: mid-band and crossover. whole: the response is that of this amplifier alone. Raises NetworkError
    where the reference has no unique solution.
    """
    low, high = between_hz
    if own.second_pole_hz is not None and own.second_pole_hz < high:
        return "the amplifier has a second pole below |T| = 1"
    hz = np.geomspace(max(low, high / FAR_BELOW), max(high, low), LOOKED_AT)
    size = np.abs(ratio_to(opening, one.output, GROUND, on_axis(hz)))
    if not np.max(size) < FLAT * np.min(size):
        return f"the noise gain is not flat, up to |T| = 1 it runs from {np.min(size):.4g} to {np.max(size):.4g}"
    if not whole:
        return ""
    ideal = np.abs(asymptotic(opening, on_axis(hz)).ideal)
    if not np.max(ideal) < np.sqrt(2.0) * np.min(ideal):
        return "the ideal gain A∞ is not flat up to |T| = 1"
    return ""
