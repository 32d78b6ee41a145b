"""Band edges on the designer's page: a right one names no slip, a slip is named by whatever method it went through."""

from __future__ import annotations

from pathlib import Path

import pytest

from role_boards import ROLE_BOARDS
from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.explain import explain
from tauledger.hand.equivalent import upper_circuit
from tauledger.netlist import read
from tauledger.numbers import Numbers, solve
from tauledger.paper.bench import work
from tauledger.paper.compare import Reviewed, compare
from tauledger.paper.page import read_page
from tauledger.paper.slips import slips
from tauledger.record import PaperFigure

EDGES = ("f_high", "f_low")
OFF = 0.02
SLIPPED = ("common emitter", "cascode", "balanced pair")


@pytest.fixture(scope="module")
def subjects(engine: Engine, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Reviewed]:
    folder: Path = tmp_path_factory.mktemp("edges")
    found = {}
    for number, (name, board) in enumerate(ROLE_BOARDS.items()):
        path = folder / f"{number}.cir"
        path.write_text(board.netlist, encoding="utf-8")
        found[name] = subject_of(solve(read(path), NO_CHANGE, engine))
    return found


def subject_of(numbers: Numbers) -> Reviewed:
    simulated = numbers.simulated
    assert simulated is not None
    return Reviewed(
        bands=numbers.bands,
        devices=numbers.devices,
        hand=explain(numbers).hand,
        f_high=simulated.f_high_hz,
        f_low=simulated.f_low_hz,
        gain_unit="V/V",
        temperature_c=27.0,
    )


def told(reviewed: Reviewed, edge: str, hz: float) -> PaperFigure:
    (figure,) = compare(read_page(f"{edge} = {hz!r}\n", "page.toml"), reviewed)
    return figure


def right(reviewed: Reviewed) -> dict[str, list[float]]:
    """Every answer that has no slip in it: the exact edge, and each method by hand."""
    assert reviewed.hand is not None
    found = {edge: [row.hz for row in reviewed.hand.methods if row.edge == edge and row.hz] for edge in EDGES}
    for edge, exact in (("f_high", reviewed.f_high), ("f_low", reviewed.f_low)):
        found[edge] = [] if exact is None else [*found[edge], exact]
    return found


@pytest.mark.parametrize("name", ROLE_BOARDS)
def test_no_edge_that_is_right_or_by_a_classical_method_is_a_slip(name: str, subjects: dict[str, Reviewed]) -> None:
    reviewed = subjects[name]
    for edge, answers in right(reviewed).items():
        for hz in answers:
            figure = told(reviewed, edge, hz)
            assert figure.slip == "", (edge, hz, figure.says)


@pytest.mark.parametrize("name", SLIPPED)
def test_a_slip_is_named_through_every_method(name: str, subjects: dict[str, Reviewed]) -> None:
    reviewed = subjects[name]
    assert reviewed.hand is not None
    circuit = upper_circuit(reviewed.bands, reviewed.devices)
    answers = right(reviewed)
    methods, checked = set(), 0
    for slip in slips(reviewed.bands, circuit, temperature_c=27.0):
        worked = work(reviewed.bands, reviewed.hand, slip.edit, slip.factor)
        if worked is None or slip.at_nodes:
            continue
        for (edge, method), hz in worked.edges.items():
            # what moves the answer by less than 2 % is no slip that shows
            if not answers[edge] or min(abs(hz / other - 1.0) for other in answers[edge]) <= OFF:
                continue
            if edge == "f_high" or checked < 12:
                figure = told(reviewed, edge, hz)
                assert figure.slip == slip.id or slip.says in figure.says, (slip.id, edge, method, figure.says)
                methods.add(method)
                checked += 1
    assert {"lowest node alone", "sum of time constants", "two coefficients", "root of sum of squares"} <= methods
