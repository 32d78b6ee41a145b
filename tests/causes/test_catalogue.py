"""What all causes have in common."""

from __future__ import annotations

import pytest
from msgspec.structs import fields

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import CAUSES, NOTES, OF_ANOTHER_METHOD, WORTH_TELLING, find_causes, find_notes
from tauledger.causes.cause import cause_facts, note_facts

ALL = [*boards.UPPER, *boards.LOWER, boards.emitter_follower, boards.gain_of_two, boards.tuned_load]


@pytest.mark.parametrize("board", ALL, ids=lambda board: board.__name__)
def test_causes_are_worth_telling_and_the_largest_comes_first(board: boards.Board) -> None:
    found = find_causes(evidence(board()))
    groups = [(cause.on_paper, cause.cause in OF_ANOTHER_METHOD) for cause in found]
    assert groups == sorted(groups)
    for group in set(groups):
        effects = [abs(cause.effect) for cause, its in zip(found, groups, strict=True) if its == group]
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


def test_what_the_printed_hand_figure_leaves_out_comes_before_why_another_method_misses() -> None:
    """Three low edges: the highest alone is 24 % low, the sum 14 % high; the page prints the highest alone."""
    told = [cause.cause for cause in find_causes(evidence(boards.three_low_edges()))]
    assert told.index("other-capacitors-left-out") < told.index("no-dominant-pole")


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
