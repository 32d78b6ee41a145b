"""The list of rules and methods: complete, and every line says where it holds and who published it."""

from __future__ import annotations

import boards
from by_algebra import evidence
from tauledger.hand.catalogue import METHODS, entries
from tauledger.hand.methods import methods
from tauledger.hand.rules import RULES


def test_every_entry_has_formula_validity_and_source() -> None:
    for entry in entries():
        assert all((entry.group, entry.name, entry.formula, entry.valid, entry.source)), entry


def test_every_rule_is_listed_under_its_own_formula() -> None:
    listed = {entry.name: entry.formula for entry in entries()}
    for rule in RULES:
        assert listed[rule.name].startswith(rule.formula)


def test_every_method_of_a_review_is_listed_and_the_other_way_round() -> None:
    found = evidence(boards.common_emitter_1ma())
    used = {row.method for row in methods(found.upper.combined, None, upper_hz=1.0, lower_hz=None)}
    assert {entry.name for entry in METHODS} == used | {"simulated"}
