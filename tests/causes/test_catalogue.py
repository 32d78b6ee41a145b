"""What all causes have in common."""

from __future__ import annotations

import pytest
from msgspec.structs import fields

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import CAUSES, NOTES, WORTH_TELLING, find_causes, find_notes
from tauledger.causes.cause import cause_facts, note_facts

ALL = [*boards.UPPER, *boards.LOWER, boards.emitter_follower, boards.gain_of_two, boards.tuned_load]


@pytest.mark.parametrize("board", ALL, ids=lambda board: board.__name__)
def test_causes_are_worth_telling_and_the_largest_comes_first(board: boards.Board) -> None:
    found = find_causes(evidence(board()))
    for on_paper in (False, True):
        effects = [abs(cause.effect) for cause in found if cause.on_paper == on_paper]
        assert effects == sorted(effects, reverse=True)
    assert all(abs(cause.effect) >= WORTH_TELLING for cause in found)
    for cause in found:
        assert cause.says
        assert cause.instead
        assert cause.where
        assert cause.numbers
        assert not any(word in cause.says + cause.instead for word in (".c_", "'", "None", "nan", "inf "))


def test_a_network_whose_paper_agrees_has_nothing_of_note() -> None:
    """Sedra and Smith, common-source example (from memory): 382 kHz by Miller, 380 kHz exact."""
    assert find_causes(evidence(boards.common_source_100k())) == ()


def test_every_disagreement_of_5_per_cent_has_a_cause() -> None:
    for board in boards.UPPER:
        found = evidence(board())
        lowest = found.upper.steps[0].hz
        assert lowest is not None
        assert found.upper.hz is not None
        if abs(lowest / found.upper.hz - 1) > 0.05:
            assert [cause for cause in find_causes(found) if cause.quantity == "f_H"], board.__name__


def test_no_cause_is_told_twice() -> None:
    for board in ALL:
        told = [(cause.cause, cause.quantity) for cause in find_causes(evidence(board()))]
        assert len(told) == len(set(told))


def test_causes_and_notes_are_written_into_the_review_field_for_field() -> None:
    found = evidence(boards.weak_stage_with_large_bridge())
    cause = find_causes(found)[0]
    facts = cause_facts(cause)
    assert {field.name for field in fields(facts)} == {field.name for field in fields(cause)}
    assert all(getattr(facts, field.name) == getattr(cause, field.name) for field in fields(cause))
    note = find_notes(evidence(boards.emitter_follower()))[0]
    assert all(getattr(note_facts(note), field.name) == getattr(note, field.name) for field in fields(note))


def test_the_catalogue_lists_each_once() -> None:
    assert len(set(CAUSES)) == len(CAUSES)
    assert len(set(NOTES)) == len(NOTES)
    assert all(look.__doc__ for look in (*CAUSES, *NOTES))
