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
    STATE_SIEMENS,
    Complex,
    Fit,
    Index,
    Real,
    at_terminals,
    first_accepted,
    fitted_rows,
    rest_apart,
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
    return first_accepted(
        samples,
        lambda z, at: _fit(samples, delay, z, at),
        lambda found, frequency_hz: _admittance(found, delay, frequency_hz),
    )


def delay_parts(owner: str, fit: Fit, delay: Delay) -> tuple[Part, ...]:
    """Give what makes J of v(b'e'), at the nodes that `with_remainder` gives the last two states."""
    j, u = (inner_node(owner, str(k)) for k in (fit.states - 1, fit.states))
    siemens = STATE_SIEMENS * delay.siemens
    return (
        delayed_transconductance(owner, (j, "0"), (u, "0"), -siemens, delay.delay_s, "delay"),
        transconductance(owner, (j, "0"), (u, "0"), siemens, "delay_0"),
    )


def _fit(samples: Samples, delay: Delay, states: Complex, at: Index) -> Fit:
    frequency_hz, y, z = samples.frequency_hz[at], samples.admittance[at], states[at]
    n, k = y.shape[1], z.shape[1]
    omega = 2.0 * np.pi * frequency_hz
    terminals = np.broadcast_to(np.eye(n, dtype=complex), (len(y), n, n))
    x = np.concatenate([terminals, z], axis=1).transpose(0, 2, 1)
    current = delay.factor(frequency_hz)[:, None] * delay.control[at]
    equations = np.concatenate([x, current[:, :, None], 1j * omega[:, None, None] * x], axis=2)
    both = fitted_rows(equations, frequency_hz, y, k)
    size = n + k + 2
    g, c = np.zeros((size, size)), np.zeros((size, size))
    g[: n + k, : n + k + 1], c[: n + k, : n + k] = both[:, : n + k + 1], both[:, n + k + 1 :]
    g[-2, -2] = STATE_SIEMENS
    told, by = _real(delay.control[at].reshape(-1)), _real(x.reshape(-1, n + k))
    g[-1, : n + k] = -STATE_SIEMENS * np.linalg.lstsq(by, told, rcond=None)[0]
    g[-1, -1] = STATE_SIEMENS
    return Fit(n, *rest_apart(g, c, slice(n, n + k)), 0.0)


def _real(array: Complex) -> Real:
    """Give the real parts and, behind them, the imaginary ones."""
    return np.concatenate([array.real, array.imag])


def _admittance(fit: Fit, delay: Delay, frequency_hz: Real) -> Complex:
    """Give Y at the terminals with the delay in place, S (n_freq, n_terminals, n_terminals)."""
    y = fit.conductance + 2j * np.pi * frequency_hz[:, None, None] * fit.capacitance
    y[:, -2, -1] -= STATE_SIEMENS * delay.factor(frequency_hz)
    return at_terminals(y, fit.terminals)
