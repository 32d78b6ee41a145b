"""The deck holds generated names and finite numbers, and no character of the netlist."""

from __future__ import annotations

import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

from circuits import NPN, board, changed, preamp
from tauledger.engine.deck import write_deck
from tauledger.errors import EngineError

HOSTILE = st.text(alphabet=";{}'\"`$*#\r\n\x0b\x85\u2028 .=()éµ;|&><!shelw", min_size=1, max_size=12)


@settings(derandomize=True, max_examples=60, deadline=None)
@given(node=HOSTILE, element=HOSTILE, model=HOSTILE, title=HOSTILE)
def test_no_name_of_the_netlist_reaches_the_deck(node: str, element: str, model: str, title: str) -> None:
    plain = preamp()
    renamed = replace(
        plain,
        title=title,
        nodes=("0", *(f"{node}{k}" for k in range(1, len(plain.nodes)))),
        passives=replace(plain.passives, name=tuple(element + name for name in plain.passives.name)),
        elements=tuple(
            replace(e, name=e.name if e.letter == "V" else element, model=model if e.model else "")
            for e in plain.elements
        ),
        models=tuple(replace(m, name=model) for m in plain.models),
    )
    assert write_deck(renamed).text == write_deck(plain).text


def test_every_line_of_a_deck_is_made_of_whitelisted_words() -> None:
    deck = write_deck(preamp()).text.splitlines()
    number = r"-?\d+(\.\d+)?(e[-+]\d+)?"
    word = rf"(0|[a-z]+\d+|dc|ac|off|{number}|[a-z]\w*={number})"
    card = re.compile(rf"[a-z]\d+( {word})+")
    model = re.compile(rf"\.model model\d+ (npn|pnp)\([a-z]\w*={number}( [a-z]\w*={number})*\)")
    options = re.compile(rf"\.options( [a-z]+={number})+")
    assert deck[0] == "generated circuit"
    assert deck[-1] == ".end"
    for line in deck[1:-1]:
        assert card.fullmatch(line) or model.fullmatch(line) or options.fullmatch(line), line


def test_title_says_nothing_that_the_engine_takes_for_a_failure() -> None:
    assert "error" not in write_deck(preamp()).text


@settings(derandomize=True, max_examples=50, deadline=None)
@given(st.floats(min_value=1e-30, max_value=1e30))
def test_a_value_crosses_the_text_without_loss(value: float) -> None:
    circuit = board("V1 out 0 1", "R1 out 0 1")
    circuit.passives.value[0] = value
    card = next(line for line in write_deck(circuit).text.splitlines() if line.startswith("r"))
    assert float(card.split()[-1]) == value


def test_real_drive_keeps_its_sign_in_the_magnitude() -> None:
    deck = write_deck(board("V1 a 0 1", "V2 out 0 0", "R1 a out 1k", drive={"V1": -0.5, "V2": 3 + 4j})).text
    assert "dc 1.0 ac -0.5 0.0" in deck
    assert "dc 0.0 ac 5.0 53.13010235415598" in deck


def test_two_names_that_differ_in_case_are_one_model() -> None:
    circuit = board("V1 out 0 1", "Q1 out out 0 qn")
    upper = replace(circuit, elements=tuple(replace(e, model=e.model.upper()) for e in circuit.elements))
    assert write_deck(upper).text == write_deck(circuit).text


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), -float("inf")])
def test_a_number_that_is_not_finite_is_refused_by_name(bad: float) -> None:
    circuit = board("V1 out 0 1", "R9 out 0 1")
    circuit.passives.value[0] = bad
    with pytest.raises(EngineError, match="R9"):
        write_deck(circuit)


def test_a_resistor_of_zero_ohm_is_refused() -> None:
    with pytest.raises(EngineError, match="R9"):
        write_deck(board("V1 out 0 1", "R9 out 0 0"))


@pytest.mark.parametrize(
    ("circuit", "culprit"),
    [
        (board("V1 out 0 1", "Q1 out out 0 qn w=2"), "w"),
        (board("V1 out 0 1", "Q1 out out 0 qn", models=(changed(NPN, file=1.0),)), "file"),
        (board("V1 out 0 1", "Q1 out out 0 qn", models=(replace(NPN, level=4),)), "qn"),
        (board("V1 out 0 1", "Q1 out out 0 qn", models=(replace(NPN, type="nmos"),)), "qn"),
        (board("V1 out 0 1", "R1 out 0 1", options=(("rawfile", 1.0),)), "rawfile"),
    ],
)
def test_what_no_family_knows_is_refused(circuit: object, culprit: str) -> None:
    from tauledger.circuit import Circuit

    assert isinstance(circuit, Circuit)
    with pytest.raises(EngineError, match=culprit):
        write_deck(circuit)


def test_temperature_nominal_temperature_and_gmin_stand_on_one_line() -> None:
    deck = write_deck(board("V1 out 0 1", "R1 out 0 1", temperature_c=-40.0, tnom_c=25.0, options=(("gmin", 1e-14),)))
    lines = [line for line in deck.text.splitlines() if line.startswith(".options")]
    assert lines == [".options reltol=1e-06 abstol=1e-15 vntol=1e-09 gmin=1e-14 temp=-40.0 tnom=25.0"]


def test_default_tolerances_leave_the_tight_ones_out() -> None:
    assert "reltol" not in write_deck(preamp(), tight=False).text
