"""What stands in a netlist for the sake of a measurement is named in one line, and in no table."""

from __future__ import annotations

from pathlib import Path

import pytest
from msgspec.structs import replace

import amplifiers
from tauledger.compose.aids import aid_notes
from tauledger.devices.parts import Part, capacitance, inductance, resistance, voltage_gain, voltage_source
from tauledger.engine.client import Engine
from tauledger.network.agreement import Agreement
from tauledger.network.assemble import Network
from tauledger.numbers import solve_network
from tauledger.pipeline import review

BOARD = """Echo preamplifier with instruments around it
VCC vcc 0 12
VIN in 0 AC 1
RS in s 600
C1 s b 220n
R1 vcc b 82k
R2 b 0 18k
Q1 k b e nsmall
VAM c k 0
VSENSE e x 0
FX 0 y VSENSE 1
RY y 0 1k
RC vcc c 4.7k
RE x 0 1.2k
CE e 0 47u
C2 c out 1{farad}
RL out 0 10k
CL out 0 33p
RP out 0 1g
.model nsmall npn(is=8f bf=220 vaf=80 rb=90 cje=6p cjc=2.5p tf=0.6n)
.print ac v(out)
.end
"""


def said(network: Network) -> list[str]:
    return [note.says for note in aid_notes(solve_network(network))]


@pytest.mark.parametrize(
    ("part", "line"),
    [
        (resistance("RP", "out", "0", 1e9), "RP 1 GΩ"),
        (inductance("LX", "out", "0", 1e9), "LX 1 GH"),
        (capacitance("CX", "vcc", "0", 2.0), "CX 2 F"),
    ],
)
def test_an_aid_is_named_with_its_value(part: Part, line: str) -> None:
    supply = resistance("RV", "vcc", "0", 100.0)
    assert said(amplifiers.coupled_stage(supply, part)) == [f"measuring aids left out: {line}"]


def test_a_resistor_that_moves_an_edge_is_no_probe_however_large() -> None:
    # 1 GΩ beside 10 pF from a capacitive source makes f_L
    network = amplifiers.network(
        capacitance("CS", "in", "g", 10e-12),
        resistance("RG", "g", "0", 1e9),
        voltage_gain("E1", ("x", "0"), ("g", "0"), 10.0),
        resistance("RO", "x", "out", 1e3),
        capacitance("CL", "out", "0", 1e-9),
    )
    assert said(network) == []


def test_a_source_that_only_reads_the_output_is_named_and_one_that_drives_a_load_is_not() -> None:
    meter = voltage_gain("EM", ("seen", "0"), ("out", "0"), 1.0)
    assert said(amplifiers.coupled_stage(meter, output="seen")) == ["measuring aids left out: EM that reads the output"]
    load = resistance("RM", "seen", "0", 50.0)
    assert said(amplifiers.coupled_stage(meter, load, output="seen")) == []


def test_a_drive_between_two_nodes_is_named() -> None:
    network = Network.from_parts(
        [
            voltage_source("VD", "p", "n", 1.0),
            resistance("RA", "p", "0", 1e3),
            resistance("RB", "n", "out", 1e3),
            resistance("RO", "out", "0", 1e3),
            capacitance("CO", "out", "0", 1e-9),
        ],
        output=amplifiers.coupled_stage().port,
    )
    assert said(network) == ["measuring aids left out: the drive VD floating between p and n"]


def test_ordinary_boards_have_nothing_to_name() -> None:
    assert said(amplifiers.coupled_stage()) == []
    assert said(amplifiers.choke_fed()) == []


def test_a_capacitor_beyond_the_simulator_s_digits_is_said_where_the_sweep_differs() -> None:
    network = amplifiers.coupled_stage(capacitance("CX", "out", "x", 1e9), resistance("RX", "x", "0", 1e4), output="x")
    numbers = solve_network(network)
    assert [note.note for note in aid_notes(numbers)] == ["measuring-aids"]
    differs = replace(numbers, agreement=Agreement(1.0, 1e6, 100))
    assert [note.note for note in aid_notes(differs)] == ["measuring-aids", "too-large-to-simulate"]


def test_an_ammeter_is_named_and_a_sensing_source_is_not(engine: Engine, tmp_path: Path) -> None:
    netlist = tmp_path / "board.cir"
    netlist.write_text(BOARD.format(farad="u"))
    found = review(netlist, engine=engine)
    assert [note.says for note in found.notes if note.note == "measuring-aids"] == [
        "measuring aids left out: RP 1 GΩ, VAM 0 V as ammeter"
    ]


def test_an_ideal_coupling_counts_in_no_table(engine: Engine, tmp_path: Path) -> None:
    netlist = tmp_path / "board.cir"
    netlist.write_text(BOARD.format(farad=""))
    found = review(netlist, engine=engine)
    part = next(part for part in found.parts if part.name == "C2")
    assert part.aid
    assert (part.share.f_high, part.share.f_low, part.edge_hz, part.in_path) == (None, None, None, False)
    assert found.f_low is not None
    assert found.f_low.exact_hz == pytest.approx(found.f_low.simulated_hz, rel=1e-5)
    assert {owner.part for pole in found.poles for owner in pole.owners}.isdisjoint({"C2"})
