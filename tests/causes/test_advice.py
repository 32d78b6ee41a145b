"""What to do instead of a figure."""

from __future__ import annotations

import re

import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence
from tauledger.causes.advice import advice, miss, nearer
from tauledger.causes.evidence import in_hertz

BOARDS = [*boards.UPPER, *boards.LOWER, boards.gain_of_two]


@pytest.mark.parametrize("board", BOARDS, ids=lambda board: board.__name__)
def test_what_is_advised_comes_nearer_than_the_figure_criticised(board: boards.Board) -> None:
    found = evidence(board())
    for edge in (found.upper, found.lower):
        combined = edge.combined
        if combined is None or edge.hz is None:
            continue
        ways = (combined.sum_of_constants, combined.all_nodes, combined.two_coefficients, combined.all_poles)
        squares = (combined.with_zeros, combined.root_sum_of_squares)
        named = {in_hertz(hz): hz for hz in (*ways, *squares) if hz is not None}
        for criticised in (combined.lowest, combined.sum_of_constants, combined.exact_constants):
            if criticised is None:
                continue
            figures = re.findall(r"[\d.]+ [kMG]?Hz$", advice(edge, criticised))
            assert all(nearer(edge, named[figure], criticised) for figure in figures)


def test_the_recommended_way_goes_first_and_else_none_that_misses_by_more_than_10_per_cent() -> None:
    """Follower with a load, complex poles: the sum of time constants, nearer than the lowest node, is no advice."""
    edge = evidence(boards.source_follower_with_load()).upper
    assert edge.combined is not None
    assert edge.combined.lowest is not None
    for known in (edge, replace(edge, recommended=None)):
        told = advice(known, edge.combined.lowest)
        figure = re.findall(r"[\d.]+ [kMG]?Hz$", told)
        assert "their sum" not in told or miss(edge, edge.combined.sum_of_constants) < 0.1
        assert figure or told.startswith("count it together")


def test_without_a_nearer_way_no_figure_is_given() -> None:
    edge = evidence(boards.cascode()).upper
    assert edge.hz is not None
    assert advice(edge, edge.hz) == "count it together with the other causes: taken alone it leads further off"
