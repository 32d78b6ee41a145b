"""The engine's lines are judged by class, together with the result; lines as libngspice 39 says them."""

from __future__ import annotations

import pytest

from circuits import preamp
from tauledger.engine.deck import write_deck
from tauledger.engine.verdict import judge, translate

NAMES = {"n1": "vcc", "n3": "base-1", "v1": "VCC", "q4": "Q1", "model1": "qn"}
STEPPING = (
    "stderr Note: Starting dynamic gmin stepping",
    "stderr Trying gmin =   1.0000E-03 Note: One successful gmin step",
    "stderr Note: Dynamic gmin stepping completed",
)
QUIET = ("stdout Doing analysis at TEMP = 27.000000 and TNOM = 27.000000", "stdout No. of Data Rows : 1")


@pytest.mark.parametrize(
    ("load", "run", "has_result", "state"),
    [
        ((), QUIET, True, "sound"),
        ((), STEPPING, True, "stepped"),
        ((), ("stderr Note: v1: has no value, DC 0 assumed",), True, "sound"),
        (("stderr Warning: Model issue on line 7 :", "stderr unrecognized parameter (foo)"), QUIET, True, "rejected"),
        (("stderr Error on line 6 or its substitute:",), ("stderr Error: circuit not parsed.",), False, "rejected"),
        ((), ("stderr Warning: singular matrix:  check node n3", *STEPPING), True, "singular"),
        ((), ("stderr Warning: source stepping failed",), True, "failed"),
        ((), ("stderr Note: Transient op finished successfully",), True, "failed"),
        ((), ("stderr op simulation(s) aborted",), True, "failed"),
        ((), QUIET, False, "failed"),
        (("stderr ngSpice_Circ returned 1",), (), False, "dead"),
    ],
)  # fmt: skip
def test_state_follows_from_lines_and_result(
    load: tuple[str, ...], run: tuple[str, ...], has_result: bool, state: str
) -> None:
    assert judge(load, run, has_result=has_result, names=NAMES).state == state


def test_singular_matrix_names_the_users_nodes_once() -> None:
    run = ("stderr Warning: singular matrix:  check node n3", "stderr Warning: singular matrix:  check node v1#branch")
    verdict = judge((), (*run, run[0]), has_result=True, names=NAMES)
    assert verdict.nodes == ("base-1", "the current through VCC")


def test_harmless_lines_are_dropped_and_the_others_told_once() -> None:
    run = (*STEPPING, *QUIET, "stderr Warning: q4: is hot", "stderr Warning: q4: is hot")
    assert judge((), run, has_result=True, names=NAMES).says == ("Warning: Q1: is hot",)


def test_a_model_parameter_read_past_is_told_and_no_failure() -> None:
    load = (
        "stderr Warning: Model issue on line 7 :",
        "stderr unrecognized parameter (foo) - ignored",
        "stdout Circuit: x",
    )
    verdict = judge(load, QUIET, has_result=True, names=NAMES)
    assert verdict.state == "sound"
    assert verdict.says == ("unrecognized parameter (foo) - ignored",)


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ('trouble with node "n3"', 'trouble with node "base-1"'),
        ("can't find model 'model1'", "can't find model 'qn'"),
        ("q4#base and q4#collCX", "Q1'b and Q1'c"),
        ("1e12 n33 xn3 n3x 2.n1", "1e12 n33 xn3 n3x 2.n1"),
    ],
)
def test_generated_names_become_the_users(line: str, said: str) -> None:
    assert translate(line, NAMES) == said


def test_every_generated_name_of_a_deck_has_a_users_name() -> None:
    deck = write_deck(preamp())
    assert set(deck.nodes[1:]) | set(deck.elements.values()) | {"model1"} == set(deck.says)
