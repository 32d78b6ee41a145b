"""Looking through a transformer: what lies beyond counts by the square of the turns ratio.

Source: Terman, "Radio Engineers' Handbook", 1943, section 2 (from memory); common practice.
"""

from __future__ import annotations

import math

from tauledger.hand.elements import Transformer

FORMULA = "n²·R into the winding of n turns per turn of the other, R/n² into the other"
VALID = "k near 1; one end of each winding at AC ground; between the edges of L_m and leakage"
SOURCE = "Terman, Radio Engineers' Handbook, 1943, section 2 (from memory)"


def through_transformer_ohm(transformer: Transformer, into: str, beyond_ohm: float) -> float:
    """Give the resistance in ohm into the winding at hand node `into`, R = beyond_ohm standing at the other: n²·R."""
    n = transformer.turns_into(into)
    return math.inf if math.isinf(beyond_ohm) else n * n * beyond_ohm
