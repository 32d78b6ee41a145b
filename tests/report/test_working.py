"""The working of a node: what is in parallel, what each capacitance counts at mid-band and at the edge, and why."""

from __future__ import annotations

import re

import pytest

import boards
from cells import near
from tauledger.devices.parts import capacitance, resistance
from tauledger.pipeline import review_network
from tauledger.record import Review
from tauledger.report.layout import lay_out
from tauledger.report.upper import upper_budget
from tauledger.report.working import find_nodes, workings


@pytest.fixture(scope="module")
def stage() -> Review:
    return review_network(boards.common_source_400_mhz())


def text(review: Review, node: str) -> str:
    section = workings(review, find_nodes(review, node))
    return "\n".join(line.text for line in lay_out([section], width=80, unicode=True, page=60))


def test_a_node_is_found_by_any_of_its_names_in_any_case(stage: Review) -> None:
    assert [node.name for node in find_nodes(stage, "G")] == ["g"]
    assert find_nodes(stage, find_nodes(stage, "g")[0].title) == find_nodes(stage, "g")
    assert find_nodes(stage, "nowhere") == []


def test_resistances_capacitances_factors_and_the_product_are_shown(stage: Review) -> None:
    told = text(stage, "g")
    for wanted in ("WORKING", "R(g) = ", "by rule; exact", "× mid-band", "K = −gm·RL", "by hand", "share of f_H"):
        assert wanted in told
    assert max(map(len, told.splitlines())) <= 80


def test_at_the_edge_the_factor_has_turned_and_shrunk(stage: Review) -> None:
    """One pole at the output: 1 − K = 1 + A/(1 + jωR_LC), so the imaginary part is negative and the size smaller."""
    (node,) = find_nodes(stage, "g")
    assert node.working is not None
    term = next(t for line in node.working.lines for t in line.capacitances if t.part == "M1.c_mu")
    assert term.edge_factor_real is not None
    assert term.edge_factor_imag is not None
    assert term.edge_factor_imag < 0.0
    assert abs(complex(term.edge_factor_real, term.edge_factor_imag)) < term.factor


def test_the_factor_at_the_edge_is_that_of_mid_band_where_nothing_falls() -> None:
    review = review_network(boards.common_source_100k())
    (node,) = find_nodes(review, "g")
    assert node.working is not None
    terms = [t for line in node.working.lines for t in line.capacitances]
    for term in terms:
        if term.edge_factor_real is not None:
            assert term.edge_factor_real == near(term.factor, rel=0.02)


def test_one_plus_one_over_a_is_named_where_it_is_the_reason() -> None:
    """At a gain of −1 the textbook's far end counts twice, where the node driven alone sees it about once."""
    review = review_network(boards.cascode())
    lines = [line for node in review.nodes if node.working for line in node.working.lines]
    told = [line.why for line in lines if line.why]
    assert any("1 + 1/|A| stands for 1 − K" in why for why in told)
    for line in lines:
        off = abs(line.time_constant_s - line.time_constant_exact_s) > 0.02 * abs(line.time_constant_exact_s)
        assert bool(line.why) == off


def test_what_is_added_at_a_node_is_small_enough_for_first_order() -> None:
    """At an integrated output 1 pF would halve f_H; the column says what a tenth of it does."""
    small = review_network(boards.cascode())
    section = upper_budget(small)
    head = lay_out([section], width=80, unicode=True, page=60)[0].text
    assert head.endswith(("fF", "aF"))
    large = upper_budget(review_network(boards.common_emitter_8k()))
    assert lay_out([large], width=80, unicode=True, page=60)[0].text.endswith("+1 pF")
    for line in lay_out([section], width=80, unicode=True, page=60)[1:]:
        cost = re.search(r"[-+](\d+(?:\.\d+)?) %$", line.text)
        assert cost is None or float(cost.group(1)) <= 10.0


def test_resistances_with_a_solved_part_are_marked() -> None:
    """Shunt feedback: the output's resistance is R0/(1 + T), and T is not from paper."""
    network = boards.driven(
        resistance("RS", "s", "b", 1e3),
        boards.stage("Q1", "b", "out", "0", 0.04, r_pi=3.75e3, r_o=80e3, c_mu=1e-12),
        resistance("RF", "out", "b", 10e3),
        resistance("RL", "out", "0", 2e3),
        capacitance("CL", "out", "0", 100e-12),
    )
    lines = [line.text for line in lay_out([upper_budget(review_network(network))], width=80, unicode=True, page=60)]
    assert any("output (out)" in line and "‡" in line for line in lines)
    assert any(line.startswith("  ‡ R0/(1 + T)") for line in lines)
