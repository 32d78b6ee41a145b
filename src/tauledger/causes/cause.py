"""What a cause and a note are, and how they are written into the review."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

from tauledger.record import CauseFacts, NamedNumber, NoteFacts

Quantity = Literal["f_H", "f_L"]


class Cause(Struct, frozen=True):
    """One reason why hand and simulation differ.

    cause: fixed id. quantity: which band edge. effect: fraction by which it moves that edge, as the cause defines it.
    where: node, capacitor or pole. says: what happens, one sentence. instead: what to do on paper instead.
    numbers: what the sentence rests on. on_paper: holds for paper that leaves something out which the hand side here
    has; told after the others.
    """

    cause: str
    quantity: Quantity
    effect: float
    where: str
    says: str
    instead: str
    numbers: tuple[NamedNumber, ...] = ()
    on_paper: bool = False


class Note(Struct, frozen=True):
    """What the reader must know about the numbers. note: fixed id. where: part, device or edge, empty for the whole."""

    note: str
    where: str
    says: str


def cause_facts(cause: Cause) -> CauseFacts:
    """Give the cause as the review carries it."""
    return CauseFacts(
        cause.cause,
        cause.quantity,
        cause.effect,
        cause.where,
        cause.says,
        cause.instead,
        cause.numbers,
        cause.on_paper,
    )


def note_facts(note: Note) -> NoteFacts:
    """Give the note as the review carries it."""
    return NoteFacts(note.note, note.where, note.says)
