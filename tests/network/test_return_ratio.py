"""Return ratio: Bode's difference, Rosenstark's gain, Blackman's impedance, Middlebrook's wire, and a worked stage."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest
import sympy as sp
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

import strategies
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    current_gain,
    current_source,
    delayed_transconductance,
    inductance,
    line,
    mutual_inductance,
    resistance,
    transconductance,
    transresistance,
    voltage_gain,
    voltage_source,
)
from tauledger.errors import InputError
from tauledger.network.admittance import admittance
from tauledger.network.assemble import Network
from tauledger.network.return_ratio import (
    CONTROLLED,
    Opening,
    asymptotic,
    at_admittance,
    at_source,
    at_wire,
    checked,
    leaves_there,
    phase_of_delays,
    ratio_to,
    return_ratio,
)
from tauledger.network.solve import Complex, on_axis, response

SEVERAL = np.array([1.0, 3e3, 1e6, 2e8])


def ratio(opening: Opening, hz: float = 0.0) -> complex:
    return complex(return_ratio(opening, on_axis(hz))[0])


def ring(stages: list[tuple[float, float, float]]) -> Network:
    """Transconductances in a ring, each into R ‖ C; the last one inverts if the number of others is even or not."""
    parts: list[Part] = [current_source("IS", "0", "n0", 1.0)]
    for k, (gm, ohm, farad) in enumerate(stages):
        after = f"n{(k + 1) % len(stages)}"
        parts += [
            transconductance(f"G{k}", (after, "0") if k == 0 else ("0", after), (f"n{k}", "0"), gm),
            resistance(f"R{k}", after, "0", ohm),
            capacitance(f"C{k}", after, "0", farad),
        ]
    return Network.from_parts(parts, output=Port("n0"))


stage = st.tuples(strategies.decades(1e-4, 0.1), strategies.decades(50.0, 1e4), strategies.decades(1e-12, 1e-9))


@settings(max_examples=25, derandomize=True, deadline=None)
@given(network=strategies.networks(strategies.DIRECT), hz=strategies.decades(1e2, 1e9))
def test_return_difference_and_asymptotic_gain_hold_at_every_transconductance(network: Network, hz: float) -> None:
    """1 + T = det Y/det Y0, and H = H∞·T/(1 + T) + H0/(1 + T)."""
    s = on_axis(hz)
    y = np.linalg.det(admittance(network, s)[0])
    h = complex(response(network, np.array([hz]))[0])
    for part in network.parts:
        if part.kind != "transconductance":
            continue
        opening = at_source(network, [part])
        dead = np.linalg.det(admittance(opening.network, s)[0])
        t = complex(return_ratio(opening, s)[0])
        assert 1.0 + t == pytest.approx(complex(y / dead), rel=1e-6)
        assert complex(asymptotic(opening, s).closed[0]) == pytest.approx(h, rel=1e-6, abs=1e-9 * abs(h))
        assert checked(opening, s, np.array([h])) < 1e-6


@settings(max_examples=25, derandomize=True, deadline=None)
@given(stages=st.lists(stage, min_size=2, max_size=4), hz=strategies.decades(1e3, 1e9))
def test_in_a_single_loop_it_does_not_matter_where_it_is_taken(
    stages: list[tuple[float, float, float]], hz: float
) -> None:
    network, s = ring(stages), on_axis(hz)
    expected = complex(np.prod([gm / (1.0 / ohm + complex(s[0]) * farad) for gm, ohm, farad in stages]))
    for k in range(len(stages)):
        at_gm = ratio(at_source(network, [network.part(f"G{k}")]), hz)
        at_control = ratio(at_wire(network, f"G{k}", f"n{k}"), hz)
        assert at_gm == pytest.approx(expected, rel=1e-9)
        assert at_control == pytest.approx(expected, rel=1e-8)


@settings(max_examples=20, derandomize=True, deadline=None)
@given(network=strategies.networks(strategies.DIRECT), hz=strategies.decades(1e2, 1e9))
def test_impedance_follows_from_two_return_ratios(network: Network, hz: float) -> None:
    """Z = Z0·(1 + T with the port shorted)/(1 + T with it open). Source: Blackman, Bell Syst. Tech. J. 22(3), 1943."""
    port = network.port.plus
    silent = [replace(part, amplitude=0.0) for part in network.parts]
    gm = next(part for part in silent if part.kind == "transconductance")

    def impedance(parts: list[Part]) -> complex:
        driven = Network.from_parts([*parts, current_source("IT", "0", port, 1.0)], output=Port(port))
        return complex(response(driven, np.array([hz]))[0])

    opened = Network.from_parts(silent, output=Port(port))
    shorted = Network.from_parts([*silent, voltage_source("VT", port, "0")], output=Port("in"))
    dead = [replace(part, value=0.0) if part is gm else part for part in silent]
    t_open, t_short = (ratio(at_source(one, [gm]), hz) for one in (opened, shorted))
    assert impedance(silent) == pytest.approx(impedance(dead) * (1.0 + t_short) / (1.0 + t_open), rel=1e-7)


@settings(max_examples=20, derandomize=True, deadline=None)
@given(network=strategies.networks(strategies.DIRECT), hz=strategies.decades(1e2, 1e9))
def test_a_wire_counts_what_is_not_reciprocal(network: Network, hz: float) -> None:
    """T = (y21 − y12)/(y11 + y22 + 2·y12), with the wire's two sides as a two-port."""
    s = on_axis(hz)
    opening = at_wire(network, "Q1", "c1")
    parts = [replace(p, amplitude=0.0) for p in opening.network.parts if p.owner != "loop'e"]
    y = np.empty((2, 2), dtype=complex)
    sides = (opening.far, "c1")
    for k, driven in enumerate(sides):
        sources = [voltage_source(f"V{j}", node, "0", 1.0 if node == driven else 0.0) for j, node in enumerate(sides)]
        for j in range(2):
            measured = Network.from_parts([*parts, *sources], output=Port("", kind="current", through=f"V{j}"))
            y[j, k] = -complex(response(measured, np.array([hz]))[0])
    expected = (y[1, 0] - y[0, 1]) / (y[0, 0] + y[1, 1] + 2.0 * y[0, 1])
    assert complex(return_ratio(opening, s)[0]) == pytest.approx(expected, rel=1e-6, abs=1e-9)


def test_nothing_comes_back_through_a_wire_into_a_resistor() -> None:
    network = Network.from_parts(
        [voltage_source("VS", "s", "0", 1.0), resistance("R1", "s", "a", 1e3), capacitance("C1", "a", "0", 1e-9)],
        output=Port("a"),
    )
    assert abs(ratio(at_wire(network, "R1", "a"), 1e5)) < 1e-12


def test_a_shunt_shunt_stage_is_as_worked_symbol_by_symbol() -> None:
    """Common emitter with R_F from collector to base, driven by a current: T by determinants of a worked matrix."""
    gm, r_pi, r_o, r_f, r_l = sp.symbols("gm r_pi r_o r_f r_l", positive=True)
    y = sp.Matrix([[1 / r_pi + 1 / r_f, -1 / r_f], [gm - 1 / r_f, 1 / r_o + 1 / r_l + 1 / r_f]])
    t = sp.simplify(y.det() / y.subs(gm, 0).det() - 1)
    load = r_o * r_l / (r_o + r_l)
    assert sp.simplify(t - gm * load * r_pi / (load + r_f + r_pi)) == 0
    ideal = sp.limit((y.inv() * sp.Matrix([1, 0]))[1], gm, sp.oo)
    assert sp.simplify(ideal + r_f) == 0
    values = {gm: 0.04, r_pi: 3e3, r_o: 60e3, r_f: 33e3, r_l: 2.2e3}
    network = Network.from_parts(
        [
            current_source("IS", "0", "b", 1.0),
            transconductance("Q1", ("c", "0"), ("b", "0"), 0.04, "gm"),
            resistance("RPI", "b", "0", 3e3),
            resistance("RO", "c", "0", 60e3),
            resistance("RF", "c", "b", 33e3),
            resistance("RL", "c", "0", 2.2e3),
        ],
        output=Port("c"),
    )
    found = asymptotic(at_source(network, [network.part("Q1.gm")]), on_axis(0.0))
    assert complex(found.return_ratio[0]) == pytest.approx(float(t.subs(values)), rel=1e-12)
    assert complex(found.ideal[0]) == pytest.approx(-33e3, rel=1e-12)


def amplifier(middle: list[Part]) -> Network:
    """An inverting amplifier of gain −10 around what stands between n and out."""
    return Network.from_parts(
        [
            voltage_source("VS", "s", "0", 1.0),
            resistance("R1", "s", "n", 1e3),
            resistance("R2", "n", "out", 10e3),
            capacitance("C2", "n", "out", 1e-12),
            *middle,
        ],
        output=Port("out"),
    )


GAIN = 5000.0
SOURCES = {
    "E": [voltage_gain("A", ("out", "0"), ("0", "n"), GAIN)],
    "G": [transconductance("A", ("out", "0"), ("n", "0"), GAIN / 50.0), resistance("RO", "out", "0", 50.0)],
    "delayed G": [
        delayed_transconductance("A", ("out", "0"), ("n", "0"), GAIN / 50.0, 1e-9),
        resistance("RO", "out", "0", 50.0),
    ],
    "F": [
        resistance("RI", "n", "m", 1e3),
        voltage_source("VM", "m", "0"),
        current_gain("A", "out", "0", 20.0 * GAIN, "VM"),
        resistance("RO", "out", "0", 50.0),
    ],
    "H": [
        resistance("RI", "n", "m", 1e3),
        voltage_source("VM", "m", "0"),
        transresistance("A", "0", "out", 1e3 * GAIN, "VM"),
    ],
}


@pytest.mark.parametrize("kind", SOURCES)
def test_every_controlled_source_obeys_the_gain_formula_and_has_the_ideal_gain_of_its_resistors(kind: str) -> None:
    network = amplifier(SOURCES[kind])
    parts = [part for part in network.parts if part.owner == "A"]
    assert all(part.kind in CONTROLLED for part in parts)
    opening = at_source(network, parts)
    assert checked(opening, on_axis(SEVERAL), response(network, SEVERAL)) < 1e-9
    found = asymptotic(opening, on_axis(0.0))
    assert complex(found.return_ratio[0]).real > 10.0
    assert complex(found.ideal[0]).real == pytest.approx(-10.0, rel=1e-9)


def test_voltages_in_series_are_one_source() -> None:
    halves = [
        voltage_gain("E1", ("out", "E1'1"), ("0", "n"), 0.25 * GAIN),
        voltage_gain("E1'2", ("E1'1", "0"), ("0", "n"), 0.75 * GAIN),
    ]
    split, whole = amplifier(halves), amplifier(SOURCES["E"])
    one = ratio(at_source(whole, [whole.part("A")]), 1e5)
    assert ratio(at_source(split, halves), 1e5) == pytest.approx(one, rel=1e-12)


def test_the_noise_gain_does_not_depend_on_the_amplifier() -> None:
    """1/β = 1 + R2/R1 at DC, whatever the gain: T = a·β."""
    for gain in (10.0, 1e6):
        network = amplifier([voltage_gain("A", ("out", "0"), ("0", "n"), gain)])
        opening = at_source(network, [network.part("A")])
        noise = complex(ratio_to(opening, "out", "0", on_axis(0.0))[0])
        assert abs(noise) == pytest.approx(11.0, rel=1e-9)
        assert ratio(opening) * abs(noise) == pytest.approx(gain, rel=1e-9)


@pytest.mark.parametrize("name", ["R2", "C2", "L1"])
def test_an_admittance_has_the_impedance_that_it_sees_over_its_own(name: str) -> None:
    """Bode's return ratio with reference 0: what stands across the place without it, times the admittance."""
    hz = 3e6
    network = amplifier([*SOURCES["G"], inductance("L1", "out", "0", 1e-6)])
    part = network.part(name)
    opening = at_admittance(network, part)
    a, b = part.nodes
    rest = [replace(p, amplitude=0.0) for p in network.parts if p is not part]
    seen = Network.from_parts([*rest, current_source("IT", b, a, 1.0)], output=Port(a, b))
    own = {"R2": 1e-4, "C2": 2j * math.pi * hz * 1e-12, "L1": 1.0 / (2j * math.pi * hz * 1e-6)}[name]
    z = complex(response(seen, np.array([hz]))[0])
    assert ratio(opening, hz) == pytest.approx(z * own, rel=1e-9)
    at = np.array([hz])
    assert checked(opening, on_axis(at), response(network, at)) < 1e-9


def test_what_has_no_return_ratio_is_refused() -> None:
    network = amplifier(SOURCES["E"])
    with pytest.raises(InputError, match="taken at controlled sources"):
        at_source(network, [network.part("R1")])
    with pytest.raises(InputError, match="no resistor, capacitor or inductor"):
        at_admittance(network, network.part("A"))
    with pytest.raises(InputError, match="no wire leads from s into R2"):
        at_wire(network, "R2", "s")
    with pytest.raises(ValueError, match="no single source"):
        asymptotic(at_wire(network, "R2", "n"), on_axis(1.0))


def test_the_phase_of_a_delay_is_in_it() -> None:
    hz = 1e7
    plain, late = (amplifier(SOURCES[kind]) for kind in ("G", "delayed G"))
    ratios: list[complex] = [ratio(at_source(one, [one.part("A")]), hz) for one in (plain, late)]
    assert ratios[1] / ratios[0] == pytest.approx(cmath.exp(-2j * math.pi * hz * 1e-9), rel=1e-9)


def test_ratios_are_arrays_over_frequency() -> None:
    network = amplifier(SOURCES["G"])
    found: Complex = return_ratio(at_source(network, [network.part("A")]), on_axis(SEVERAL))
    assert found.shape == SEVERAL.shape


def test_a_source_in_the_forward_path_alone_has_no_loop_and_no_ideal_gain() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        transconductance("G1", ("0", "out"), ("a", "0"), 2e-3),
        resistance("R2", "out", "0", 5e3),
        capacitance("C1", "out", "0", 1e-9),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    opening = at_source(network, [network.part("G1")])
    found = asymptotic(opening, on_axis(SEVERAL))
    assert np.all(found.return_ratio == 0.0)
    assert np.all(np.isnan(found.ideal))
    # what goes through the source is no feedthrough
    assert np.all(found.feedthrough == 0.0)
    assert checked(opening, on_axis(SEVERAL), response(network, SEVERAL)) < 1e-12


def test_what_rounding_leaves_of_a_return_ratio_gives_no_ideal_gain() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        transconductance("G1", ("0", "b"), ("a", "0"), 2e-3),
        resistance("R2", "b", "0", 5e3),
        # bridges of 1e-9 Ω make rounding of all that stands beside them
        resistance("R3", "b", "out", 1e-9),
        resistance("R4", "out", "0", 3e3),
        resistance("R5", "a", "s", 1e-9),
        capacitance("C1", "out", "0", 1e-9),
        capacitance("C2", "a", "out", 1e-32),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    opening = at_source(network, [network.part("G1")])
    found = asymptotic(opening, on_axis(SEVERAL))
    assert np.all(np.abs(found.return_ratio) > 0.0)
    assert np.all(np.isnan(found.ideal))
    assert checked(opening, on_axis(SEVERAL), response(network, SEVERAL)) < 1e-9


def test_a_forced_voltage_and_a_current_together_are_no_single_source() -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 1e3),
        voltage_gain("E1", ("out", "0"), ("a", "0"), 3.0),
        current_gain("F1", "a", "0", -3.0, "E1"),
        resistance("R2", "out", "0", 5e3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    with pytest.raises(InputError, match="several outputs"):
        at_source(network, [network.part("E1"), network.part("F1")])


def test_names_are_compared_as_the_netlist_compares_them() -> None:
    parts = [
        voltage_source("VS", "in", "0", 1.0),
        resistance("R1", "in", "a", 50.0),
        inductance("L1", "a", "0", 1e-6),
        inductance("L2", "out", "0", 1e-6),
        mutual_inductance("K1", "l1", "l2", ("a", "0", "out", "0"), 0.5e-6),
        resistance("R2", "out", "0", 1e3),
    ]
    network = Network.from_parts(parts, output=Port("out"))
    with pytest.raises(InputError, match="is used elsewhere"):
        at_admittance(network, network.part("L1"))
    assert at_wire(network, "r2", "out").kind == "wire"


def test_a_wire_by_which_the_signal_comes_out_is_cut_the_other_way_round() -> None:
    """A transconductance into R ‖ C with half of it back: T = gm·R/2 at its control and, outward, at its output."""
    network = ring([(2e-3, 10e3, 1e-12), (1e-3, 2e3, 1e-12)])
    s = on_axis(1e6)
    assert not leaves_there(network, "G0", "n0", complex(s[0]))
    assert leaves_there(network, "G0", "n1", complex(s[0]))
    whole = ratio(at_source(network, [part for part in network.parts if part.owner == "G0"]), 1e6)
    assert ratio(at_wire(network, "G0", "n0"), 1e6) == pytest.approx(whole, rel=1e-9)
    assert ratio(at_wire(network, "G0", "n1", outward=True), 1e6) == pytest.approx(whole, rel=1e-9)
    assert ratio(at_wire(network, "G0", "n1"), 1e6) != pytest.approx(whole, rel=0.1)


@pytest.mark.parametrize(("delay_s", "hz"), [(2e-9, 1e6), (10e-9, 5e6)])
def test_a_matched_line_in_the_loop_delays_t_by_its_own_phase(delay_s: float, hz: float) -> None:
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("RS", "s", "in", 1e3),
        transconductance("G1", ("a", "0"), ("in", "0"), 1.0),
        resistance("R1", "a", "0", 50.0),
        line("T1", ("a", "0", "b", "0"), delay_s, surge_ohm=50.0),
        resistance("R2", "b", "0", 50.0),
        resistance("RF", "b", "in", 1e6),
    ]
    network = Network.from_parts(parts, output=Port("b"))
    opening = at_source(network, [part for part in network.parts if part.owner == "G1"])
    assert phase_of_delays(opening, hz) == pytest.approx(-360.0 * hz * delay_s, rel=1e-3)
    without = Network.from_parts([part for part in parts if part.kind != "line"], output=Port("a"))
    assert phase_of_delays(replace(opening, network=without), hz) == 0.0
