"""Band edges that are close to each other: a case and a near miss for each side."""

from __future__ import annotations

import math

import pytest

import boards
from by_algebra import evidence
from tauledger.causes.catalogue import find_causes
from tauledger.causes.edges_interact import lower_edge_near_upper, upper_edge_near_lower


def test_edges_sixty_to_one_move_each_other() -> None:
    """Two sections r to one, |H|² = 1/[(1 + 1/x²)(1 + x²/r²)] with x = f/f_L, peak 1/(1 + 1/r)² at x = √r.

    −3 dB of the peak: u + 1/u = r + 4 + 1/r with u = x²/r, so that f_H is √(u/r) times its own section's.
    """
    r = 60.0
    s = r + 4.0 + 1.0 / r
    u = (s + math.sqrt(s * s - 4.0)) / 2.0
    found = evidence(boards.coupled_stage(r))
    above, below = upper_edge_near_lower(found), lower_edge_near_upper(found)
    assert above is not None
    assert below is not None
    assert (above.quantity, below.quantity) == ("f_H", "f_L")
    assert above.effect == pytest.approx(math.sqrt(u / r) - 1.0, abs=1e-4)
    assert (1 + above.effect) * (1 + below.effect) == pytest.approx(1.0, abs=1e-4)
    assert {cause.cause for cause in find_causes(found)} >= {"edges-interact"}
    assert f"only {u:.3g} to 1" in above.says


def test_edges_two_hundred_to_one_apart_are_nothing_of_note() -> None:
    found = evidence(boards.coupled_stage(200.0))
    assert not any(cause.cause == "edges-interact" for cause in find_causes(found))


def test_with_one_edge_there_is_nothing_to_interact() -> None:
    assert upper_edge_near_lower(evidence(boards.common_source_100k())) is None
    assert lower_edge_near_upper(evidence(boards.common_source_100k())) is None
