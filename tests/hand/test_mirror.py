"""Half circuits: a balanced pair in opposite phase is one half with its axis at ground."""

from __future__ import annotations

import math

import pytest

from cells import bands_of, bipolar, near
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, voltage_source
from tauledger.hand.budget import signal_nodes
from tauledger.hand.equivalent import upper_circuit
from tauledger.hand.halves import counted, images
from tauledger.hand.mirror import drive_of_halves, find_mirror, half_circuit
from tauledger.hand.stages import stage_rows
from tauledger.network.assemble import Network
from tauledger.network.bands import Bands
from tauledger.network.spectrum import pole_frequencies


def pair(
    *extra: Part, right: float = 0.04, drive: float = -0.5, output: str = "p,n"
) -> tuple[Bands, tuple[Device, ...]]:
    """A differential pair with 47 ohm in each emitter and 5 kohm from there to ground; `right`: gm of the second."""
    devices = tuple(
        bipolar(f"Q{side}", (side, f"b{side}", f"e{side}"), gm=gm, r_b=100.0, c_pi=20e-12, c_mu=1e-12)
        for side, gm in (("p", 0.04), ("n", right))
    )
    parts = [voltage_source("VP", "sp", "0", 0.5), voltage_source("VN", "sn", "0", drive)]
    for side in ("p", "n"):
        parts += [resistance(f"RS{side}", f"s{side}", f"b{side}", 500.0), resistance(f"RC{side}", side, "0", 5e3)]
        parts += [resistance(f"RE{side}", f"e{side}", "t", 47.0), capacitance(f"CL{side}", side, "0", 5e-12)]
    parts += [resistance("RT", "t", "0", 5e3), resistance("RX", "p", "n", 20e3), *extra]
    network = Network.from_parts(
        [*parts, *(part for device in devices for part in device.parts)],
        output=Port(output.partition(",")[0], output.partition(",")[2] or "0"),
    )
    return bands_of(network), devices


def test_the_axis_rests_and_each_node_has_its_image() -> None:
    bands, devices = pair()
    mirror = find_mirror(upper_circuit(bands, devices))
    assert mirror is not None
    assert mirror.image["p"] == "n"
    assert mirror.image["Qp'b"] == "Qn'b"
    assert mirror.axis == {"t"}


def test_the_halves_hold_every_differential_pole_and_no_other() -> None:
    """Σ of the exact constants of one half is −Σ 1/p of its own network, built by hand: RX/2 and t at ground."""
    bands, devices = pair()
    half = Network.from_parts(
        [
            voltage_source("VP", "sp", "0", 0.5),
            resistance("RSp", "sp", "bp", 500.0),
            resistance("RCp", "p", "0", 5e3),
            resistance("REp", "ep", "0", 47.0),
            resistance("RX", "p", "0", 10e3),
            capacitance("CLp", "p", "0", 5e-12),
            *devices[0].parts,
        ],
        output=Port("p"),
    )
    rows = counted(signal_nodes(bands, devices)).rows
    exact = math.fsum(row.time_constant_exact_s for row in rows)
    assert exact == near(-sum((1 / pole_frequencies(bands_of(half).upper)).real), rel=1e-6)
    by_half = {row.name: row for row in signal_nodes(bands_of(half), devices[:1])}
    assert {row.name for row in rows} <= set(by_half)
    for row in rows:
        assert row.time_constant_s == near(by_half[row.name].time_constant_s, rel=1e-9)
        assert all(line.resistance.source == "rule" for line in row.lines)


def test_the_second_half_is_listed_and_counts_in_no_sum() -> None:
    rows = {row.name: row for row in signal_nodes(*pair())}
    assert rows["p"].image == "n"
    assert rows["n"].second
    assert not rows["p"].second
    assert rows["n"].time_constant_s == near(rows["p"].time_constant_s)
    assert not rows["t"].in_path
    found = counted(tuple(rows.values()))
    assert found.parts == 2
    assert not any(row.second for row in found.rows)


def test_what_leads_across_is_halved_and_a_capacitance_across_counts_twice() -> None:
    bands, devices = pair(capacitance("CX", "p", "n", 3e-12))
    rows = {row.name: row for row in signal_nodes(bands, devices)}
    line = next(line for line in rows["p"].lines if line.at == "p")
    term = next(term for term in line.capacitances if term.part == "CX")
    assert term.factor == 2.0
    assert "RX/2" in line.resistance.text


def test_the_stages_of_a_half_multiply_to_the_gain_of_the_pair() -> None:
    bands, devices = pair()
    rows = stage_rows(bands, devices)
    assert [row.node for row in rows] == ["bp", "p"]
    assert rows[1].role == "common emitter, degenerated"
    # each half has half of the drive and half of the output
    assert math.prod(row.gain_exact or math.nan for row in rows) == near(bands.midband.gain.real)
    assert math.prod(row.gain_hand or math.nan for row in rows) == near(bands.midband.gain.real, rel=1e-6)


def test_an_output_on_one_side_keeps_the_half_circuit() -> None:
    bands, devices = pair(output="n")
    circuit = upper_circuit(bands, devices)
    mirror = find_mirror(circuit)
    assert mirror is not None
    assert "n" in mirror.image
    assert half_circuit(circuit, mirror).response == near(circuit.response)


@pytest.mark.parametrize(
    ("drive", "right"),
    [(0.0, 0.04), (0.5, 0.04), (-0.5, 0.0404)],
    ids=["driven on one side", "driven in phase", "halves that differ by 1 %"],
)
def test_other_circuits_are_no_half_circuits(drive: float, right: float) -> None:
    assert find_mirror(upper_circuit(*pair(drive=drive, right=right))) is None


def test_what_crosses_to_another_node_than_its_image_forbids_halves() -> None:
    """Neutralisation: a capacitance from each base to the other side's collector."""
    crossed = (capacitance("CN1", "bp", "n", 1e-12), capacitance("CN2", "bn", "p", 1e-12))
    assert find_mirror(upper_circuit(*pair(*crossed))) is None


def test_images_name_the_nodes_of_the_network() -> None:
    found = images(signal_nodes(*pair()))
    assert found["Qp'b"] == "Qn'b"
    assert found["n"] == "p"


def floating() -> tuple[Bands, tuple[Device, ...]]:
    """The same pair between the ends of one floating source of 1 V, with 47 kohm from each base to ground."""
    devices = tuple(
        bipolar(f"Q{side}", (side, f"b{side}", f"e{side}"), r_b=100.0, c_pi=20e-12, c_mu=1e-12) for side in ("p", "n")
    )
    parts = [voltage_source("VIN", "sp", "sn", 1.0)]
    for side in ("p", "n"):
        parts += [
            resistance(f"RS{side}", f"s{side}", f"b{side}", 500.0),
            resistance(f"RB{side}", f"b{side}", "0", 47e3),
        ]
        parts += [resistance(f"RC{side}", side, "0", 5e3), resistance(f"RE{side}", f"e{side}", "t", 47.0)]
        parts += [capacitance(f"CL{side}", side, "0", 5e-12)]
    parts += [resistance("RT", "t", "0", 5e3), *(part for device in devices for part in device.parts)]
    return bands_of(Network.from_parts(parts, output=Port("p", "n"))), devices


def test_a_floating_source_drives_two_halves_with_half_of_it_each() -> None:
    bands, devices = floating()
    mirror = find_mirror(upper_circuit(bands, devices))
    assert mirror is not None
    assert mirror.axis == {"t", "sp"}
    rows = stage_rows(bands, devices)
    assert rows[0].gain_hand == near(rows[0].gain_exact, rel=1e-6)
    assert math.prod(row.gain_exact or math.nan for row in rows) == near(bands.midband.gain.real)
    first = next(row for row in signal_nodes(bands, devices) if row.name == "bp")
    # the base sees R_S to the source's middle, which rests
    assert "RSp" in first.lines[0].resistance.text
    assert first.resistance_hand_ohm < 600.0


def test_drives_of_different_size_have_no_common_amplitude() -> None:
    assert drive_of_halves(pair()[0].network) == 0.5
    assert drive_of_halves(floating()[0].network) == 0.5
    assert drive_of_halves(pair(drive=-0.4)[0].network) is None
