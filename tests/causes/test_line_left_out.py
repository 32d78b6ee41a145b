"""A line, which paper takes as a wire or a resistor."""

from __future__ import annotations

import math

import pytest

from amplifiers import network
from tauledger.causes.cause import Cause
from tauledger.devices.parts import Part, capacitance, line, resistance
from tauledger.explain import Explanation, explain
from tauledger.numbers import solve_network

ENDS = ("near", "0", "out", "0")


def explained(part: Part, load_ohm: float, *more: Part) -> Explanation:
    made = network(resistance("RS", "in", "near", 1e3), part, resistance("RL", "out", "0", load_ohm), *more)
    return explain(solve_network(made))


def the_cause(found: Explanation) -> Cause:
    (told,) = [cause for cause in found.causes if cause.cause == "line-left-out"]
    return told


def test_an_open_line_is_a_capacitor_that_paper_leaves_out() -> None:
    """1 kΩ into 100 pF of line and 20 pF: 7.96 MHz with the 20 pF alone, about 1.33 MHz with all."""
    found = explained(line("T1", ENDS, 5e-9, 50.0), 1e6, capacitance("CL", "out", "0", 20e-12))
    cause = the_cause(found)
    assert (cause.quantity, cause.where) == ("f_H", "T1")
    assert cause.effect == pytest.approx(20.0 / 120.0 - 1.0, abs=5e-3)
    assert cause.says == (
        "T1 is a line (50 Ω, 5 ns): taken as at DC, as on paper, f_H would be 7.97 MHz; it is 1.33 MHz"
    )
    assert cause.instead == (
        "end a line with its own resistance, or where it is short against the wavelength put 100 pF across and 250 nH "
        "along into the circuit"
    )
    steps = [step for step in found.hand.steps if step.edge == "f_high"] if found.hand else []
    assert steps[-1].step == "lines"
    assert steps[-1].why == "T1 is a line (50 Ω, 5 ns), till here as at DC"
    assert steps[-2].hz == pytest.approx(1.0 / (2.0 * math.pi * 20e-12 / (1e-3 + 1e-6)), rel=1e-9)


def test_without_any_capacitor_on_paper_there_would_be_no_edge() -> None:
    cause = the_cause(explained(line("T1", ENDS, 5e-9, 50.0), 1e6))
    assert cause.effect == -1.0
    assert "there would be no f_H; it is 1.60 MHz" in cause.says


def test_a_track_has_capacitance_but_no_wavelength() -> None:
    cause = the_cause(explained(line("O1", ENDS, 2e-9, series_ohm=200.0), 1e6))
    assert "O1 is a line (200 Ω and 10 pF)" in cause.says
    assert cause.instead == "put 10 pF into the circuit, half of it at either end"


def test_a_matched_line_costs_nothing() -> None:
    found = explained(line("T1", ENDS, 5e-9, 1e3), 1e3, capacitance("CN", "in", "0", 20e-12))
    assert "line-left-out" not in [cause.cause for cause in found.causes]


def test_a_network_without_lines_has_none() -> None:
    made = network(resistance("RS", "in", "out", 1e3), capacitance("CL", "out", "0", 20e-12))
    found = explain(solve_network(made))
    assert "line-left-out" not in [cause.cause for cause in found.causes]
    assert "lines" not in [note.note for note in found.notes]


def test_a_note_says_what_takes_the_line_as_at_dc() -> None:
    notes = {note.note: note for note in explained(line("T1", ENDS, 5e-9, 50.0, 3.0), 1e6).notes}
    assert notes["lines"].where == "T1"
    assert notes["lines"].says == (
        "T1 is a line (50 Ω, 5 ns, 3 Ω along it): response, band edges and shares are exact; poles, zeros, time "
        "constants and figures by hand leave out its delay and take it as at DC, what resistance it has"
    )
    assert "peaking" not in notes or "reflections on T1" in notes["peaking"].says


def test_a_note_says_how_far_a_ripple_is_followed() -> None:
    """10 km beside a centimetre: the ripple of the long one is not followed to the short one's first resonance."""
    found = explained(
        line("T1", ("near", "0", "mid", "0"), 5e-5, 1e3), 1e3, line("T2", ("mid", "0", "out", "0"), 5e-11, 1e3)
    )
    (note,) = [note for note in found.notes if note.note == "ripple-followed"]
    assert "followed up to 8.33 MHz" in note.says


def test_a_note_says_where_ten_per_cent_less_moves_the_edge_to_another_dip() -> None:
    """The long dips come nearer when the line is shorter, and another one is first to reach -3 dB."""
    rippling = network(
        *(resistance("RS", "in", "near", 50.0), capacitance("CN", "near", "0", 2e-12)),
        line("T1", ENDS, 5e-8, 75.0),
        *(resistance("RL", "out", "0", 120.0), capacitance("CL", "out", "0", 1e-12)),
    )
    found = explain(solve_network(rippling))
    (note,) = [note for note in found.notes if note.note == "another-dip"]
    assert note.where == "f_H"
    assert "10 % less of delay of T1 moves it to another, by -0.01 %, where its share, 97 %," in note.says
    smooth = explained(line("T1", ENDS, 5e-9, 50.0), 1e6, capacitance("CL", "out", "0", 20e-12))
    assert "another-dip" not in [note.note for note in smooth.notes]


def test_no_method_that_leaves_out_a_line_is_recommended_where_it_has_a_share_or_moves_the_edge() -> None:
    found = explained(line("T1", ENDS, 5e-9, 50.0), 1e6, capacitance("CL", "out", "0", 20e-12))
    assert found.hand is not None
    assert not [row for row in found.hand.methods if row.edge == "f_high" and row.recommended]
    assert found.hand.no_method["f_high"].startswith("T1, a line, moves it by -83 % and has a share of ")


def test_a_line_that_does_nothing_leaves_the_recommendation_alone() -> None:
    found = explained(line("T1", ENDS, 1e-15, 50.0), 1e6, capacitance("CL", "out", "0", 20e-12))
    assert found.hand is not None
    assert [row.method for row in found.hand.methods if row.edge == "f_high" and row.recommended]
    assert "f_high" not in found.hand.no_method
