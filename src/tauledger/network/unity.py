"""Unity gain: where |H| first falls to 1 beyond mid-band, and how far the phase there is from a half turn.

The phase margin is 180° plus the phase beyond mid-band, so that the sign of the mid-band gain is taken out; the gain
margin is how far |H| is below 1 where that phase first reaches −180°. Both say how the amplifier fares with all of its
output fed back at the sign that opposes, as a follower.

Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945 (gain and phase margin); Gray, Hurst, Lewis and
Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed. 2009, section 9.3.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.network.angle import scanned_angle
from tauledger.network.assemble import Network
from tauledger.network.edges import Edges, Miss, crossing, find_edges, narrowed
from tauledger.network.midband import MidBand
from tauledger.network.solve import Complex, Real, Solution, log_slope, on_axis, response, solve

HALF_TURN_DEG = 180.0
BEYOND = 2.0
FALLS = -0.5
POINTS_PER_DECADE = 20


class Unity(Struct, frozen=True):
    """The unity gain frequency of a gain (V/V or A/A) that exceeds 1 at mid-band.

    hz: the first |H| = 1 going out from mid-band, upwards. slope: d ln|H|/d ln f there. phase_slope: d arg H/d ln f
    there, in radian. phase_margin_deg: 180° plus the phase beyond mid-band. gain_margin_db: −|H| in dB where that phase
    first reaches −180°, at gain_margin_at_hz; both None where it never does. gain_bandwidth_hz: |A_mid|·f_H, None where
    there is no f_H. further_hz: later |H| = 1, outwards.
    """

    hz: float
    slope: float
    phase_slope: float
    phase_margin_deg: float
    gain_margin_db: float | None
    gain_margin_at_hz: float | None
    gain_bandwidth_hz: float | None
    further_hz: tuple[float, ...] = ()


def find_unity(network: Network, midband: MidBand, edges: Edges | None = None) -> Unity | None:
    """Find the unity gain frequency with its margins, refined to rounding; None where there is none.

    edges: those of this network where they are known, whose scan is used again.
    There is none where the response is no plain ratio (`is_ratio`), where the mid-band gain is 1 or less, and where |H|
    does not fall to 1.
    Raises NetworkError where the network has no unique solution.
    """
    if not is_ratio(network) or abs(midband.gain) <= 1.0:
        return None
    edges = find_edges(network, midband) if edges is None else edges
    angle = edges.angle
    if angle is None:
        return None
    frequency, h = _outwards(network, midband, edges)
    if network.lines:
        from tauledger.network.ripple import with_ripple

        frequency, h = with_ripple(network, frequency, h, from_hz=midband.frequency_hz, level=1.0)
        angle = scanned_angle(midband, frequency, h)
    over = np.abs(h) >= 1.0
    at = [
        crossing(network, 1.0, float(frequency[k]), float(frequency[k + 1]))
        for k in np.flatnonzero(over[:-1] != over[1:])
    ]
    if not at:
        return None
    there = solve(network, on_axis(at[0]))
    slope = complex(log_slope(network, there)[0])
    turned_hz = _half_turn(network, midband, frequency, angle.along(frequency, h))
    high = edges.f_high
    return Unity(
        hz=at[0],
        slope=slope.real,
        phase_slope=slope.imag,
        phase_margin_deg=HALF_TURN_DEG + angle.beyond_midband(at[0], complex(there.response[0])),
        gain_margin_db=None if turned_hz is None else _below_one_db(network, turned_hz),
        gain_margin_at_hz=turned_hz,
        gain_bandwidth_hz=None if high is None or high.hz is None else abs(midband.gain) * high.hz,
        further_hz=tuple(at[1:]),
    )


def is_ratio(network: Network) -> bool:
    """Whether the response is a plain ratio, V/V or A/A, so that 1 means something."""
    return {part.kind for part in network.driving} == {f"{network.port.kind} source"}


def _outwards(network: Network, midband: MidBand, edges: Edges) -> tuple[Real, Complex]:
    """Give the scan from mid-band upwards, frequency (k,) and H (k,).

    It is carried on to where |H| has fallen below 1 if it still falls at the end.
    """
    above = edges.frequency_hz > midband.frequency_hz
    frequency = np.concatenate(
        [[midband.frequency_hz or float(edges.frequency_hz[0]) / 10.0], edges.frequency_hz[above]]
    )
    h = np.concatenate([[midband.gain], edges.response[above]])
    last = float(frequency[-1])
    gain, slope = abs(complex(h[-1])), float(log_slope(network, solve(network, on_axis(last)))[0].real)
    if gain < 1.0 or slope > FALLS:
        return frequency, h
    stop = BEYOND * last * gain ** (-1.0 / slope)
    more = np.geomspace(last, stop, int(np.ceil(np.log10(stop / last) * POINTS_PER_DECADE)) + 1)[1:]
    return np.concatenate([frequency, more]), np.concatenate([h, response(network, more)])


def _half_turn(network: Network, midband: MidBand, frequency: Real, phase_deg: Real) -> float | None:
    """Give where the phase beyond mid-band first reaches −180°, in Hz."""
    reached = np.flatnonzero(phase_deg <= -HALF_TURN_DEG)
    if not len(reached) or reached[0] == 0:
        return None
    k = int(reached[0])
    a_hz, b_hz = float(frequency[k - 1]), float(frequency[k])
    ahead, behind = phase_deg[k - 1] + HALF_TURN_DEG, phase_deg[k] + HALF_TURN_DEG

    def miss_at(solution: Solution) -> Miss:
        left = np.angle(-solution.response[0] / midband.gain)
        return Miss(float(left), float(log_slope(network, solution)[0].imag))

    start_hz = a_hz * (b_hz / a_hz) ** float(ahead / (ahead - behind))
    return narrowed(network, miss_at, start_hz, (a_hz, b_hz), rises=False)


def _below_one_db(network: Network, hz: float) -> float:
    return float(-20.0 * np.log10(np.abs(response(network, np.array([hz]))[0])))
