"""Fourteen netlists, one per role group: roles, looking-in resistances and the recommended method, ngspice as judge.

`pytest tests/test_roles.py --write-tables` prints the table that DEVELOPERS.md keeps.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from role_boards import ROLE_BOARDS
from tauledger.engine.client import Engine
from tauledger.pipeline import review
from tauledger.record import Review, WorkingLine

WITHIN, NEAR = 0.02, 0.10


@pytest.fixture(scope="module")
def reviews(engine: Engine, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Review]:
    folder: Path = tmp_path_factory.mktemp("roles")
    found = {}
    for number, (name, board) in enumerate(ROLE_BOARDS.items()):
        path = folder / f"{number}.cir"
        path.write_text(board.netlist, encoding="utf-8")
        found[name] = review(path, engine=engine)
    return found


def lines(found: Review) -> list[WorkingLine]:
    return [line for node in found.nodes if node.working for line in node.working.lines]


def recommended(found: Review) -> tuple[str, float] | None:
    for row in found.estimates:
        if row.edge == "f_high" and row.recommended and row.difference is not None:
            return row.method, row.difference
    return None


@pytest.mark.parametrize("name", ROLE_BOARDS)
def test_the_last_stage_has_its_role(name: str, reviews: dict[str, Review]) -> None:
    last = reviews[name].stages[-1]
    assert ROLE_BOARDS[name].role in "; ".join((last.role, *last.around))


@pytest.mark.parametrize("name", ROLE_BOARDS)
def test_every_resistance_is_within_two_per_cent_and_says_how_it_came_about(
    name: str, reviews: dict[str, Review]
) -> None:
    found = lines(reviews[name])
    assert found
    for line in found:
        assert line.resistance_hand_ohm == pytest.approx(line.resistance_exact_ohm, rel=WITHIN, abs=0.0), line.node
        assert line.source in ("rule", "loop", "branch", "solved")
        # what no rule reaches shows what the rule would have given, or that it was solved
        assert line.source != "solved" or "solved" in line.text


@pytest.mark.parametrize("name", ROLE_BOARDS)
def test_the_recommended_method_is_within_ten_per_cent_or_a_cause_says_why_not(
    name: str, reviews: dict[str, Review]
) -> None:
    found = reviews[name]
    choice = recommended(found)
    if choice is None or abs(choice[1]) > NEAR:
        assert any(cause.quantity == "f_H" and not cause.on_paper for cause in found.causes), choice


@pytest.mark.parametrize("name", ROLE_BOARDS)
def test_a_gain_by_hand_that_is_off_gives_its_reason(name: str, reviews: dict[str, Review]) -> None:
    for stage in reviews[name].stages:
        if stage.gain_hand is not None and stage.gain_exact is not None:
            assert bool(stage.why) == (abs(stage.gain_hand / stage.gain_exact - 1.0) > WITHIN), stage


def table(found: dict[str, Review]) -> str:
    rows = [
        "| role group | R by rule, loop, branch, solved | worst R | f_H simulated | lowest node | recommended method |",
        "|---|---|---|---|---|---|",
    ]
    for name, one in found.items():
        every = lines(one)
        count = ", ".join(
            str(sum(line.source == kind for line in every)) for kind in ("rule", "loop", "branch", "solved")
        )
        worst = max(abs(line.resistance_hand_ohm / line.resistance_exact_ohm - 1.0) for line in every)
        choice = recommended(one)
        told = "none" if choice is None else f"{choice[0]} {100 * choice[1]:+.1f} %"
        f_high = one.f_high
        hz = f_high.simulated_hz if f_high is not None else None
        lowest = f_high.difference if f_high is not None else None
        rows.append(
            f"| {name} | {count} | {100 * worst:.2f} % | {'none' if hz is None else f'{hz / 1e6:.4g} MHz'} "
            f"| {'none' if lowest is None else f'{100 * lowest:+.1f} %'} | {told} |"
        )
    return "\n".join(rows)


def test_the_table_of_all_role_groups(
    reviews: dict[str, Review], pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    text = table(reviews)
    assert text.count("\n") == len(ROLE_BOARDS) + 1
    if pytestconfig.getoption("--write-tables"):
        with capsys.disabled():
            print(f"\n{text}")
