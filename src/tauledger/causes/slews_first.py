"""At the stated amplitude a transistor runs out of current below f_H, which an AC sweep cannot show."""

from __future__ import annotations

import math

from tauledger.causes.cause import Cause
from tauledger.causes.evidence import in_hertz
from tauledger.hand.slewing import Slew
from tauledger.quantity import engineering
from tauledger.record import NamedNumber


def slews_first(slowest: Slew, *, swing_v: float, f_high_hz: float) -> Cause | None:
    """The full-power bandwidth SR/(2π·V_peak) lies below f_H. Effect: the one ÷ the other. None where it does not.

    swing_v: peak at the output, V.
    """
    full_power_hz = slowest.output_slew_v_per_s / (2.0 * math.pi * swing_v)
    if full_power_hz >= f_high_hz:
        return None
    who = f"the tail of {' and '.join(slowest.drivers)}" if len(slowest.drivers) > 1 else slowest.drivers[0]
    current, farad = engineering(slowest.current_a, "A", 3), engineering(slowest.capacitance_f, "F", 3)
    return Cause(
        cause="slews-first",
        quantity="f_H",
        effect=full_power_hz / f_high_hz - 1.0,
        where=slowest.title,
        says=f"at {swing_v:.3g} V peak {who} has too little current: {current} into {farad} at {slowest.title} "
        f"follows up to {in_hertz(full_power_hz)}, below f_H, which holds for small signals alone",
        instead=f"take {in_hertz(full_power_hz)} as the bandwidth at this amplitude, or give the stage more current",
        numbers=(
            NamedNumber("amplitude at the output", swing_v, "V"),
            NamedNumber("current", slowest.current_a, "A"),
            NamedNumber("capacitance", slowest.capacitance_f, "F"),
            NamedNumber("slew rate at the output", slowest.output_slew_v_per_s, "V/s"),
            NamedNumber("full-power bandwidth", full_power_hz, "Hz"),
        ),
    )
