"""The whole walk on the demo boards, with ngspice as the judge."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

from tauledger.circuit import NO_CHANGE, Change, Load
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.netlist import elaborate, read
from tauledger.network.agreement import agreement
from tauledger.network.constants import group_delay, open_constants
from tauledger.network.recompute import without
from tauledger.network.shares import find_shares
from tauledger.network.solve import response
from tauledger.numbers import Numbers, recompute, solve
from tauledger.pipeline import review, review_network
from tauledger.record import Review

FIXTURES = Path(__file__).parent.parent / "fixtures"
BOARDS = sorted(path.name for path in FIXTURES.glob("*.cir"))
HALF_PERCENT = 0.005

# A coupled stage whose band edges lie a decade apart: no plateau of half a decade.
NARROW = """River-level gauge, narrow-band tap behind the echo preamplifier
VIN in 0 AC 1
RS in a 1k
C1 a b 8n
RB b 0 10k
GM c 0 b 0 10m
RC c 0 2k
CL c 0 5n
.ac dec 20 10 1meg
.print ac v(c)
.end
"""


def numbers_of(path: Path, engine: Engine, change: Change = NO_CHANGE) -> Numbers:
    return solve(read(path), change, engine)


@pytest.mark.parametrize("board", BOARDS)
def test_network_and_engine_agree_to_rounding(board: str, engine: Engine) -> None:
    numbers = numbers_of(FIXTURES / board, engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= 1e-7
    low = numbers.edges.f_low.hz if numbers.edges.f_low and numbers.edges.f_low.hz else 1.0
    assert numbers.edges.f_high is not None
    assert numbers.edges.f_high.hz is not None
    grid = decades(low / 100.0, 100.0 * numbers.edges.f_high.hz, 20)
    sweep = engine.sweep(grid)
    near = agreement(grid, response(numbers.network, grid), sweep.response, numbers.midband.gain)
    fitted = any(part.kind == "block" for device in numbers.devices for part in device.parts)
    assert near.max_relative_error <= (1e-6 if fitted else 1e-9)


@pytest.mark.parametrize("board", BOARDS)
def test_band_edges_are_where_ngspice_falls_by_3_db(board: str, engine: Engine) -> None:
    numbers = numbers_of(FIXTURES / board, engine)
    assert numbers.simulated is not None
    for edge, simulated_hz, outwards in (
        (numbers.edges.f_low, numbers.simulated.f_low_hz, -1e-4),
        (numbers.edges.f_high, numbers.simulated.f_high_hz, 1e-4),
    ):
        if edge is None or edge.hz is None:
            assert simulated_hz is None
            continue
        assert simulated_hz == pytest.approx(edge.hz, rel=1e-6)
        reference_hz = numbers.midband.frequency_hz or 1e-6 * edge.hz
        gains = np.abs(engine.sweep([reference_hz, edge.hz * (1 - outwards), edge.hz * (1 + outwards)]).response)
        assert gains[1] > gains[0] / math.sqrt(2.0) > gains[2]


@pytest.mark.parametrize(
    ("board", "parts"),
    [
        ("echo_preamp.cir", ("CL", "C1", "C2", "C7")),
        ("echo_cascode.cir", ("CL", "C5", "C6")),
        ("cable_driver.cir", ("CL", "L1", "C1", "C2")),
        ("gain_pair.cir", ("CL", "C3", "C8")),
        ("pair.cir", ("CLP", "CLN")),
        ("hydrophone.cir", ("CF", "CS", "CC")),
        ("mos_gain.cir", ("CC", "CF")),
        ("line_driver.cir", ("CL", "C2")),
    ],
)
def test_shares_are_what_ngspice_does_when_a_part_changes_by_half_a_per_cent(
    board: str, parts: tuple[str, ...], engine: Engine
) -> None:
    path = FIXTURES / board
    numbers = numbers_of(path, engine)
    for name in parts:
        for edge in (numbers.edges.f_low, numbers.edges.f_high):
            if edge is None or edge.hz is None:
                continue
            share = find_shares(numbers.network, numbers.midband, edge.hz, numbers.bands.class_of).parts[name]
            moved = [
                edge_in_engine(path, {name: 1.0 + change}, numbers, edge.hz, engine)
                for change in (HALF_PERCENT, -HALF_PERCENT)
            ]
            measured = -math.log(moved[0] / moved[1]) / math.log((1.0 + HALF_PERCENT) / (1.0 - HALF_PERCENT))
            assert share == pytest.approx(measured, abs=0.005), (name, edge.hz)


@pytest.mark.parametrize(("board", "part"), [("echo_preamp.cir", "CL"), ("cable_driver.cir", "L1")])
def test_recomputed_edges_are_those_of_ngspice_with_the_part_changed(board: str, part: str, engine: Engine) -> None:
    path = FIXTURES / board
    numbers = numbers_of(path, engine)
    again = recompute(numbers, {part: 0.9})
    assert again.f_high is not None
    simulated = edge_in_engine(path, {part: 0.9}, numbers, again.f_high, engine)
    assert again.f_high == pytest.approx(simulated, rel=1e-4)


@pytest.mark.parametrize("board", BOARDS)
def test_delays_of_all_parts_add_to_the_phase_slope_of_ngspice(board: str, engine: Engine) -> None:
    numbers = numbers_of(FIXTURES / board, engine)
    assert numbers.edges.f_high is not None
    assert numbers.edges.f_high.hz is not None
    f_mid = numbers.midband.frequency_hz or numbers.edges.f_high.hz / 1e3
    step = 1e-3
    around = engine.sweep([f_mid * (1 - step), f_mid * (1 + step)]).response
    slope = -float(np.angle(around[1] / around[0])) / (2 * math.pi * f_mid * 2 * step)
    delays = group_delay(numbers.network, f_mid)
    scale = max(abs(delay) for delay in delays.values())
    assert sum(delays.values()) == pytest.approx(slope, rel=1e-3, abs=1e-3 * scale)


@pytest.mark.parametrize(
    ("board", "decoupling"),
    [
        ("echo_preamp.cir", {"C6", "R7", "C7"}),  # electrolytic with its own resistance, and ceramic
        ("echo_cascode.cir", {"C9"}),
        ("gain_pair.cir", {"C9"}),
    ],
)
def test_decoupling_is_in_no_sum_of_the_path(board: str, decoupling: set[str], engine: Engine) -> None:
    numbers = numbers_of(FIXTURES / board, engine)
    with_it = review_network(numbers.network, devices=numbers.devices).budget.upper
    without_it = review_network(without(numbers.network, frozenset(decoupling)), devices=numbers.devices).budget.upper
    assert with_it is not None
    assert without_it is not None
    assert without_it.path_sum_s == pytest.approx(with_it.path_sum_s, rel=0.01, abs=0)
    assert without_it.weighted_sum_s == pytest.approx(with_it.weighted_sum_s, rel=0.01, abs=0)


def test_a_ceramic_beside_an_electrolytic_counts_in_the_sum_over_all_parts_alone(engine: Engine) -> None:
    numbers = numbers_of(FIXTURES / "echo_preamp.cir", engine)
    row = open_constants(numbers.bands).part("C7")
    assert not row.in_path
    assert row.time_constant_s > 20e-9
    assert abs(row.delay_s) < 1e-9


def test_narrow_band_gives_shares_and_withholds_the_hand_tables(tmp_path: Path, engine: Engine) -> None:
    path = tmp_path / "narrow.cir"
    path.write_text(NARROW)
    found = review(path, engine=engine)
    assert found.midband.from_hz is None
    assert found.f_high is not None
    assert found.f_low is not None
    assert found.f_high.exact_hz is not None
    assert found.f_low.exact_hz is not None
    assert 5 < found.f_high.exact_hz / found.f_low.exact_hz < 20
    assert found.nodes == ()
    assert found.steps == ()
    assert any(note.note == "no-plateau" for note in found.notes)
    numbers = numbers_of(path, engine)
    for name in ("C1", "CL"):
        row = next(part for part in found.parts if part.name == name)
        for share, hz in ((row.share.f_high, found.f_high.exact_hz), (row.share.f_low, found.f_low.exact_hz)):
            moved = [edge_in_engine(path, {name: factor}, numbers, hz, engine) for factor in (1.005, 0.995)]
            assert share == pytest.approx(-math.log(moved[0] / moved[1]) / math.log(1.005 / 0.995), abs=0.005)


def test_a_change_of_the_transistors_junction_moves_the_edge_by_its_share(engine: Engine) -> None:
    """CJC scales C_mu and its outer part alike and leaves the operating point alone."""
    path = FIXTURES / "echo_preamp.cir"
    numbers = numbers_of(path, engine)
    assert numbers.circuit is not None
    assert numbers.edges.f_high is not None
    assert numbers.edges.f_high.hz is not None
    model = numbers.circuit.models[0]
    shares = find_shares(numbers.network, numbers.midband, numbers.edges.f_high.hz, numbers.bands.class_of).parts
    moved = []
    for factor in (1.005, 0.995):
        change = Change(models=((model.name, "cjc", model.parameter("cjc", 0.0) * factor),))
        moved.append(edge_of_loaded(path, change, numbers, numbers.edges.f_high.hz, engine))
    measured = -math.log(moved[0] / moved[1]) / math.log(1.005 / 0.995)
    assert shares["Q1.c_mu"] + shares["Q1.c_bx"] == pytest.approx(measured, abs=0.005)


def test_supply_above_60_v_carries_the_caution(tmp_path: Path, engine: Engine) -> None:
    path = tmp_path / "high.cir"
    path.write_text(NARROW.replace("VIN in 0 AC 1", "VIN in 0 AC 1\nVHV hv 0 72\nRHV hv 0 1meg"))
    assert "72 V" in review(path, engine=engine).cautions[0]
    path.write_text(NARROW.replace("VIN in 0 AC 1", "VIN in 0 AC 1\nVHV hv 0 48\nRHV hv 0 1meg"))
    assert review(path, engine=engine).cautions == ()


def review_of(board: str, engine: Engine) -> Review:
    return review(FIXTURES / board, engine=engine)


def edge_in_engine(path: Path, factors: dict[str, float], numbers: Numbers, near_hz: float, engine: Engine) -> float:
    """Give the band edge of ngspice with cards scaled, the reference at the unchanged mid-band frequency."""
    value = {part.name: part.value for part in numbers.network.parts}
    change = Change(elements=tuple((name, value[name] * factor) for name, factor in factors.items()))
    return edge_of_loaded(path, change, numbers, near_hz, engine)


def edge_of_loaded(path: Path, change: Change, numbers: Numbers, near_hz: float, engine: Engine) -> float:
    circuit = elaborate(read(path), change)
    engine.operating_point(circuit)
    reference_hz = numbers.midband.frequency_hz or 1e-6 * near_hz
    level = abs(engine.sweep([reference_hz]).response[0]) / math.sqrt(2.0)
    grid = np.geomspace(0.8 * near_hz, 1.25 * near_hz, 9)
    for _ in range(3):
        gain = np.abs(engine.sweep(grid).response)
        k = int(np.flatnonzero((gain[:-1] - level) * (gain[1:] - level) <= 0.0)[0])
        grid = np.geomspace(grid[k], grid[k + 1], 9)
    position = math.log(level / gain[k]) / math.log(gain[k + 1] / gain[k])
    return float(grid[0] * (grid[-1] / grid[0]) ** position)


def test_a_lone_source_gives_a_gain_whatever_its_ac_value(tmp_path: Path, engine: Engine) -> None:
    text = (FIXTURES / "echo_preamp.cir").read_text()
    path = tmp_path / "millivolt.cir"
    path.write_text(text.replace("VIN echo 0 DC 0 AC 1", "VIN echo 0 DC 0 AC 1m 90"))
    assert path.read_text() != text
    assert review(path, engine=engine).midband == review(FIXTURES / "echo_preamp.cir", engine=engine).midband


def test_one_picofarad_more_at_the_named_node_moves_the_edge_as_told(engine: Engine) -> None:
    """The output of the cable driver hangs on its emitter through 200 nH: the row is named after the output."""
    path = FIXTURES / "cable_driver.cir"
    numbers = numbers_of(path, engine)
    row = next(node for node in review(path, engine=engine).nodes if node.name == "out")
    assert row.per_farad.f_high is not None
    assert numbers.edges.f_high is not None
    near_hz = numbers.edges.f_high.hz
    assert near_hz is not None
    moved = [
        edge_of_loaded(path, Change(loads=(Load("C", "out", "0", farad),)), numbers, near_hz, engine)
        for farad in (1e-12, 1e-15)
    ]
    assert row.per_farad.f_high * 1e-12 == pytest.approx(moved[0] - moved[1], rel=0.02, abs=0)


def test_settings_give_the_headline_of_the_edited_netlist_beside_that_of_the_netlist(
    engine: Engine, tmp_path: Path
) -> None:
    path = FIXTURES / "echo_preamp.cir"
    found = review(path, engine=engine, settings=["R3=4.7k"])
    plain = review(path, engine=engine)
    text = path.read_text()
    edited = tmp_path / "edited.cir"
    edited.write_text(text.replace("3.9k", "4.7k"))
    assert text.count("3.9k") == 1
    by_hand = review(edited, engine=engine)
    moved = {row.figure: row for row in found.moved}
    assert found.f_high == by_hand.f_high
    for name, before, after in (("f_H", plain.f_high, by_hand.f_high), ("f_L", plain.f_low, by_hand.f_low)):
        assert before is not None
        assert after is not None
        assert (moved[f"{name} simulated"].before, moved[f"{name} simulated"].after) == (
            before.simulated_hz,
            after.simulated_hz,
        )
        assert (moved[f"{name} by hand"].before, moved[f"{name} by hand"].after) == (before.hand_hz, after.hand_hz)
    assert (moved["gain"].before, moved["gain"].after) == (plain.midband.gain_db, by_hand.midband.gain_db)


@pytest.mark.parametrize("board", BOARDS)
def test_no_cause_is_told_of_an_edge_that_paper_meets(board: str, engine: Engine) -> None:
    found = review(FIXTURES / board, engine=engine)
    for quantity, edge in (("f_H", found.f_high), ("f_L", found.f_low)):
        if edge is not None and edge.difference is not None and abs(edge.difference) < 0.0199:
            assert not [cause for cause in found.causes if cause.quantity == quantity and not cause.on_paper]


def test_the_hydrophone_s_lower_edge_is_one_that_paper_meets(engine: Engine) -> None:
    edge = review(FIXTURES / "hydrophone.cir", engine=engine).f_low
    assert edge is not None
    assert edge.difference is not None
    assert abs(edge.difference) < 0.01
