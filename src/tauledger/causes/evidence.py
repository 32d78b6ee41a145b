"""Everything that a cause or a note may look at, frozen, and the few questions that several of them ask."""

from __future__ import annotations

import math
from collections.abc import Mapping

from msgspec import Struct

from tauledger.causes.cause import Quantity
from tauledger.devices.family import Device
from tauledger.devices.parts import Part
from tauledger.hand.combine import Combined
from tauledger.hand.estimate import Edge as EdgeName
from tauledger.hand.estimate import InductorRow, LowerRow, MethodEstimate, SignalNode, StepEstimate
from tauledger.hand.halves import counted
from tauledger.network.bands import Bands
from tauledger.network.edges import Edge
from tauledger.network.solve import Complex
from tauledger.quantity import engineering

DIFFERS = 0.02
GREEK = {"pi": "π", "mu": "μ"}


class EdgeEvidence(Struct, frozen=True):
    """One band edge.

    hz: exact, None where there is none. slope: d ln|H| / d ln f there. combined, steps: None and empty where the hand
    side is withheld. found: the same edge with what lies around it, None where nothing happens on that side.
    shares: −∂ln f/∂ln C by part name. recommended: the method that suits the edge, None where no method does.
    at_rest_hz: the edge with every line as at DC; None without lines.
    """

    edge: EdgeName
    hz: float | None
    slope: float | None
    combined: Combined | None
    steps: tuple[StepEstimate, ...]
    found: Edge | None = None
    shares: Mapping[str, float] = {}
    recommended: MethodEstimate | None = None
    at_rest_hz: float | None = None

    @property
    def quantity(self) -> Quantity:
        """The edge as the trade writes it."""
        return "f_H" if self.edge == "f_high" else "f_L"


class Evidence(Struct, frozen=True):
    """One reviewed network.

    poles, zeros: of the full network in rad/s (n,), (m,). devices: empty where the network was not read from a netlist.
    images: the node of the other half by that of the first, where a balanced circuit is worked as half circuits.
    stepped: the engine found the operating point only by stepping. lines: the network's lines, which `bands` takes
    as at DC; followed_to_hz: how far the scan follows their ripple; ten_percent_less: f_H in Hz with one part
    at a time 10 % smaller, by part name, given with lines alone.
    """

    bands: Bands
    poles: Complex
    zeros: Complex
    devices: tuple[Device, ...]
    nodes: tuple[SignalNode, ...]
    capacitors: tuple[LowerRow, ...]
    upper: EdgeEvidence
    lower: EdgeEvidence
    stepped: bool = False
    images: Mapping[str, str] = {}
    lines: tuple[Part, ...] = ()
    followed_to_hz: float | None = None
    ten_percent_less: Mapping[str, float | None] = {}
    inductors: tuple[InductorRow, ...] = ()


def move(edge: EdgeEvidence, later: str, earlier: str) -> float | None:
    """Give by which fraction the estimate moved from step `earlier` to step `later`; None where one is missing."""
    hz = {step.step: step.hz for step in edge.steps}
    after, before = hz.get(later), hz.get(earlier)
    return after / before - 1.0 if after is not None and before is not None else None


def hand_differs(evidence: Evidence) -> bool:
    """Say whether the lowest node alone and the exact f_H differ by more than 2 %: else there is nothing to explain."""
    hz, combined = evidence.upper.hz, evidence.upper.combined
    if hz is None or combined is None or combined.lowest is None:
        return False
    return abs(combined.lowest / hz - 1.0) > DIFFERS


def interaction_step(edge: EdgeEvidence) -> str:
    """Name the step at which the capacitances act on each other: all-poles where two coefficients tell nothing."""
    named = {step.step for step in edge.steps}
    return "two-coefficients" if "two-coefficients" in named else "all-poles"


def rows_that_count(nodes: tuple[SignalNode, ...]) -> list[SignalNode]:
    """Give the signal nodes that count with a positive time constant (of mirror images one), the longest first."""
    return [row for row in counted(nodes).rows if row.time_constant_s > 0]


def rows_of_the_edge(evidence: Evidence) -> list[SignalNode | InductorRow]:
    """Give the nodes and inductors that count in the upper edge with a positive time constant, the longest first."""
    rows: list[SignalNode | InductorRow] = [
        *rows_that_count(evidence.nodes),
        *(row for row in evidence.inductors if row.in_path),
    ]
    return sorted(rows, key=lambda row: -row.time_constant_s)


def outward(edge: EdgeEvidence) -> list[complex]:
    """Give the visible poles (of a pair the one above the axis) from mid-band outwards, rad/s."""
    if edge.combined is None:
        return []
    poles = [complex(pole) for pole in edge.combined.roots.poles if pole.imag >= 0 and pole != 0]
    return poles if edge.edge == "f_high" else poles[::-1]


def nearest_zero(edge: EdgeEvidence) -> complex | None:
    """Give the visible zero nearest mid-band (of a pair the one above the axis), rad/s; None without one off DC."""
    if edge.combined is None:
        return None
    zeros = [complex(zero) for zero in edge.combined.roots.zeros if zero.imag >= 0 and zero != 0]
    choose = min if edge.edge == "f_high" else max
    return choose(zeros, key=abs, default=None)


def in_words(part: Part) -> str:
    """Name a part as the trade does: "CL" for a card, "C_μ of Q1" inside a device."""
    if not part.label:
        return part.owner
    if part.kind == "line":
        return f"{'C in R·C' if part.label == 'rc' else part.label} of {part.owner}"
    head, _, tail = part.label.partition("_")
    return f"{head.upper()}{'_' if tail else ''}{GREEK.get(tail, tail)} of {part.owner}"


def hertz(omega: complex) -> float:
    """Give |s|/2π in Hz."""
    return abs(omega) / (2 * math.pi)


def in_hertz(hz: float) -> str:
    """Write a frequency with three digits."""
    return engineering(hz, "Hz", 3)


def in_seconds(seconds: float) -> str:
    """Write a time constant with three digits."""
    return engineering(seconds, "s", 3)
