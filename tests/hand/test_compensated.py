"""The compensated stage is found among the parts, whatever they are called, and left alone where there is none."""

from __future__ import annotations

import math

import pytest
from msgspec.structs import replace

from cells import bands_of, bipolar, board, near
from compensated import TwoStages, hertz, network_of
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, transconductance, voltage_source
from tauledger.hand.compensated import CompensatedStage, dominant_hz, find_compensated_stage
from tauledger.hand.equivalent import EquivalentCircuit, upper_circuit
from tauledger.hand.roots import ExactRoot, HandRoot, belonging, hand_roots
from tauledger.network.assemble import Network
from tauledger.network.poles import find_poles


def circuit_of(network: Network, devices: tuple[Device, ...] = ()) -> EquivalentCircuit:
    return upper_circuit(bands_of(network), devices)


def stage_of(network: Network, devices: tuple[Device, ...] = ()) -> CompensatedStage | None:
    circuit = circuit_of(network, devices)
    return find_compensated_stage(circuit, {}, circuit.response)


ONE = TwoStages()


def test_capacitor_across_an_inverting_stage_is_its_compensation() -> None:
    stage = stage_of(network_of(ONE))
    assert stage is not None
    assert (stage.input_name, stage.output_name, stage.owners) == ("x", "out", ("K5",))
    assert (stage.capacitors, stage.first, stage.resistor) == (("K7",), "K2", "")
    figures = (stage.gm_1, stage.r_1, stage.c_1, stage.gm_2, stage.c_l, stage.c_c, stage.a_2)
    assert figures == near((ONE.gm_1, ONE.r_1, ONE.c_1, ONE.gm_2, ONE.c_l, ONE.c_c, ONE.a_2), rel=1e-9)
    assert stage.r_z == 0.0
    assert stage.to_output == near(1.0, rel=1e-9)


@pytest.mark.parametrize("at_output", [False, True])
def test_a_resistor_in_series_on_either_side_belongs_to_it(at_output: bool) -> None:
    stage = stage_of(network_of(replace(ONE, r_z=500.0), at_output=at_output))
    assert stage is not None
    assert (stage.capacitors, stage.resistor) == (("K7",), "K8")
    assert (stage.c_c, stage.r_z, stage.c_direct) == near((ONE.c_c, 500.0, 0.0), rel=1e-9)


def test_what_bridges_the_transistor_itself_counts_beside_a_series_branch() -> None:
    own = capacitance("K10", "x", "out", 0.1e-12)
    stage = stage_of(network_of(replace(ONE, r_z=500.0), own))
    assert stage is not None
    assert (stage.c_c, stage.c_direct, stage.across) == near((2e-12, 0.1e-12, 2.1e-12), rel=1e-9)
    straight = stage_of(network_of(ONE, own))
    assert straight is not None
    assert (straight.capacitors, straight.c_c) == (("K7", "K10"), near(2.1e-12, rel=1e-9))


def test_what_hangs_between_resistor_and_capacitor_ends_the_series() -> None:
    beside = replace(ONE, r_z=500.0)
    strayed = stage_of(network_of(beside, capacitance("K10", "m", "0", 0.05 * ONE.c_c)))
    assert strayed is not None
    assert strayed.resistor == "K8"
    assert stage_of(network_of(beside, capacitance("K10", "m", "0", 0.5 * ONE.c_c))) is None
    assert stage_of(network_of(beside, resistance("K10", "m", "0", 1e6))) is None


def test_a_stage_that_does_not_invert_or_has_no_gain_is_none() -> None:
    upright = [
        replace(part, value=-part.value) if part.name == "K5" else part
        for part in network_of(replace(ONE, c_c=1e-15)).parts
    ]
    assert stage_of(Network.from_parts(upright, output=Port("out"))) is None
    assert stage_of(network_of(replace(ONE, r_2=1000.0))) is None
    assert stage_of(network_of(replace(ONE, r_2=2000.0))) is not None


def test_a_bridged_stage_beside_the_signal_path_is_none() -> None:
    parts = [
        *network_of(ONE).parts,
        transconductance("K20", ("far", "0"), ("out", "0"), 1e-3),
        resistance("K21", "far", "0", 50e3),
        capacitance("K22", "out", "far", 1e-9),
        resistance("K23", "in2", "s", 10.0),
    ]
    stage = stage_of(Network.from_parts(parts, output=Port("out")))
    assert stage is not None
    assert stage.owners == ("K5",)


def test_a_follower_before_the_inverting_transistor_is_part_of_the_stage() -> None:
    """C_c from the collector of the second to the base of the first, as general-purpose amplifiers have it."""
    follower = bipolar("QF", ("0", "x", "y"), gm=0.4e-3, beta=200.0, r_o=1e6)
    second = bipolar("QS", ("out", "y", "0"), gm=8e-3, beta=200.0, r_o=100e3)
    bands, devices = board(
        transconductance("G1", ("x", "0"), ("s", "0"), 0.2e-3),
        resistance("R1", "x", "0", 1e6),
        follower,
        resistance("RE", "y", "0", 50e3),
        second,
        resistance("R2", "out", "0", 50e3),
        capacitance("CX", "x", "out", 30e-12),
        capacitance("CL", "out", "0", 30e-12),
    )
    circuit = upper_circuit(bands, devices)
    stage = find_compensated_stage(circuit, {}, circuit.response)
    assert stage is not None
    assert (stage.input_name, stage.owners, stage.capacitors) == ("x", ("QF", "QS"), ("CX",))
    # what is left of 8 mS behind the follower
    assert 0.8 * 8e-3 < stage.gm_2 < 8e-3
    first = find_poles(bands.network).poles[0]
    assert dominant_hz(stage) == near(hertz(abs(first.s)), rel=0.01)


def test_inner_nodes_of_a_transistor_are_taken_with_the_outer_ones() -> None:
    second = bipolar(
        "QS", ("out", "x", "0"), gm=4e-3, beta=200.0, r_o=100e3, r_b=200.0, r_c=20.0, c_mu=0.3e-12, c_pi=2e-12
    )
    bands, devices = board(
        transconductance("G1", ("x", "0"), ("s", "0"), 0.2e-3),
        resistance("R1", "x", "0", 1e6),
        second,
        resistance("R2", "out", "0", 50e3),
        capacitance("CX", "x", "out", 3e-12),
        capacitance("CL", "out", "0", 5e-12),
    )
    circuit = upper_circuit(bands, devices)
    stage = find_compensated_stage(circuit, {}, circuit.response)
    assert stage is not None
    assert (stage.input_name, stage.output_name) == ("x", "out")
    assert stage.capacitors == ("CX", "QS.c_mu")
    assert (stage.c_c, stage.c_1, stage.c_l) == near((3.3e-12, 2e-12, 5e-12), rel=1e-9)


def roots_of(network: Network) -> tuple[HandRoot, ...]:
    circuit = circuit_of(network)
    return hand_roots(circuit, find_compensated_stage(circuit, {}, circuit.response))


def exact_of(network: Network) -> list[ExactRoot]:
    found = find_poles(network)
    return [
        *(ExactRoot("pole", pole.s, pole.paired) for pole in found.poles),
        *(ExactRoot("zero", zero.s, zero.paired) for zero in found.zeros),
    ]


def test_every_formula_belongs_to_its_own_root() -> None:
    network = network_of(replace(ONE, r_z=700.0, c_1=0.1e-12))
    exact, by_hand = exact_of(network), roots_of(network)
    names = {k: [one.formula.name for one in found] for k, found in belonging(exact, by_hand).items()}
    assert names == {
        0: ["dominant pole"],
        1: ["second pole"],
        2: ["third pole"],
        3: ["zero of the nulling resistor"],
    }


def test_a_formula_that_misses_by_a_half_belongs_to_none() -> None:
    by_hand = roots_of(network_of(ONE))
    second = next(one for one in by_hand if one.formula.name == "second pole")
    near_by = ExactRoot("pole", complex(-2.0 * math.pi * second.hz * 1.4), False)
    far = ExactRoot("pole", complex(-2.0 * math.pi * second.hz * 1.6), False)
    assert belonging([near_by], by_hand)[0] == (second,)
    assert belonging([far], by_hand) == {}


def test_a_zero_on_the_other_side_of_the_axis_is_another_one() -> None:
    by_hand = [one for one in roots_of(network_of(ONE)) if one.kind == "zero"]
    (zero,) = by_hand
    assert zero.hz > 0.0
    assert belonging([ExactRoot("zero", complex(2.0 * math.pi * zero.hz), False)], by_hand) == {0: (zero,)}
    assert belonging([ExactRoot("zero", complex(-2.0 * math.pi * zero.hz), False)], by_hand) == {}


def test_two_poles_by_hand_belong_to_a_complex_pair_by_their_mean() -> None:
    by_hand = roots_of(network_of(ONE))
    poles = tuple(one for one in by_hand if one.kind == "pole")
    omega = 2.0 * math.pi * math.sqrt(poles[0].hz * poles[1].hz)
    pair = ExactRoot("pole", omega * complex(-0.6, 0.8), True)
    assert belonging([pair], by_hand) == {0: poles}


def test_mirror_and_follower_are_seen_and_a_bias_line_is_not() -> None:
    parts: list[Part] = [
        voltage_source("VS", "s", "0", 1.0),
        transconductance("G1", ("m", "0"), ("s", "0"), 0.5e-3),
        transconductance("G2", ("0", "x"), ("s", "0"), 0.5e-3),
        transconductance("G3", ("m", "0"), ("m", "0"), 1e-3),
        capacitance("CM", "m", "0", 80e-15),
        transconductance("G4", ("x", "0"), ("m", "0"), 1e-3),
        resistance("RX", "x", "0", 40e3),
        transconductance("G5", ("0", "out"), ("x", "out"), 2e-3),
        capacitance("CG", "x", "out", 0.2e-12),
        resistance("RO", "out", "0", 2e3),
        capacitance("CL", "out", "0", 60e-15),
        transconductance("G6", ("bias", "0"), ("bias", "0"), 1e-3),
        capacitance("CB", "bias", "0", 80e-15),
        transconductance("G7", ("out", "0"), ("bias", "0"), 1e-3),
    ]
    found = {one.formula.name: one for one in roots_of(Network.from_parts(parts, output=Port("out")))}
    assert set(found) == {"mirror pole", "mirror zero", "zero of a follower"}
    assert "G3" in found["mirror pole"].values
    assert found["mirror pole"].hz == near(1e-3 / (2.0 * math.pi * 80e-15), rel=1e-9)
    assert found["zero of a follower"].hz == near(-2e-3 / (2.0 * math.pi * 0.2e-12), rel=1e-9)
