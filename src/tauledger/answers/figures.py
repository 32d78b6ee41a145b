"""The figures that a designer wants of a changed network: margins, unity gain frequency, band edges; exact, by ngspice.

The operating point is held. The reference is found anew in the changed network, as a review of the changed netlist
would find it; one that the user named stays where it is.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.network.admittance import all_pass
from tauledger.network.assemble import Network
from tauledger.network.edges import HALF_POWER, find_edges
from tauledger.network.follower import polarity, polarity_offset_deg
from tauledger.network.lines import lumped
from tauledger.network.midband import MidBand, find_midband, in_changed
from tauledger.network.spectrum import pole_frequencies
from tauledger.network.unity import HALF_TURN_DEG, find_unity
from tauledger.solution import Sweep

RunSweep = Callable[[NDArray[np.float64]], Sweep]
# How far around the exact frequency ngspice is asked for the crossing, the closest first.
AROUND = (1e-3, 1e-2, 1e-1)
FAR_BELOW = 1e-6
QUANTITIES = {"margin": "°", "gain_margin": "dB", "f_u": "Hz", "f_h": "Hz", "f_l": "Hz"}
MARGINS = ("margin", "gain_margin")


class Figures(Struct, frozen=True):
    """f_u with its margins, band edges in Hz and mid-band gain in dB of one network; None for what it does not have.

    reference_hz: mid-band frequency. gain_margin_at_hz: where the phase has turned by half. stable: no pole lies to the
    right of the axis. margin_at_hz: of several |H| = 1 that with the smallest margin; further_unity_hz: those
    beyond f_u.
    """

    reference_hz: float
    f_unity_hz: float | None
    phase_margin_deg: float | None
    gain_margin_db: float | None
    gain_margin_at_hz: float | None
    f_high_hz: float | None
    f_low_hz: float | None
    gain_db: float
    stable: bool
    margin_at_hz: float | None = None
    further_unity_hz: tuple[float, ...] = ()

    def of(self, quantity: str) -> float | None:
        """Give one figure by the word with which it is asked for; what never comes to an end is infinite or 0.

        None where the quantity means nothing: no unity gain frequency, or poles in the right half plane.
        """
        if not self.stable:
            return None
        unending = {"gain_margin": math.inf, "f_h": math.inf, "f_l": 0.0}
        if quantity in (*MARGINS, "f_u") and self.f_unity_hz is None:
            return None
        if quantity in MARGINS and self.phase_margin_deg is None:
            return None
        found = {
            "margin": self.phase_margin_deg,
            "gain_margin": self.gain_margin_db,
            "f_u": self.f_unity_hz,
            "f_h": self.f_high_hz,
            "f_l": self.f_low_hz,
        }[quantity]
        return unending.get(quantity) if found is None else found


def reference_in(network: Network, midband: MidBand, *, chosen: bool) -> MidBand:
    """Give the reference of a changed network. midband: of the unchanged one. chosen: the user named its frequency.

    Raises NetworkError where the network has no unique solution, InputError where no signal passes.
    """
    if chosen or midband.frequency_hz == 0.0:
        return in_changed(network, midband)
    return find_midband(network, within_hz=midband.within_hz)


def figures_of(network: Network, midband: MidBand, *, chosen: bool) -> Figures:
    """Give all figures of a changed network, exact; midband, chosen: as in `reference_in`.

    Raises NetworkError where the network has no unique solution, InputError where no signal passes.
    """
    reference = reference_in(network, midband, chosen=chosen)
    edges = find_edges(network, reference)
    unity = find_unity(network, reference, edges)
    poles = pole_frequencies(all_pass(lumped(network)))
    # below the floor measuring aids make poles of their own
    poles = poles[np.abs(poles) > 2.0 * np.pi * reference.floor_hz]
    return Figures(
        reference_hz=reference.frequency_hz,
        f_unity_hz=unity.hz if unity else None,
        phase_margin_deg=unity.phase_margin_deg if unity else None,
        gain_margin_db=unity.gain_margin_db if unity else None,
        gain_margin_at_hz=unity.gain_margin_at_hz if unity else None,
        f_high_hz=edges.f_high.hz if edges.f_high else None,
        f_low_hz=edges.f_low.hz if edges.f_low else None,
        gain_db=20.0 * math.log10(abs(reference.gain)),
        stable=bool(np.all(poles.real <= 0.0)),
        margin_at_hz=unity.margin_at_hz if unity else None,
        further_unity_hz=unity.further_hz if unity else (),
    )


def simulated_figure(run: RunSweep, quantity: str, exact: Figures) -> float | None:
    """Give one figure by ngspice's own response around the exact frequency; None where it has no crossing there.

    run: asks the engine for the response of the changed circuit.
    """
    near = {
        "margin": exact.margin_at_hz,
        "gain_margin": exact.gain_margin_at_hz,
        "f_u": exact.f_unity_hz,
        "f_h": exact.f_high_hz,
        "f_l": exact.f_low_hz,
    }[quantity]
    if near is None:
        return None
    # ngspice has no AC at 0 Hz; that far below the plateau has been reached
    reference_hz = exact.reference_hz or FAR_BELOW * min(near, exact.f_high_hz or near)
    for width in AROUND:
        frequency = np.array([reference_hz, near * (1.0 - width), near, near * (1.0 + width)])
        response = run(np.sort(frequency)).response[np.argsort(np.argsort(frequency))]
        reference = complex(response[0])
        if quantity == "gain_margin":
            reference = polarity(reference) * abs(reference)
        found = _crossing(quantity, frequency[1:], response[1:] / reference, abs(reference))
        if found is not None:
            if quantity == "gain_margin" and exact.gain_margin_db is not None:
                return math.copysign(found, exact.gain_margin_db)
            if quantity == "margin":
                # of the phase beyond mid-band, as which nominal polarity stands
                return _nearest_turn(found + (polarity_offset_deg(complex(response[0])) or 0.0), exact.phase_margin_deg)
            return found
    return None


def _crossing(quantity: str, frequency_hz: NDArray[np.float64], h: NDArray[np.complex128], gain: float) -> float | None:
    """Interpolate on ln f between three points, frequency (3,) and h (3,); None where nothing is crossed there.

    h: H over its mid-band value. gain: the size of that value.
    """
    size, place = np.log(np.abs(h)), np.log(frequency_hz)
    phase = np.unwrap(np.angle(h))
    level = {"f_h": math.log(HALF_POWER), "f_l": math.log(HALF_POWER)}.get(quantity, -math.log(gain))
    if quantity == "gain_margin":
        turned = phase - math.pi * (2.0 * round((float(phase[1]) / math.pi - 1.0) / 2.0) + 1.0)
        at = _zero(place, turned)
        return None if at is None else -20.0 * math.log10(gain * math.exp(float(np.interp(at, place, size))))
    at = _zero(place, size - level)
    if at is None:
        return None
    if quantity == "margin":
        return HALF_TURN_DEG + math.degrees(float(np.interp(at, place, phase)))
    return math.exp(at)


def _zero(place: NDArray[np.float64], value: NDArray[np.float64]) -> float | None:
    """Give where a nearly straight line of three points passes zero, None where it does not."""
    if value[0] * value[-1] > 0.0:
        return None
    k = 0 if value[0] * value[1] <= 0.0 else 1
    a, b = float(value[k]), float(value[k + 1])
    start, stop = float(place[k]), float(place[k + 1])
    return start if a == b else start + (stop - start) * a / (a - b)


def _nearest_turn(margin: float, exact: float | None) -> float:
    return margin if exact is None else margin + 360.0 * round((exact - margin) / 360.0)
