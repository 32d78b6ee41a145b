"""How time constants, coefficients or poles are combined into one band edge.

Everything is written once, for an upper edge: H(s)/H(0) = Π(1 − s/z) / Π(1 − s/p). A lower edge is the same with
ω → 1/ω: an edge frequency ω_k = 1/(R_k C_k) takes the place of a time constant, 1/p that of a pole, and a zero at DC
drops out.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray

from tauledger.hand.estimate import InductorRow, LowerRow, SignalNode
from tauledger.hand.halves import counted
from tauledger.network.poles import cancelled_pairs
from tauledger.network.spectrum import ascending

Complex = NDArray[np.complex128]
Real = NDArray[np.float64]

HALF_POWER = 0.5 * math.log(2.0)
POINTS_PER_DECADE = 60


class Coefficients(Struct, frozen=True):
    """The first two coefficients of the denominator 1 + b1·s + b2·s², in s and s² (rad/s and its square for a1, a2)."""

    b1: float
    b2: float

    @property
    def separation(self) -> float:
        """b1²/b2: r + 2 + 1/r for two real poles of ratio r; below 4 the pair is complex; infinite for one pole."""
        return self.b1**2 / self.b2 if self.b2 else math.inf

    @property
    def q(self) -> float | None:
        """Q = √b2/b1 of the pair, None where it has none (b1 or b2 not positive)."""
        return math.sqrt(self.b2) / self.b1 if self.b1 > 0 and self.b2 > 0 else None


class Roots(Struct, frozen=True):
    """Poles and zeros in rad/s that are seen between input and output, sorted by magnitude, and the pairs that cancel.

    poles (n,), zeros (m,), cancelled (k,): the poles that have a zero within 2 % of themselves.
    """

    poles: Complex
    zeros: Complex
    cancelled: Complex


class Combined(Struct, frozen=True):
    """One band edge from the same network in every classical way, in Hz; None where that way gives no −3 dB frequency.

    lowest: the dominant time constant alone. all_nodes: all of them as separate real poles. exact_constants: the same
    with exact time constants. two_coefficients, all_poles: from the visible poles. with_zeros: with the zeros as well.
    sum_of_constants: 1/(2π·Στ), for a lower edge Σf_k. root_sum_of_squares: 1/(2π·√(Σ1/p² − 2Σ1/z²)), for a lower
    edge √(Σp² − 2Σz²)/2π. sigma: b2 / Σ_{i<j} τ_i·τ_j, None below two time constants. coefficients: b1, b2 of the
    visible poles; for a lower edge a1, a2 of s² + a1·s + a2. far_gain: |H| far beyond the edge relative to mid-band.
    stable: no pole in the right half plane. complex_pair: the dominant poles are complex. seen: b1 of the visible poles
    over the sum of the exact time constants, 1 where no pole is hidden; None where no time constant counts.
    """

    lowest: float | None
    all_nodes: float | None
    exact_constants: float | None
    two_coefficients: float | None
    all_poles: float | None
    with_zeros: float | None
    sum_of_constants: float | None
    root_sum_of_squares: float | None
    sigma: float | None
    coefficients: Coefficients
    roots: Roots
    far_gain: float
    stable: bool
    complex_pair: bool
    seen: float | None

    @property
    def hidden(self) -> bool:
        """Whether poles that a zero cancels hold more than a tenth of the time constants."""
        return len(self.roots.cancelled) > 0 and self.seen is not None and abs(self.seen - 1) > 0.1

    @property
    def two_coefficients_overshoot(self) -> bool:
        """Whether the two coefficients lead away from where all poles lead back: then they explain nothing.

        |ln f4/f3| + |ln f5/f4| > 1.2·|ln f5/f3| + 0.05 with f3 exact constants, f4 two coefficients, f5 all poles.
        """
        f3, f4, f5 = self.exact_constants, self.two_coefficients, self.all_poles
        if f3 is None or f4 is None or f5 is None:
            return False
        return abs(math.log(f4 / f3)) + abs(math.log(f5 / f4)) > 1.2 * abs(math.log(f5 / f3)) + 0.05


def combine_upper(
    nodes: Sequence[SignalNode], poles: Complex, zeros: Complex, inductors: Sequence[InductorRow] = ()
) -> Combined:
    """Combine the time constants of the nodes and inductors that count, and the roots of the upper network, into f_H.

    Of mirror images that carry one signal together, one half is taken.

    poles, zeros: of the upper network in rad/s (n,), (m,), both members of every complex pair.
    """
    rows: list[SignalNode | InductorRow] = [*counted(nodes).rows, *(row for row in inductors if row.in_path)]
    return _combine(
        [node.time_constant_s for node in rows],
        [node.time_constant_exact_s for node in rows],
        visible_roots(poles, zeros),
        lower=False,
    )


def combine_lower(rows: Sequence[LowerRow], poles: Complex, zeros: Complex) -> Combined:
    """Combine the edges of the coupling and bypass capacitors that count, and the roots of the lower network, into f_L.

    poles, zeros: of the lower network in rad/s (n,), (m,), both members of every complex pair.
    """
    used = [row for row in rows if row.in_path]
    return _combine(
        [2 * math.pi * row.edge_hand_hz for row in used],
        [2 * math.pi * row.edge_exact_hz for row in used],
        visible_roots(poles, zeros),
        lower=True,
    )


def visible_roots(poles: Complex, zeros: Complex) -> Roots:
    """Take out every pole that a zero cancels (within 2 %), and that zero: neither is seen at the output.

    poles, zeros: rad/s (n,), (m,), both members of every complex pair, in any order.
    """
    poles, zeros = _sorted(poles), _sorted(zeros)
    pole_gone, zero_gone = cancelled_pairs(poles, zeros)
    return Roots(poles[~pole_gone], zeros[~zero_gone], poles[pole_gone])


def coefficients(poles: Complex) -> Coefficients:
    """Give b1 = −Σ1/p and b2 = ½(b1² − Σ1/p²) of Π(1 − s/p); poles in rad/s (n,), none of them 0.

    Source: Gray, Hurst, Lewis and Meyer, Analysis and Design of Analog Integrated Circuits, 5th ed. (2009), sec. 7.3.
    """
    inverse = 1.0 / poles
    b1 = -float(np.sum(inverse).real)
    return Coefficients(b1, 0.5 * (b1**2 - float(np.sum(inverse**2).real)) if len(poles) > 1 else 0.0)


def two_pole_edge(b1: float, b2: float) -> float | None:
    """Give ω in rad/s where |1 + b1·jω + b2·(jω)²| = √2, complex pairs included; None where b1 = b2 = 0.

    ω² = (2·b2 − b1² + √((b1² − 2·b2)² + 4·b2²)) / (2·b2²), written so that b2 → 0 gives 1/b1 without cancellation.
    """
    m = b1**2 - 2 * b2
    root = math.hypot(m, 2 * b2)
    if m >= 0:
        return math.sqrt(2 / (m + root)) if m + root > 0 else None
    return math.sqrt((root - m) / 2) / abs(b2)


def root_sum_of_squares_edge(poles: Complex, zeros: Complex) -> float | None:
    """Give ω ≈ 1/√(Σ1/p² − 2·Σ1/z²) in rad/s, None where the zeros leave nothing to take the root of.

    Source: Sedra and Smith, Microelectronic Circuits, 8th ed., sec. 10.3.2 (from memory).
    """
    squares = float(np.sum(1 / poles**2).real) - 2 * float(np.sum(1 / zeros**2).real)
    return 1 / math.sqrt(squares) if squares > 0 else None


def first_fall(poles: Complex, zeros: Complex, level: float = HALF_POWER) -> float | None:
    """Give the first ω in rad/s at which Π|1 − jω/z| / Π|1 − jω/p| falls by `level` neper from DC (½·ln 2 is 3 dB).

    poles, zeros: rad/s (n,), (m,), none of them 0. None where the magnitude never falls that far.
    """
    if len(poles) == 0:
        return None
    magnitudes = np.abs(np.concatenate([poles, zeros]))
    start = 1e-3 * float(magnitudes.min()) / len(magnitudes)
    stop = 1e3 * float(magnitudes.max())
    excess = len(poles) - len(zeros)
    if excess > 0:
        # Far out the fall is excess·ln ω − Σ ln|p| + Σ ln|z|; with zeros far below the poles that begins late.
        asymptote = (level + _log_magnitude(poles) - _log_magnitude(zeros)) / excess
        stop = max(stop, 10 * math.exp(asymptote))
    grid = np.geomspace(start, stop, 2 + int(POINTS_PER_DECADE * math.log10(stop / start)))
    # A sharp pair turns faster than the grid: its own frequencies are looked at as well.
    grid = ascending(np.concatenate([grid, magnitudes, np.abs(np.concatenate([poles, zeros]).imag)]))
    grid = grid[(grid >= start) & (grid <= stop)]
    bracket = _first_bracket(grid, poles, zeros, level)
    # Each round narrows the bracket a hundredfold; the ratio of its ends starts at 1.04 at most.
    for _ in range(7):
        if bracket is None:
            return None
        bracket = _first_bracket(np.geomspace(*bracket, 101), poles, zeros, level) or bracket
    return None if bracket is None else math.sqrt(bracket[0] * bracket[1])


def _combine(hand: list[float], exact: list[float], roots: Roots, *, lower: bool) -> Combined:
    poles, zeros = roots.poles, roots.zeros
    if lower:
        poles, zeros = 1 / poles[poles != 0], 1 / zeros[zeros != 0]
    positive = [tau for tau in hand if tau > 0]
    positive_exact = [tau for tau in exact if tau > 0]
    pair = coefficients(poles)
    products = 0.5 * (math.fsum(positive_exact) ** 2 - math.fsum(tau**2 for tau in positive_exact))
    total = math.fsum(exact)
    nothing = np.empty(0, dtype=complex)

    def hz(omega: float | None) -> float | None:
        if omega is None:
            return None
        return (1 / omega if lower else omega) / (2 * math.pi)

    return Combined(
        lowest=hz(1 / max(positive)) if positive else None,
        all_nodes=hz(first_fall(_as_poles(positive), nothing)),
        exact_constants=hz(first_fall(_as_poles(positive_exact), nothing)),
        two_coefficients=hz(two_pole_edge(pair.b1, pair.b2)),
        all_poles=hz(first_fall(poles, nothing)),
        with_zeros=hz(first_fall(poles, zeros)),
        sum_of_constants=hz(1 / total) if total > 0 else None,
        root_sum_of_squares=hz(root_sum_of_squares_edge(poles, zeros)),
        sigma=pair.b2 / products if len(positive_exact) > 1 else None,
        coefficients=pair,
        roots=roots,
        far_gain=_far_gain(poles, zeros),
        complex_pair=len(poles) > 0 and bool(poles[np.argmin(np.abs(poles))].imag),
        seen=pair.b1 / total if total > 0 else None,
        stable=bool(np.all(roots.poles.real <= 0) and np.all(roots.cancelled.real <= 0)),
    )


def _as_poles(time_constants: list[float]) -> Complex:
    return np.array([-1 / tau for tau in time_constants], dtype=complex)


def _far_gain(poles: Complex, zeros: Complex) -> float:
    if len(poles) != len(zeros):
        return 0.0 if len(poles) > len(zeros) else math.inf
    return math.exp(_log_magnitude(poles) - _log_magnitude(zeros))


def _log_magnitude(roots: Complex) -> float:
    return float(np.sum(np.log(np.abs(roots))))


def _first_bracket(grid: Real, poles: Complex, zeros: Complex, level: float) -> tuple[float, float] | None:
    s = 1j * grid[:, None]
    with np.errstate(divide="ignore"):
        fall = np.sum(np.log(np.abs(1 - s / poles)), axis=1) - np.sum(np.log(np.abs(1 - s / zeros)), axis=1)
    below = np.flatnonzero(fall >= level)
    if len(below) == 0:
        return None
    first = int(below[0])
    return (float(grid[max(first - 1, 0)]), float(grid[first]))


def _sorted(roots: Complex) -> Complex:
    return np.array(sorted((complex(root) for root in roots), key=lambda root: (abs(root), root.imag)), dtype=complex)
