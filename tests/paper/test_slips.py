"""Every known slip: a page that has it is told so, a near miss and a page that is right are not.

The figures are written down by the formula that the slip gives, never taken from the program.
"""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from msgspec.structs import replace

import boards
from cells import bands_of, bipolar, near
from tauledger.circuit import Port
from tauledger.devices.family import Device
from tauledger.devices.parts import Part, capacitance, resistance, voltage_source
from tauledger.engine.client import Engine
from tauledger.network.assemble import Network
from tauledger.paper.page import read_page
from tauledger.pipeline import review, review_network
from tauledger.record import PaperFigure

GM, BETA, R_O, R_B = 0.043, 220.0, 78e3, 120.0
RS, RB1, RB2, RC, RL, RE = 600.0, 47e3, 12e3, 3.9e3, 10e3, 100.0
C_PI, C_MU, C_SUB, C_L = 30e-12, 1.2e-12, 4e-12, 33e-12
R_PI = BETA / GM
VT = 8.617333262e-5 * 300.15

Circuit = tuple[Network, tuple[Device, ...]]


def parallel(*ohms: float) -> float:
    return 1.0 / math.fsum(1.0 / ohm for ohm in ohms)


def circuit(*parts: Part | Device) -> Circuit:
    devices = tuple(part for part in parts if isinstance(part, Device))
    flat = [voltage_source("VS", "s", "0", 1.0)]
    for part in parts:
        flat += part.parts if isinstance(part, Device) else [part]
    return Network.from_parts(flat, output=Port("out")), devices


def common_emitter(emitter: float = 0.0) -> Circuit:
    """Base divider, r_b, collector and load resistor, substrate and load capacitance; `emitter` unbypassed."""
    q = bipolar("Q1", ("out", "b", "e" if emitter else "0"), gm=GM, beta=BETA, r_o=R_O, r_b=R_B, c_pi=C_PI, c_mu=C_MU)
    q = replace(q, figures=(("i_c", GM * VT), ("gm", GM), ("r_pi", R_PI)))
    substrate = capacitance("Q1", "out", "0", C_SUB, "c_sub")
    return circuit(
        resistance("RS", "s", "b", RS),
        resistance("RB1", "b", "0", RB1),
        resistance("RB2", "b", "0", RB2),
        replace(q, parts=(*q.parts, substrate)),
        *([resistance("RE", "e", "0", emitter)] if emitter else []),
        resistance("RC", "out", "x", RC),
        voltage_source("VCC", "x", "0"),
        resistance("RL", "out", "0", RL),
        capacitance("CL", "out", "0", C_L),
    )


def follower() -> Circuit:
    q = bipolar("Q1", ("0", "b", "out"), gm=GM, beta=BETA, r_o=R_O, c_pi=C_PI, c_mu=C_MU)
    return circuit(resistance("RS", "s", "b", RS), q, resistance("RL", "out", "0", 1e3))


def published(network: Network) -> Circuit:
    return network, ()


def told(made: Circuit, figure: str) -> PaperFigure:
    network, devices = made
    (found,) = review_network(network, devices=devices, page=read_page(figure, "page.toml")).paper
    return found


def two_source_pairs() -> Network:
    """Boylestad and Nashelsky, Electronic Devices and Circuit Theory, high-frequency BJT example (from memory).

    R_s 1k, R1‖R2 8k, β·r_e 1.576k, R_C‖R_L 1.419k, C_be 36p, C_bc 4p, wiring 6p and 8p, C_ce 1p.
    """
    r_e = 15.76
    return boards.driven(
        resistance("RS", "s", "b", 1e3),
        resistance("R1", "b", "0", 40e3),
        resistance("R2", "b", "0", 10e3),
        boards.stage("Q1", "b", "out", "0", 1 / r_e, r_pi=100 * r_e, c_pi=36e-12, c_mu=4e-12),
        capacitance("Cwi", "b", "0", 6e-12),
        resistance("RC", "out", "0", 4e3),
        resistance("RL", "out", "0", 2.2e3),
        capacitance("Cce", "out", "0", 1e-12),
        capacitance("Cwo", "out", "0", 8e-12),
    )


def degenerated_source() -> Network:
    """Formulas after Razavi, Design of Analog CMOS Integrated Circuits, 2nd ed., ch. 6: R_G 5k, R_S 500, R_D 10k."""
    return boards.driven(
        resistance("RG", "s", "g", 5e3),
        boards.stage("M1", "g", "out", "x", 4e-3, c_pi=100e-15, c_mu=20e-15),
        resistance("RS", "x", "0", 500.0),
        resistance("RD", "out", "0", 10e3),
        capacitance("CL", "out", "0", 30e-15),
    )


RC1, R_B2, RPI2 = 2.2e3, 10.0, 3.4e3


def two_stages() -> Circuit:
    """A common-emitter stage whose collector is the base of the next, of which r_π 3.4k loads 2.2k."""
    first = bipolar("Q1", ("c1", "b", "0"), gm=GM, beta=BETA, r_o=R_O)
    second = bipolar("Q2", ("out", "c1", "0"), gm=0.05, beta=0.05 * RPI2, r_o=40e3, r_b=R_B2, c_pi=C_PI, c_mu=C_MU)
    return circuit(
        resistance("RS", "s", "b", RS),
        first,
        resistance("RC1", "c1", "0", RC1),
        second,
        resistance("RC", "out", "0", RC),
        capacitance("CL", "out", "0", C_L),
    )


R_SOURCE = parallel(RS, RB1, RB2)
R_OUT = parallel(RC, RL, R_O)
A = GM * R_OUT
C_IN = C_PI + C_MU * (1.0 + A)
R_LOAD = parallel(RC, RL)
DIVIDED = R_PI / (R_PI + R_B + R_SOURCE) * parallel(RB1, RB2) / (parallel(RB1, RB2) + RS)
LOADED = parallel(RC1, R_O, R_B2 + RPI2)
TWO_GAINS = R_PI / (R_PI + RS) * GM * LOADED * RPI2 / (R_B2 + RPI2) * 0.05 * parallel(RC, 40e3)

CASES = [
    ("r_o-forgotten", common_emitter(), "[node.out]\nresistance = ", parallel(RC, RL)),
    ("load-forgotten", common_emitter(), "[node.out]\nresistance = ", parallel(RC, R_O)),
    ("r_o-and-load-forgotten", common_emitter(), "[node.out]\nresistance = ", RC),
    ("bias-twice", common_emitter(), "[node.b]\nresistance = ", parallel(R_B + parallel(R_SOURCE, RB1, RB2), R_PI)),
    ("r_b-forgotten", common_emitter(), "[node.b]\nresistance = ", parallel(R_SOURCE, R_PI)),
    ("thermal-voltage-25", common_emitter(), "[device.q1]\ngm = ", GM * VT / 25e-3),
    ("thermal-voltage-25", common_emitter(), "[device.Q1]\nr_pi = ", R_PI * 25e-3 / VT),
    ("gm-for-G_m", common_emitter(RE), "[node.b]\nmiller_gain = ", A),
    ("overall-gain", published(boards.common_source_100k()), "[node.g]\nmiller_gain = ", 6.994),
    ("r_o-forgotten", published(boards.common_source_100k()), "[node.g]\nmiller_gain = ", 7.5),
    ("A-for-1-plus-A", published(boards.common_source_100k()), "[node.g]\ncapacitance = ", 1e-12 + 0.4e-12 * 50 / 7),
    ("c_mu-not-multiplied", common_emitter(), "[node.b]\ncapacitance = ", C_PI + C_MU),
    ("c_pi-not-bootstrapped", follower(), "[node.b]\ncapacitance = ", C_PI + C_MU),
    ("substrate-left-out", common_emitter(), "[node.out]\ncapacitance = ", C_L + C_MU * (1 + 1 / A)),
    ("load-capacitance-left-out", common_emitter(), "[node.out]\ncapacitance = ", C_SUB + C_MU * (1 + 1 / A)),
    (
        "parallel-for-series",
        common_emitter(),
        "[node.b]\nresistance = ",
        parallel(R_B, R_SOURCE, R_PI),
    ),
    ("input-resistance-left-out", two_stages(), "[node.c1]\nresistance = ", parallel(RC1, R_O)),
    ("input-resistance-left-out", two_stages(), "gain = ", TWO_GAINS * parallel(RC1, R_O) / LOADED),
    ("overall-gain", common_emitter(), "[node.b]\ncapacitance = ", C_PI + C_MU * (1 + A * DIVIDED)),
    ("gm-for-G_m", common_emitter(RE), "[node.b]\ncapacitance = ", C_PI + C_MU * (1 + A)),
    ("gm-for-G_m", common_emitter(RE), "[node.b]\ncapacitance = ", C_PI / (1 + GM * RE) + C_MU * (1 + GM * R_LOAD)),
    (
        "A-for-1-plus-A",
        common_emitter(2e3),
        "[node.b]\ncapacitance = ",
        C_PI / (1 + GM * 2e3) + C_MU * GM * R_LOAD / (1 + GM * 2e3),
    ),
    ("parallel-for-series", common_emitter(), "[node.b]\nresistance = ", R_B + RS + parallel(RB1, RB2) + R_PI),
    ("parallel-for-series", common_emitter(), "[node.out]\nresistance = ", parallel(RC + RL, R_O)),
    # 738 kHz in older editions: R_s ‖ R1 ‖ R2 ‖ R_i with R1 ‖ R2 in R_i already
    ("bias-twice", published(two_source_pairs()), "f_high = ", 738.24e3),
    # gm·R_D in place of G_m·R_D and C_gs not bootstrapped: 34.6 MHz where the stage has 77.3
    ("gm-for-G_m", published(degenerated_source()), "f_high = ", 34.6e6),
]


@pytest.mark.parametrize(("slip", "made", "page", "value"), CASES, ids=[f"{c[0]} {c[2].split()[0]}" for c in CASES])
def test_a_page_that_has_the_slip_is_told_so(slip: str, made: Circuit, page: str, value: float) -> None:
    found = told(made, f"{page}{value!r}\n")
    assert found.slip == slip, found.says
    assert found.off is not None
    assert abs(found.off) > 0.02
    assert found.slip_gives is not None
    assert abs(found.slip_gives) == near(value, rel=0.01)
    assert "yours within" in found.says


@pytest.mark.parametrize(("slip", "made", "page", "value"), CASES, ids=[f"{c[0]} {c[2].split()[0]}" for c in CASES])
def test_a_near_miss_is_not_that_slip(slip: str, made: Circuit, page: str, value: float) -> None:
    """Five per cent beyond what the slip gives, away from the right value."""
    right = told(made, f"{page}{value!r}\n").exact
    assert right is not None
    away = 1.05 if value > abs(right) else 0.95
    assert told(made, f"{page}{value * away!r}\n").slip != slip


def test_two_pi_is_found_in_a_frequency_and_in_a_time_constant() -> None:
    network, devices = common_emitter()
    exact = review_network(network, devices=devices).f_high
    assert exact is not None
    assert exact.exact_hz is not None
    assert told(common_emitter(), f"f_high = {2 * math.pi * exact.exact_hz!r}\n").slip == "two-pi"
    tau = parallel(R_B + R_SOURCE, R_PI) * C_IN
    assert told(common_emitter(), f"[node.b]\ntime_constant = {tau / (2 * math.pi)!r}\n").slip == "two-pi"


def test_a_thermal_voltage_of_26_mv_shows_where_it_is_far_from_the_true_one() -> None:
    """At 27 °C V_T is 25.86 mV, 0.5 % from 26: nothing to find. At 125 °C it is 34.3 mV."""
    made = common_emitter()
    assert told(made, f"[device.Q1]\ngm = {GM * VT / 26e-3!r}\n").slip == ""


def test_an_edge_that_a_classical_method_gives_is_no_slip() -> None:
    found = told(published(two_source_pairs()), "f_high = 689.28e3\n")
    assert (found.slip, found.slip_gives) == ("", None)
    assert found.says.startswith("no slip: it is the lowest node alone")
    assert found.off == near(689.28e3 / 643.13e3 - 1, rel=0.01)


def balanced() -> Circuit:
    """A differential pair with 47 ohm in each emitter, 5.6k in each collector and 20k between the collectors."""
    sides = []
    for side in ("p", "n"):
        sides += [
            voltage_source(f"V{side}", f"s{side}", "0", 0.5 if side == "p" else -0.5),
            resistance(f"RS{side}", f"s{side}", f"b{side}", 300.0),
            resistance(f"RC{side}", side, "0", 5.6e3),
            resistance(f"RE{side}", f"e{side}", "t", 47.0),
            capacitance(f"CL{side}", side, "0", 12e-12),
        ]
    devices = tuple(
        bipolar(f"Q{side}", (side, f"b{side}", f"e{side}"), gm=0.0385, r_o=1e9, c_pi=28e-12, c_mu=1.6e-12)
        for side in ("p", "n")
    )
    parts = [*sides, resistance("RT", "t", "0", 5.6e3), resistance("RX", "p", "n", 20e3)]
    parts += [part for device in devices for part in device.parts]
    return Network.from_parts(parts, output=Port("p", "n")), devices


def test_a_half_circuit_that_was_none_is_told() -> None:
    """R_C ‖ R_X/2 is right; with the other collector at rest paper has R_C ‖ (R_X + R_C)."""
    assert told(balanced(), f"[node.p]\nresistance = {parallel(5.6e3, 10e3)!r}\n").says == "agrees within 2 %"
    found = told(balanced(), f"[node.n]\nresistance = {parallel(5.6e3, 25.6e3)!r}\n")
    assert found.slip == "half-circuit-ignored"
    assert told(balanced(), f"[node.p]\nresistance = {1.05 * parallel(5.6e3, 25.6e3)!r}\n").slip == ""


RIGHT = {
    "[node.b]\nresistance = ": parallel(R_B + R_SOURCE, R_PI),
    "[node.b]\ncapacitance = ": C_IN,
    "[node.b]\ntime_constant = ": parallel(R_B + R_SOURCE, R_PI) * C_IN,
    "[node.b]\nmiller_gain = ": -A,
    "[node.out]\nresistance = ": R_OUT,
    "[device.Q1]\ngm = ": GM,
    "gain = ": -A * R_PI / (R_PI + R_B + R_SOURCE) * parallel(RB1, RB2) / (parallel(RB1, RB2) + RS),
}


@pytest.mark.parametrize("page", RIGHT)
def test_a_page_that_is_right_names_none(page: str) -> None:
    found = told(common_emitter(), f"{page}{RIGHT[page]!r}\n")
    assert (found.slip, found.slip_gives, found.says) == ("", None, "agrees within 2 %")
    assert found.off == pytest.approx(0.0, abs=0.01)


def behind_r_b() -> Circuit:
    """C_μ in two parts: one inside r_b, one outside (C_bx), as the engine has it."""
    q = bipolar("Q1", ("out", "b", "0"), gm=GM, beta=BETA, r_o=R_O, r_b=R_B, c_pi=C_PI, c_mu=C_MU)
    return circuit(
        resistance("RS", "s", "b", RS), q, resistance("RC", "out", "0", RC), capacitance("CBX", "b", "out", C_MU)
    )


def test_the_plain_sum_of_the_parts_is_a_right_capacitance() -> None:
    """At the outer base R is R_S ‖ (r_b + r_π), inside it (R_S + r_b) ‖ r_π, 14 % more; K is the smaller inside."""
    gain = GM * parallel(RC, R_O)
    plain = C_PI + C_MU * (1 + gain) + C_MU * (1 + gain * R_PI / (R_PI + R_B))
    found = told(behind_r_b(), f"[node.b]\ncapacitance = {plain!r}\n")
    assert (found.slip, found.slip_gives) == ("", None)
    assert found.says.startswith("no slip: it is the plain sum of the parts")
    assert found.off is not None
    assert found.off > 0.03
    assert found.exact is not None
    assert told(behind_r_b(), f"[node.b]\ncapacitance = {found.exact!r}\n").says == "agrees within 2 %"
    assert not told(behind_r_b(), f"[node.b]\ncapacitance = {1.04 * plain!r}\n").says.startswith("no slip")


def test_the_miller_gain_of_a_degenerated_base_is_that_to_the_collector() -> None:
    found = told(common_emitter(RE), f"[node.b]\nmiller_gain = {-GM * R_LOAD / (1 + GM * RE)!r}\n")
    assert "across Q1.c_mu" in found.title
    assert found.says == "agrees within 2 %"
    other = told(common_emitter(RE), f"[node.b]\nmiller_gain = {1 - 1 / (1 + GM * RE)!r}\n")
    assert other.says.startswith("no slip: it is the gain across Q1.c_pi")


def board(tmp_path: Path, name: str, edit: tuple[str, str] = ("", "")) -> Path:
    text = (Path(__file__).parents[2] / "fixtures" / name).read_text(encoding="utf-8")
    path = tmp_path / name
    path.write_text(text.replace(*edit) if edit[0] else text, encoding="utf-8")
    return path


def test_no_resistance_inside_a_device_is_taken_in_series(tmp_path: Path, engine: Engine) -> None:
    """RC ‖ r_o without the load is 3.714k; R_L + r_c in series is no way to it. R3 + RL without r_o's 77k is 11.8k."""
    path = board(tmp_path, "echo_preamp.cir")
    page = "[node.out]\nresistance = {}\n[node.b]\nresistance = {}\n"
    first, all_ = review(path, engine=engine, page=read_page(page.format('"3.712k"', '"15.2k"'), "p")).paper
    second, one = review(path, engine=engine, page=read_page(page.format('"11.78k"', '"3.38k"'), "p")).paper
    assert (first.slip, second.slip) == ("load-forgotten", "parallel-for-series")
    assert (all_.slip, one.slip) == ("parallel-for-series", "parallel-for-series")
    assert "r_c" not in first.says + second.says
    assert one.says.startswith("RS and (R2 ‖ R1) in series")


def test_all_nodes_together_are_no_single_method(tmp_path: Path, engine: Engine) -> None:
    path = board(tmp_path, "gain_pair.cir")
    (found,) = review(path, engine=engine, page=read_page('f_high = "319.9k"\n', "p")).paper
    assert found.says.startswith("no slip: it is all nodes together, ")


def test_26_mv_is_named_in_the_cold_where_v_t_is_20_mv(tmp_path: Path, engine: Engine) -> None:
    path = board(tmp_path, "echo_preamp.cir", (".end\n", ".temp -40\n.end\n"))
    (device,) = review(path, engine=engine).devices
    ampere = next(figure.value for figure in device.figures if figure.symbol == "i_c")
    (found,) = review(path, engine=engine, page=read_page(f"[device.Q1]\ngm = {ampere / 26e-3!r}\n", "p")).paper
    assert found.slip == "thermal-voltage-26"


def test_a_substrate_capacitance_left_out_of_the_netlists_transistor(tmp_path: Path, engine: Engine) -> None:
    """8 pF at the collector beside 34.7: 33 pF of load and C_μ + C_bx, 1.71 pF, times 1.01."""
    path = board(tmp_path, "echo_preamp.cir", ("cjs=0", "cjs=8p"))
    page = '[node.out]\ncapacitance = "{}"\n'
    (found,) = review(path, engine=engine, page=read_page(page.format("34.72p"), "p")).paper
    (near_miss,) = review(path, engine=engine, page=read_page(page.format("36.5p"), "p")).paper
    assert (found.slip, near_miss.slip) == ("substrate-left-out", "")


def test_a_figure_that_nothing_gives_is_said_to_be_unexplained() -> None:
    found = told(common_emitter(), "[node.b]\ncapacitance = 500e-12\n")
    assert (found.slip, found.says) == ("", "none of the known slips gives it")


def test_the_boards_of_this_file_are_what_they_say() -> None:
    network, devices = common_emitter()
    assert len(devices) == 1
    gain = bands_of(network).midband.gain.real
    assert gain == near(RIGHT["gain = "], rel=1e-3)
