"""The elements of a circuit as a reader names them, and which effects of them are worth a row."""

from __future__ import annotations

from msgspec import Struct

from tauledger.compose.helps import LESS, UNITS, all_elements, is_card, moves_bias
from tauledger.numbers import Numbers

# Changes by 10 % of an element, or by 1 pF: below these nobody looks.
WORTH_A_FRACTION = 5e-3
WORTH_DEGREES = 0.1
# A degree ranks like a per cent.
DEGREE = 0.01
# So many rows, the largest, are computed again as proof of the first-order effects.
PROVED = 2


class Element(Struct, frozen=True):
    """One element by its part's name; a resistor by its resistance.

    sign: −1 where more of the element is less of the part's value (a resistance beside a conductance), else 1.
    free: a card that leaves the operating point alone. moves_bias: it takes part in the operating point.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    sign: float
    free: bool
    moves_bias: bool

    @property
    def ten_percent_less(self) -> float:
        """Factor on the part's value that is 10 % less of the element."""
        return float((1.0 - LESS) ** self.sign)


def worth_a_row(fraction: float, degrees: float) -> bool:
    """Whether a change, of gain or f_u as a fraction and of phase or margin in degrees, is large enough to be told."""
    return abs(fraction) >= WORTH_A_FRACTION or abs(degrees) >= WORTH_DEGREES


def size(fraction: float, degrees: float) -> float:
    """Rank a change, of gain or f_u as a fraction and of phase or margin in degrees, on one scale."""
    return max(abs(fraction), DEGREE * abs(degrees))


def elements(numbers: Numbers) -> tuple[Element, ...]:
    """Give the elements of the network in its order."""
    found = []
    for part in all_elements(numbers.network):
        resistor, bias = part.kind == "conductance", moves_bias(part, numbers)
        found.append(
            Element(
                name=part.name,
                owner=part.owner,
                nodes=part.nodes,
                value=float(1.0 / part.value if resistor else part.value),
                unit=UNITS.get(part.kind, "S"),
                sign=-1.0 if resistor else 1.0,
                free=is_card(part) and not bias,
                moves_bias=bias,
            )
        )
    return tuple(found)
