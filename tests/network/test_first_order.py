"""First-order effect of every element on both edges and the gain, against the exact answer of a changed network."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import boards
from tauledger.network.assemble import Network
from tauledger.network.bands import find_midband
from tauledger.network.edges import find_edges
from tauledger.network.first_order import Sensitivity, rerun, sensitivities
from tauledger.network.recompute import edge_frequencies, scaled


def found(network: Network) -> dict[str, Sensitivity]:
    midband = find_midband(network, at_hz=None)
    return dict(sensitivities(network, midband, find_edges(network, midband), network.parts))


def log_error(network: Network, name: str, step: float) -> list[float]:
    """|ln(exact) − S·ln(factor)| for both edges and the gain, with the part's value times 1 + step."""
    midband = find_midband(network, at_hz=None)
    edges = find_edges(network, midband)
    after = rerun(network, midband, edges, {name: 1.0 + step})
    before = [edges.f_high.hz if edges.f_high else None, edges.f_low.hz if edges.f_low else None, abs(midband.gain)]
    slope = found(network)[name]
    return [
        abs(math.log(new / old) - s * math.log1p(step))
        for old, new, s in zip(
            before, (after.f_high, after.f_low, after.gain), (slope.f_high, slope.f_low, slope.gain), strict=True
        )
        if old is not None and new is not None and s is not None
    ]


@settings(max_examples=25, derandomize=True, deadline=None)
@given(
    r_s=st.floats(1e2, 1e5),
    gm=st.floats(1e-4, 1e-1),
    r_l=st.floats(1e3, 1e5),
    c_l=st.floats(1e-13, 1e-10),
    step=st.sampled_from([-0.1, 0.1]),
)
def test_the_error_of_the_prediction_shrinks_with_the_square_of_the_step(
    r_s: float, gm: float, r_l: float, c_l: float, step: float
) -> None:
    """Halving the step leaves a quarter of the error, a tenth of it a hundredth; rounding excepted."""
    network = boards.common_source(r_s, gm, r_l, 1e-12, 0.3e-12, c_l)
    for name in found(network):
        coarse, fine = log_error(network, name, step), log_error(network, name, step / 10)
        for large, small in zip(coarse, fine, strict=True):
            assert small <= 0.015 * large + 1e-9, name


@pytest.mark.parametrize("board", [*boards.UPPER, *boards.LOWER], ids=lambda board: board.__name__)
def test_a_rerun_gives_what_a_search_of_the_changed_network_gives(board: boards.Board) -> None:
    network = board()
    midband = find_midband(network, at_hz=None)
    edges = find_edges(network, midband)
    for name in found(network):
        followed = rerun(network, midband, edges, {name: 0.9})
        searched = edge_frequencies(scaled(network, {name: 0.9}), midband)
        for one, other in ((followed.f_high, searched.f_high), (followed.f_low, searched.f_low)):
            assert (one is None) == (other is None)
            if one is not None and other is not None:
                assert one == pytest.approx(other, rel=1e-9)


def test_all_capacitors_together_move_f_h_as_its_inverse_and_all_resistances_do_not_change_that() -> None:
    """Scaling all C scales frequency; scaling all conductances and gm alike scales it back, and leaves the gain."""
    network = boards.common_source(1e4, 2e-3, 2e4, 1e-12, 0.3e-12, 1e-12)
    slopes = found(network)
    kinds = {part.name: part.kind for part in network.parts}
    reactive = [slope for name, slope in slopes.items() if kinds[name] == "capacitance"]
    resistive = [slope for name, slope in slopes.items() if kinds[name] != "capacitance"]
    assert sum(slope.f_high or 0.0 for slope in reactive) == pytest.approx(-1.0)
    assert sum(slope.f_high or 0.0 for slope in resistive) == pytest.approx(1.0)
    assert sum(slope.gain for slope in resistive) == pytest.approx(0.0, abs=1e-9)
