"""From one instance measured alone to its matrices: G + s·C over its terminals and as many inner states as it has.

Every terminal was driven in turn and the inner nodes' voltages recorded. What the inner nodes do beyond their rest at
the lowest frequency spans a few states z only (nodes that always move together are one state, and so no pole is made
up). In x = (terminal voltages, z) every row is a real relation (g + jω·c)·x = i at all frequencies: least squares give
the rows of the terminals, i being their currents, and the null space gives those of the states, i = 0. Without inner
states G and C are the real and the imaginary part of Y itself.

Rows of states are known up to a mixing among each other, and into the rows of the terminals: response and poles are
right, single entries mean nothing. The mixing taken is the one in which the states rest at s = 0: G has no entries
between terminals and states, so that the terminals' own G₀ and C₀ are Y = G₀ + s·C₀ + … and the states add only what
comes after, with time constants of their own.

Sources: Golub and Van Loan, "Matrix computations", 4th ed., 2013, sections 5.3 and 2.4 (least squares, singular
values); Ho and Kalman, "Effective construction of linear state-variable models from input/output functions",
Regelungstechnik 14, 1966 (the rank of the data is the number of states).
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
from msgspec import Struct
from msgspec.structs import replace
from numpy.typing import NDArray

from tauledger.errors import ElementError
from tauledger.solution import Samples

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]
Index = NDArray[np.intp]

# An inner node that moves less than this many volt per volt is at rest. Some models have nodes that stand for charges
# or currents and move by 1e-13; they are looked at only where the fit does not do without.
AT_REST = (1e-9, 1e-14, 1e-19)
# What nodes that move together differ by is rounding of the engine's answer: a singular value this small is no state.
SAME_STATE = 1e-9
# Rows of states beyond this are weighted down: there ω·C alone is left of them.
HIGH_HZ = 1e10
# Scale of the states' own rows, of no effect at the terminals; that of a board keeps the matrices well scaled.
STATE_SIEMENS = 1e-3
# Error against the frequencies that the check leaves out, relative to the largest entry of Y there.
ACCEPTED = 1e-8
ROUNDING = 1e-6

START_HZ, STOP_HZ, PER_DECADE = 1.0, 1e12, 6


class Fit(Struct, frozen=True):
    """G and C of one instance, (n, n), n = terminals and then states; error: what the check found.

    error: largest |ΔY| / largest |Y| at one frequency, of this fit and of one that leaves out every second frequency.
    """

    terminals: int
    conductance: Real
    capacitance: Real
    error: float

    @property
    def states(self) -> int:
        """How many inner states there are."""
        return len(self.conductance) - self.terminals

    def admittance(self, frequency_hz: Real) -> Complex:
        """Give Y at the terminals at every frequency (k,) in Hz, (k, n_terminals, n_terminals), S."""
        y = self.conductance + 2j * np.pi * np.asarray(frequency_hz)[:, None, None] * self.capacitance
        return at_terminals(y, self.terminals)

    def at_rest(self) -> tuple[Real, Real]:
        """Give the terminals' Y = G₀ + s·C₀ + … near s = 0: G₀ in S and C₀ in F, (n_terminals, n_terminals)."""
        n = self.terminals
        return self.conductance[:n, :n], self.capacitance[:n, :n]


def at_terminals(y: Complex, n_terminals: int) -> Complex:
    """Give Y at the terminals alone, S (k, n_terminals, n_terminals), of Y over terminals and states, (k, n, n)."""
    n = n_terminals
    return np.asarray(y[:, :n, :n] - y[:, :n, n:] @ np.linalg.solve(y[:, n:, n:], y[:, n:, :n]), dtype=np.complex128)


def frequencies() -> tuple[float, ...]:
    """Give the frequencies in Hz at which an instance is measured for a fit."""
    count = round(PER_DECADE * np.log10(STOP_HZ / START_HZ)) + 1
    return tuple(float(START_HZ * 10.0 ** (k / PER_DECADE)) for k in range(count))


def fit(samples: Samples) -> Fit:
    """Fit G + s·C to what one instance answered, and check it at the frequencies that a second fit leaves out.

    Raises ElementError where no such matrices describe it: delays, noise, or lines inside.
    """
    y, frequency = samples.admittance, samples.frequency_hz
    return first_accepted(samples, lambda z, at: _fit(frequency[at], y[at], z[at]), Fit.admittance)


def first_accepted(
    samples: Samples, attempt: Callable[[Complex, Index], Fit], answer: Callable[[Fit, Real], Complex]
) -> Fit:
    """Give the first fit whose check is passed, states that move less and less taken into it.

    attempt: fits the states (n_freq, n_states, n_terminals) at some of the frequencies, by place. answer: Y of a fit at
    frequencies (k,) in Hz, S (k, n_terminals, n_terminals).
    Raises ElementError where none is passed.
    """
    worst = np.inf
    for floor in AT_REST:
        found = _checked(samples, partial(attempt, states(samples, floor)), answer)
        if found.error <= ACCEPTED:
            return found
        worst = min(worst, found.error)
    raise ElementError(
        samples.element,
        f"the small-signal behaviour of {samples.element} could not be fitted within {ACCEPTED:.0e} (error "
        f"{worst:.1e}): no conductances and capacitances describe what ngspice says of it",
        "leave out what in its model is a delay or depends on the frequency, or use a simpler level",
    )


def _checked(samples: Samples, attempt: Callable[[Index], Fit], answer: Callable[[Fit, Real], Complex]) -> Fit:
    """Fit, and compare with every frequency; a second fit that leaves out every second frequency with those."""
    y, frequency = samples.admittance, samples.frequency_hz
    every = np.arange(len(frequency))
    whole, checked = attempt(every), attempt(every[::2])
    size = np.abs(y).max(axis=(1, 2))
    # a transistor that is off has 1e-12 S behind 1 S: below a millionth of the largest Y ngspice's own rounding is seen
    size = np.maximum(size, ROUNDING * size.max()).clip(min=np.finfo(float).tiny)
    errors = [
        np.abs(answer(tried, frequency[at]) - y[at]).max(axis=(1, 2)) / size[at]
        for tried, at in ((checked, every[1::2]), (whole, every))
    ]
    return replace(whole, error=float(max(error.max() for error in errors)))


def states(samples: Samples, at_rest: float = AT_REST[0]) -> Complex:
    """Give the inner states that the instance has, from the moves of its inner nodes: (n_freq, n_states, n_terminals).

    at_rest: nodes that move less than this, V/V, are none. Zero at the lowest frequency, each scaled to about 1.
    """
    v = samples.inner_gain
    moves = v - v[:1].real
    reach = np.abs(moves).max(axis=(0, 2)) if v.shape[1] else np.zeros(0)
    moving = reach > at_rest
    if not np.any(moving):
        return np.zeros((len(v), 0, v.shape[2]), dtype=complex)
    scaled = moves[:, moving] / reach[moving, None]
    flat = scaled.transpose(1, 0, 2).reshape(scaled.shape[1], -1)
    u, size, _ = np.linalg.svd(np.concatenate([flat.real, flat.imag], axis=1), full_matrices=False)
    kept = size > SAME_STATE * size[0]
    z = np.einsum("ks,fkt->fst", u[:, kept], scaled)
    return np.asarray(z / np.abs(z).max(axis=(0, 2))[:, None], dtype=np.complex128)


def _fit(frequency_hz: Real, y: Complex, z: Complex) -> Fit:
    n, k = y.shape[1], z.shape[1]
    omega = 2.0 * np.pi * frequency_hz
    terminals = np.broadcast_to(np.eye(n, dtype=complex), (len(y), n, n))
    # one equation per frequency and driven terminal, (n_freq, n_terminals, n + k)
    x = np.concatenate([terminals, z], axis=1).transpose(0, 2, 1)
    equations = np.concatenate([x, 1j * omega[:, None, None] * x], axis=2)
    both = fitted_rows(equations, frequency_hz, y, k)
    g, c = rest_apart(both[:, : n + k], both[:, n + k :], slice(n, n + k))
    return Fit(n, g, c, 0.0)


def fitted_rows(equations: Complex, frequency_hz: Real, y: Complex, n_states: int) -> Real:
    """Give the rows (n_terminals + n_states, m) of all relations that hold at every frequency (n_freq,) in Hz.

    equations: (n_freq, n_terminals, m), for each driven terminal what the m columns are multiplied by. y: currents of
    the terminals, S (n_freq, n_terminals, n_terminals), right sides of the first rows; those of the states are 0.
    """
    rows = [_least_squares(equations, y[:, i, :]) for i in range(y.shape[1])]
    if n_states:
        weighted, scale = _scaled(equations, 1.0 / (1.0 + frequency_hz / HIGH_HZ))
        _, _, vt = np.linalg.svd(weighted, full_matrices=False)
        rows += list(vt[-n_states:] / scale)
    return np.array(rows)


def rest_apart(g: Real, c: Real, own: slice) -> tuple[Real, Real]:
    """Mix the rows and columns `own` of the states so that G has no entries between them and the terminals before."""
    n, k = own.start, own.stop - own.start
    if not k:
        return g, c
    g, c = g.copy(), c.copy()
    mix = STATE_SIEMENS * np.linalg.inv(g[own, own])
    g[own], c[own] = mix @ g[own], mix @ c[own]
    rows_in, columns_in = np.eye(len(g)), np.eye(len(g))
    rows_in[:n, own] = -g[:n, own] / STATE_SIEMENS
    columns_in[own, :n] = -g[own, :n] / STATE_SIEMENS
    g, c = rows_in @ g @ columns_in, rows_in @ c @ columns_in
    g[:n, own], g[own, :n], g[own, own] = 0.0, 0.0, STATE_SIEMENS * np.eye(k)
    return g, c


def _least_squares(equations: Complex, current: Complex) -> Real:
    """Give (g, c) of one terminal's row; every frequency counts alike, relative to its own largest current."""
    weight = 1.0 / np.abs(current).max(axis=1).clip(min=1e-30)
    weighted, scale = _scaled(equations, weight)
    right = (current * weight[:, None]).reshape(-1)
    found = np.linalg.lstsq(weighted, np.concatenate([right.real, right.imag]), rcond=1e-15)[0]
    return np.asarray(found / scale, dtype=float)


def _scaled(equations: Complex, weight: Real) -> tuple[Real, Real]:
    """Give the equations weighted, real parts above imaginary ones, with columns of norm 1, and those norms."""
    flat = (equations * weight[:, None, None]).reshape(-1, equations.shape[2])
    real = np.concatenate([flat.real, flat.imag])
    scale = np.linalg.norm(real, axis=0)
    scale[scale == 0.0] = 1.0
    return real / scale, scale
