"""From paper to simulation: methods and steps, causes and notes, the designer's own figures, what would help."""

from __future__ import annotations

from msgspec import Struct


class Estimate(Struct, frozen=True):
    """One method's answer for one edge ("f_high" or "f_low")."""

    edge: str
    method: str
    hz: float | None
    difference: float | None
    recommended: bool = False


class NoMethod(Struct, frozen=True):
    """Why no method by hand is recommended for one edge ("f_high" or "f_low")."""

    edge: str
    why: str


class Step(Struct, frozen=True):
    """One step from paper to simulation: the estimate after it, the factor by which it moved, and why."""

    edge: str
    step: str
    hz: float | None
    factor: float | None
    why: str


class NamedNumber(Struct, frozen=True):
    """A number with its name and unit."""

    name: str
    value: float
    unit: str


class CauseFacts(Struct, frozen=True):
    """Why hand and simulation differ. cause: fixed id. effect: fraction by which it moves `quantity`. says,
    instead: sentences. on_paper: holds for paper that leaves out what the hand side here has."""

    cause: str
    quantity: str
    effect: float
    where: str
    says: str
    instead: str
    numbers: tuple[NamedNumber, ...]
    on_paper: bool = False


class NoteFacts(Struct, frozen=True):
    """What the reader must know about the numbers. note: fixed id."""

    note: str
    where: str
    says: str


class PaperFigure(Struct, frozen=True):
    """One figure of the designer's own page beside hand and exact.

    where: node or device as the page names it, empty for the whole circuit. key: as on the page. line: where it stands.
    hand: None where paper reads it from the operating point. exact: of an edge the simulated value where there is one.
    off: yours/exact − 1, of gains by size. slip: id of the slip that reproduces it within 1 %, empty where it agrees or
    none does; slip_gives: what that slip gives. says: the verdict in words.
    """

    where: str
    key: str
    title: str
    unit: str
    line: int
    yours: float
    hand: float | None
    exact: float | None
    off: float | None
    slip: str
    slip_gives: float | None
    says: str


class Help(Struct, frozen=True):
    """What 10 % less of one element does, to first order: f_high, f_low and gain as fractions of f_H, f_L and |H_mid|.

    name: part, "RC", "CL", "Q1.gm", "Q1.c_mu"; a resistor by its resistance, value in `unit`. free: a card of the board
    that leaves the operating point alone. moves_bias: it takes part in the operating point, which is held here.
    *_rerun*: computed again with 10 % less, the operating point held; None where that was not done or there is no edge.
    """

    name: str
    owner: str
    nodes: tuple[str, ...]
    value: float
    unit: str
    free: bool
    moves_bias: bool
    f_high: float | None
    f_low: float | None
    gain: float
    f_high_rerun_hz: float | None = None
    f_low_rerun_hz: float | None = None
    gain_rerun: float | None = None
