"""Named faults that must be noticed: by the agreement with ngspice, by an identity of the run, or by a printed number.

A suite that passes with one of these in place would prove nothing.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from compensated import TwoStages, network_of
from tauledger.asked import Asked
from tauledger.circuit import Circuit, Port
from tauledger.devices import gummel_poon
from tauledger.devices.catalogue import linearise
from tauledger.devices.family import Linearised
from tauledger.devices.parts import (
    Part,
    capacitance,
    inductance,
    mutual_inductance,
    resistance,
    voltage_source,
)
from tauledger.engine.client import Engine
from tauledger.errors import NetworkError
from tauledger.hand.equivalent import Capacitor, EquivalentCircuit
from tauledger.hand.estimate import MillerTerm
from tauledger.hand.miller import miller_term
from tauledger.network import lines, reactances, return_ratio
from tauledger.network.angle import Angle
from tauledger.network.assemble import Network, Triplets
from tauledger.network.bands import Bands, classify
from tauledger.network.constants import OpenConstants, open_constants
from tauledger.network.edges import find_edges
from tauledger.network.identities import Identity, check, share_identities
from tauledger.network.midband import find_midband
from tauledger.network.return_ratio import at_source, checked
from tauledger.network.shares import find_shares
from tauledger.network.solve import Complex, Real, Solution, on_axis, solve
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

# The line is long enough to turn the phase within the band.
LEAD = """River-level gauge, lead of the cable driver
VIN in 0 AC 1
RS in near 33
CN near 0 15p
{card}
RL out 0 1k
CL out 0 20p
.model coax ltra (r=0.4 l=375n c=66.7p len=4)
.ac dec 20 10k 1g
.print ac v(out)
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


def test_mutant_phase_margin_with_the_wrong_sign_of_the_phase(monkeypatch: pytest.MonkeyPatch) -> None:
    """180° − φ in place of 180° + φ: what poles and zeros use is not what the margin leaves."""
    network, sound = network_of(TwoStages()), Angle.along
    assert review_network(network).phase_budget is not None
    monkeypatch.setattr(Angle, "along", lambda angle, hz, h: -sound(angle, hz, h))
    with pytest.raises(NetworkError, match="degrees of poles and zeros add to the phase used"):
        review_network(network)


def test_mutant_return_ratio_of_a_source_with_the_wrong_sign(monkeypatch: pytest.MonkeyPatch) -> None:
    network, s = boards.common_source_400_mhz(), on_axis(np.array([1e6, 3e8]))
    opening, sound = at_source(network, [part for part in network.parts if part.label == "gm"]), return_ratio._control
    h = solve(network, s).response
    assert checked(opening, s, h) < 1e-9
    monkeypatch.setattr(return_ratio, "_control", lambda opening, s: -sound(opening, s))
    with pytest.raises(NetworkError, match="ratio of determinants"):
        checked(opening, s, h)


def test_mutant_return_ratio_of_a_wire_with_the_wrong_sign(engine: Engine, monkeypatch: pytest.MonkeyPatch) -> None:
    """v₁ − i₁ in place of v₁ + i₁: ngspice's own double injection says something else."""

    def error() -> float:
        found = review(FIXTURES / "series_shunt.cir", engine=engine, asked=Asked(loops=("Q1.emitter",)))
        loop = next(one for one in found.loops if one.loop == "Q1.emitter")
        assert loop.return_ratio_simulated is not None
        return abs(abs(complex(loop.return_ratio_real, loop.return_ratio_imag)) / loop.return_ratio_simulated - 1.0)

    sound = return_ratio._driven

    def faulty(network: Network, right: Real, s: Complex) -> Complex:
        answer = sound(network, right, s)
        return answer if right.ndim == 1 else answer * np.array([1.0, -1.0])[:, None]

    assert error() < 1e-3
    monkeypatch.setattr(return_ratio, "_driven", faulty)
    assert error() > 0.1


@pytest.mark.parametrize("card", ["T1 near 0 out 0 z0=75 td=20n", "O1 near 0 out 0 coax"])
def test_mutant_line_that_answers_before_it_is_asked(
    card: str, engine: Engine, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """A delay of the other sign: e^(+γ) for e^(−γ) on the axis."""
    lead = tmp_path / "lead.cir"
    lead.write_text(LEAD.format(card=card))
    assert error_of(lead, engine) < AGREES
    sound = lines._equations
    monkeypatch.setattr(lines, "_equations", lambda part, s: tuple(found.conj() for found in sound(part, s)))
    assert error_of(lead, engine) > AGREES


def test_mutant_coupling_that_acts_one_way_in_the_shares(monkeypatch: pytest.MonkeyPatch) -> None:
    """Coils coupled too loosely to be drawn as a transformer: their shares no longer add up."""
    network = Network.from_parts(
        [
            voltage_source("VIN", "in", "0", 1.0),
            resistance("RS", "in", "a", 50.0),
            inductance("L1", "a", "0", 10e-6),
            mutual_inductance("K1", "L1", "L2", ("a", "0", "out", "0"), 7.4e-6),
            inductance("L2", "out", "0", 22e-6),
            *(resistance("RL", "out", "0", 1e3), capacitance("CL", "out", "0", 470e-12)),
        ],
        output=Port("out"),
    )
    midband = find_midband(network)
    edges = find_edges(network, midband)
    assert edges.f_high is not None
    hz = edges.f_high.hz
    assert hz is not None

    def identities() -> tuple[Identity, ...]:
        return share_identities(find_shares(network, midband, hz, classify(network, midband).class_of))

    assert all(identity.holds for identity in identities())
    monkeypatch.setattr(reactances, "TERMS", {})
    with pytest.raises(NetworkError, match="shares"):
        check(identities())
