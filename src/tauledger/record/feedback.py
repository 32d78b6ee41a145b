"""Feedback: the return ratio of a loop, what it makes of the closed gain, and what paper says of both."""

from __future__ import annotations

from msgspec import Struct


class LoopStageFacts(Struct, frozen=True):
    """One factor of T₀ by hand: the gain to this node from the one before; the first in Ω, from the source's output."""

    node: str
    hand: float
    exact: float


class LoopNodeFacts(Struct, frozen=True):
    """One node of the opened loop by hand: R in Ω, C in F, R·C in s."""

    node: str
    ohm: float
    farad: float
    time_constant_s: float


class LoopEstimate(Struct, frozen=True):
    """What a loop says of f_H by one method; difference: hz/simulated − 1 (against exact without simulation)."""

    method: str
    hz: float | None
    difference: float | None


class AmplifierFacts(Struct, frozen=True):
    """An instance by itself, output open, other pins at AC ground: a₀, first pole, a₀·pole, second pole.

    loaded: taken as it stands instead, its output being one of its inputs; the pole is that of the opened loop.
    """

    name: str
    open_loop_gain: float | None
    first_pole_hz: float | None
    gain_bandwidth_hz: float | None
    second_pole_hz: float | None
    loaded: bool = False


class LoopFacts(Struct, frozen=True):
    """A loop without cutting it: return ratio T at one place, its margins, and what it makes of the closed gain.

    loop: as named ("M6", "Q1.base"). kind: source, admittance (of a bilateral element, against none) or wire (double
    injection). where: in words. found: not asked for. through: signal nodes that it passes. return_ratio_*: T at at_hz
    (mid-band), positive for negative feedback; *_simulated (size), *_deg (angle): by double injection in ngspice, None
    where no wire carries that T alone. crossover: |T| = 1 above mid-band; lower_crossover below it. open_edge_hz: −3 dB
    of T. closing_source: for which H = ideal_gain·T/(1 + T) + feedthrough/(1 + T) = closed_gain at at_hz, with
    closing_return_ratio for T; identity_error: largest relative error of that against the network. noise_gain: 1/β of
    an amplifier, noise_gain_edge_hz its gain-bandwidth product over that, where that is f_H: not_f_high says why not.
    further_hz: |T| = 1 above mid-band elsewhere; crossover_hz is then the fall with the least margin. flat: T is in
    phase at at_hz and does not rise before open_edge_hz, which is None else. hand_return_ratio: hand_siemens·Π hand of
    hand_stages; without hand_siemens −Π of the gains round the cut wire. hand_open_edge_hz: 1/(2π·Σ R·C) of the opened
    loop, hand_open_nodes those that take 1 % of it or more.
    """

    loop: str
    kind: str
    where: str
    found: bool
    through: tuple[str, ...]
    at_hz: float
    return_ratio_real: float
    return_ratio_imag: float
    return_ratio_simulated: float | None
    crossover_hz: float | None
    phase_margin_deg: float | None
    crossover_simulated_hz: float | None
    phase_margin_simulated_deg: float | None
    gain_margin_db: float | None
    gain_margin_at_hz: float | None
    gain_margin_simulated_db: float | None
    lower_crossover_hz: float | None
    lower_phase_margin_deg: float | None
    open_edge_hz: float | None
    unit: str
    closing_source: str = ""
    closing_return_ratio: float | None = None
    ideal_gain: float | None = None
    feedthrough: float | None = None
    closed_gain: float | None = None
    identity_error: float | None = None
    noise_gain: float | None = None
    noise_gain_edge_hz: float | None = None
    amplifier: AmplifierFacts | None = None
    hand_return_ratio: float | None = None
    hand_siemens: float | None = None
    hand_stages: tuple[LoopStageFacts, ...] = ()
    hand_ideal_gain: float | None = None
    hand_ideal_text: str = ""
    hand_open_edge_hz: float | None = None
    hand_open_nodes: tuple[LoopNodeFacts, ...] = ()
    estimates: tuple[LoopEstimate, ...] = ()
    why: tuple[str, ...] = ()
    says: tuple[str, ...] = ()
    return_ratio_simulated_deg: float | None = None
    closing_return_ratio_imag: float | None = None
    further_hz: tuple[float, ...] = ()
    flat: bool = True
    not_f_high: str = ""


class LoopCurve(Struct, frozen=True):
    """T over frequency of one loop: magnitude in dB, phase in degrees from negative feedback, exact."""

    loop: str
    frequency_hz: tuple[float, ...]
    ratio_db: tuple[float, ...]
    phase_deg: tuple[float, ...]
