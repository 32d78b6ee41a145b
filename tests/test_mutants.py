"""Named faults that must be noticed: by the agreement with ngspice, by an identity of the run, or by a printed number.

A suite that passes with one of these in place would prove nothing.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from msgspec.structs import replace

import boards
from tauledger.circuit import Circuit
from tauledger.devices import gummel_poon
from tauledger.devices.catalogue import linearise
from tauledger.devices.family import Linearised
from tauledger.devices.parts import Part
from tauledger.engine.client import Engine
from tauledger.errors import NetworkError
from tauledger.hand.equivalent import Capacitor, EquivalentCircuit
from tauledger.hand.estimate import MillerTerm
from tauledger.hand.miller import miller_term
from tauledger.network.assemble import Network, Triplets
from tauledger.network.bands import Bands
from tauledger.network.constants import OpenConstants, open_constants
from tauledger.network.solve import Complex, Solution, solve
from tauledger.pipeline import review, review_network
from tauledger.solution import Bias

# What the boards reach; the limit of design for a rebuilt network.
AGREES = 1e-7

FIXTURES = Path(__file__).parent.parent / "fixtures"

# Every reading of the model counts: lateral substrate (pnp), series resistances, area, base-collector split.
BOARD = """River-level gauge, level shifter behind the echo preamplifier
VCC vcc 0 9
VIN s 0 AC 1
RS s in 1k
C1 in b 1u
R1 vcc b 10k
R2 b 0 33k
RE vcc e 1k
C2 e 0 22u
Q1 c b e sub pshift 2
RSUB sub 0 220
RC c 0 2.2k
CL c 0 22p
.model pshift pnp (is=8e-15 bf=120 vaf=60 rb=150 re=6 rc=12 cje=12p cjc=5p xcjc=0.6 cjs=7p tf=500p xtf=3 vtf=4 itf=0.1)
.ac dec 10 10 1g
.print ac v(c)
.end
"""

Mutation = Callable[[Part], Part | None]


@pytest.fixture
def board(tmp_path: Path) -> Path:
    path = tmp_path / "shifter.cir"
    path.write_text(BOARD)
    return path


def error_of(board: Path, engine: Engine) -> float:
    agreement = review(board, engine=engine).agreement
    assert agreement is not None
    return agreement.max_relative_error


def mutate_parts(monkeypatch: pytest.MonkeyPatch, mutation: Mutation) -> None:
    sound = linearise

    def faulty(circuit: Circuit, bias: Bias) -> Linearised:
        linearised = sound(circuit, bias)
        mutated = [mutation(part) for part in linearised.parts]
        assert mutated != list(linearised.parts), "the mutant changes nothing on this board"
        return replace(linearised, parts=tuple(part for part in mutated if part is not None))

    monkeypatch.setattr("tauledger.numbers.linearise", faulty)


def test_without_a_mutant_the_board_agrees(board: Path, engine: Engine) -> None:
    assert error_of(board, engine) < AGREES


def test_mutant_drop_cexbc(board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    mutate_parts(monkeypatch, lambda part: None if part.label == "cexbc" else part)
    assert error_of(board, engine) > AGREES


def test_mutant_wrong_substrate_node(board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    sound = gummel_poon.vertical_substrate
    monkeypatch.setattr(gummel_poon, "vertical_substrate", lambda model: not sound(model))
    assert error_of(board, engine) > AGREES


def test_mutant_area_not_applied_to_the_emitter_resistance(
    board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch
) -> None:
    mutate_parts(monkeypatch, lambda part: replace(part, value=part.value / 2.0) if part.label == "g_e" else part)
    assert error_of(board, engine) > AGREES


def test_mutant_gm_off_by_a_millionth(board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    mutate_parts(monkeypatch, lambda part: replace(part, value=part.value * (1 + 1e-6)) if part.label == "gm" else part)
    assert error_of(board, engine) > AGREES


def test_mutant_transposed_conductance_matrix(board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    sound = Network.from_parts

    def faulty(*parts: object, **ports: object) -> Network:
        network = sound(*parts, **ports)  # type: ignore[arg-type]
        g = network.conductance
        return replace(network, conductance=Triplets(g.column, g.row, g.value))

    monkeypatch.setattr(Network, "from_parts", faulty)
    assert error_of(board, engine) > AGREES


def test_mutant_miller_with_the_gain_instead_of_one_plus_the_gain(monkeypatch: pytest.MonkeyPatch) -> None:
    """Gray, Hurst, Lewis and Meyer 5e, sec. 7.2.1.2 prints 35.7 pF for C_gd (1 + 70.5); |A| alone gives 35.3 pF."""
    sound = miller_term

    def faulty(circuit: EquivalentCircuit, capacitor: Capacitor, node: str) -> MillerTerm:
        term = sound(circuit, capacitor, node)
        return replace(term, factor=abs(term.gain)) if abs(term.gain) > 1.0 else term

    def printed_capacitance() -> float:
        node = next(row for row in review_network(boards.common_source_400_mhz()).nodes if row.name == "g")
        assert node.capacitance_f is not None
        return node.capacitance_f

    assert printed_capacitance() == pytest.approx(5.1e-12 + 35.7e-12, rel=2e-3, abs=0)
    monkeypatch.setattr("tauledger.hand.budget.miller_term", faulty)
    assert printed_capacitance() != pytest.approx(5.1e-12 + 35.7e-12, rel=2e-3, abs=0)


def test_mutant_conjugated_adjoint(board: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    sound = solve

    def faulty(network: Network, s: Complex) -> Solution:
        solution = sound(network, s)
        return replace(solution, adjoint=solution.adjoint.conj())

    monkeypatch.setattr("tauledger.network.shares.solve", faulty)
    with pytest.raises(NetworkError, match="slope by the shares"):
        review(board, engine=engine)


def test_mutant_weight_one_for_decoupling(engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    sound = open_constants

    def faulty(bands: Bands) -> OpenConstants:
        constants = sound(bands)
        assert any(not row.in_path for row in constants.parts)
        rows = tuple(row if row.in_path else replace(row, weight=1.0) for row in constants.parts)
        return replace(constants, parts=rows)

    monkeypatch.setattr("tauledger.explain.open_constants", faulty)
    with pytest.raises(NetworkError, match="weight of"):
        review(FIXTURES / "echo_preamp.cir", engine=engine)
