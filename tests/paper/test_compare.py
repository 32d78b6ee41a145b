"""A page beside the review: what stands beside each figure, and what a page may not ask of a circuit."""

from __future__ import annotations

import pytest

import boards
from cells import bands_of, near
from tauledger.errors import NetlistError
from tauledger.hand.budget import signal_nodes
from tauledger.paper.empty import empty_page
from tauledger.paper.page import read_page
from tauledger.pipeline import review_network
from tauledger.record import Review


def checked(text: str) -> Review:
    return review_network(boards.common_source_100k(), page=read_page(text, "page.toml"))


def test_each_figure_stands_beside_hand_and_exact_in_the_order_of_the_page() -> None:
    """Sedra and Smith, common-source example (from memory): 382 kHz by Miller; gain −7.14 of the node, −6.99 in all."""
    found = checked('gain = -7\nf_high = "382k"\n[node.G]\ncapacitance = "4.26p"\nmiller_gain = 7.14\n').paper
    assert [(f.key, f.where, f.line) for f in found] == [
        ("gain", "", 1),
        ("f_high", "", 2),
        ("capacitance", "G", 4),
        ("miller_gain", "G", 5),
    ]
    assert [f.exact for f in found] == near([-6.994, 379.81e3, 4.257e-12, -7.143], rel=2e-3)
    assert [f.hand for f in found] == near([-6.994, 381.81e3, 4.257e-12, -7.143], rel=2e-3)
    assert {f.says for f in found} == {"agrees within 2 %"}


def test_off_counts_from_exact_and_gains_by_size() -> None:
    (found,) = checked("[node.g]\nmiller_gain = 8\n").paper
    assert found.off == near(8 / 7.142857 - 1, rel=1e-4)


@pytest.mark.parametrize(
    ("text", "line", "says", "hint"),
    [
        ('[node.x]\nresistance = "1k"\n', 2, "there is no signal node x", "signal nodes here: g, out"),
        ("[device.Q7]\ngm = 0.1\n", 2, "there is no device Q7", "devices here: none"),
        ("gain = 7\nf_low = 10\n", 2, "this circuit has no f_low", "leave the line out"),
        ("[node.out]\nmiller_gain = 7\n", 2, "no capacitance at out bridges a stage", "leave the line out"),
    ],
)
def test_what_this_circuit_does_not_have_is_pointed_at(text: str, line: int, says: str, hint: str) -> None:
    with pytest.raises(NetlistError) as caught:
        checked(text)
    (diagnostic,) = caught.value.diagnostics
    assert (diagnostic.file, diagnostic.line) == ("page.toml", line)
    assert says in diagnostic.message
    assert hint in diagnostic.hint


def test_without_a_page_there_is_nothing_of_it_in_the_review() -> None:
    assert review_network(boards.common_source_100k()).paper == ()


def test_every_line_of_an_empty_page_can_be_filled_in() -> None:
    """Whoever takes each # away and writes a figure gets a page that is read and compared, line by line."""
    network = boards.common_source_100k()
    nodes = signal_nodes(bands_of(network), ())
    text = empty_page(title="a\nb", netlist="b.cir", page="p.toml", gain_unit="V/V", nodes=nodes, figures={})
    assert all(line.startswith(("#", "[")) or not line for line in text.splitlines())
    assert "[node.g]" in text
    filled = "\n".join(
        line.replace('= ""', "= 1e-3").removeprefix("#")
        for line in text.splitlines()
        if '= ""' not in line or not line.startswith("#f_low")
    )
    page = read_page("\n".join(line for line in filled.splitlines() if not line.startswith(" ")), "p.toml")
    assert {claim.key for claim in page.claims} >= {"f_high", "gain", "resistance", "capacitance", "time_constant"}
    assert len(review_network(network, page=page).paper) == len(page.claims)


def test_names_that_toml_does_not_take_bare_are_quoted() -> None:
    figures = {'x1."q': ("gm",)}
    text = empty_page(title="", netlist="b.cir", page="p.toml", gain_unit="", nodes=(), figures=figures)
    page = read_page(text.replace('#gm = ""', "gm = 1"), "p.toml")
    assert [claim.name for claim in page.claims] == ['x1."q']
