"""The fit of an instance whose transport current is delayed: G + s·C, and one current that is none of both.

Excess phase multiplies (gm + g_o) by e^(−s·τ), between nodes behind the terminals that only the measurement tells
about. The current that the delay adds, J = (gm + g_o)·(e^(−jω·τ) − 1)·v(b'e'), is known: gm and g_o have readings, and
v(b'e') was recorded. So J is one more column beside terminals and states in the equations of `fit.py`, without a row.
In the matrices it is the voltage of a state of its own, which a delayed transconductance makes of another state,
v(b'e').
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from tauledger.devices.family import inner_node
from tauledger.devices.fit import (
    ACCEPTED,
    AT_REST,
    HIGH_HZ,
    ROUNDING,
    STATE_SIEMENS,
    Complex,
    Fit,
    Real,
    least_squares,
    refused,
    scaled,
    states,
)
from tauledger.devices.parts import Part, delayed_transconductance, transconductance
from tauledger.solution import Samples


class Delay(Struct, frozen=True):
    """The current that is delayed: gm + g_o in S, the delay in s, and its control v(b'e') per volt on each terminal,
    V/V (n_freq, n_terminals)."""

    siemens: float
    delay_s: float
    control: Complex

    def factor(self, frequency_hz: Real) -> Complex:
        """What the delay adds to the current, S (n_freq,)."""
        return np.asarray(self.siemens * (np.exp(-2j * np.pi * frequency_hz * self.delay_s) - 1.0))


def fit_delayed(samples: Samples, delay: Delay) -> Fit:
    """Fit as `fit` does, with the delay beside the matrices; the last two states are J and v(b'e').

    Raises ElementError where no such matrices describe it.
    """
    worst = np.inf
    for floor in AT_REST:
        found = _checked(samples, delay, states(samples, floor))
        if found.error <= ACCEPTED:
            return found
        worst = min(worst, found.error)
    raise refused(samples.element, worst)


def delay_parts(owner: str, fit: Fit, delay: Delay) -> tuple[Part, ...]:
    """Give what makes J of v(b'e'), at the nodes that `with_remainder` gives the last two states."""
    j, u = (inner_node(owner, str(k)) for k in (fit.states - 1, fit.states))
    siemens = STATE_SIEMENS * delay.siemens
    return (
        delayed_transconductance(owner, (j, "0"), (u, "0"), -siemens, delay.delay_s, "delay"),
        transconductance(owner, (j, "0"), (u, "0"), siemens, "delay_0"),
    )


def _checked(samples: Samples, delay: Delay, z: Complex) -> Fit:
    """Fit, and compare with every frequency; a second fit that leaves out every second frequency with those."""
    y, frequency = samples.admittance, samples.frequency_hz
    every, half = np.arange(len(frequency)), np.arange(0, len(frequency), 2)
    size = np.abs(y).max(axis=(1, 2))
    size = np.maximum(size, ROUNDING * size.max()).clip(min=np.finfo(float).tiny)
    error = 0.0
    for at, compared in ((half, every[1::2]), (every, every)):
        whole = _fit(frequency[at], y[at], z[at], delay.factor(frequency[at])[:, None] * delay.control[at], delay, at)
        found = _admittance(whole, delay, frequency[compared])
        error = max(error, float((np.abs(found - y[compared]).max(axis=(1, 2)) / size[compared]).max()))
    return Fit(whole.terminals, whole.conductance, whole.capacitance, error)


def _fit(frequency_hz: Real, y: Complex, z: Complex, current: Complex, delay: Delay, at: np.ndarray) -> Fit:
    n, k = y.shape[1], z.shape[1]
    omega = 2.0 * np.pi * frequency_hz
    terminals = np.broadcast_to(np.eye(n, dtype=complex), (len(y), n, n))
    x = np.concatenate([terminals, z], axis=1).transpose(0, 2, 1)
    equations = np.concatenate([x, current[:, :, None], 1j * omega[:, None, None] * x], axis=2)
    rows = [least_squares(equations, y[:, i, :]) for i in range(n)]
    if k:
        weighted, scale = scaled(equations, 1.0 / (1.0 + frequency_hz / HIGH_HZ))
        _, _, vt = np.linalg.svd(weighted, full_matrices=False)
        rows += list(vt[-k:] / scale)
    both = np.array(rows)
    size = n + k + 2
    g, c = np.zeros((size, size)), np.zeros((size, size))
    g[: n + k, : n + k + 1], c[: n + k, : n + k] = both[:, : n + k + 1], both[:, n + k + 1 :]
    g[n + k, n + k] = STATE_SIEMENS
    flat = x.reshape(-1, n + k)
    told = delay.control[at].reshape(-1)
    g[-1, : n + k] = -STATE_SIEMENS * np.linalg.lstsq(_parts(flat), _parts(told), rcond=None)[0]
    g[-1, -1] = STATE_SIEMENS
    if k:
        own = slice(n, n + k)
        mix = STATE_SIEMENS * np.linalg.inv(g[own, own])
        g[own], c[own] = mix @ g[own], mix @ c[own]
        rows_in, columns_in = np.eye(size), np.eye(size)
        rows_in[:n, own] = -g[:n, own] / STATE_SIEMENS
        columns_in[own, :n] = -g[own, :n] / STATE_SIEMENS
        g, c = rows_in @ g @ columns_in, rows_in @ c @ columns_in
        g[:n, own], g[own, :n], g[own, own] = 0.0, 0.0, STATE_SIEMENS * np.eye(k)
    return Fit(n, g, c, 0.0)


def _parts(array: Complex) -> Real:
    return np.concatenate([array.real, array.imag])


def _admittance(fit: Fit, delay: Delay, frequency_hz: Real) -> Complex:
    """Give Y at the terminals with the delay in place, S (n_freq, n_terminals, n_terminals)."""
    n = fit.terminals
    y = fit.conductance + 2j * np.pi * frequency_hz[:, None, None] * fit.capacitance
    y[:, -2, -1] -= STATE_SIEMENS * delay.factor(frequency_hz)
    return np.asarray(y[:, :n, :n] - y[:, :n, n:] @ np.linalg.solve(y[:, n:, n:], y[:, n:, :n]))
