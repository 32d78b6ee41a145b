"""Unity gain: where |H| first falls to 1 beyond mid-band, and how far the phase there is from a half turn.

The phase margin is 180° plus the phase from nominal polarity, the multiple of 180° nearest to the phase at mid-band;
the gain margin is how far |H| is from 1 where that phase reaches −180°. Both say how the amplifier fares with all of
its output fed back at the sign that opposes, as a follower. Of several |H| = 1 the smallest margin counts.

Source: Bode, "Network Analysis and Feedback Amplifier Design", 1945 (gain and phase margin); Gray, Hurst, Lewis and
Meyer, "Analysis and Design of Analog Integrated Circuits", 5th ed. 2009, section 9.3.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.network.angle import scanned_angle
from tauledger.network.assemble import Network
from tauledger.network.edges import Edges, Miss, crossing, find_edges, narrowed
from tauledger.network.follower import HalfTurn, gain_margin, polarity, polarity_offset_deg
from tauledger.network.midband import MidBand
from tauledger.network.solve import Complex, Real, Solution, log_slope, on_axis, response, solve

HALF_TURN_DEG = 180.0
BEYOND = 2.0
FALLS = -0.5
POINTS_PER_DECADE = 20
# What is farther below 1 than 180 dB moves no margin, and a line turns the phase without end.
SMALLEST = 1e-9
MOST_HALF_TURNS = 20


class Unity(Struct, frozen=True):
    """The unity gain frequency of a gain (V/V or A/A) that exceeds 1 at mid-band.

    hz: the first |H| = 1 going out from mid-band, upwards. slope: d ln|H|/d ln f there. phase_margin_deg: the smallest
    180° plus phase from nominal polarity of all |H| = 1, at margin_at_hz; None where the polarity is not clear.
    gain_margin_db: as `follower.gain_margin` has it, at gain_margin_at_hz; both None where the phase never reaches
    −180°. gain_bandwidth_hz: |A_mid|·f_H, None where there is no f_H. further_hz: later |H| = 1, outwards. half_turns:
    all of them.
    """

    hz: float
    slope: float
    phase_margin_deg: float | None
    margin_at_hz: float
    gain_margin_db: float | None
    gain_margin_at_hz: float | None
    gain_bandwidth_hz: float | None
    further_hz: tuple[float, ...] = ()
    half_turns: tuple[HalfTurn, ...] = ()


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
    there = solve(network, on_axis(np.array(at)))
    offset = polarity_offset_deg(midband.gain)
    margin, margin_at_hz = None, at[0]
    turns: tuple[HalfTurn, ...] = ()
    if offset is not None:
        margins = HALF_TURN_DEG + offset + angle.along(np.array(at), there.response)
        k = int(np.argmin(margins))
        margin, margin_at_hz = float(margins[k]), at[k]
        turns = _half_turns(network, midband, frequency, h, offset + angle.along(frequency, h))
    left = gain_margin(network, midband, turns)
    high = edges.f_high
    return Unity(
        hz=at[0],
        slope=float(log_slope(network, there)[0].real),
        phase_margin_deg=margin,
        margin_at_hz=margin_at_hz,
        gain_margin_db=None if left is None else left.below_db,
        gain_margin_at_hz=None if left is None else left.hz,
        gain_bandwidth_hz=None if high is None or high.hz is None else abs(midband.gain) * high.hz,
        further_hz=tuple(at[1:]),
        half_turns=turns,
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


def _half_turns(
    network: Network, midband: MidBand, frequency: Real, h: Complex, phase_deg: Real
) -> tuple[HalfTurn, ...]:
    """Give where the phase (k,) from nominal polarity passes −180° or a whole turn beyond, outwards."""
    turn = np.floor((phase_deg - HALF_TURN_DEG) / 360.0)
    at = [k for k in np.flatnonzero(turn[1:] != turn[:-1]) if abs(h[k + 1]) >= SMALLEST][:MOST_HALF_TURNS]
    places = [_half_turn(network, midband, frequency[k : k + 2], phase_deg[k : k + 2]) for k in at]
    return tuple(HalfTurn(hz, _below_one_db(network, hz)) for hz in places)


def _half_turn(network: Network, midband: MidBand, bracket_hz: Real, phase_deg: Real) -> float:
    """Give where the phase passes half a turn inside the bracket, in Hz."""
    first, last = (float(hz) for hz in bracket_hz)
    ahead, behind = (float(np.mod(one, 360.0)) - HALF_TURN_DEG for one in phase_deg)
    start = first * (last / first) ** (ahead / (ahead - behind))
    opposed = -polarity(midband.gain)

    def miss(at: Solution) -> Miss:
        return Miss(float(np.angle(at.response[0] * opposed)), float(log_slope(network, at)[0].imag))

    return narrowed(network, miss, start, (first, last), rises=behind > ahead)


def _below_one_db(network: Network, hz: float) -> float:
    return float(-20.0 * np.log10(np.abs(response(network, np.array([hz]))[0])))
