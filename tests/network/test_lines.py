"""Uniform lines against the telegrapher's closed forms: response, slope, band edges, shares, phase."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from amplifiers import DRIVE, network
from strategies import decades
from tauledger.circuit import Port
from tauledger.devices.parts import Part, capacitance, line, resistance, transconductance, voltage_source
from tauledger.errors import InputError
from tauledger.network.assemble import Network
from tauledger.network.bands import classify
from tauledger.network.constants import group_delay
from tauledger.network.edges import Edges, find_edges
from tauledger.network.identities import check, response_identities, share_identities
from tauledger.network.lines import at_rest, lumped, require_held_ends
from tauledger.network.midband import MidBand, find_midband
from tauledger.network.poles import find_poles
from tauledger.network.recompute import each_scaled, edge_frequencies, scaled
from tauledger.network.ripple import followed
from tauledger.network.shares import Shares, find_shares
from tauledger.network.solve import DENSE_LIMIT, Complex, Real, log_slope, on_axis, response, solve
from tauledger.network.unity import find_unity
from tauledger.numbers import solve_network
from tauledger.pipeline import review_network

ENDS = ("near", "0", "out", "0")


def driven(source_ohm: float, part: Part, load_ohm: float, *more: Part) -> Network:
    """A source with resistance, a line, a load."""
    return network(resistance("RS", "in", "near", source_ohm), part, resistance("RL", "out", "0", load_ohm), *more)


def telegrapher(f: Real, source_ohm: float, rlc: tuple[float, float, float], load_ohm: float) -> Complex:
    """H of source resistance, line of R, L and C in all, and load: by its chain matrix."""
    s = 2j * np.pi * f
    z, y = rlc[0] + s * rlc[1], s * rlc[2]
    gamma = np.sqrt(y) * np.sqrt(z)
    surge = z / gamma
    return np.asarray(
        1.0
        / (np.cosh(gamma) * (1.0 + source_ohm / load_ohm) + np.sinh(gamma) * (surge / load_ohm + source_ohm / surge))
    )


def made(rlc: tuple[float, float, float]) -> Part:
    ohm, henry, farad = rlc
    if henry:
        return line("T1", ENDS, math.sqrt(henry * farad), math.sqrt(henry / farad), ohm)
    return line("T1", ENDS, ohm * farad, series_ohm=ohm)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(
    decades(1.0, 1e4),
    decades(1.0, 1e6),
    st.sampled_from([0.0, 1e-3, 2.0, 300.0]),
    decades(1e-9, 1e-5),
    decades(1e-12, 1e-8),
)
def test_every_line_obeys_the_telegraphers_equations(
    source: float, load: float, ohm: float, henry: float, farad: float
) -> None:
    tau = math.sqrt(henry * farad)
    # the phase of the closed form itself rounds by some ε·2πf·τ
    f = np.geomspace(1e-9, 30.0, 60) / tau
    exact = telegrapher(f, source, (ohm, henry, farad), load)
    ours = response(driven(source, made((ohm, henry, farad)), load), f)
    seen = np.abs(exact) > 1e-9
    assert np.allclose(ours[seen], exact[seen], rtol=1e-9 * (1.0 + source / load), atol=0.0)


@settings(max_examples=20, deadline=None, derandomize=True)
@given(decades(1.0, 1e5), decades(1.0, 1e6), decades(1.0, 1e5), decades(1e-14, 1e-9))
def test_a_line_of_resistance_and_capacitance_alone_does_too(
    source: float, load: float, ohm: float, farad: float
) -> None:
    f = np.geomspace(1e-6, 20.0, 50) / (ohm * farad)
    exact = telegrapher(f, source, (ohm, 0.0, farad), load)
    assert np.allclose(response(driven(source, made((ohm, 0.0, farad)), load), f), exact, rtol=1e-10, atol=0.0)


def test_what_a_long_lossy_line_lets_through_keeps_its_digits() -> None:
    """18 neper: of 1 V some 10 nV arrive, and their digits are those of the wave, not of what drives it."""
    rlc = (2000.0, 2.5e-6, 1e-9)
    f = np.array([1e9, 3e9])
    exact = telegrapher(f, 50.0, rlc, 50.0)
    assert np.all(np.abs(exact) < 1e-7)
    assert np.allclose(response(driven(50.0, made(rlc), 50.0), f), exact, rtol=1e-11, atol=0.0)


def test_a_shorted_stub_is_z0_tan() -> None:
    """Near DC ngspice's own waves lose what is left of 1 − e^(−jωτ); the closed form and these rows do not."""
    stub = line("T1", ("out", "0", "0", "0"), 5e-9, 50.0)
    made = network(resistance("RS", "in", "out", 50.0), stub)
    f = np.array([1.0, 1e3, 1e6, 3e7, 1.7e8])
    z = 50j * np.tan(2.0 * np.pi * f * 5e-9)
    assert np.allclose(response(made, f), z / (50.0 + z), rtol=1e-13, atol=0.0)


def test_a_matched_line_is_a_delay_and_a_short_one_a_wire() -> None:
    f = np.geomspace(1.0, 1e9, 40)
    matched = response(driven(75.0, line("T1", ENDS, 5e-9, 75.0), 75.0), f)
    assert np.allclose(matched, 0.5 * np.exp(-2j * np.pi * f * 5e-9), rtol=1e-13)
    wire = response(driven(10.0, line("T1", ENDS, 1e-21, 75.0), 1e3), f)
    assert np.allclose(wire, 1e3 / 1010.0, rtol=1e-10)


@pytest.mark.parametrize(
    ("whole", "half"),
    [
        (line("T1", ENDS, 8e-9, 60.0), (4e-9, 60.0, 0.0)),
        (line("T1", ENDS, 8e-9, 60.0, 14.0), (4e-9, 60.0, 7.0)),
        (line("T1", ENDS, 6e-7, series_ohm=3e3), (1.5e-7, 0.0, 1.5e3)),
    ],
    ids=["lossless", "lossy", "R and C"],
)
def test_two_halves_are_the_whole(whole: Part, half: tuple[float, float, float]) -> None:
    delay, surge, ohm = half
    halves = network(
        *(resistance("RS", "in", "near", 20.0), resistance("RL", "out", "0", 1e3)),
        line("TA", ("near", "0", "mid", "0"), delay, surge, ohm),
        line("TB", ("mid", "0", "out", "0"), delay, surge, ohm),
    )
    f = np.geomspace(1e3, 1e9, 60)
    assert np.allclose(response(driven(20.0, whole, 1e3), f), response(halves, f), rtol=1e-10, atol=0.0)


@pytest.mark.parametrize("ohm", [0.0, 30.0])
def test_a_line_is_the_same_from_either_end(ohm: float) -> None:
    f = np.geomspace(1e3, 1e9, 30)
    forth, back = (driven(20.0, line("T1", ends, 8e-9, 60.0, ohm), 1e3) for ends in (ENDS, ("out", "0", "near", "0")))
    assert np.allclose(response(forth, f), response(back, f), rtol=1e-11)


def test_a_line_without_common_return_passes_no_common_voltage() -> None:
    """The current out of one conductor is that into the other; nothing else joins the ends."""
    f = np.geomspace(1e3, 1e9, 30)
    tied = response(driven(20.0, line("T1", ENDS, 8e-9, 60.0), 1e3), f)
    lifted = network(
        *(resistance("RS", "in", "near", 20.0), resistance("RB", "far", "0", 7e3)),
        line("T1", ("near", "0", "out", "far"), 8e-9, 60.0),
        resistance("RL", "out", "far", 1e3),
    )
    across = response(lifted, f) - response(Network.from_parts(lifted.parts, output=Port("far")), f)
    assert np.allclose(across, tied, rtol=1e-10)
    assert np.allclose(response(at_rest(lifted), f), 1e3 / 1020.0, rtol=1e-12)


def test_a_line_that_nothing_else_holds_is_refused() -> None:
    loose = [DRIVE, resistance("RS", "in", "near", 20.0), line("T1", ("near", "0", "out", "far"), 8e-9, 60.0)]
    made = Network.from_parts([*loose, resistance("RL", "out", "far", 1e3)], output=Port("out"))
    with pytest.raises(InputError, match="T1: nothing but the line holds the nodes out and far"):
        require_held_ends(made)
    require_held_ends(driven(20.0, line("T1", ENDS, 8e-9, 60.0), 1e3))


LINES = {
    "lossless": line("T1", ENDS, 8e-9, 60.0),
    "lossy": line("T1", ENDS, 8e-9, 60.0, 30.0),
    "very lossy": line("T1", ENDS, 8e-9, 60.0, 3e3),
    "R and C": line("T1", ENDS, 6e-9, series_ohm=3e2),
}


def stage(part: Part, *more: Part) -> Network:
    return driven(20.0, part, 1e3, capacitance("CN", "near", "0", 20e-12), capacitance("CL", "out", "0", 2e-12), *more)


@pytest.mark.parametrize("kind", LINES)
def test_the_slope_of_h_is_exact(kind: str) -> None:
    made = stage(LINES[kind])
    f, step = np.geomspace(1e5, 2e9, 25), 1e-5
    exact = log_slope(made, solve(made, on_axis(f)))
    ahead, behind = (np.log(response(made, f * (1.0 + way * step))) for way in (1.0, -1.0))
    turn = ahead - behind
    by_steps = (turn.real + 1j * (np.mod(turn.imag + np.pi, 2.0 * np.pi) - np.pi)) / (2.0 * step)
    assert np.allclose(exact, by_steps, rtol=1e-6, atol=1e-6 * float(np.max(np.abs(exact))))


@pytest.mark.parametrize("kind", LINES)
def test_dense_and_sparse_solution_are_the_same(kind: str) -> None:
    few = stage(LINES[kind])
    many = Network.from_parts(
        [*few.parts, *(resistance(f"R{k}", f"x{k}", "0", 1e3) for k in range(DENSE_LIMIT))], output=few.port
    )
    f = np.geomspace(1e3, 3e9, 7)
    assert np.allclose(response(few, f), response(many, f), rtol=1e-11, atol=0.0)
    a, b = solve(few, on_axis(f)), solve(many, on_axis(f))
    assert np.allclose(a.adjoint, b.adjoint[:, [*range(few.n_nodes), *range(many.n_nodes, many.size)]], rtol=1e-9)
    assert np.allclose(log_slope(few, a), log_slope(many, b), rtol=1e-9)


def edges_of(made: Network) -> tuple[MidBand, Edges]:
    midband = find_midband(made)
    return midband, find_edges(made, midband)


def shares_of(made: Network) -> tuple[MidBand, Shares]:
    midband, edges = edges_of(made)
    assert edges.f_high is not None
    assert edges.f_high.hz is not None
    return midband, find_shares(made, midband, edges.f_high.hz, classify(made, midband).class_of)


@pytest.mark.parametrize("kind", LINES)
def test_shares_of_line_and_capacitors_add_up_and_are_what_small_changes_do(kind: str) -> None:
    made = stage(LINES[kind])
    midband, shares = shares_of(made)
    check((*share_identities(shares), *response_identities(made, midband)))
    names = [part.name for part in made.parts if part.kind in ("capacitance", "line")]
    assert set(names) == set(shares.parts)
    for name in names:
        up, down = (edge_frequencies(scaled(made, {name: 1.0 + step}), midband).f_high for step in (1e-4, -1e-4))
        assert up is not None
        assert down is not None
        assert shares.parts[name] == pytest.approx(-math.log(up / down) / 2e-4, abs=1e-5)


@pytest.mark.parametrize("kind", LINES)
def test_scaling_delay_and_capacitors_together_scales_frequency(kind: str) -> None:
    made = stage(LINES[kind])
    slower = scaled(made, {part.name: 3.0 for part in made.parts if part.kind in ("capacitance", "line")})
    f = np.geomspace(1e5, 3e9, 20)
    assert np.allclose(response(made, f), response(slower, f / 3.0), rtol=1e-11)


def test_ten_per_cent_less_of_a_line_is_solved_anew() -> None:
    made = stage(LINES["lossy"])
    midband, edges = edges_of(made)
    less = each_scaled(made, midband, edges, 0.9)
    assert set(less) == {"CN", "CL", "T1.delay"}
    assert less["T1.delay"] == edge_frequencies(scaled(made, {"T1.delay": 0.9}), midband)


def ripple_edge(source: float, surge: float, delay: float, load: float) -> float:
    """The first f where 1/|cos θ·(1 + S/R) + j·sin θ·(Z/R + S/Z)| is 3 dB below its value at DC, θ = 2πfτ."""
    dc, sine = 1.0 + source / load, surge / load + source / surge
    return math.asin(dc / math.sqrt(sine**2 - dc**2)) / (2.0 * math.pi * delay)


@pytest.mark.parametrize(("source", "load"), [(300.0, 500.0), (1e3, 1e3), (5.0, 9.0)])
def test_without_any_capacitor_the_edge_is_where_reflections_put_it(source: float, load: float) -> None:
    midband, edges = edges_of(driven(source, line("T1", ENDS, 5e-9, 50.0), load))
    assert midband.frequency_hz == 0.0
    assert edges.f_high is not None
    assert edges.f_high.hz == pytest.approx(ripple_edge(source, 50.0, 5e-9, load), rel=1e-12)
    # the ripple comes back and falls again, a half period further each time
    assert edges.f_high.hz is not None
    assert edges.f_high.hz + edges.f_high.further_hz[0] == pytest.approx(1.0 / (2.0 * 5e-9), rel=1e-9)


def test_a_long_line_that_matches_has_no_edge_and_no_peak() -> None:
    midband, edges = edges_of(driven(50.0, line("T1", ENDS, 5e-7, 50.0), 50.0))
    assert midband.plateau
    assert edges.f_high is None


def test_the_first_of_many_dips_is_the_edge() -> None:
    """Mismatch ripples |H| 40 times before one of its dips reaches −3 dB; none before that one is passed over."""
    made = driven(50.0, line("T1", ENDS, 5e-8, 75.0), 120.0, capacitance("CN", "near", "0", 2e-12))
    midband, edges = edges_of(made)
    assert edges.f_high is not None
    hz = edges.f_high.hz
    assert hz is not None
    before = np.abs(response(made, np.linspace(1e5, hz * (1.0 - 1e-9), 40_000))) / abs(midband.gain)
    assert before.min() > 1.0 / math.sqrt(2.0)
    assert hz > 40.0 / (2.0 * 5e-8)


def test_phase_at_the_edge_holds_all_turns_of_the_delay() -> None:
    delay = 2e-7
    matched = driven(
        50.0,
        line("T1", ENDS, delay, 50.0),
        50.0,
        transconductance("G1", ("0", "x"), ("out", "0"), 1e-3, label="gm"),
        resistance("RX", "x", "0", 1e3),
        capacitance("CX", "x", "0", 1e-12),
    )
    made = Network.from_parts(matched.parts, output=Port("x"))
    _, edges = edges_of(made)
    assert edges.f_high is not None
    hz = edges.f_high.hz
    assert hz == pytest.approx(1.0 / (2.0 * math.pi * 1e-9), rel=1e-9)
    assert hz is not None
    assert edges.f_high.phase_deg == pytest.approx(-45.0 - 360.0 * hz * delay, abs=1e-6)


def test_group_delay_of_a_matched_line_is_its_delay() -> None:
    delays = group_delay(driven(50.0, line("T1", ENDS, 5e-9, 50.0), 50.0), 1e6)
    assert delays == {"T1.delay": pytest.approx(5e-9, rel=1e-12, abs=0.0)}


def test_delay_in_a_loop_takes_phase_margin() -> None:
    """A single pole of gain 1000 and a matched line: at f_u the margin is 90° less the turn of the delay."""
    parts = [
        *(
            DRIVE,
            resistance("RS", "in", "near", 50.0),
            line("T1", ENDS, 3e-9, 50.0),
            resistance("RL", "out", "0", 50.0),
        ),
        transconductance("G1", ("0", "x"), ("out", "0"), 2.0, label="gm"),
        *(resistance("RX", "x", "0", 1e3), capacitance("CX", "x", "0", 1e-8)),
    ]
    made = Network.from_parts(parts, output=Port("x"))
    unity = find_unity(made, find_midband(made))
    assert unity is not None
    pole = 1.0 / (2.0 * math.pi * 1e-5)
    assert unity.hz == pytest.approx(pole * math.sqrt(1000.0**2 - 1.0), rel=1e-9)
    lag = math.degrees(math.atan(unity.hz / pole)) + 360.0 * unity.hz * 3e-9
    assert unity.phase_margin_deg == pytest.approx(180.0 - lag, abs=1e-6)


def test_poles_take_a_line_as_at_dc() -> None:
    made = stage(LINES["lossy"])
    wired = network(
        *(
            resistance("RS", "in", "near", 20.0),
            resistance("T1", "near", "out", 30.0),
            resistance("RL", "out", "0", 1e3),
        ),
        *(capacitance("CN", "near", "0", 20e-12), capacitance("CL", "out", "0", 2e-12)),
    )
    ours, theirs = find_poles(made), find_poles(wired)
    assert [pole.s for pole in ours.poles] == pytest.approx([pole.s for pole in theirs.poles], rel=1e-9)
    assert classify(made, find_midband(made)).sound


def test_two_wires_beside_each_other_are_one() -> None:
    made = driven(10.0, line("T1", ENDS, 5e-9, 75.0), 50.0, line("T2", ENDS, 7e-9, 75.0))
    assert response(at_rest(made), np.array([1e3]))[0] == pytest.approx(50.0 / 60.0, rel=1e-12)


@pytest.mark.parametrize("kind", ["lossless", "lossy"])
def test_one_lumped_section_is_right_far_below_the_first_resonance(kind: str) -> None:
    made = stage(LINES[kind])
    f = np.array([1e3, 1e5, 1e6])
    assert np.allclose(response(lumped(made), f), response(made, f), rtol=1e-3, atol=0.0)


def test_phase_is_followed_as_far_as_it_is_asked_for() -> None:
    delay = 2e-7
    made = driven(50.0, line("T1", ENDS, delay, 50.0), 50.0, capacitance("CN", "near", "0", 20e-12))
    _, edges = edges_of(made)
    assert edges.angle is not None
    hz = 1234.56e6
    h = response(made, np.array([hz]))
    angle, end_hz = followed(made, edges.angle, hz, 100_000)
    assert end_hz >= hz
    # 25 Ω and 20 pF at the near end, the delay behind
    turned = -math.degrees(math.atan(2.0 * math.pi * hz * 0.5e-9)) - 360.0 * hz * delay
    assert angle.along(np.array([hz]), h)[0] == pytest.approx(turned, abs=1e-6)
    assert followed(made, edges.angle, hz, 100)[1] < hz


def test_a_stub_that_shorts_the_path_at_dc_is_reviewed_by_its_waves_alone() -> None:
    """The near end is shorted: no signal passes the line as at DC, and so there are neither zeros nor edges of that."""
    parts = [
        voltage_source("VS", "s", "0", 1.0),
        resistance("R1", "s", "a", 600.0),
        line("T1", ("0", "0", "a", "0"), 0.29e-9, 50.0),
        transconductance("G1", ("0", "out"), ("a", "0"), 0.01),
        resistance("R2", "out", "0", 1e3),
        capacitance("C1", "out", "0", 1e-12),
    ]
    found = review_network(Network.from_parts(parts, output=Port("out")))
    assert found.f_high is not None
    assert found.f_high.exact_hz is not None
    assert found.zeros == ()
    assert found.nodes == ()


def test_a_stage_fed_through_a_shorted_line_from_a_held_node_has_a_response_though_the_line_is_a_wire_at_dc() -> None:
    """A shorted quarter wave of 75 Ω between a supply of 0 V and the output: the gain is highest where it opens."""
    parts = [
        voltage_source("VS", "in", "0", 1.0),
        voltage_source("VCC", "vcc", "0", 0.0),
        transconductance("G1", ("out", "0"), ("in", "0"), 0.1),
        resistance("RO", "out", "0", 300.0),
        line("T1", ("out", "0", "vcc", "0"), 2.5e-9, 75.0),
    ]
    numbers = solve_network(Network.from_parts(parts, output=Port("out", "0")))
    assert numbers.midband.frequency_hz == pytest.approx(100e6, rel=1e-9)
    assert abs(numbers.midband.gain) == pytest.approx(30.0, rel=1e-9)
    # |H| = 30/√(1 + (300/(75·tan θ))²), which is 3 dB down where tan θ = 4
    low, high = numbers.edges.f_low, numbers.edges.f_high
    assert low is not None
    assert high is not None
    assert low.hz == pytest.approx(np.arctan(4.0) / (2.0 * np.pi * 2.5e-9), rel=1e-9)
    assert high.hz == pytest.approx((np.pi - np.arctan(4.0)) / (2.0 * np.pi * 2.5e-9), rel=1e-9)
    held = solve_network(Network.from_parts(parts, output=Port("out", "0")), midband_hz=100e6)
    assert held.edges.f_high is not None
    assert held.edges.f_high.hz == pytest.approx(high.hz, rel=1e-9)
