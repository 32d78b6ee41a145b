"""Notes: what the reader must know about the numbers."""

from __future__ import annotations

import numpy as np
import pytest
from msgspec.structs import replace

import boards
from by_algebra import evidence
from tauledger.causes import notes
from tauledger.causes.catalogue import find_notes
from tauledger.causes.evidence import Evidence
from tauledger.circuit import Port
from tauledger.devices.family import Device, Terminal, Transconductor
from tauledger.devices.parts import Part, capacitance, inductance, mutual_inductance, resistance, voltage_source
from tauledger.network.assemble import Network
from tauledger.quantity import percent


def ids(found: Evidence) -> list[str]:
    return [note.note for note in find_notes(found)]


def transistor(base: str, inner: str, *, without_charge: bool = False) -> Device:
    return Device(
        name="Q1",
        kind="npn",
        region="active",
        figures=(),
        terminals=(Terminal("collector", "out", "out"), Terminal("base", base, inner), Terminal("emitter", "0", "0")),
        cell=Transconductor("Q1", inner, "0", "out", 0.04, 2.5e3),
        parts=(),
        without_charge=without_charge,
    )


def stage(*, source: float | None = 600.0, r_b: float = 45.0) -> Network:
    """A stage with base resistance, driven through `source` ohm or straight."""
    base = "b" if source is not None else "s"
    return boards.driven(
        [resistance("RS", "s", "b", source)] if source is not None else [],
        resistance("Q1", base, "Q1'b", r_b, "r_b"),
        boards.stage("Q1", "Q1'b", "out", "0", 0.04, r_pi=2.5e3, c_pi=50e-12, c_mu=2e-12),
        resistance("RC", "out", "0", 2e3),
    )


def test_an_ordinary_stage_has_no_notes() -> None:
    assert ids(evidence(stage(), devices=(transistor("b", "Q1'b"),))) == []


def test_what_a_family_says_of_its_device_is_told() -> None:
    said = replace(transistor("b", "Q1'b"), remarks=("Q1 is late",))
    note = notes.as_rebuilt(evidence(stage(), devices=(said,)))
    assert note is not None
    assert (note.where, note.says) == ("Q1", "Q1 is late")
    assert notes.as_rebuilt(evidence(stage(), devices=(transistor("b", "Q1'b"),))) is None


def test_coupled_inductors_are_called_coupled_and_not_tuned() -> None:
    network = boards.driven(
        [resistance("RS", "s", "b", 50.0)],
        [inductance("L1", "b", "0", 1e-3), inductance("L2", "out", "0", 1e-3)],
        [mutual_inductance("K1", "L1", "L2", ("b", "0", "out", "0"), 0.9e-3)],
        resistance("RL", "out", "0", 50.0),
    )
    found = evidence(network)
    note = notes.coupled(found)
    assert note is not None
    assert note.where == "L1, L2"
    assert notes.tuned(found) is None
    assert notes.coupled(evidence(stage())) is None


def test_ideal_drive_names_the_base_resistance_that_is_left() -> None:
    note = notes.ideal_drive(evidence(stage(source=None), devices=(transistor("s", "Q1'b"),)))
    assert note is not None
    assert note.where == "base of Q1 (s)"
    assert note.says.startswith(
        "VS drives the base of Q1 (s) with no resistance in between but the device's own 45.0 Ω"
    )


def test_a_coupling_capacitor_is_no_source_resistance() -> None:
    network = stage(source=600.0)
    parts = [part for part in network.parts if part.owner != "RS"]
    coupled = Network.from_parts([*parts, capacitance("CC", "s", "b", 1e-5)], output=network.port)
    assert ids(evidence(coupled, devices=(transistor("b", "Q1'b"),))) == ["ideal-drive"]


def test_one_ohm_of_source_resistance_is_a_source_resistance() -> None:
    assert notes.ideal_drive(evidence(stage(source=1.0), devices=(transistor("b", "Q1'b"),))) is None


def test_ideal_drive_is_seen_without_devices_where_there_is_charge() -> None:
    charged = boards.driven(
        boards.stage("M1", "s", "out", "0", 1e-3, c_pi=1e-12),
        resistance("RL", "out", "0", 1e3),
        capacitance("CL", "out", "0", 1e-12),
    )
    assert ids(evidence(charged)) == ["ideal-drive"]
    assert ids(evidence(boards.bypassed_source_without_coupling())) == []


def test_a_silent_source_is_not_a_drive() -> None:
    network = stage()
    silent = Network.from_parts(
        [*network.parts, replace(network.part("VS"), owner="VB", nodes=("b2", "0"), amplitude=0.0)],
        output=network.port,
    )
    found = evidence(
        Network.from_parts([*silent.parts, *boards.stage("Q2", "b2", "out", "0", 1e-3)], output=silent.port),
        devices=(replace(transistor("b2", "b2"), name="Q2"),),
    )
    assert notes.ideal_drive(found) is None


def test_a_model_without_charge_is_named() -> None:
    found = evidence(stage(), devices=(transistor("b", "Q1'b", without_charge=True),))
    note = notes.model_without_charge(found)
    assert note is not None
    assert note.where == "Q1"
    assert "f_H leaves out the device" in note.says


def test_stepped_operating_point_is_told() -> None:
    assert ids(evidence(stage(), devices=(transistor("b", "Q1'b"),), stepped=True)) == ["stepped-operating-point"]


def test_no_plateau_tells_what_the_couplings_cost() -> None:
    """One section each side, f_H/f_L = 10: |H| at its peak is 1/(1 + 1/10), 9.1 % below the ideal gain."""
    found = evidence(boards.coupled_stage(10.0))
    note = notes.no_plateau(found)
    assert note is not None
    assert "|H| at 3.16 kHz (-9.1 % against all couplings short" in note.says
    assert found.upper.steps == ()
    assert notes.no_plateau(evidence(boards.coupled_stage(1000.0))) is None


def test_edges_30_to_1_have_a_plateau_but_no_hand_tables() -> None:
    """The gain with ideal couplings is 3.3 % above the real one: more than the 2 % that hand tables may miss."""
    assert ids(evidence(boards.coupled_stage(30.0))) == ["hand-withheld"]
    assert ids(evidence(boards.coupled_stage(100.0))) == []


def test_capacitors_near_the_middle_are_neither_short_nor_open() -> None:
    """f_H/f_L = 4: x = 2 and ½, r = x/√(1 + x²) = 0.89 and 0.45."""
    note = notes.neither_short_nor_open(evidence(boards.coupled_stage(4.0)))
    assert note is not None
    assert note.where == "CC, CL"
    assert "(0.89, 0.45 on a scale" in note.says


def test_a_tank_is_tuned() -> None:
    note = notes.tuned(evidence(boards.tuned_load()))
    assert note is not None
    assert (note.where, "in resonance at 3.16 MHz" in note.says) == ("L1, CT", True)
    assert notes.tuned(evidence(boards.cascode())) is None


def test_levelling_off_is_told_with_its_level() -> None:
    """Gray, Hurst, Lewis and Meyer, 5th ed. (2009), sec. 7.2.3.1: falls to R_L/(R_L + R_S) = 0.909 of the source."""
    note = notes.levels_off_above(evidence(boards.emitter_follower()))
    assert note is not None
    assert (note.note, note.where) == ("levels-off", "f_H")
    assert "-0.71 dB" in note.says
    assert notes.levels_off_above(evidence(boards.emitter_follower(c_mu=1e-12))) is None


def test_a_network_without_charge_does_not_level_off() -> None:
    """No open capacitance at all: nothing falls, nothing levels off."""
    assert notes.levels_off_above(evidence(boards.three_low_edges())) is None


def shelf(r_e: float) -> Network:
    """A bypassed source, g_m 2 mS: towards DC the gain falls by 1 + g_m·R."""
    return boards.driven(
        resistance("RS", "s", "g", 1e3),
        capacitance("CG", "g", "0", 1e-12),
        boards.stage("M1", "g", "out", "q", 2e-3),
        resistance("RQ", "q", "0", r_e),
        capacitance("CQ", "q", "0", 1e-4),
        resistance("RD", "out", "0", 5e3),
    )


def test_a_shelf_less_than_3_db_deep_levels_off_towards_dc() -> None:
    """Depth 1 + g_m·R = 1.3; the reference is put above the shelf, because of itself it would be the DC plateau."""
    found = evidence(shelf(150.0), at_hz=1e4)
    note = notes.levels_off_below(found)
    assert note is not None
    assert (note.where, "-2.3 dB" in note.says) == ("f_L", True)
    assert notes.levels_off_below(evidence(shelf(500.0), at_hz=1e4)) is None


def test_direct_coupling_is_not_levelling_off() -> None:
    assert notes.levels_off_below(evidence(boards.two_common_source_stages())) is None


def test_an_edge_on_a_shelf_is_ill_conditioned() -> None:
    """Depth 1 + g_m·R just above √2: |H| = H_mid·√((1 + x²)/(1 + x²·d²))… falls 3 dB only far down the shelf."""
    found = evidence(shelf(208.0))
    assert found.lower.slope is not None
    assert abs(found.lower.slope) < 0.2
    note = notes.ill_conditioned_below(found)
    assert note is not None
    assert (note.note, note.where) == ("ill-conditioned-edge", "f_L")
    assert "-6 dB is never reached" in note.says
    assert "no node limits it" in note.says
    assert notes.ill_conditioned_below(evidence(shelf(2000.0))) is None


def test_frequencies_around_an_ill_conditioned_edge_are_those_of_the_response() -> None:
    """One pole p and one zero z: 1 dB down where (1 + f²/z²)/(1 + f²/p²) = 10^(−0.1), with H(DC)/H_mid = z/p."""
    found = evidence(shelf(208.0))
    note = notes.ill_conditioned_below(found)
    assert note is not None
    zero = 1 / (2 * np.pi * 208.0 * 1e-4)
    pole = zero * (1 + 2e-3 * 208.0)
    level = 10**-0.1
    expected = np.sqrt((level * pole**2 - zero**2) / (1 - level))
    assert f"-1 dB is at {expected:.1f} Hz" in note.says


def test_ordinary_edges_are_well_conditioned() -> None:
    found = evidence(boards.three_low_edges())
    assert notes.ill_conditioned_below(found) is None
    assert notes.ill_conditioned_above(evidence(boards.cascode())) is None


def test_a_right_half_plane_pole_is_unstable() -> None:
    """A capacitor of 1.5 pF across a gain of +2: b1 = 10 kΩ·1 pF − 9 kΩ·1.5 pF < 0."""
    network = boards.gain_of_two()
    grown = [replace(part, value=1.5e-12) if part.owner == "Cf" else part for part in network.parts]
    found = evidence(Network.from_parts(grown, output=network.port))
    note = notes.unstable(found)
    assert note is not None
    assert ids(found)[0] == "unstable"
    assert found.upper.steps == ()
    assert notes.unstable(evidence(network)) is None


@pytest.mark.parametrize("board", [*boards.UPPER, *boards.LOWER], ids=lambda board: board.__name__)
def test_worked_examples_need_no_notes(board: boards.Board) -> None:
    assert ids(evidence(board())) == []


def ladder(*parts: Part) -> Network:
    """A voltage source VIN at node in, the parts, the output at node out."""
    return Network.from_parts([voltage_source("VIN", "in", "0", 1.0), *parts], output=Port("out", "0", "voltage"))


def test_a_peak_is_told_with_the_q_of_its_pair_and_the_overshoot_of_a_step() -> None:
    """Series R, L and C with Q = √(L/C)/R = 2: |H| peaks by Q/√(1 − 1/(4Q²)), a step by exp(−π/√(4Q² − 1)) = 44 %."""
    network = ladder(
        resistance("R1", "in", "m", 50.0), inductance("L1", "m", "out", 1e-6), capacitance("C1", "out", "0", 1e-10)
    )
    note = notes.peaking_above(evidence(network, at_hz=1e3))
    assert note is not None
    assert note.note == "peaking"
    assert "peaks 6.3 dB above mid-band" in note.says
    assert "Q = 2.00" in note.says
    assert "overshoots by 44 %" in note.says
    assert notes.peaking_above(evidence(boards.cascode())) is None


def test_the_overshoot_of_a_peak_that_zeros_lower_is_that_of_the_whole_response() -> None:
    """Series R, L with C and r across: H = (1 + s·r·C)/(1 + s·(R + r)·C + s²·L·C), its step response in closed form."""
    big, small, henry, farad = 20.0, 60.0, 1e-6, 1e-10
    network = ladder(
        resistance("R1", "in", "m", big),
        inductance("L1", "m", "out", henry),
        resistance("R2", "out", "x", small),
        capacitance("C1", "x", "0", farad),
    )
    note = notes.peaking_above(evidence(network, at_hz=1e3))
    assert note is not None
    zeta_omega, omega = (big + small) / (2.0 * henry), 1.0 / np.sqrt(henry * farad)
    damped = np.sqrt(omega**2 - zeta_omega**2)
    time = np.linspace(0.0, 20.0 / zeta_omega, 200_000)
    # 1 − e^(−σt)·(cos ωt + (σ/ω)·sin ωt) of the poles alone, and r·C times its derivative of the zero
    ringing = np.exp(-zeta_omega * time)
    poles_alone = 1.0 - ringing * (np.cos(damped * time) + zeta_omega / damped * np.sin(damped * time))
    of_zero = small * farad * omega**2 / damped * ringing * np.sin(damped * time)
    overshoot = percent(float((poles_alone + of_zero).max() - 1.0)).removeprefix("+")
    assert f"overshoots by {overshoot}" in note.says


def test_a_peak_of_a_band_that_does_not_reach_dc_has_no_overshoot_told() -> None:
    network = ladder(
        capacitance("C0", "in", "a", 1e-6),
        resistance("R1", "a", "m", 50.0),
        inductance("L1", "m", "out", 1e-6),
        capacitance("C1", "out", "0", 1e-10),
        resistance("R2", "out", "0", 1e4),
    )
    note = notes.peaking_above(evidence(network))
    assert note is not None
    assert "pair of poles" in note.says
    assert "overshoots" not in note.says


def test_what_comes_back_within_3_db_is_told() -> None:
    """A series L and C across the output short it at 1 MHz; far above, nothing loads it any more."""
    network = ladder(
        resistance("R1", "in", "out", 1e3),
        inductance("L1", "out", "m", 1e-3 / (2 * np.pi)),
        capacitance("C1", "m", "0", 1e-9 / (2 * np.pi)),
    )
    note = notes.further_crossings_above(evidence(network, at_hz=10.0))
    assert note is not None
    # |X| = R on both sides: f/f0 - f0/f = ±1, the golden ratio and its inverse
    assert note.says == "beyond f_H |H| comes back within 3 dB at 1.62 MHz: f_H is the first"
    assert notes.further_crossings_above(evidence(boards.cascode())) is None


def test_a_capacitor_of_which_more_raises_the_edge_is_told() -> None:
    """C1 across the upper arm of a divider brings a zero: −∂ln f_H/∂ln C1 is negative."""
    network = ladder(
        resistance("RS", "in", "a", 50.0),
        resistance("R1", "a", "out", 1e3),
        capacitance("C1", "a", "out", 30e-12),
        resistance("R2", "out", "0", 1e3),
        capacitance("C2", "out", "0", 100e-12),
    )
    found = evidence(network)
    note = notes.negative_share_above(found)
    assert note is not None
    assert (note.note, note.where) == ("negative-share", "f_H")
    assert note.says.startswith("C1 (")
    assert "adding capacitance there raises the edge" in note.says
    assert found.upper.hz is not None
    more = [replace(part, value=33e-12) if part.owner == "C1" else part for part in network.parts]
    raised = evidence(Network.from_parts(more, output=network.port)).upper.hz
    assert raised is not None
    assert raised > found.upper.hz
    assert notes.negative_share_above(evidence(boards.cascode())) is None
