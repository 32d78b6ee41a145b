"""The fast ways through plain cards give exactly what the grammar gives."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from netlist_boards import BOARDS
from netlist_elements import ELEMENTS
from netlist_language import LANGUAGE
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, place, read
from tauledger.netlist import lines as lines_module
from tauledger.netlist.cards import grammar_items, wide_items
from tauledger.netlist.diagnostics import Site
from tauledger.netlist.netlist import Card, Piece, SourceFile
from tauledger.netlist.runs import Run
from tauledger.netlist.writer import flat_netlist

WORDS = st.text(st.sampled_from("aR1.k+-/}:;$µ*"), min_size=1, max_size=4)
JOINTS = st.sampled_from([" (", ") ", ")", "(", " ", "\t", "  ", "=", " = ", ",", "(", ")", "{", "'", '"'])


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
    assert taken > 0.7 * len(texts)


def test_what_the_grammar_refuses_the_wide_way_refuses_too() -> None:
    for text in (
        "R1 a b=",
        "R1 a b = 2",
        "R1 =a",
        "R1 a b=c=d",
        "R1 a {b",
        "R1 (a b",
        "R1 a)",
        "R1 a=(b)",
        ",",
        "(((a)",
    ):
        assert wide_items(text) is None
        try:
            grammar_items(site(text), text)
        except NetlistError:
            continue


def site(text: str) -> Site:
    return Site((SourceFile("board.cir", "\n" + text),), Card(text, 0, (Piece(0, 2, 1),)))


NAMES = st.builds(str.__add__, st.sampled_from("RCLrcl"), st.text(st.sampled_from("aB1.#-"), max_size=3))
NODES = st.one_of(
    st.sampled_from(["0", "gnd", "GND", "vdd"]), st.text(st.sampled_from("aAbB1-+[]"), min_size=1, max_size=2)
)
NUMBERS = st.builds(
    "{}{}{}".format,
    st.sampled_from(["1", "4.7", "5.", ".25", "+3", "0", "-1"]),
    st.sampled_from(["", "", "", "e3", "E-3", "d2"]),
    st.sampled_from(["", "k", "MEG", "mil", "uF", "pf", "Ohm", "f", "m", "k5", "x"]),
)
BETWEEN = st.sampled_from(["\n", "\n", "\n", "\n", "\n* a comment\n", "\n\n", " \n", " ; end\n", "\n+ \n", "\n+ m=2\n"])
ROWS = st.tuples(NAMES, NODES, NODES, NUMBERS, BETWEEN)


def understood(path: Path, text: str) -> str:
    """The flat deck with notes, or the messages."""
    path.write_text(text)
    try:
        circuit = elaborate(read(path), purpose="reading")
    except InputError as error:
        return str(error)
    return flat_netlist(circuit) + "\n".join(f"{note.where} {note.says}" for note in circuit.notes)


@settings(derandomize=True, max_examples=80, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(ROWS, min_size=8, max_size=30), st.booleans())
def test_runs_of_plain_lines_give_what_each_line_gives_by_the_grammar(
    tmp_path: Path, rows: list[tuple[str, str, str, str, str]], inside: bool
) -> None:
    lines = "".join(
        f"{name}{k if k % 7 else ''} {a} {b} {value}{end}" for k, (name, a, b, value, end) in enumerate(rows)
    )
    around = (".global vdd\nX1 x y cell m=2\n.subckt cell a b\n", ".ends\n") if inside else ("", "")
    text = f"runs\nV0 x 0 1\n{around[0]}{lines}\n{around[1]}.param p=1\n"
    fast = understood(tmp_path / "board.cir", text)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(lines_module, "run_at", lambda *_arguments, **_options: None)
        slow = understood(tmp_path / "board.cir", text)
    assert fast == slow


def test_runs_are_found_where_they_are(tmp_path: Path) -> None:
    rows = "".join(f"R{k} a{k} 0 {k + 1}k\n" for k in range(20))
    path = tmp_path / "board.cir"
    path.write_text(f"runs\nV1 a0 0 1\n{rows}+ m=1\nC1 a1 0 1p\n")
    netlist = read(path)
    assert [entry.count for entry in netlist.cards.entries if isinstance(entry, Run)] == [19]
    circuit = elaborate(netlist, purpose="reading")
    row = circuit.passives.name.index("R7")
    assert place(netlist, int(circuit.passives.card[row])).line == 10
    assert place(netlist, int(circuit.passives.card[circuit.passives.name.index("R19")])).line == 22


def test_a_name_given_twice_is_found_inside_of_runs_and_across_them(tmp_path: Path) -> None:
    rows = "".join(f"R{k} a{k} 0 1k\n" for k in range(20))
    path = tmp_path / "board.cir"
    for text, at, first in (
        (f"runs\nV1 a0 0 1\n{rows}R3 a0 0 1k\n", 23, 6),
        (f"runs\nV1 a0 0 1\n{rows}.param p=1\n{rows[:200]}\n", 24, 3),
    ):
        path.write_text(text)
        with pytest.raises(InputError) as raised:
            elaborate(read(path), purpose="reading")
        assert f"board.cir:{at}:1: there is an element" in str(raised.value)
        assert f"it stands at {path}:{first}" in str(raised.value)
