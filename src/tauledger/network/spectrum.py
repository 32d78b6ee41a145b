"""Natural frequencies: where a pencil G + s·C is singular, over a range of many decades.

One shift-and-invert is accurate only to eps·|s|/σ far above its shift σ, and an amplifier's poles span twelve decades
and more. So several shifts are used, a window of six decades around each; what lies outside a window is left to the
others.
"""

from __future__ import annotations

import numpy as np
from msgspec.structs import replace

from tauledger.errors import NetworkError
from tauledger.network.admittance import slope_moment
from tauledger.network.assemble import Network
from tauledger.network.lines import at_rest
from tauledger.network.solve import Complex, Real, log_slope, solve

# Beyond 1e15 Hz only rounding of the infinite natural frequencies is found.
HIGHEST_RAD_S = 2.0 * np.pi * 1e15
WINDOW = 1e3
# Windows must not begin where poles stand, and poles like to stand a round factor apart.
OFF_ROUND = 0.7
SAME = 1e-6
NEWTON_STEP = 1e-2
ASIDE = (1.0, 1.3, 0.8, 1.0 / 30.0, 1.0 / 300.0)
NO_SIGNAL = 1e-14
_SPREAD = 0.5 * 2.0 ** np.arange(6)
RESONANCE_OFFSETS = np.concatenate([-_SPREAD[::-1], _SPREAD])


def pole_frequencies(network: Network) -> Complex:
    """Give all finite poles in rad/s, sorted by magnitude, then by the sign of the imaginary part.

    Poles at the origin (a node without a path for direct current) are exact zeros. Lines are taken as at DC.
    Raises NetworkError where G + s·C is singular at every s.
    """
    network = at_rest(network)
    g = network.conductance.dense(network.size)
    c = network.capacitance.dense(network.size)
    lowest = _lowest(g, c)
    if lowest is None:
        return np.zeros(0, dtype=complex)
    start = lowest[0]
    return in_order(np.concatenate([np.zeros(lowest[1], dtype=complex), natural_frequencies(g, c, start)]))


def zero_frequencies(network: Network, poles: Complex) -> Complex:
    """Give all finite zeros of the transfer function in rad/s, sorted like the poles.

    They are the natural frequencies of the bordered pencil [Y −b; eᵀ 0] (output nulled, drive free). That pencil is
    defective at infinity and at the origin, where rounding scatters its values; so the zeros at the origin are counted
    by the slope of H, and elsewhere a value counts only where H really vanishes. A zero that lies a million times below
    the lowest pole counts as one at the origin. `poles` (rad/s) sets the range. Delays are left out, and
    lines taken as at DC, as in the poles; none where no signal reaches the output then.
    Raises NetworkError where the network has no unique solution.
    Source: Rosenbrock, "State-space and multivariable theory", 1970 (system matrix).
    """
    network = replace(at_rest(network), delayed=())
    finite = np.abs(poles[np.abs(poles) > 0.0])
    if not len(finite) or not passes_signal(network, 1j * finite):
        return np.zeros(0, dtype=complex)
    n = network.size
    g = np.zeros((n + 1, n + 1), dtype=complex)
    g[:n, :n] = network.conductance.dense(n)
    g[:n, n], g[n, :n] = -network.drive, network.output
    c = np.zeros_like(g)
    c[:n, :n] = network.capacitance.dense(n)
    start = OFF_ROUND * float(finite.min()) / WINDOW**2
    found = natural_frequencies(g, c, start, min(float(finite.max()) * WINDOW**2, HIGHEST_RAD_S))
    bottom = solve(network, np.array([start], dtype=complex))
    slope = float(log_slope(network, bottom)[0].real)
    # steeper than all unknowns together could make it: nothing but rounding reaches the output down there
    at_origin = (round(slope) if abs(slope) <= n else 0) + int(np.sum(poles == 0.0))
    return in_order(np.concatenate([np.zeros(max(at_origin, 0), dtype=complex), _vanishing(network, found, poles)]))


def passes_signal(network: Network, s: Complex) -> bool:
    """Whether more than rounding of the other unknowns reaches the output at any of these s (k,) in rad/s."""
    at = solve(network, s)
    return bool(np.any(np.abs(at.response) > NO_SIGNAL * np.max(np.abs(at.x), axis=1, initial=0.0)))


def _vanishing(network: Network, s: Complex, poles: Complex) -> Complex:
    """Keep the values where Newton's step on H is small, and those on a pole, which they cancel."""
    if not len(s):
        return s
    on_a_pole = np.min(np.abs(s[:, None] - poles), axis=1) <= SAME * np.abs(s)
    kept = on_a_pole.copy()
    asked = np.flatnonzero(~on_a_pole)
    if len(asked):
        at = solve(network, s[asked])
        derivative = slope_moment(network, at)
        kept[asked] = np.abs(at.response) <= NEWTON_STEP * np.abs(at.s * derivative)
    remaining: Complex = s[kept]
    return remaining


def natural_frequencies(g: Complex | Real, c: Complex | Real, start: float, stop: float = HIGHEST_RAD_S) -> Complex:
    """Give the s with det(G + s·C) = 0 and start ≤ |s| < stop, in rad/s, unordered.

    g, c: (n, n). Raises NetworkError where G + s·C is singular at every s.
    """
    found: list[Complex] = []
    low = start
    while low < stop:
        high = min(low * WINDOW * WINDOW, stop)
        # in the middle of what is asked: far beyond all poles G + σ·C leaves nothing of G but rounding
        s = shifted(g, c, float(np.sqrt(low * high)))
        found.append(s[(np.abs(s) >= low) & (np.abs(s) < high)])
        low = high
    return np.concatenate(found) if found else np.zeros(0, dtype=complex)


def shifted(g: Complex | Real, c: Complex | Real, shift: float) -> Complex:
    """Give all n values s = σ − 1/μ with μ the eigenvalues of (G + σ·C)⁻¹·C; infinite ones where μ = 0.

    Far above what holds a node, rounding can make exactly nothing of that: then a σ beside the one asked for is taken.
    Raises NetworkError where G + σ·C is singular there too.
    """
    for aside in (1.0,) if shift == 0.0 else ASIDE:
        at = shift * aside
        try:
            mu = np.linalg.eigvals(np.linalg.solve(g + at * c, c)).astype(complex)
        except np.linalg.LinAlgError:
            continue
        break
    else:
        raise NetworkError("the small-signal network has no unique solution")
    s = np.full(len(mu), complex(np.inf))
    finite = np.abs(mu) > 0.0
    s[finite] = at - 1.0 / mu[finite]
    return s


def in_order(s: Complex) -> Complex:
    """Sort by magnitude, then by the sign of the imaginary part (above the axis last), so that pairs stay together.

    LAPACK's order of a pair differs between builds and the magnitudes of a pair by rounding.
    """
    real = np.abs(s.imag) <= 1e-9 * np.abs(s)
    s = np.where(real, s.real + 0j, s)
    s = s[np.argsort(np.abs(s), kind="stable")]
    for k in range(len(s) - 1):
        if s[k].imag > 0.0 and abs(s[k + 1] - np.conj(s[k])) <= SAME * abs(s[k]):
            s[[k, k + 1]] = s[[k + 1, k]]
    return s


def _lowest(g: Real, c: Real) -> tuple[float, int] | None:
    """Give where to start (at or below the lowest pole that is not at the origin) and how many are at the origin."""
    if not np.any(c):
        return None
    if is_regular(g):
        s = np.abs(shifted(g, c, 0.0))
        finite = s[s < HIGHEST_RAD_S]
        return (float(finite.min()) * OFF_ROUND, 0) if len(finite) else None
    # G is singular: no time constant of the network is much longer than its largest part over its smallest
    conductances, capacitances = np.abs(g[g != 0.0]), np.abs(c[c != 0.0])
    shift = (float(conductances.min()) if len(conductances) else 1.0) / float(capacitances.max()) / WINDOW
    s = np.abs(shifted(g, c, shift))
    return shift / WINDOW, int(np.sum(s < shift / WINDOW))


def is_regular(g: Real | Complex) -> bool:
    """Whether a matrix (n, n) has an inverse that rounding leaves any meaning, judged with rows and columns scaled."""
    rows = np.max(np.abs(g), axis=1)
    if not np.all(rows):
        return False
    scaled = g / rows[:, None]
    columns = np.max(np.abs(scaled), axis=0)
    return bool(np.all(columns)) and bool(np.linalg.cond(scaled / columns) < 1e15)


def frequency_grid(low_hz: float, high_hz: float, per_decade: int, roots: Complex) -> Real:
    """Give frequencies in Hz, evenly spaced in the logarithm, and closer around every resonance among `roots` (rad/s).

    A pole or zero pair of high Q lies between two points of any even grid.
    """
    even = np.geomspace(low_hz, high_hz, int(np.ceil(np.log10(high_hz / low_hz) * per_decade)) + 1)
    sharp = roots[(roots.imag > 0.0) & (np.abs(roots.real) < 0.1 * np.abs(roots))]
    half_width = np.maximum(np.abs(sharp.real), 1e-6 * np.abs(sharp))
    near = (sharp.imag + half_width * RESONANCE_OFFSETS[:, None]).ravel() / (2.0 * np.pi)
    return ascending(np.concatenate([even, near[(near > low_hz) & (near < high_hz)]]))


def ascending(values: Real) -> Real:
    """Give the values (k,) in ascending order, each once.

    numpy's own function for it imports its masked arrays first, which costs a twentieth of a review.
    """
    ordered = np.sort(values)
    new = np.ones(len(ordered), dtype=bool)
    new[1:] = ordered[1:] > ordered[:-1]
    return ordered[new]
