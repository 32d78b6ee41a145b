"""The fast ways through plain cards give exactly what the grammar gives."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from netlist_boards import BOARDS
from netlist_elements import ELEMENTS
from netlist_language import LANGUAGE
from tauledger.errors import NetlistError
from tauledger.netlist.cards import grammar_items, wide_items
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.netlist import Card, Piece, SourceFile

WORDS = st.text(st.sampled_from("aR1.k+-/}:;$µ*"), min_size=1, max_size=4)
JOINTS = st.sampled_from([" ", "\t", "  ", "=", " = ", ",", "(", ")", "{", "'", '"'])


@st.composite
def cards(draw: st.DrawFn) -> str:
    """Words with joints between them, mostly blanks."""
    text = draw(WORDS)
    for _ in range(draw(st.integers(0, 6))):
        joint = draw(st.one_of(st.sampled_from([" ", " ", " ", "="]), JOINTS))
        text += joint + draw(WORDS)
    return text


@settings(derandomize=True, max_examples=400, deadline=None)
@given(cards())
def test_a_wide_card_has_the_items_that_the_grammar_finds(text: str) -> None:
    found = wide_items(text)
    if found is None:
        return
    assert found == grammar_items(site(text), text)


def test_the_wide_way_takes_the_usual_cards_and_no_others() -> None:
    texts = [line for board in (*BOARDS.values(), *ELEMENTS.values(), *LANGUAGE.values()) for line in board.split("\n")]
    taken = 0
    for text in (line.strip() for line in texts):
        found = wide_items(text) if text else None
        if found is not None:
            assert found == grammar_items(site(text), text)
            taken += 1
    assert taken > 0.6 * len(texts)


def test_what_the_grammar_refuses_the_wide_way_refuses_too() -> None:
    for text in ("R1 a b=", "R1 a b = 2", "R1 =a", "R1 a b=c=d", "R1 a {b", "R1 (a b) 2", "R1 a,b 2"):
        assert wide_items(text) is None
        try:
            grammar_items(site(text), text)
        except NetlistError:
            continue


def site(text: str) -> Site:
    return Site((SourceFile("board.cir", "\n" + text),), Card(text, 0, (Piece(0, 2, 1),)))
